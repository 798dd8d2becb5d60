"""Bands and regimes from typed text: the grammar of Band.words, and what cannot be read is refused."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from labbook.errors import Refusal, Refusals
from labbook.registry.catalogue import NUMBERS
from labbook.registry.regime_text import band_words, pretty, read_band, read_regime, tried_regime
from labbook.registry.regimes import COLOURS, INF, REGIMES, Band

CELLS = {"name": "soft tail", "band": "Sp > 4", "source": "common practice, no source"}


# what each text means is the reading of inequality signs, from memory; the limits are those written
@pytest.mark.parametrize(("text", "band"), [
    ("0.1 <= Re_omega < 1", Band("Re_omega", 0.1, 1.0, True, False)),
    ("Sp > 4", Band("Sp", 4.0, INF, low_closed=False)),
    ("Sp >= 1", Band("Sp", 1.0, INF)),
    ("1 < Sp", Band("Sp", 1.0, INF, low_closed=False)),
    ("1 <= Sp", Band("Sp", 1.0, INF)),
    ("4 > Sp", Band("Sp", -INF, 4.0, high_closed=False)),
    ("Sp < 4", Band("Sp", -INF, 4.0, high_closed=False)),
    ("Sp <= 4", Band("Sp", -INF, 4.0)),
    ("0.2 <= St <= 0.4", Band("St", 0.2, 0.4)),
    ("0.2 ≤ St ≤ 0.4", Band("St", 0.2, 0.4)),
    ("St ≥ 0.2", Band("St", 0.2, INF)),
    ("4 >= Sp > 1", Band("Sp", 1.0, 4.0, False, True)),  # the same interval told from above
    ("  -0.3<St<  -.2 ", Band("St", -0.3, -0.2, False, False)),
    ("−1e-3 < Re ≤ 2.5E2", Band("Re", -1e-3, 250.0, False, True)),
    ("0,2 <= St <= 0,4", Band("St", 0.2, 0.4)),
])  # fmt: skip
def test_a_band_in_signs(text, band):
    assert read_band(text) == band
    assert read_band(text, NUMBERS) == band


def test_a_symbol_names_its_number_too():
    assert read_band("Re_ω < 0.1", NUMBERS) == read_band("Re_omega < 0.1") == REGIMES["creeping"].bands[0]


def limits():
    # words keep twelve digits, so a limit of up to twelve must come back as it went
    digits = st.floats(allow_nan=False, allow_infinity=False).map(lambda v: float(f"{v:.12g}"))
    return digits.filter(math.isfinite)


@st.composite
def bands(draw):
    """Any band; an endless side has the flag that a band left out there has."""
    low, high = sorted(draw(st.lists(limits(), min_size=2, max_size=2, unique=True)))
    sides = draw(st.sampled_from(("both", "low", "high")))
    key = draw(st.sampled_from(tuple(NUMBERS)))
    return Band(
        key, -INF if sides == "high" else low, INF if sides == "low" else high,
        sides == "high" or draw(st.booleans()), sides == "low" or draw(st.booleans()),
    )  # fmt: skip


@given(bands())
def test_what_a_band_writes_is_read_as_that_band(band):
    assert read_band(band.words) == band
    assert read_band(pretty(band.words, NUMBERS), NUMBERS) == band


@given(bands(), st.floats(allow_nan=False))
def test_read_bands_hold_what_the_written_inequality_holds(band, value):
    # an outside reading of the same text: Python's own chained comparisons
    told = band.words.replace(band.number, "x")
    assert bool(read_band(band.words).holds(value)) is eval(told, {"x": value})


@pytest.mark.parametrize(("text", "reason", "remedy"), [
    ("", "is missing", "write e.g. Sp > 4"),
    ("Sp", "no sign", "write e.g."), ("Sp 1 to 3", "no sign", "write e.g."),
    ("Sp = 3", "single value", "write e.g."),
    ("1 < Sp <", "lacks a number or a limit", "write e.g."), ("< 4", "lacks a number", "write e.g."),
    ("1 < Sp < 2 < 3", "more than two signs", "write e.g."),
    ("1 < Sp > 4", "different ways", "1 < Sp <= 4"), ("4 > Sp < 1", "different ways", "1 < Sp <= 4"),
    ("4 < Sp < 1", "lower limit lies above", "lower limit first"),
    ("1 <= Sp <= 1", "single value", "higher one"),
    ("1 > Sp >= 4", "lower limit lies above", "lower limit first"),
    ("Sp < 4 Hz", "'4 Hz' is no plain number", "no unit"), ("Sp < inf", "no plain number", "no unit"),
    ("nan < Sp", "is no", ""), ("Sp < 1e999", "too large", "leave that side out"),
    ("1.000,5 < Sp", "is no", ""), ("Sp < 0x10", "no plain number", "no unit"),
    ("2 < speed", "'speed' is no number of the registry", "one of Re, Re_omega"),
    ("speed > 2", "'speed' is no number of the registry", "one of Re, Re_omega"),
    ("1 < speed < 2", "'speed' is no number of the registry", "one of Re, Re_omega"),
    ("1 < 2", "'2' is no number", "one of"), ("Sp < St", "'St' is no plain number", "no unit"),
    ("Sp > " + "1" * 400, "longer than 400", "write e.g."),
])  # fmt: skip
def test_what_cannot_be_read_is_refused_at_its_field(text, reason, remedy):
    with pytest.raises(Refusal) as caught:
        read_band(text, NUMBERS, "second")
    assert caught.value.field == "second"
    assert reason in caught.value.reason and remedy in caught.value.remedy


# --- regimes


def test_cells_make_a_regime():
    row = read_regime(CELLS | {"second": "0.1 ≤ Re_ω < 1", "colour": "sky", "name": " soft tail "}, NUMBERS)
    assert (row.name, row.colour, row.source) == ("soft tail", "sky", "common practice, no source")
    assert row.words == "Sp > 4 and 0.1 <= Re_omega < 1"
    assert read_regime(CELLS | {"second": " ", "colour": ""}, NUMBERS).numbers == ("Sp",)


@pytest.mark.parametrize("row", REGIMES.values(), ids=lambda r: r.name)
def test_a_regime_told_in_cells_comes_back(row):
    cells = {"name": row.name, "band": row.words, "colour": row.colour, "source": row.source}
    assert read_regime(cells, NUMBERS) == row


@pytest.mark.parametrize(("change", "field", "said"), [
    ({"name": " "}, "name", "is missing"), ({"name": "a\nb"}, "name", "one line"),
    ({"name": "x" * 65}, "name", "1 to 64"), ({"name": "Creeping"}, "name", "'creeping' stands already"),
    ({"band": None}, "band", "is missing"), ({"band": "Sq > 1"}, "band", "no number of the registry"),
    ({"second": "Sp <= 5"}, "second", "stands on Sp, as the first"), ({"second": "St"}, "second", "no sign"),
    ({"colour": "vermilion"}, "colour", "one of orange, sky"), ({"source": ""}, "source", "common practice"),
    ({"source": "a\nb"}, "source", "one line"), ({"hue": "red"}, "hue", "it has name, band"),
])  # fmt: skip
def test_a_refusal_names_its_field(change, field, said):
    with pytest.raises(Refusal) as caught:
        read_regime(CELLS | change, NUMBERS, taken=REGIMES)
    assert caught.value.field == field and said in str(caught.value)


def test_everything_that_is_wrong_is_said_at_once():
    with pytest.raises(Refusals) as caught:
        read_regime({"band": "Sp", "colour": "red"}, NUMBERS)
    assert [f.field for f in caught.value.findings] == ["name", "band", "source", "colour"]


def test_unfinished_cells_can_be_tried():
    assert tried_regime({"band": "Sp >"}, NUMBERS) is None
    assert tried_regime(CELLS | {"second": "Sp < 5"}, NUMBERS) is None
    row = tried_regime({"band": "Sp > 4", "colour": "red", "name": "\t"}, NUMBERS)
    assert row.words == "Sp > 4" and row.name == "this regime" and not row.colour
    assert tried_regime(CELLS | {"colour": COLOURS[0]}, NUMBERS).name == "soft tail"


# --- words


@pytest.mark.parametrize(("text", "words"), [
    ("1 <= Sp < 4", "sperm number Sp from 1 (included) to 4 (left out)"),
    ("Sp > 4", "sperm number Sp above 4"), ("Sp >= 4", "sperm number Sp of 4 and more"),
    ("Sp < 4", "sperm number Sp below 4"), ("Sp <= 4", "sperm number Sp of 4 and less"),
    ("stride > 0.5", "stride length above 0.5"),
])  # fmt: skip
def test_a_band_without_signs(text, words):
    assert band_words(read_band(text), NUMBERS) == words


def test_signs_and_symbols_for_a_page():
    assert pretty("0.1 <= Re_omega < 1 and Sp >= 2", NUMBERS) == "0.1 ≤ Re_ω < 1 and Sp ≥ 2"
