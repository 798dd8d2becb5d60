"""The registry out: a spreadsheet and a Markdown reader get the registry back, and nothing runs in it."""

import csv
import io

import pytest

from labbook.exchange.registry_out import COLUMNS, other_dialects, registry_csv, registry_markdown
from labbook.registry.catalogue import NUMBERS, Number
from labbook.registry.dialects import DIALECTS
from labbook.registry.formula import parse
from labbook.registry.group import Registry, at_birth
from labbook.registry.quantities import QUANTITIES


def own(**changes) -> Number:
    """Viscous to elastic force with the speed as its rate: 1 x 2e-3 x 0.02^3/8e-8 = 0.2, worked by hand."""
    row = {"key": "Vs", "symbol": "V_s", "name": "stretch", "formula": "mu * U * L_tail**3 / EI",
           "compares": "drag to bending", "source": "own definition", "dialect": "the group's own",
           "example": {"mu": 1.0, "U": 2e-3, "L_tail": 0.02, "EI": 8e-8}, "answer": 0.2,
           "signed": True}  # fmt: skip
    return Number(**row | changes)


def rows(registry, counts=None) -> dict[str, dict[str, str]]:
    read = csv.DictReader(io.StringIO(registry_csv(registry, counts or {})))
    assert tuple(read.fieldnames) == COLUMNS
    return {row["key"]: row for row in read}


def test_the_csv_holds_every_number_once_with_its_formula_and_runs():
    found = rows(at_birth(), {"Sp": 1204})
    assert list(found) == list(NUMBERS)
    for key, row in found.items():
        number = NUMBERS[key]
        found_again = parse(row["formula"], QUANTITIES).value(number.example)
        assert found_again == pytest.approx(number.answer, rel=number.tolerance)
        assert (row["name"], row["source"], row["compares"]) == (number.name, number.source, number.compares)
        assert row["version"] == "at birth"
    assert found["Sp"]["runs"] == "1204" and found["De"]["runs"] == "0"
    assert found["Re"]["inputs"] == "rho [kg/m3], U [m/s], L_body [m], mu [Pa.s]"
    # Re_omega's published limits of creeping flow stand beside it
    assert "creeping: Re_omega < 0.1" in found["Re_omega"]["regimes"]


def test_the_csv_has_every_published_dialect_with_its_source():
    found = rows(at_birth())
    told = [row for row in DIALECTS if row.choices]
    assert len(told) > 20
    for row in told:
        assert f"{row.formula} ({row.source})" in found[row.of]["dialects"]
    assert not found["Sp"]["dialects"].startswith(":")  # the house's own row
    assert "rate f, power 1" not in found["Sp"]["dialects"]  # only published ones
    assert "coefficient spheroid_asymptotic, power 1: zeta_n * omega" in found["Sp"]["dialects"]


def test_the_other_dialects_are_those_beside_the_groups_house():
    registry = Registry(house={"Sp": {"coefficient": "spheroid_asymptotic"}, "De": {"rate": "f"}})
    told = other_dialects("Sp", registry)
    birth = NUMBERS["Sp"]
    assert told["coefficient cylinder_finite"] == (birth.formula, birth.source)
    assert not [words for words in told if words == "house" or "spheroid_asymptotic" in words]
    assert {"rate f", "power 1", "length L_body, coefficient cylinder_finite"} <= set(told)
    found = rows(registry)
    assert f"coefficient cylinder_finite: {birth.formula} (" in found["Sp"]["dialects"]
    assert "spheroid_asymptotic" not in found["Sp"]["dialects"].replace(birth.source, "")
    # no paper's row says it, but De with omega is what came with labbook
    assert found["De"]["dialects"] == f"rate omega: {NUMBERS['De'].formula} ({NUMBERS['De'].source})"
    assert "- coefficient cylinder\\_finite: $" in registry_markdown(registry, {})
    assert other_dialects("Vs", registry) == {}


def test_an_own_number_and_a_changed_house_are_marked():
    registry = Registry(own={"Vs": own()}, versions={"Vs": 3}, house={"St": {"rate": "omega"}})
    found = rows(registry, {"Vs": 7})
    assert list(found)[-1] == "Vs"
    row = found["Vs"]
    assert (row["version"], row["runs"], row["symbol"]) == ("own, version 3", "7", "V_s")
    assert found["St"]["formula"] == "omega * A_tip / U" and "omega" in found["St"]["house dialect"]
    assert found["St"]["version"] == "at birth, house dialect changed"


@pytest.mark.parametrize("begin", ["=", "+", "-", "@", "\t", "\r"])
def test_no_cell_begins_as_a_spreadsheets_formula(begin):
    # the signs are those of the OWASP page on CSV injection (from memory)
    bad = f'{begin}HYPERLINK("http://x")'
    formula = "-mu * U * L_tail**3 / EI"
    number = own(name=bad, compares=bad, source=bad, symbol=bad, formula=formula, answer=-0.2)
    registry = Registry(own={"Vs": number}, versions={"Vs": 1})
    for row in csv.reader(io.StringIO(registry_csv(registry, {}))):
        assert not [cell for cell in row if cell[:1] in "=+-@\t\r" and cell]


def test_the_markdown_sets_every_formula_as_mathematics():
    registry = Registry(own={"Vs": own()}, versions={"Vs": 2})
    text = registry_markdown(registry, {"Vs": 5})
    for number in registry.numbers.values():
        section = text.split(f"`{number.key}`\n\n", 1)[1].split("\n## ", 1)[0].split("\n# ", 1)[0]
        formula = section.splitlines()[0]
        assert formula.startswith("$") and formula.endswith("$") and formula.count("{") == formula.count("}")
        assert f"`{number.formula}`" in section
    section = text.split("`Vs`\n\n", 1)[1]
    assert section.startswith(r"$V_{s} = \frac{\mu \, U \, L_{\mathrm{tail}}^{3}}{\mathit{EI}}$")
    assert "own, version 2" in section and "5 kept" in section
    assert text.count("$") % 2 == 0
    for row in DIALECTS:
        assert not row.choices or row.source.replace("_", "\\_") in text


def test_markdown_in_a_name_stands_as_it_is():
    registry = Registry(own={"Vs": own(name="a | b $x$ <b> `c`\n# d", symbol="$x")}, versions={"Vs": 1})
    text = registry_markdown(registry, {})
    assert r"## a \| b \$x\$ \<b\> \`c\` \# d: \$x `Vs`" in text.splitlines()
