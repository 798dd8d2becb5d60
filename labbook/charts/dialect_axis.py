"""Numbers on an axis in another dialect: the words, labels and titles that say which."""

from collections.abc import Iterable, Mapping

from labbook.charts import axes
from labbook.registry.catalogue import NUMBERS, Number
from labbook.registry.dialects import AT_BIRTH, DIALECTS, Choices, completed, formula_of, written_choices
from labbook.registry.formula import parse
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES

OWN = "the group's own"
HOUSE_ONLY = "regimes and ranges are read in the house dialect"


def dialects(number: str, house: Choices | None = None) -> dict[str, dict[str, object]]:
    """Every choice of a number's published dialects, by the words that name them; the house's first.

    house: the group's choices (left out: those at birth). A number without dialects has the house's alone.
    """
    if number not in AT_BIRTH:
        return {"house": {}}
    rows = [{}, *(row.choices for row in DIALECTS if row.of == number)]
    spoken = [completed(number, {}, house), *(completed(number, choices) for choices in rows)]
    return {written_choices(number, choices, house): choices for choices in spoken}


def dialect_title(
    number: str, choices: Choices, house: Choices | None = None, numbers: Mapping[str, Number] = NUMBERS
) -> str:
    """The axis title: the dialect's formula, and its words; 'house dialect' where it is the house's."""
    if number not in AT_BIRTH:
        return axes.title(number, axes.HOUSE if number in NUMBERS else OWN, numbers)
    chosen = completed(number, choices, house)
    if chosen == AT_BIRTH[number] == completed(number, {}, house):
        return axes.title(number)
    row = NUMBERS[number]
    formula = _formula(number, chosen)
    head = f"{row.name} {formula}" if _spelt_out(row) else f"{row.symbol} = {formula}"
    # said against the dialect at birth: that one never changes
    words = written_choices(number, chosen)
    if chosen == completed(number, {}, house):
        return f"{head}, {axes.HOUSE} ({words})"
    return f"{head}, dialect {'as at birth' if words == 'house' else words}"


def dialect_label(
    number: str, choices: Choices, house: Choices | None = None, numbers: Mapping[str, Number] = NUMBERS
) -> str:
    """The symbol with the dialect's words, 'Sp (rate f, power 1)'; the symbol alone in the house dialect."""
    if number not in AT_BIRTH:
        return axes.label(number, numbers)
    chosen, row = completed(number, choices, house), NUMBERS[number]
    symbol = _formula(number, chosen) if _spelt_out(row) and chosen != AT_BIRTH[number] else row.symbol
    words = written_choices(number, chosen, house)
    return symbol if words == "house" else f"{symbol} ({words})"


def axis_words(keys: Iterable[str], spoken: Mapping[str, Choices], registry: Registry) -> str:
    """The numbers among some keys in sentences, each with its formula and dialect; '' where none is a number.

    spoken: the dialects of those that are not in the house's. A number of the group's own says its version.
    """
    said = []
    for key in dict.fromkeys(keys):
        if key in registry.own:
            title = axes.title(key, registry.own[key].name, registry.numbers)
            said.append(f"{title}, {OWN} number, version {registry.versions.get(key, 1)}")
        elif key in registry.numbers:
            title = dialect_title(key, spoken.get(key, {}), registry.choices(key) or None, registry.numbers)
            told = key in spoken or key in registry.house  # the title names its choices already
            dialect = registry.numbers[key].dialect
            said.append(title if told or not dialect else f"{title} ({dialect})")
    return f"{'. '.join(said)}." if said else ""


def _formula(number: str, chosen: Choices) -> str:
    return axes.written_formula(parse(formula_of(number, chosen), QUANTITIES).tree)


def _spelt_out(row: Number) -> bool:
    """Whether a symbol is a formula itself: it then holds for the dialect at birth alone."""
    return "/" in row.symbol
