"""The page Plan, run without a browser: map, what each fluid gives, proposals and their ways out, bad input.

Truth from outside: at one sperm number the product of viscosity and frequency is the same in every fluid
(Sp^4 = L^4 zeta_n omega/EI, zeta_n in proportion to mu; Machin 1958, Wiggins & Goldstein 1998), and E goes
as Sp^-4.
"""

import csv
import html
import io
import json
import re
from datetime import date

import pytest
from streamlit.dataframe_util import convert_arrow_bytes_to_pandas_df

from labbook import Book
from labbook.app import plan_out
from labbook.book.plan_targets import optimum
from labbook.charts.plan_map import FORBIDDEN

SWIMMER = "sedge-05"


def charts(page):
    return [(json.loads(c.proto.spec), c) for c in page.at.get("vega_lite_chart")]


def rows(page, kind, chart=0):
    """The rows of a kind on the map (0) or on the coverage (1)."""
    spec, element = charts(page)[chart]
    (data,) = element.proto.datasets
    found = convert_arrow_bytes_to_pandas_df(data.data.data)
    found = found[found["kind"] == kind]
    return found.dropna(axis="columns", how="all").to_dict("records")


def words(page):
    return html.unescape(re.sub(r"<style>.*?</style>", "", page.words(), flags=re.DOTALL))


def table(page, first="settles in"):
    """{fluid: cells} of the table that has this header."""
    found = next(t for t in page.texts() if 'class="lb"' in t and f">{first}<" in t)
    lines = re.findall(r"<tr>(.*?)</tr>", found)
    cells = [[html.unescape(c) for c in re.findall(r"<td[^>]*>(.*?)</td>", line)] for line in lines]
    return {line[0]: line[1:] for line in cells if line}


def proposals(page):
    """(place, 'fluid, f ...') of the list."""
    found = re.findall(r'<span class="p">(\d+)</span><b>(.*?)</b>', page.words())
    return [(int(i), html.unescape(text)) for i, text in found]


def address(page):
    return {
        k: (v[0] if isinstance(v, list) and len(v) == 1 else v) for k, v in dict(page.at.query_params).items()
    }


def typed(page, name, text):
    page.at.text_input(key=f"plan:{name}").set_value(text)
    return page.run()


# ---- what stands there


def test_the_first_look_is_the_swimmer_used_last_at_the_optimum_of_theory(open_page, demo_book):
    page = open_page(demo_book, "plan")
    assert page.at.selectbox(key="plan:swimmer").value == SWIMMER
    with Book.open(demo_book) as book:
        best = optimum(book.plan(SWIMMER))
        frame = book.runs(swimmer=SWIMMER)
    assert f"Sp = {best:.3g}, where theory has the largest scaled speed" in words(page)
    kept = frame[frame["f"].notna() & frame["mu"].notna()]
    assert f"{len(kept)} earlier kept runs" in words(page)
    # dots are one a place, so no more than runs, and all of them lie where a run lies
    dots = rows(page, "runs")
    places = {(round(f, 4), round(mu, 3)) for f, mu in zip(kept["f"], kept["mu"], strict=True)}
    assert 10 < len(dots) <= len(kept)
    assert {(round(d["f"], 4), round(d["mu"], 3)) for d in dots} <= places
    assert [r["name"] for r in rows(page, "fluid_names") if r["name"]] and rows(page, "target")
    assert len(proposals(page)) == 5 == len(rows(page, "proposed"))
    assert not address(page), "defaults leave the address"
    assert page.at.text_input(key="plan:theta0").placeholder == "0.150(6) rad", "as in its last run"


def test_at_one_sperm_number_viscosity_times_frequency_is_one_number(open_page, demo_book):
    page = open_page(demo_book, "plan", Sp="2")
    found = table(page)
    with Book.open(demo_book) as book:
        mu = {row["code"]: row["mu"] for row in rows(page, "fluids")}
        assert set(found) == set(mu) == {x.code for x in book.plan(SWIMMER).fluids}
    product = [mu[code] * float(cells[0].removesuffix(" Hz")) for code, cells in found.items()]
    # f is printed to three digits, at worst 0.5 %
    assert product == pytest.approx([product[0]] * len(product), rel=0.011)
    assert {cells[1].partition("(")[0] for cells in found.values()} <= {"2.00", "2.0"}
    (start, end) = rows(page, "target")
    assert start["f"] * start["mu"] == pytest.approx(product[0], rel=0.011)
    assert end["f"] * end["mu"] == pytest.approx(product[0], rel=0.011)


def test_twice_the_target_takes_sixteen_times_the_frequency(open_page, demo_book):
    at_1, at_2 = (table(open_page(demo_book, "plan", Sp=text))["sil12500-a"] for text in ("1", "2"))
    ratio = float(at_2[0].removesuffix(" Hz")) / float(at_1[0].removesuffix(" Hz"))
    assert ratio == pytest.approx(16.0, rel=0.011)


def test_zones_have_their_names_on_the_map_and_their_reasons_below(open_page, demo_book):
    page = open_page(demo_book, "plan")
    said = words(page)
    assert "inertia</b> forbidden: no Stokes flow any more" in said
    assert "rig frequency</b> doubtful: faster than coil-1 has run so far" in said
    assert {"inertia: forbidden", "inertia: doubtful"} <= {r["text"] for r in rows(page, "words")}
    assert rows(page, "hatch") and rows(page, "forbidden") and rows(page, "doubtful")
    # what the table forbids at its own frequency lies in the forbidden zone: Re_omega = rho omega L^2/mu > 1
    for code, cells in table(page).items():
        value = float(cells[2].partition("(")[0]) * (
            10.0 ** int(cells[2].partition("e")[2] or 0) if "e" in cells[2] else 1
        )
        assert (cells[-1] == FORBIDDEN) == (value > 1.0), code


def test_another_temperature_moves_the_lines_of_the_fluids(open_page, demo_book):
    cold, warm = (rows(open_page(demo_book, "plan", T=text), "fluids") for text in ("18 degC", "28 degC"))
    before, after = ({r["code"]: r["mu"] for r in found} for found in (cold, warm))
    assert all(after[code] < before[code] for code in before), "every fluid here thins as it warms"
    assert "fluids at 28 degC" in words(open_page(demo_book, "plan", T="28 degC"))


# ---- the address


def test_what_is_typed_stands_in_the_address_and_a_link_gives_the_same_page(open_page, demo_book):
    page = open_page(demo_book, "plan")
    typed(page, "Sp", "2.5")
    typed(page, "theta0", "0.2 rad")
    page.at.selectbox(key="plan:next").set_value("Sp,theta0")
    page.run()
    page.at.number_input(key="plan:n").set_value(3)
    page.run()
    found = address(page)
    assert found == {"Sp": "2.5", "theta0": "0.2 rad", "next": "Sp,theta0", "n": "3"}
    again = open_page(demo_book, "plan", **found)
    assert proposals(again) == proposals(page) and len(proposals(page)) == 3
    assert table(again) == table(page)
    assert len({text.partition("θ₀ ")[2] for _, text in proposals(page)}) > 1, (
        "amplitudes vary where one is an axis"
    )


def test_another_swimmer_is_planned_as_it_is(open_page, demo_book):
    page = open_page(demo_book, "plan", d="1 mm", section="rod", Sp="2")
    page.at.selectbox(key="plan:swimmer").set_value("reed-06")
    page.run()
    assert address(page) == {"Sp": "2", "swimmer": "reed-06"}
    assert not page.at.toggle(key="plan:build").value


def test_a_bad_address_says_what_it_did_not_understand_and_shows_the_rest(open_page, demo_book):
    page = open_page(demo_book, "plan", swimmer="nobody", next="sideways", n="99", strict="maybe", rig="zz",
                     fluid="none", within="Sp", size="girth")  # fmt: skip
    said = " ".join(page.said())
    for word in (
        "'nobody'",
        "'sideways'",
        "'99'",
        "'maybe'",
        "rig 'zz'",
        "fluid 'none'",
        "within",
        "'girth'",
    ):
        assert word in said, word
    assert (
        len(proposals(page)) == 5 and table(page) and page.at.selectbox(key="plan:swimmer").value == SWIMMER
    )


# ---- bad input


@pytest.mark.parametrize(("cells", "said"), [
    ({"theta0": "3 mm"}, "theta0 '3 mm': mm is a length, and an angle is needed"),
    ({"theta0": "wide"}, "theta0 'wide': cannot be read as an angle"),
    ({"T": "x"}, "T 'x': cannot be read"),
    ({"Sp": "-2"}, "Sp '-2': is no sperm number; a number above 0"),
    ({"Sp": "two"}, "Sp 'two': is no sperm number"),
    ({"f": "2 rad/s"}, "f '2 rad/s'"),
    ({"h_wall": "1 mm"}, "closer than the head radius"),
    ({"Sp": "400"}, "Sp '400': no fluid reaches it with sedge-05"),
    ({"L_tail": "90 mm"}, "the tail is longer than the body"),
    ({"E": "hard"}, "E 'hard': cannot be read as a modulus"),
    ({"b": "200 mm"}, "closer than the head radius"),
])  # fmt: skip
def test_what_cannot_be_is_said_at_its_field_kept_and_the_rest_stands(open_page, demo_book, cells, said):
    page = open_page(demo_book, "plan", **cells)
    found = " ".join(page.said()).replace("  ", " ")
    (name,) = cells
    assert said.partition(": ")[2].split(";")[0] in found and name in found
    assert address(page) == cells
    assert page.at.text_input(key=f"plan:{name}").value == cells[name]
    assert rows(page, "fluids") and len(proposals(page)) == 5


def test_a_refused_cell_changes_nothing_else(open_page, demo_book):
    with_it = open_page(demo_book, "plan", Sp="2", T="24 degC", theta0="wide")
    without = open_page(demo_book, "plan", Sp="2", T="24 degC")
    assert table(with_it) == table(without)


def test_no_amplitude_is_said_and_typing_one_mends_it(open_page, demo_book):
    page = open_page(demo_book, "plan", swimmer="reed-04")
    (sentence,) = page.said()
    assert "needs theta0" in sentence and "give theta0='0.3 rad'" in sentence
    assert "no predicted speed: needs theta0" in words(page) and rows(page, "fluids")
    typed(page, "theta0", "0.2 rad")
    assert not page.said() and "where theory has the largest scaled speed" in words(page)


def test_no_material_is_said_and_a_modulus_in_its_place_mends_it(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        book.stock("swimmer", code="bare-1", form="flexible tail", L_body="24 mm", L_tail="20 mm",
                   section="rod", d="1 mm", b="2 mm")  # fmt: skip
    page = open_page(demo_copy, "plan", swimmer="bare-1")
    (sentence,) = page.said()
    assert "names no material" in sentence and "E='0.5 MPa'" in sentence and "a tail to build" in sentence
    mended = open_page(demo_copy, "plan", swimmer="bare-1", E="1.0 MPa")
    assert not mended.said() and table(mended)["sil12500-a"][1]


def test_a_missing_section_is_said_and_giving_it_mends_it(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        book.stock(
            "swimmer",
            code="bare-2",
            form="flexible tail",
            L_body="24 mm",
            L_tail="20 mm",
            material="firm-b",
            b="2 mm",
        )
    page = open_page(demo_copy, "plan", swimmer="bare-2")
    assert "section of bare-2 is not complete" in " ".join(page.said())
    mended = open_page(demo_copy, "plan", swimmer="bare-2", section="rod", d="1.0(1) mm")
    assert not mended.said() and table(mended)["sil12500-a"][1]


def test_an_angle_beyond_the_linear_range_is_doubtful_at_its_field(open_page, demo_book):
    page = open_page(demo_book, "plan", theta0="0.9 rad")
    caution = [t for t in page.texts() if "lb-caution" in t]
    assert any("above 0.3 rad" in t for t in caution)
    assert not any("lb-caution" in t for t in open_page(demo_book, "plan", theta0="0.2 rad").texts())


@pytest.mark.parametrize("swimmer", ["hop-01", "kelp-02", "thorn-03", "clover-02"])
def test_every_form_has_its_page_without_alarm(open_page, demo_book, swimmer):
    page = open_page(demo_book, "plan", swimmer=swimmer)
    assert not page.said() and rows(page, "fluids") and not rows(page, "target")
    assert "the middle of what the rig has run" in words(page) and table(page)
    assert (swimmer != "hop-01") or "step-out</b> forbidden" in words(page)


def test_a_plane_that_a_form_has_not_is_refused_in_the_list_alone(open_page, demo_book):
    page = open_page(demo_book, "plan", swimmer="hop-01", next="Sp,theta0")
    assert "needs E" in " ".join(page.said()) and table(page) and not proposals(page)


def test_an_empty_book_says_what_it_needs(open_page, tmp_path):
    Book.new(tmp_path / "empty.db").close()
    page = open_page(tmp_path / "empty.db", "plan")
    assert "needs a *swimmer* and a *fluid*" in page.at.markdown[0].value and page.links()


# ---- a tail to build, and the inverse question


def test_a_tail_to_build_starts_from_the_swimmer_and_goes_to_paper_alone(open_page, demo_book):
    page = open_page(demo_book, "plan", Sp="2")
    before = table(page)["sil12500-a"]
    page.at.toggle(key="plan:build").set_value(True)
    page.run()
    assert page.at.text_input(key="plan:t").placeholder == "0.80(1) mm"
    typed(page, "t", "1.60(2) mm")
    after = table(page)["sil12500-a"]
    # EI goes as t^3 and zeta_n hardly changes: eight times the frequency, but for the drag's logarithm of a
    assert float(after[0].removesuffix(" Hz")) / float(before[0].removesuffix(" Hz")) == pytest.approx(
        8.0, rel=0.12
    )
    assert "is not on the shelf" in words(page) and address(page)["t"] == "1.60(2) mm"
    assert page.at.button(key="plan:bench").disabled
    page.at.toggle(key="plan:build").set_value(False)
    page.run()
    assert table(page)["sil12500-a"] == before and "t" not in address(page)
    assert not page.at.button(key="plan:bench").disabled


def test_the_modulus_that_puts_the_target_there_puts_it_there(open_page, demo_book):
    page = open_page(demo_book, "plan", Sp="2", size="E", size_f="0.2 Hz")
    E = {code: cells[0] for code, cells in table(page, "E").items()}["sil12500-a"]
    built = open_page(demo_book, "plan", Sp="2", E=E)
    # E is printed to three digits, 0.5 % at worst, and f goes with it; f is printed to three digits too
    assert float(table(built)["sil12500-a"][0].removesuffix(" Hz")) == pytest.approx(0.2, rel=0.011)
    assert "1 % of E moves Sp by 0.25 %" in words(page), "Sp goes as E^(-1/4)"
    assert "batches on the shelf, the nearest first" in words(page)


def test_a_bad_frequency_of_the_inverse_question_is_said_there(open_page, demo_book):
    page = open_page(demo_book, "plan", size="t", size_f="1 kg")
    assert any("1 kg" in s for s in page.said()) and table(page)


# ---- the next runs


def test_each_way_to_choose_says_its_criterion(open_page, demo_book):
    gap, top = words(open_page(demo_book, "plan")), words(open_page(demo_book, "plan", next="top"))
    assert "Johnson, Moore & Ylvisaker 1990" in gap and re.search(
        r"widest gap, as a share of the plane: [\d.]+ % now", gap
    )
    assert "Atkinson, Donev & Tobias 2007" in top and "the maximum is taken at Sp" in top
    target = open_page(demo_book, "plan", next="target", Sp="2")
    codes = {text.partition(",")[0] for _, text in proposals(target)}
    good = {code for code, cells in table(target).items() if cells[-1] != FORBIDDEN}
    assert codes == good, "the target is run in every fluid that does not forbid it"
    strict = open_page(demo_book, "plan", next="target", Sp="2", strict="on")
    undoubted = {code for code, cells in table(strict).items() if cells[-1] == "good"}
    assert {text.partition(",")[0] for _, text in proposals(strict)} == undoubted < good


def test_nothing_doubtful_is_proposed_where_that_is_asked(open_page, demo_book):
    page = open_page(demo_book, "plan", strict="on")
    verdicts = re.findall(r'<span class="v">(\w+)</span>', page.words())
    assert len(verdicts) == 5 and set(verdicts) == {"good"}


def test_a_part_of_the_plane_holds_every_proposal(open_page, demo_book):
    page = open_page(demo_book, "plan", within="Sp:2:3")
    values = [float(v) for v in re.findall(r"<div>Sp ([\d.]+)\(", page.words())]
    assert len(values) == 5 and all(2.0 <= v <= 3.0 for v in values)
    refused = open_page(demo_book, "plan", within="Sp:900:1000")
    assert any("reaches no place there" in s for s in refused.said()) and table(refused)


def test_coverage_shows_the_groups_runs_and_the_proposals(open_page, demo_book):
    page = open_page(demo_book, "plan")
    n = int(re.search(r"(\d+) kept runs of flexible tail swimmers, dark those", words(page))[1])
    assert n > 500 and len(rows(page, "proposed", 1)) == 5 and rows(page, "own", 1) and rows(page, "kept", 1)
    top = open_page(demo_book, "plan", next="top")
    assert "U/(ω L_tail θ₀²)" in "".join(charts(top)[1][0]["layer"][0]["encoding"]["y"]["axis"]["title"])


def test_the_ways_out_carry_the_proposals(open_page, demo_book, monkeypatch):
    made = {}

    def keep(label, data, name, mime, **more):
        made[name] = data()

    monkeypatch.setattr(plan_out.st, "download_button", keep)
    page = open_page(demo_book, "plan", n="3")
    sheet = list(csv.DictReader(io.StringIO(made["plan-sedge-05.csv"])))
    assert [f"{r['fluid']}, {r['f']}" for r in sheet] == [text for _, text in proposals(page)]
    assert {r["series"] for r in sheet} == {f"plan {SWIMMER} {date.today():%Y-%m-%d}"}
    printed = made["plan-sedge-05.html"]
    assert (
        printed.count('type="checkbox" aria-label="run') == 3 and "Criterion: fills the widest gap" in printed
    )
    assert "http" not in printed.replace("http-equiv", ""), "a page to print asks for nothing"


def test_a_logged_run_fills_the_gap(open_page, demo_copy):
    page = open_page(demo_copy, "plan", n="1")
    ((_, first),) = proposals(page)
    before = int(re.search(r"(\d+) kept runs of flexible", words(page))[1])
    fluid, f = first.split(", ")
    with Book.open(demo_copy) as book:
        book.record(swimmer=SWIMMER, fluid=fluid, f=f, theta0="0.150(6) rad", T="20.6 degC", rig="coil-1",
                    I_coil="2.68 A", h_wall="35 mm", U="0.0001(1) mm/s", confirm=True)  # fmt: skip
    page.run()
    ((_, again),) = proposals(page)
    assert again != first
    assert int(re.search(r"(\d+) kept runs of flexible", words(page))[1]) == before + 1
