"""Numbers, the form: proof while typing, value and slopes on a run, suggestions, refusals, versions."""

import html
import math
import re

import numpy as np
import pytest

from labbook import Book
from labbook.app.numbers_cells import cells_of
from labbook.book.ledger_pages import newest_line
from labbook.registry.group import Registry, at_birth
from labbook.registry.own_numbers import FIELDS, read_number

# 1 Pa.s x 2 Hz x (0.02 m)^4/8e-8 N.m2 = 4, worked by hand
CELLS = {"key": "Vf", "name": "viscous stretch", "formula": "mu * f * L_tail**4 / EI",
         "compares": "drag to bending", "source": "own definition",
         "example": "mu = 1 Pa.s, f = 2 Hz, L_tail = 20 mm, EI = 8e-8 N.m2",
         "answer": "4.00"}  # fmt: skip
NEW = "number:new"


@pytest.fixture
def form(open_page, demo_book):
    """The empty form over the demo book, which is only read."""
    return open_page(demo_book, "numbers", part="new")


def said(page) -> str:
    return html.unescape(page.words())


def tried(page):
    """The box with the run that the formula is tried on."""
    (found,) = [box for box in page.at.selectbox if box.label.startswith("Try it on a run")]
    return found


def type_code(page, keys, text):
    """Type a text that is none of the box's options: AppTest can only set it before the box is made."""
    formula = page.at.text_input(key=f"{NEW}:0:formula").value
    page.fill(NEW, formula="").run().at.session_state[f"numbers:try:{keys}"] = text
    return page.fill(NEW, formula=formula).run()


def lines_of(path) -> int:
    with Book.open(path) as book:
        return int(book.ask(newest_line).id)


# ---- while typing


@pytest.mark.parametrize(("formula", "sentence"), [
    # the dimensions by hand: (M L^-3)(L T^-1)/(M L^-1 T^-1) = L^-1; a torque is M L^2 T^-2
    ("rho * U / mu", "not a pure number: L^-1 is left over"), ("f * A_tip / U**2", "L^-1 T is left over"),
    ("m_mag * B", "not a pure number: M L^2 T^-2 is left over"), ("U + f", "adds L T^-1 to T^-1"),
    ("rho * U * bogus / mu", "'bogus' is not a key of the vocabulary"),
    ("sin(theta0)", "calls are not allowed"), ("rho.real", "attributes are not allowed"),
    ("rho * (U", "cannot be read"), ("2 * 3", "holds no quantity"),
    # resolved for no run, so no column could hold it
    ("turns", "'turns' is not a key of the vocabulary"),
])  # fmt: skip
def test_what_is_no_pure_number_is_said_in_one_sentence(form, formula, sentence):
    form.fill(NEW, formula=formula).run()
    (refusal,) = form.said()
    assert sentence in refusal
    assert "a pure number</b>" not in form.words()


def test_a_pure_number_is_set_as_mathematics_and_tried_on_a_run(form, demo_book):
    form.fill(NEW, key="Vf", formula=CELLS["formula"]).run()
    assert form.said() == [] and "<b>a pure number</b>" in form.words()
    assert r"\mathit{Vf} = \frac{\mu \, f \, L_{\mathrm{tail}}^{4}}{\mathit{EI}}" in form.at.latex[0].value
    with Book.open(demo_book) as book:
        runs = book.runs(columns=("mu", "f", "L_tail", "EI"))
    whole = runs.dropna(subset=["mu", "f", "L_tail", "EI"])
    assert f"{len(whole)} kept runs have all its inputs." in said(form)
    newest = whole.iloc[-1]
    assert tried(form).value == newest["code"]
    # the value and the quadrature of JCGM 100:2008, 5.1.2, written out for this product of powers
    value = newest["mu"] * newest["f"] * newest["L_tail"] ** 4 / newest["EI"]
    parts = {k: p * newest[f"u_{k}"] / newest[k] for k, p in (("mu", 1), ("f", 1), ("L_tail", 4), ("EI", -1))}
    u = value * math.sqrt(sum(p * p for p in parts.values()))
    shown = re.search(r"<b>(\d[^<]*)</b>", form.words())[1]
    digits, spread = re.fullmatch(r"([\d.]+)\((\d+)\)", shown).groups()
    last = 10.0 ** -len(digits.partition(".")[2])
    assert float(digits) == pytest.approx(value, abs=0.51 * last)
    assert int(spread) * last == pytest.approx(u, abs=0.51 * last)
    rows = re.findall(r"<tr><td>([^<]+)</td><td class=\"n\">[^<]*</td><td class=\"n\">([^<]*)</td>"
                      r"<td class=\"n\">([^<]*) %</td></tr>", form.words())  # fmt: skip
    # the exponents of the formula are its logarithmic slopes
    assert {symbol: float(slope) for symbol, slope, _ in rows} == {"μ": 1, "f": 1, "L_tail": 4, "EI": -1}
    for symbol, _, share in rows:
        key = {"μ": "mu"}.get(symbol, symbol)
        assert float(share) == pytest.approx(100 * abs(parts[key]), rel=0.06)  # two digits are written
    assert [float(share) for *_, share in rows] == sorted((float(s) for *_, s in rows), reverse=True)
    assert "Inputs are taken as independent here" in said(form)


def test_a_run_that_lacks_an_input_or_does_not_exist_says_so(open_page, demo_book):
    with Book.open(demo_book) as book:
        runs = book.runs(columns=("lam", "f"))
    lacking = runs[runs["lam"].isna() & runs["f"].notna()]["code"].iloc[-1]
    for code, sentence in ((lacking, f"{lacking}: this run lacks lam."), ("R-9999999", "R-9999999")):
        form = open_page(demo_book, "numbers", part="new").fill(NEW, formula="lam * f").run()
        assert form.said() == [] and tried(form).value != lacking
        (refusal,) = type_code(form, "lam,f", code).said()
        assert sentence in refusal


def test_another_formula_moves_on_to_a_run_that_has_its_inputs(form):
    form.fill(NEW, formula="b / h_wall").run()
    first = tried(form).value
    form.fill(NEW, formula="lam * f").run()
    assert form.said() == [] and tried(form).value != first


def test_each_set_of_inputs_has_a_box_of_its_own_that_shows_the_run_whose_values_stand(form, demo_book):
    # a browser keeps what a box of the same key shows, whatever the page says of it
    form.fill(NEW, formula="U / (f * L_tail)").run()
    first = tried(form)
    form.fill(NEW, formula="m_mag * B / (8 * pi * mu * b**3 * omega)").run()
    assert tried(form).proto.id != first.proto.id
    with Book.open(demo_book) as book:
        runs = book.runs(columns=("m_mag", "B", "mu", "b", "omega")).set_index("code")
    m, B, mu, b, w = runs.loc[tried(form).value, ["m_mag", "B", "mu", "b", "omega"]]
    digits = re.search(r"<b>(\d[^<(]*)\(", form.words())[1]
    last = 10.0 ** -len(digits.partition(".")[2])  # the shown value is rounded to its last digit
    assert float(digits) == pytest.approx(m * B / (8 * math.pi * mu * b**3 * w), abs=0.51 * last)


def test_a_run_that_was_chosen_stays_where_the_next_formula_can_take_it(form):
    form.fill(NEW, formula="U / (f * L_tail)").run()
    third = tried(form).options[2].partition(":")[0]
    tried(form).set_value(third)
    form.run().fill(NEW, formula="f * L_tail / U").run()  # the same inputs in another order
    assert tried(form).value == third
    assert form.fill(NEW, formula="omega * L_tail / U").run() and tried(form).value == third


def test_a_label_that_comes_back_is_read_by_its_code(form):
    form.fill(NEW, formula="U / (f * L_tail)").run()
    label = tried(form).options[0]
    assert ": " in label and type_code(form, "U,f,L_tail", f"{label} of old").said() == []
    assert "<th>on this run</th>" in form.words().replace(' class="n"', "")


def test_the_worked_example_says_what_it_still_needs(form):
    form.fill(NEW, formula=CELLS["formula"], example="mu = 1 Pa.s, f = 2 Hz").run()
    assert "still needs L_tail [m], EI [N.m2] (or what it follows from: E * I_area)" in said(form)
    form.fill(NEW, example=CELLS["example"]).run()
    assert "has all its inputs" in said(form)
    form.fill(NEW, answer="4.00").run()
    assert "The worked example gives its answer." in said(form)
    form.fill(NEW, answer="5.00").run()
    assert "The worked example gives 4, not 5.00" in form.said()[0]
    form.fill(NEW, example="mu = 1 kg").run()
    assert "kg" in said(form) and "Traceback" not in said(form)


def test_an_angular_frequency_follows_from_a_frequency_in_the_example(form):
    form.fill(NEW, formula="lam * omega", example="lam = 0.5 s, f = 1 Hz", answer="3.14159").run()
    assert "The worked example gives its answer." in said(form)  # pi


def test_a_look_at_another_part_costs_nothing_of_what_was_typed(form):
    form.fill(NEW, formula="rho * U", name="half").run().go(part="quantities")
    form.go(part="new")
    assert form.at.text_input(key=f"{NEW}:0:formula").value == "rho * U"
    assert form.at.text_input(key=f"{NEW}:0:name").value == "half"


# ---- suggestions


def test_suggestions_count_the_independent_numbers_and_name_the_known_one(form):
    # rho, U, L_body, mu: four quantities of three dimensions, one number, Reynolds' (Buckingham 1914)
    form.at.multiselect(key="numbers:suggest").set_value(["rho", "U", "L_body", "mu"])
    form.run()
    assert "4 quantities, 1 independent pure number;" in said(form)
    assert "every other pure number of these quantities is a product of powers of them." in said(form)
    assert "known: Re, Reynolds number" in said(form)
    form.press("use")
    assert form.at.text_input(key=f"{NEW}:0:formula").value == "rho * U * L_body / mu"
    assert "<b>a pure number</b>" in form.words()


def test_enter_takes_one_quantity_and_not_every_match(form):
    assert form.at.multiselect(key="numbers:suggest").proto.select_all == 0  # Streamlit's word for never


def test_suggestions_of_quantities_that_allow_none_or_spare_one(form):
    form.at.multiselect(key="numbers:suggest").set_value(["rho", "U"])
    assert "allow no pure number" in said(form.run())
    form.at.multiselect(key="numbers:suggest").set_value(["U", "f", "L_body", "B"])
    # no other quantity here holds a current, so B can be in none
    assert "4 quantities, 1 independent" in said(form.run()) and "In none of them: B." in said(form)


# ---- saving


def test_saving_adds_a_column_and_leads_to_its_runs(open_page, demo_copy):
    page = open_page(demo_copy, "numbers", part="new").fill(NEW, **CELLS).press("Save the number")
    assert page.said() == []
    with Book.open(demo_copy) as book:
        runs = book.runs(columns=("Vf", "mu", "f", "L_tail", "EI"))
        line = book.ask(newest_line)
        assert book.check() == []
    expected = (runs["mu"] * runs["f"] * runs["L_tail"] ** 4 / runs["EI"]).to_numpy()
    np.testing.assert_allclose(runs["Vf"].to_numpy(), expected, rtol=1e-12)  # nan where an input is absent
    n = int(np.isfinite(expected).sum())
    assert page.at.success[0].value == f"Vf is in the registry, version 1; {n} kept runs have it"
    links = page.links()
    assert links["on Trends"] == "y=Vf" and links["Runs with it"].startswith("range=Vf%3A-inf%3Ainf")
    assert (line.by, line.act, line.subject) == ("wren", "define", "Vf")
    assert page.at.text_input(key=f"{NEW}:1:formula").value == ""  # the next one begins empty
    assert page.run().at.success  # it stays until another formula is typed, so that nothing jumps
    assert not page.fill(NEW, 1, formula="U").run().at.success


@pytest.mark.parametrize(("change", "field", "sentence"), [
    ({"formula": "mu * f * L_tail**3 / EI"}, "formula", "not a pure number: L^-1 is left over"),
    ({"formula": "__import__('os')"}, "formula", "calls are not allowed"),
    ({"answer": "4.10"}, "answer", "the worked example gives 4"),
    ({"answer": "four"}, "answer", "is no plain number"),
    ({"example": "mu = 1 Pa.s, f = 2 Hz"}, "example", "lacks L_tail, EI"),
    ({"example": "mu = 1 kg, f = 2 Hz, L_tail = 20 mm, EI = 8e-8"}, "example", "kg is a mass"),
    ({"key": "Sp"}, "key", "is taken"), ({"key": "2x"}, "key", "is no plain name"),
    ({"source": ""}, "source", "is missing"),
])  # fmt: skip
def test_a_refusal_stands_at_its_field_keeps_what_was_typed_and_changes_nothing(
    open_page, demo_copy, change, field, sentence
):
    before = lines_of(demo_copy)
    page = open_page(demo_copy, "numbers", part="new").fill(NEW, **CELLS | change).press("Save the number")
    column = page.at.columns
    assert lines_of(demo_copy) == before
    assert any(sentence in s for s in page.said())
    with_field = [c for c in column if any(w.key == f"{NEW}:0:{field}" for w in c.text_input)]
    innermost = min(with_field, key=lambda c: len(c.text_input))
    assert sentence in html.unescape("".join(b.proto.body for b in innermost.get("html")))
    for name, text in (CELLS | change).items():
        assert page.at.text_input(key=f"{NEW}:0:{name}").value == text
    with Book.open(demo_copy) as book:
        assert not book.registry.own


def test_a_refusal_leaves_when_its_field_is_mended(open_page, demo_copy):
    page = open_page(demo_copy, "numbers", part="new")
    page.fill(NEW, **CELLS | {"answer": "5.00", "source": ""}).press("Save the number")
    assert len(page.said()) == 2 and any("source: is missing" in s for s in page.said())  # and the live one
    page.fill(NEW, source="own definition").press("Save the number")
    assert sum("the worked example gives 4" in s for s in page.said()) == 1
    page.fill(NEW, formula="1.25 * mu * f * L_tail**4 / EI").run()  # 5, the answer that was typed
    assert page.said() == [] and page.at.text_input(key=f"{NEW}:0:answer").value == "5.00"


def test_several_refusals_stand_each_at_its_field(open_page, demo_copy):
    page = open_page(demo_copy, "numbers", part="new").press("Save the number")
    assert len(page.said()) == 7 and all("is missing" in s for s in page.said())  # all but the symbol


def test_an_own_key_asks_for_a_reason_and_becomes_a_version(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        book.define_number(**CELLS, by="wren")
    page = open_page(demo_copy, "numbers", part="new")
    page.fill(NEW, **CELLS | {"formula": "2 * mu * f * L_tail**4 / EI", "answer": "8.00"}).run()
    assert "Vf stands in the registry, version 1" in said(page)
    page.press("Save the number")
    assert "why: is missing" in page.said()[0]
    page.fill(NEW, why="both sides of the tail").press("Save the number")
    assert "version 2" in page.at.success[0].value
    with Book.open(demo_copy) as book:
        assert book.registry.versions["Vf"] == 2
        assert book.ask(newest_line).why == "both sides of the tail"


def test_editing_begins_with_what_stands_and_nothing_changed_is_said(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        book.define_number(**CELLS, by="wren")
    page = open_page(demo_copy, "numbers", part="numbers", number="Vf").press("Edit")
    assert page.at.text_input(key="number:Vf:0:key").disabled
    assert page.at.text_input(key="number:Vf:0:formula").value == CELLS["formula"]
    assert page.at.text_input(key="number:Vf:0:answer").value == "4.00"
    page.press("Save the number")
    assert "nothing would change" in page.at.info[0].value
    page.go(part="new", number="Vf")
    page.fill("number:Vf", 1, formula="3 * mu * f * L_tail**4 / EI", answer="12.00", why="three")
    page.press("Save the number")
    assert "version 2" in page.at.success[0].value and "number" not in page.at.query_params


def test_a_number_withdrawn_while_it_is_edited_leaves_what_was_typed(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        book.define_number(**CELLS, by="wren")
        page = open_page(demo_copy, "numbers", part="new", number="Vf")
        typed = {"formula": "3 * mu * f * L_tail**4 / EI", "answer": "12.00", "why": "three"}
        page.fill("number:Vf", **typed).run()
        book.withdraw("number", "Vf", why="the same as Sp", by="finch")
        page.fill("number:Vf", name="thrice").press("Save the number")
        assert "Vf" not in book.registry.own  # nobody had read yet that it is gone
    (sentence,) = page.said()
    assert "Vf is no longer in the registry: finch withdrew it" in sentence and "the same as Sp" in sentence
    for column, text in (CELLS | typed | {"name": "thrice"}).items():
        if column != "example":
            assert page.at.text_input(key=f"number:Vf:0:{column}").value == text
    assert "mu = 1.0 Pa.s" in page.at.text_input(key="number:Vf:0:example").value
    assert not page.at.text_input(key="number:Vf:0:key").disabled
    page.run().press("Save the number")
    with Book.open(demo_copy) as book:
        assert book.registry.own["Vf"].name == "thrice" and book.check() == []
    assert page.said() == [] and "version 3" in page.at.success[0].value


def test_only_own_numbers_are_edited(open_page, demo_book):
    page = open_page(demo_book, "numbers", part="new", number="Sp")
    assert "'Sp'" in page.said()[0] and "not one of the group's own" in page.said()[0]


# ---- a number as cells again


@pytest.mark.parametrize("changes", [
    {}, {"symbol": "V_f"}, {"answer": "4.0"}, {"answer": "4.0000e0"}, {"answer": "4,00"},
    {"formula": "mu * omega * L_tail**4 / EI", "answer": "25.13"},
    {"formula": "mu * omega * L_tail**4 / EI", "answer": "2.5133e1",
     "example": "mu = 1 Pa.s, omega = 12.5664, L_tail = 0.02 m, EI = 8e-8"},
    {"formula": "theta0 * T / T", "example": "theta0 = 30 deg, T = 22.5 degC", "answer": "0.523599"},
])  # fmt: skip
def test_a_number_as_cells_reads_as_the_same_number(changes):
    number = read_number(CELLS | changes, at_birth())
    cells = cells_of(number)
    assert tuple(cells) == FIELDS
    registry = Registry(own={"Vf": number}, versions={"Vf": 1})
    again = read_number({k: v for k, v in cells.items() if v}, registry)
    assert again == number


def test_a_changed_input_of_the_example_changes_what_follows():
    number = read_number(CELLS | {"formula": "mu * omega * L_tail**4 / EI", "answer": "25.13"}, at_birth())
    assert "omega" not in cells_of(number)["example"] and "f = 2.0 Hz" in cells_of(number)["example"]
