"""A question as the parameters of a page's address, and back: what is not understood is said."""

import math
from collections.abc import Mapping, Sequence

from labbook.book.asking import Question
from labbook.book.clock import read_moment
from labbook.book.records import STATES
from labbook.errors import Refusal
from labbook.registry.dialects import Choices, completed, read_choices
from labbook.registry.group import Registry

# parameter -> field of a question, for those that name records; material, person and series likewise
CHOSEN = {
    "fluid": "fluids",
    "swimmer": "swimmers",
    "material": "materials",
    "person": "people",
    "series": "series",
}
PARAMETERS = ("regime", "range", *CHOSEN, "since", "until", "text", "state")
DIALECT = "dialect"  # a parameter beside the question's, which is always read in the house dialect


def parameters(question: Question) -> dict[str, list[str]]:
    """Every parameter of an address, with the texts that ask the question; [] where it leaves the address."""
    ranges = [f"{key}:{low:.12g}:{high:.12g}" for key, (low, high) in question.ranges.items()]
    found = {"regime": list(question.regimes), "range": ranges}
    found |= {name: list(getattr(question, field)) for name, field in CHOSEN.items()}
    for name in ("since", "until", "text"):
        found[name] = [getattr(question, name)] if getattr(question, name) else []
    return found | {"state": [] if question.state == "kept" else [question.state]}


def read_question(
    given: Mapping[str, Sequence[str]], known: Mapping[str, Sequence[str]], registry: Registry
) -> tuple[Question, list[str]]:
    """The question of an address, and one sentence for each part that could not be read and was left out.

    given: parameter -> its texts (other parameters are ignored); known: fluid, swimmer, material, person and
    series -> what the book has.
    """
    said: list[str] = []

    def kept(name, read):
        results = []
        for text in dict.fromkeys(given.get(name, ())):
            try:
                results.append(read(text))
            except Refusal as refusal:
                said.append(str(refusal))
        return results

    def one_of(name):
        def read(text):
            if text not in known[name]:
                raise Refusal(name, text, "the book has no such " + name)
            return text

        return read

    chosen = {field: tuple(kept(name, one_of(name))) for name, field in CHOSEN.items()}
    moments = {name: (kept(name, _moment(name)) or [None])[-1] for name in ("since", "until")}
    text = (kept("text", str.strip) or [None])[-1] or None
    state = (kept("state", _state) or ["kept"])[-1]
    question = Question(
        regimes=tuple(kept("regime", lambda name: registry.regime(name).name)),
        ranges=dict(kept("range", lambda text: read_range(text, registry))),
        **chosen,
        **moments,
        text=text,
        state=state,
    )
    return question, said


def read_dialects(
    texts: Sequence[str], registry: Registry
) -> tuple[dict[str, dict[str, object]], list[str]]:
    """Number -> every choice, of 'Sp=rate:f,power:1' and the like; and a sentence for each that cannot be read.

    A dialect that is the house's is left out.
    """
    found, said = {}, []
    for text in dict.fromkeys(texts):
        try:
            number, choices = read_choices(text)
            if number in found:
                reason = f"{number} has a dialect in this address already"
                raise Refusal(DIALECT, text, reason, "give one for each number")
        except Refusal as refusal:
            said.append(str(refusal))
        else:
            found[number] = completed(number, choices, registry.house.get(number))
    return {n: choices for n, choices in found.items() if choices != registry.choices(n)}, said


def dialect_texts(dialects: Mapping[str, Choices], registry: Registry) -> list[str]:
    """The texts that name some dialects in an address or on the command line; those of the house need none."""
    texts = []
    for number, choices in dialects.items():
        house = registry.choices(number)
        chosen = completed(number, choices, house)
        away = [f"{name}:{option}" for name, option in chosen.items() if option != house[name]]
        texts += [f"{number}={','.join(away)}"] if away else []
    return texts


def read_range(text: str, registry: Registry) -> tuple[str, tuple[float, float]]:
    """(key, (low, high)) of 'Sp:1:3', in SI; an empty limit is open. Refusal for anything else."""
    parts = text.split(":")
    if len(parts) != 3:
        raise Refusal("range", text, "is not a range", "write key:low:high, e.g. Sp:1:3")
    key, low, high = parts[0].strip(), _limit(text, parts[1], -math.inf), _limit(text, parts[2], math.inf)
    if key not in registry.keys:
        raise Refusal(
            "range", text, f"{key!r} is no quantity or number of a run", "the Numbers page lists them"
        )
    if low > high:
        raise Refusal("range", text, "is empty", "give the lower limit first")
    return key, (low, high)


def _limit(whole: str, text: str, absent: float) -> float:
    if not text.strip():
        return absent
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if math.isnan(value):
        raise Refusal("range", whole, f"{text.strip()!r} is no number", "write e.g. Sp:1:3, limits in SI")
    return value


def _moment(name: str):
    def read(text):
        text = text.strip()
        try:
            read_moment(name, text + "T00:00:00" if len(text) == 10 else text)
        except Refusal as refusal:
            raise Refusal(name, text, refusal.reason, "write e.g. 2026-03-01") from None
        return text

    return read


def _state(text: str) -> str:
    if text not in (*STATES, "all"):
        raise Refusal("state", text, "is no state of a run", "kept, void or all")
    return text
