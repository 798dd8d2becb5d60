"""Statistics on Trends and repeats on Runs, run without a browser: folded, open, refused, and on the chart."""

import html
import json
import re
import sqlite3
from contextlib import closing

import pytest
import streamlit as st
from streamlit.dataframe_util import convert_arrow_bytes_to_pandas_df

from labbook import Book
from labbook.app import runs_repeats, trend_pieces
from labbook.book.asking import Question
from labbook.book.repeat_groups import repeat_groups
from labbook.book.trend_group import trend_group
from labbook.book.trend_statistics import repeated_runs, repeats_placed, top_of


@pytest.fixture(autouse=True)
def _fresh():
    yield
    st.cache_resource.clear()


@pytest.fixture
def trends(open_page, demo_book):
    return lambda **address: open_page(demo_book, "trends", **address)


@pytest.fixture
def runs(open_page, demo_book):
    return lambda **address: open_page(demo_book, "runs", **address)


@pytest.fixture(scope="module")
def group(demo_book):
    with Book.open(demo_book) as book:
        return book.ask(trend_group, Question(), "Sp", "U_scaled")


def layers(page):
    specs = [json.loads(c.proto.spec) for c in page.at.get("vega_lite_chart")]
    spec = next(s for s in specs if any(part.get("name") == "runs" for part in s.get("layer", ())))
    return {part["name"]: part for part in spec["layer"] if "name" in part}


def rows(page, name):
    data = layers(page)[name]["data"]
    if "values" in data:
        return data["values"]
    found = [d for c in page.at.get("vega_lite_chart") for d in c.proto.datasets if d.name == data["name"]]
    return convert_arrow_bytes_to_pandas_df(found[0].data.data).to_dict("records")


def words(page):
    return html.unescape(page.words())


def told(page):
    return [html.unescape(p) for p in re.findall(r'<p class="lb-told">(.*?)</p>', page.words())]


def in_address(page, name):
    found = page.at.query_params.get(name)
    return found[0] if isinstance(found, list) else found


# ---- Trends


def test_folded_nothing_is_worked_out_and_nothing_drawn(trends, monkeypatch):
    def never(*_):
        raise AssertionError("worked out while folded")

    monkeypatch.setattr(trend_pieces, "trend_group", never)
    page = trends()
    assert not told(page) and "maximum" not in layers(page)
    assert not [b for b in page.at.selectbox if b.label == "maxima by"]


def test_open_the_text_and_the_cross_are_the_statistics_of_the_runs_shown(trends, group):
    page = trends(statistics="on")
    top = top_of(group).maximum
    said = told(page)
    assert said[0].startswith(f"Data: {len(group.points.index)} of the {group.found} runs found (kept)")
    assert f"at Sp = {top.x:.3f} (95 % interval {top.x_low:.3f} to {top.x_high:.3f})" in said[1]
    (cross,) = rows(page, "maximum")
    assert (cross["x"], cross["x_high"], cross["y_low"]) == pytest.approx((top.x, top.x_high, top.y_low), rel=1e-4)
    assert "Thin cross" in words(page) and "repeats" not in layers(page)


def test_the_filter_is_the_statistics_too(trends, group):
    page = trends(statistics="on", range="Re_omega::1")
    found = int(re.search(r"of the (\d+) runs found", told(page)[0])[1])
    assert 0 < found < group.found and "Re_omega" in told(page)[0]


def test_switches_draw_the_means_and_take_the_cross_away(trends, group):
    page = trends(statistics="on", repeats="on")
    placed = repeats_placed(group, repeated_runs(group))
    drawable = placed[(placed["x"] > 0) & (placed["y"] > 0)]
    assert [r["n"] for r in rows(page, "repeats")] == drawable["n"].tolist()
    page.at.toggle(key="trends:statistics:repeats").set_value(False).run()
    assert "repeats" not in layers(page) and not in_address(page, "repeats")
    page.at.toggle(key="trends:statistics:maxima").set_value(False).run()
    assert "maximum" not in layers(page) and in_address(page, "maxima") == "off"
    assert told(page), "the words stay"


def test_families_by_the_colour_have_crosses_in_it(trends):
    page = trends(statistics="on", colour="material")
    fill = layers(page)["runs"]["encoding"]["fill"]["scale"]
    hues = dict(zip(fill["domain"], fill["range"], strict=True))
    crosses = {r["name"]: r["hue"] for r in rows(page, "maximum")}
    assert {"all runs", "firm-a", "firm-b", "mid-a", "mid-b"} == set(crosses), "those with an interval"
    assert all(crosses[name] == hues[name] for name in crosses if name != "all runs")
    page.at.selectbox(key="trends:statistics:family").set_value("fluid").run()
    assert in_address(page, "family") == "fluid" and [r["name"] for r in rows(page, "maximum")] == ["all runs"]
    assert "Maximum by fluid" in " ".join(told(page))


def test_a_range_for_the_slope_is_kept_in_the_address_and_refused_at_its_field(trends):
    page = trends(statistics="on", family="none")
    assert len([p for p in told(page) if "goes as Sp" in p]) == 2
    page.at.text_input(key="trends:slope:low").set_value("0,9").run()
    page.at.text_input(key="trends:slope:high").set_value("1.5").run()
    assert in_address(page, "slope") == "0.9:1.5"
    (slope,) = [p for p in told(page) if "goes as Sp" in p]
    assert re.search(r"between Sp = 0\.9\d* and 1\.[45]", slope)
    page.at.text_input(key="trends:slope:high").set_value("0.5").run()
    assert any("0.9 to 0.5 is no range" in said for said in page.said())
    assert page.at.text_input(key="trends:slope:high").value == "0.5", "what was typed stays"
    assert in_address(page, "slope") == "0.9:1.5"
    page.at.text_input(key="trends:slope:high").set_value("1.4").run()
    assert not page.said() and in_address(page, "slope") == "0.9:1.4"


def test_another_form_is_chosen_and_one_without_values_is_refused_with_a_way_back(trends):
    page = trends(statistics="on", x="f", y="U", family="none")
    assert page.at.selectbox(key="trends:statistics:form").options[0].startswith("flexible tail (")
    page.at.selectbox(key="trends:statistics:form").set_value("helix").run()
    assert "of form helix with both values" in told(page)[0] and in_address(page, "form") == "helix"
    page = trends(statistics="on", form="helix")
    assert any("none of the 106 runs of form helix" in said for said in page.said()) and not told(page)
    page.press("The form with most runs")
    assert told(page) and not in_address(page, "form")


def test_what_the_address_has_wrong_is_said(trends):
    page = trends(statistics="on", family="person", slope="much")
    said = " ".join(page.said())
    assert "family cannot be 'person'; material is shown" in said and "slope cannot be 'much'" in said
    assert told(page)


def test_in_another_dialect_nothing_is_drawn_and_the_house_is_named(trends):
    page = trends(statistics="on", family="none", dialect="Sp=rate:f,power:1")
    assert "maximum" not in layers(page) and "Statistics are in the house dialect" in words(page)
    assert "at Sp = 2.1" in " ".join(told(page))


def test_an_outlier_opens_its_run(trends):
    page = trends(statistics="on", x="Sw", y="Re", family="none")
    (code,) = [b.label for b in page.at.button if b.key.startswith("trends:statistics:open:")]
    assert f"{code}: " in " ".join(told(page))
    page.press(code)
    assert in_address(page, "run") == code


def test_too_many_runs_are_refused_in_the_fold(trends, monkeypatch):
    monkeypatch.setattr("labbook.book.trend_source.MOST", 100)
    page = trends(statistics="on")
    assert any("statistics take 100 runs at most" in said for said in page.said())
    assert "runs" in layers(page), "the chart is there"


# ---- Runs


def by_hand(path, statement):
    with closing(sqlite3.connect(path)) as connection:
        return connection.execute(statement).fetchall()


def test_repeats_are_folded_away_and_not_looked_for(runs, monkeypatch):
    monkeypatch.setattr(runs_repeats, "repeat_groups", lambda *_: 1 / 0)
    page = runs()
    assert not [b for b in page.at.selectbox if b.label == "scatter of"]


def test_repeats_list_the_groups_those_first_that_scatter_most(runs, demo_book):
    page = runs(repeats="on")
    with Book.open(demo_book) as book:
        groups = book.ask(repeat_groups, Question(), "U")
    table = page.at.dataframe[-1].value
    assert len(table) == len(groups.table) and table["p"].is_monotonic_increasing
    assert table["n"].sum() == groups.table["n"].sum()
    worst = groups.table.sort_values("p").iloc[0]
    assert (table.iloc[0]["swimmer"], table.iloc[0]["fluid"]) == (worst["swimmer"], worst["fluid"])
    assert groups.in_words() in words(page)
    page.at.selectbox(key="runs:repeats:of").set_value("St").run()
    assert in_address(page, "of") == "St" and "mean St" in page.at.dataframe[-1].value.columns


def test_a_group_touched_shows_its_runs_and_filters_the_table(runs, demo_book, monkeypatch):
    with Book.open(demo_book) as book:
        table = book.ask(repeat_groups, Question(), "U").table
    place = int(table["theta0_low"].notna().to_numpy().argmax())
    monkeypatch.setattr(runs_repeats, "_table", lambda groups, told: place if len(groups.table) > 1 else None)
    page = runs(repeats="on")
    codes = table.iloc[place]["codes"]
    labels = [b.label for b in page.at.button]
    assert set(codes) <= set(labels)
    (button,) = [label for label in labels if label.endswith("alone in the table")]
    page.press(button)
    assert in_address(page, "swimmer") == table.iloc[place]["swimmer"]
    found = set(page.at.dataframe[0].value["code"])
    assert found >= set(codes) and f" {len(found)} runs" in button
    rest = ", ".join(map(repr, found - set(codes))) or "''"
    (others,) = by_hand(demo_book, f"""select count(*) from run
        where json_extract(typed, '$.U') is null and code in ({rest})""")[0]
    assert others == len(found) - len(codes), "those beside the group's have no U"
    assert ("these settings" in button) == bool(others)
    page = runs(repeats="on")
    page.press(codes[0])
    assert in_address(page, "run") == codes[0]


def test_what_cannot_be_repeated_is_said(runs):
    page = runs(repeats="on", state="void")
    assert any("void runs stay out of statistics" in said for said in page.said())
    page = runs(repeats="on", of="beauty", swimmer="sedge-04")
    assert any("of cannot be 'beauty'; U is shown" in said for said in page.said())
    assert "No run was repeated" in words(page)
