"""Points that others printed: entered and loaded as a sheet, restated to the group's dialect, never counted as runs."""

import math

import pytest

from labbook.book.asking import Question
from labbook.book.published_points import all_series, points
from labbook.book.queries import count, ledger_lines
from labbook.errors import LabbookError

# an invented series; the point stands at Sp with f for omega
POINT = dict(series="pond-2019", citation="Pond & Weir, Invented Letters 3:14 (2019)", x="Sp", x_value="2.00(10)",
             x_dialect="rate:f", y="U_scaled", y_value="0.0120(6)", by="wren")  # fmt: skip


def test_a_point_is_restated_to_the_house_dialect_and_to_any_other(filled):
    filled.stock("published", **POINT)
    house = filled.ask(points, "Sp", "U_scaled").iloc[0]
    # f in place of omega makes a sperm number smaller by (2 pi)^(1/4) = 1.58323
    assert house["Sp"] == pytest.approx(2.0 * 1.58323, rel=1e-5) and house["u_Sp"] == pytest.approx(0.158323, rel=1e-5)
    assert (house["U_scaled"], house["u_U_scaled"]) == pytest.approx((0.012, 0.0006), rel=1e-12)
    fourth = filled.ask(points, "U_scaled", "Sp", {"Sp": {"rate": "f", "power": 1}}).iloc[0]
    assert fourth["Sp"] == pytest.approx(16.0, rel=1e-12) and fourth["u_Sp"] == pytest.approx(4 * 0.05 * 16, rel=1e-9)


def test_it_follows_the_group_to_another_house_dialect(filled):
    filled.stock("published", **POINT)
    filled.adopt_dialect("Sp", {"rate": "f"}, why="try", by="wren")
    assert filled.ask(points, "Sp", "U_scaled")["Sp"].tolist() == pytest.approx([2.0], rel=1e-12)


def test_what_its_dialect_needs_must_be_there_or_it_is_counted_as_left_out(filled):
    filled.stock("published", **{**POINT, "x_dialect": "length:L_body"})
    lacking = filled.ask(points, "Sp", "U_scaled")
    assert len(lacking) == 0 and sum(lacking.attrs["lost"].values()) == 1
    filled.stock("published", **{**POINT, "x_dialect": "length:L_body", "L_body": "30 mm", "L_tail": "24 mm"})
    assert filled.ask(points, "Sp", "U_scaled")["Sp"].tolist() == pytest.approx([2.0 * 24 / 30], rel=1e-12)


def test_it_is_no_run(filled):
    runs = filled.ask(count, Question(state="all"))
    filled.stock("published", **POINT)
    assert filled.ask(count, Question(state="all")) == runs and filled.check() == []


def test_a_sheet_of_them_loads_once_and_whole(filled, tmp_path):
    sheet = tmp_path / "published.csv"
    rows = "\n".join(f'pond-2019,"Pond & Weir, Invented Letters 3:14 (2019)",Sp,{1 + i / 2:.2f}(5),stride,0.0{i + 1}0'
                     for i in range(4))  # fmt: skip
    sheet.write_text("series,citation,x,x_value,y,y_value\n" + rows + "\n", encoding="utf-8")
    assert str(filled.load(sheet, by="knot")) == "added 4 published points"
    assert "nothing new" in str(filled.load(sheet, by="knot"))
    assert len(filled.ask(points, "Sp", "stride")) == 4 and len(filled.ask(points, "stride", "Sp")) == 4
    sheet.write_text(sheet.read_text(encoding="utf-8") + "pond-2019,another paper,Bo,1.0,stride,0.01\n", encoding="utf-8")
    with pytest.raises(LabbookError, match="line 6, x 'Bo'"):
        filled.load(sheet, by="knot")
    assert len(filled.ask(points, "Sp", "stride")) == 4


def test_a_withdrawn_series_leaves_the_plot_and_the_ledger_knows(filled):
    filled.stock("published", **POINT)
    filled.withdraw("published", "pond-2019", why="they retracted it", by="wren")
    assert filled.ask(all_series) == {} and len(filled.ask(points, "Sp", "U_scaled")) == 0
    assert filled.ask(ledger_lines, act="void").iloc[0]["subject"] == "pond-2019"
    filled.stock("published", **POINT)
    assert len(filled.ask(points, "Sp", "U_scaled")) == 1


@pytest.mark.parametrize(
    ("change", "word"),
    [
        ({"x": "speed"}, "no number has this key"),
        ({"x_dialect": "rate:Hz"}, "one of omega, f"),
        ({"x_dialect": "f"}, "write e.g."),
        ({"y": "wall", "y_dialect": "length:L_body"}, "has no dialects"),
        ({"x_value": "2 mm"}, "a pure number is needed"),
        ({"x_value": "-2.0(1)"}, "never negative"),
        ({"x_value": None}, "is missing"),
        ({"y": "Sp"}, "already"),
        ({"citation": None}, "is missing"),
    ],
)  # fmt: skip
def test_a_point_that_cannot_be_drawn_is_refused_and_nothing_is_kept(filled, counts, change, word):
    before = counts(filled)
    with pytest.raises(LabbookError) as refused:
        filled.stock("published", **{**POINT, **change})
    assert word in str(refused.value) and "\n" not in str(refused.value)
    assert counts(filled) == before


def test_one_series_has_one_citation(filled):
    filled.stock("published", **POINT)
    with pytest.raises(LabbookError, match="one series, one citation"):
        filled.stock("published", **{**POINT, "x_value": "3.0", "citation": "Somebody else"})
    assert math.isclose(filled.ask(points, "Sp", "U_scaled")["Sp"].sum(), 2.0 * (2 * math.pi) ** 0.25)


def test_house_is_no_dialect_of_a_print(filled):
    # the group's house dialect may change tomorrow; what a paper printed does not
    with pytest.raises(LabbookError, match="x_dialect 'house': is the group's choice"):
        filled.stock("published", **{**POINT, "x_dialect": "house"})


def test_a_refusal_names_its_column(filled):
    for change, column in (({"x": "Bo"}, "x"), ({"y_dialect": "rate"}, "y_dialect"), ({"y": "Sp"}, "y")):
        with pytest.raises(LabbookError) as refused:
            filled.stock("published", **{**POINT, **change})
        assert refused.value.field == column


def test_points_of_several_prints_are_restated_each_from_its_own(filled):
    prints = ("rate:f", "", "power:1", "length:L_body")
    for i, dialect in enumerate(prints):
        filled.stock("published", **{**POINT, "series": f"s{i}", "x_dialect": dialect})
    found = filled.ask(points, "Sp", "U_scaled").set_index("series")
    # (2 pi)^(1/4) = 1.58323; as it is; the fourth root of 2; L_tail is not given
    assert found["Sp"].to_dict() == pytest.approx({"s0": 2.0 * 1.58323, "s1": 2.0, "s2": 2.0**0.25}, rel=1e-5)
    # u: 0.10 x 1.58323; 0.10; and for the root a quarter of 5 % of it
    assert found["u_Sp"].to_dict() == pytest.approx({"s0": 0.158323, "s1": 0.10, "s2": 0.0125 * 2.0**0.25}, rel=1e-5)
    assert found["printed_Sp"].tolist() == ["2.00(10)"] * 3 and found["dialect_Sp"].tolist() == list(prints[:3])
    assert found.attrs["lost"] == {"no Sp in this dialect (needs L_tail)": 1}
    assert len(filled.ask(points, "Sp", "U_scaled", series="s1")) == 1


def test_a_value_that_a_power_cannot_take_is_counted(filled):
    filled.stock("published", **{**POINT, "x_dialect": "power:1", "x_value": "0(1)"})
    found = filled.ask(points, "Sp", "U_scaled")
    assert len(found) == 0 and found.attrs["lost"] == {"no Sp in this dialect (printed as 0)": 1}
    assert filled.ask(points, "Sp", "U_scaled", {"Sp": {"power": 1}})["Sp"].tolist() == [0.0]


def test_only_a_number_with_a_sign_may_be_negative(filled):
    filled.stock("published", **{**POINT, "y_value": "-0.0120(6)"})
    assert filled.ask(points, "Sp", "U_scaled")["U_scaled"].tolist() == [-0.012]
