"""The page of trends, run without a browser: address, controls, open run, empty book, saved figures."""

import csv
import json
import math
import re
import sqlite3
from contextlib import closing

import numpy as np
import pytest
import streamlit as st
from streamlit.dataframe_util import convert_arrow_bytes_to_pandas_df
from streamlit.testing.v1 import AppTest

from labbook import Book
from labbook.book import plotting
from labbook.book.asking import Question

PAGE = """
from types import SimpleNamespace
import streamlit as st
from labbook.app import trends
st.session_state["pages"] = {p: st.Page(lambda: None, title=p, url_path=p) for p in ("bench", "runs")}
if "picked by the test" in st.session_state:
    st.session_state["the chart"] = SimpleNamespace(selection=st.session_state.pop("picked by the test"))
    trends._pick("the chart")
trends.page()
"""


@pytest.fixture
def page(demo_book, monkeypatch):
    monkeypatch.setenv("LABBOOK_OPEN", str(demo_book))
    monkeypatch.setenv("LABBOOK_BY", "wren")

    def run(**address):
        app = AppTest.from_string(PAGE, default_timeout=60)
        for name, value in address.items():
            app.query_params[name] = value
        app.run()
        assert not app.exception
        return app

    return run


def chart(app):
    """The specification of the trend: filters may draw charts of their own."""
    specs = [json.loads(c.proto.spec) for c in app.get("vega_lite_chart")]
    return next(s for s in specs if any(part.get("name") == "runs" for part in s.get("layer", ())))


def layers(spec):
    return {part["name"]: part for part in spec["layer"] if "name" in part}


def texts(app):
    return " ".join(h.proto.body for h in app.get("html"))


def value(app, name):
    """What the address says of one name, or None."""
    found = app.query_params.get(name)
    return found[0] if isinstance(found, list) else found


def by_hand(path, statement):
    with closing(sqlite3.connect(path)) as connection:
        return connection.execute(statement).fetchall()


def test_the_first_look_is_scaled_speed_against_sperm_number(page, demo_book):
    app = page()
    runs = layers(chart(app))["runs"]
    assert runs["encoding"]["x"]["scale"]["type"] == runs["encoding"]["y"]["scale"]["type"] == "log"
    assert "Sp = L_tail" in str(runs["encoding"]["x"]) and "U/(ω L_tail θ₀²)" in str(runs["encoding"]["y"])
    assert runs["encoding"]["fill"]["title"] == "swimmer"
    (drawn,), = by_hand(demo_book, """select count(*) from resolved
        where state = 'kept' and Sp > 0 and U_scaled > 0""")  # fmt: skip
    (void,), = by_hand(demo_book, "select count(*) from resolved where state = 'void'")
    (every,), = by_hand(demo_book, "select count(*) from run")
    said = texts(app)
    assert f"{drawn} runs drawn · {every - drawn} not drawn" in said and f"{void} void" in said
    assert f"{drawn} of {every} runs drawn" in said
    assert not app.query_params, "defaults leave the address"


def test_the_address_chooses(page):
    app = page(x="Re", y="stride", colour="person", logy="off", bands="off", bars="none")
    spec = chart(app)
    encoding = layers(spec)["runs"]["encoding"]
    assert encoding["x"]["scale"]["type"] == "log" and encoding["y"]["scale"]["type"] == "linear"
    assert encoding["fill"]["title"] == "person"
    assert not [name for name in layers(spec) if name.startswith(("bars", "bands", "curve"))]
    assert app.selectbox(key="trends:x").value == "Re" and not app.toggle(key="trends:logy").value


def test_a_control_writes_the_address_and_its_default_leaves_it(page):
    app = page()
    app.selectbox(key="trends:y").set_value("stride").run()
    app.toggle(key="trends:bands").set_value(False).run()
    assert (value(app, "y"), value(app, "bands")) == ("stride", "off")
    assert "U/(f L_body)" in str(layers(chart(app))["runs"]["encoding"]["y"])
    app.selectbox(key="trends:y").set_value("U_scaled").run()
    assert "y" not in app.query_params and value(app, "bands") == "off"


def test_a_bad_address_is_said_and_the_rest_is_shown(page):
    app = page(x="speed", colour="fluid")
    assert "x cannot be &#x27;speed&#x27;" in texts(app)
    assert layers(chart(app))["runs"]["encoding"]["fill"]["title"] == "fluid"


def test_a_picked_mark_opens_its_run_and_rings_it(page, demo_book):
    (code,) = by_hand(demo_book, """select run.code from run join resolved on run_id = run.id
        where resolved.state = 'kept' and Sp > 1 and U_scaled > 0 limit 1""")[0]  # fmt: skip
    app = page()
    assert "picked" not in layers(chart(app))
    app.session_state["picked by the test"] = {"pick": [{"code": code}]}
    app.run()
    assert value(app, "run") == code
    assert "picked" in layers(chart(app))
    assert code in texts(app) + " ".join(m.value for m in app.markdown)
    app.button(key="trends:close").click().run()
    assert "run" not in app.query_params and "picked" not in layers(chart(app))


def test_a_mark_of_many_runs_says_so_and_opens_nothing(page):
    app = page()
    app.session_state["picked by the test"] = {"pick": [{"code": None}]}
    app.run()
    assert "several runs" in texts(app) and "run" not in app.query_params


def test_an_unknown_run_is_said_beside_the_chart(page):
    app = page(run="R-9999999")
    assert "R-9999999" in texts(app) and chart(app)


def rows_behind(app, name):
    """The rows of a layer, which Streamlit sends beside the specification."""
    wanted = layers(chart(app))[name]["data"]["name"]
    found = [d for c in app.get("vega_lite_chart") for d in c.proto.datasets if d.name == wanted]
    return convert_arrow_bytes_to_pandas_df(found[0].data.data)


def marks_of(app):
    """{run: (x, y)} of the marks."""
    return {row.code: (row.x, row.y) for row in rows_behind(app, "runs").itertuples()}


def test_another_dialect_moves_the_marks_and_is_on_the_axis(page):
    app = page(dialect="Sp=rate:f,power:1")
    house, spoken = marks_of(page()), marks_of(app)
    assert house.keys() == spoken.keys() and len(house) > 500
    for code, (x, y) in spoken.items():
        # physics.md section 9: Sp^4/(2 pi); five digits are 5e-5, in the fourth power four times that and its own
        assert x == pytest.approx(house[code][0] ** 4 / (2 * math.pi), rel=3e-4)
        assert y == house[code][1]
    encoding = layers(chart(app))["runs"]["encoding"]
    assert encoding["x"]["axis"]["title"] == ["Sp = ζ_n f L_tail⁴/EI, dialect rate f, power 1"]
    assert "Sp (rate f, power 1)" in str(encoding["tooltip"])


def test_bands_of_a_restated_number_are_hidden_and_one_line_says_why(page):
    house, spoken = page(y="Re_omega"), page(y="Re_omega", dialect="Sp=coefficient:eight_pi_mu")
    assert "8π" in str(layers(chart(spoken))["runs"]["encoding"]["x"])
    assert {"bands_x", "bands_y"} <= layers(chart(house)).keys()
    assert "bands_y" in layers(chart(spoken)) and "bands_x" not in layers(chart(spoken))
    assert "regimes and ranges are read in the house dialect" in texts(spoken)
    assert "read in the house dialect" not in texts(house)


def test_y_has_a_dialect_too(page):
    house, spoken = marks_of(page(y="stride")), marks_of(page(y="stride", dialect="stride=rate:omega"))
    assert len(house) > 100
    for code, (x, y) in spoken.items():
        # U/(omega L) is U/(f L) over 2 pi; both are rounded to five digits, so to 5e-5 each
        assert x == house[code][0] and y == pytest.approx(house[code][1] / (2 * math.pi), rel=1.1e-4)


def test_a_bad_dialect_is_said_in_a_sentence_and_the_rest_is_shown(page):
    app = page(dialect=["Sp=rate:rpm", "U_scaled=rate:f", "wall=x:1"])
    said = texts(app)
    assert "rate of Sp &#x27;rpm&#x27;" in said and "wall" in said
    title = str(layers(chart(app))["runs"]["encoding"]["y"]["axis"]["title"])
    assert "U/(f L_tail θ₀²)" in title and "rate f" in title
    assert app.selectbox(key="trends:dialect:Sp").value == "house"
    assert app.selectbox(key="trends:dialect:U_scaled").value == "rate f"


def test_a_dialect_is_chosen_by_name_or_choice_by_choice(page):
    app = page()
    offered = app.selectbox(key="trends:dialect:Sp").options
    assert offered[0] == "house" and offered[-1] == "other…" and "coefficient mu" in offered
    app.selectbox(key="trends:dialect:Sp").set_value("coefficient mu").run()
    assert value(app, "dialect") == "Sp=coefficient:mu"
    app.selectbox(key="trends:dialect:Sp").set_value("other…").run()
    assert value(app, "dialect") == "Sp=coefficient:mu", "nothing moves before a choice is made"
    assert app.selectbox(key="trends:dialect:Sp:coefficient").value == "mu"
    app.selectbox(key="trends:dialect:Sp:coefficient").set_value("cylinder_finite").run()
    assert "dialect" not in app.query_params
    app.selectbox(key="trends:dialect:Sp:power").set_value(1).run()
    app.selectbox(key="trends:dialect:Sp:rate").set_value("f").run()
    assert value(app, "dialect") == "Sp=rate:f,power:1"
    assert "ζ_n f L_tail⁴/EI" in str(layers(chart(app))["runs"]["encoding"]["x"])
    app.selectbox(key="trends:dialect:Sp").set_value("house").run()
    assert "dialect" not in app.query_params
    assert not [s for s in app.selectbox if s.key == "trends:dialect:Sp:power"]


def test_an_axis_without_dialects_offers_none(page):
    app = page(x="T", y="wall")
    assert not [s.key for s in app.selectbox if s.key and s.key.startswith("trends:dialect")]


def test_runs_without_a_value_in_a_dialect_are_counted_with_the_reason(page, demo_book):
    (have,), = by_hand(demo_book, "select count(Sp) from resolved where state = 'kept'")
    app = page(dialect="Sp=coefficient:lighthill")  # no tail of the demo's is a helix
    assert f"{have} no Sp in this dialect (needs a helix pitch)" in texts(app)


def test_a_grid_of_many_runs_is_restated_as_a_whole(page, monkeypatch, demo_book):
    defaults = plotting.plot_frame.__kwdefaults__
    monkeypatch.setattr(plotting.plot_frame, "__kwdefaults__", defaults | {"most": 100})
    st.cache_data.clear()
    st.cache_resource.clear()
    app = page(dialect="Sp=rate:f,power:1", bars="shared band")
    st.cache_data.clear()
    st.cache_resource.clear()
    runs = layers(chart(app))["runs"]["encoding"]["x"]
    assert "One mark stands for up to" in texts(app) and "dialect rate f, power 1" in str(runs)
    (low, high), = by_hand(demo_book, """select min(Sp), max(Sp) from resolved
        where state = 'kept' and Sp > 0 and U_scaled > 0""")  # fmt: skip
    # cells stand at means, the outermost ones mostly at one run: within the axis' own margin of a few per cent
    span = [math.log10(v**4 / (2 * math.pi)) for v in (low, high)]
    found = [math.log10(v) for v in runs["scale"]["domain"]]
    assert found == pytest.approx(span, abs=0.06 * (span[1] - span[0]))
    assert "No shared bands on a grid of many runs" in texts(app)


def curve_of(app):
    """Rows of x and y of the theory's curve."""
    return rows_behind(app, "curve")[["x", "y"]].to_numpy()


def test_the_curve_follows_a_change_of_rate_and_power_exactly(page):
    house, spoken = curve_of(page()), curve_of(page(dialect=["Sp=rate:f,power:1", "U_scaled=rate:f"]))
    # physics.md section 9, and U/(f L) = 2 pi U/(omega L); five digits are 5e-5, in the fourth power 5 times that
    assert spoken[:, 0] == pytest.approx(house[:, 0] ** 4 / (2 * math.pi), rel=3e-4)
    assert spoken[:, 1] == pytest.approx(house[:, 1] * 2 * math.pi, rel=1.1e-4)


@pytest.mark.parametrize(("dialect", "why"), [
    ("Sp=coefficient:mu", "cylinder_finite as the coefficient in Sp"),
    ("Sp=length:L_body", "L_tail as the length in Sp"),
    ("U_scaled=length:L_body", "L_tail as the length in U_scaled"),
])  # fmt: skip
def test_no_curve_where_each_swimmer_would_have_its_own(page, dialect, why):
    app = page(dialect=dialect)
    assert "curve" not in layers(chart(app)) and f"no theory here: the curve needs {why}" in texts(app)
    assert not [t for t in app.toggle if t.key == "trends:theory"]


def test_in_a_house_of_the_groups_own_the_curve_is_right_or_absent(demo_copy, page, monkeypatch):
    house = curve_of(page())
    with Book.open(demo_copy) as book:
        book.adopt_dialect("Sp", {"rate": "f", "power": 1}, why="as in our papers", by="wren")
    monkeypatch.setenv("LABBOOK_OPEN", str(demo_copy))
    app = page()
    moved = curve_of(app)
    assert moved[:, 0] == pytest.approx(house[:, 0] ** 4 / (2 * math.pi), rel=3e-4)
    assert moved[:, 1] == pytest.approx(house[:, 1], rel=1.1e-4)
    assert "Sp = ζ_n f L_tail⁴/EI, house dialect" in str(layers(chart(app))["runs"]["encoding"]["x"])
    with Book.open(demo_copy) as book:
        book.adopt_dialect("Sp", {"coefficient": "mu"}, why="again", by="wren")
    app = page()
    assert "curve" not in layers(chart(app)) and "no theory here" in texts(app)
    # the dialect at birth is one of the others now, and there the curve is as it was
    back = curve_of(page(dialect="Sp=rate:omega,power:0.25,coefficient:cylinder_finite"))
    assert back[:, 0] == pytest.approx(house[:, 0], rel=2e-5)


def test_in_a_house_of_another_drag_model_the_curve_is_that_models(demo_copy, page, monkeypatch):
    with Book.open(demo_copy) as book:
        book.adopt_dialect("Sp", {"coefficient": "spheroid_asymptotic"}, why="as in our papers", by="wren")
    monkeypatch.setenv("LABBOOK_OPEN", str(demo_copy))
    curve = curve_of(page(colour="none"))
    peak = curve[curve[:, 1].argmax() + np.array([-1, 0, 1])]
    a, b, _ = np.polyfit(np.log(peak[:, 0]), peak[:, 1], 2)
    # physics.md section 8: fastest at Sp = 2.090123 for b/L = 0.1; heads of the demo differ a little, 3 %
    assert math.exp(-b / (2 * a)) == pytest.approx(2.090, rel=0.03)


def families_of(app, name="curve"):
    """{part: rows} of the theory's lines or bands."""
    return dict(list(rows_behind(app, name).groupby("part")))


def test_each_named_swimmer_has_its_curve_in_its_colour_with_a_band_under_the_points(page):
    app = page()
    spec = chart(app)
    names = [part.get("name") for part in spec["layer"]]
    assert names.index("curve_band") < names.index("runs") < names.index("curve")
    scale = layers(spec)["runs"]["encoding"]["fill"]["scale"]
    hues = dict(zip(scale["domain"], scale["range"], strict=True))
    lines, bands = families_of(app), families_of(app, "curve_band")
    assert {part["hue"].iloc[0] for part in lines.values()} == {h for n, h in hues.items() if n != "other"}
    assert len(lines) == len(bands) == 6
    for part, band in bands.items():
        assert (band["low"] < lines[part]["y"]).all() and (band["high"] > lines[part]["y"]).all()
        assert (band["high"] / band["low"]).max() < 1.2  # 1 u of some per cent
    said = texts(app)
    assert "a curve for each of 6 groups of one swimmer" in said and "1 u of the predicted speed" in said


def test_a_swimmers_curve_goes_through_its_predicted_speeds(page, demo_book):
    with Book.open(demo_book) as book:
        runs = book.frame(Question(swimmers=("reed-02",)), keys=("Sp", "U_scaled", "U_model", "U_ratio", "h_wall"),
                          texts=("code",))  # fmt: skip
    app = page(swimmer="reed-02")
    curve, band = rows_behind(app, "curve"), rows_behind(app, "curve_band")
    seen = runs.dropna(subset=["Sp", "U_ratio", "h_wall"]).query("U_scaled > 0")  # all but one had that wall
    assert len(seen) > 10
    for run in seen.itertuples():
        # both are drawn to five digits, and the line is straight between 120 points: a thousandth
        drawn = math.exp(np.interp(math.log(run.Sp), np.log(curve["x"]), np.log(curve["y"])))
        assert drawn == pytest.approx(run.U_scaled / run.U_ratio, rel=2e-3)
        share = np.interp(math.log(run.Sp), np.log(band["x"]), band["high"] / band["y"] - 1)
        # the book's own derivation, run by run; the curve has the middle of their viscosities and angles
        assert share == pytest.approx(run.u_shared_U_model / run.U_model, rel=0.15)


def test_on_the_master_plot_one_curve_is_enough(page):
    app = page(y="F_scaled")
    lines = families_of(app)
    assert len(lines) == 1 and "median of 6 swimmers" in texts(app)
    band = rows_behind(app, "curve_band")
    assert 1.0 < (band["high"] / band["low"]).max() < 1.11


def test_other_colours_share_the_median_curve(page):
    for colour in ("fluid", "none"):
        app = page(colour=colour)
        assert len(families_of(app)) == 1 and "swimmers, its band from the lowest to the highest" in texts(app)


def test_residuals_lie_around_a_line_at_one(page):
    app = page(y="U_ratio", logy="off")
    line, band = rows_behind(app, "curve"), rows_behind(app, "curve_band")
    assert set(line["y"]) == {1.0} and len(set(band["high"])) == 1 and 1.005 < band["high"].iloc[0] < 1.02
    assert "1 u of the model itself" in texts(app) and "helix" not in texts(app).split("1 u of the model itself")[1][:80]
    app = page(x="f", y="U_ratio")
    assert set(rows_behind(app, "curve")["y"]) == {1.0} and "for a helix" in texts(app)
    assert [t for t in app.toggle if t.key == "trends:theory"]
    assert "curve" not in layers(chart(page(y="U_ratio", theory="off")))


def test_a_residual_needs_no_dialect_of_sp(page):
    app = page(y="U_ratio", dialect="Sp=coefficient:mu")
    assert set(rows_behind(app, "curve")["y"]) == {1.0}


def test_runs_that_have_no_curve_say_what_would_give_one(page):
    app = page(swimmer="thorn-01")  # a rigid tail
    assert "curve" not in layers(chart(app))
    assert "no theory here: the curve is that of a flexible tail" in texts(app)


def test_shared_bands_stand_behind_the_own_bars(page):
    app = page(bars="shared band")
    spec = chart(app)
    names = [part.get("name") for part in spec["layer"]]
    assert names.index("shared_bands") < names.index("runs") and "bars_y" in names
    assert "share at most (fluid, material, swimmer, rig), 2 u; more runs do not shrink it" in texts(app)
    assert "along x a family may move by" in texts(app)


def points_of(app):
    """Rows of the published points, [] where none is drawn."""
    return rows_behind(app, "published").to_dict("records") if "published" in layers(chart(app)) else []


def test_published_points_stand_beside_the_runs_and_are_none(page, demo_book):
    app = page()
    assert [p["series"] for p in points_of(app)] == ["marsh-2014"] * 5 + ["tarn-2017"] * 6
    # 1.39 with f for omega is 1.39 (2 pi)^(1/4), 0.083/(2 pi); five digits are drawn
    third = points_of(app)[2]
    assert (third["x"], third["y"]) == pytest.approx((1.39 * (2 * math.pi) ** 0.25, 0.083 / (2 * math.pi)), rel=1e-4)
    (drawn,), = by_hand(demo_book, """select count(*) from resolved
        where state = 'kept' and Sp > 0 and U_scaled > 0""")  # fmt: skip
    said = texts(app)
    assert f"{drawn} of 920 runs drawn" in said and f"{drawn} runs drawn ·" in said
    assert "published, not runs: marsh-2014 (bittern &amp; coot, Letters on Invented Tails 7, 21 (2014), invented), 5" in said
    assert "tarn-2017 (dipper, Annals of Invented Swimming 3, 140 (2017), invented), 6 points" in said


def test_they_follow_the_pages_dialect_and_those_that_cannot_are_counted(page):
    spoken = points_of(page(dialect=["Sp=rate:f,power:1", "U_scaled=rate:f"]))
    assert (spoken[2]["x"], spoken[2]["y"]) == pytest.approx((1.39**4, 0.083), rel=1e-4)
    # spheroid_asymptotic to cylinder_finite and L_body for L_tail: the second needs no more than both lengths
    app = page(dialect="Sp=coefficient:spheroid_asymptotic,length:L_body")
    assert [p["x"] for p in points_of(app)] == pytest.approx(
        [x * 22.4 / 18.0 for x in (0.88, 1.47, 1.96, 2.55, 3.53, 5.09)], rel=1e-4
    )
    # which length the reason names is the first that is missing
    assert re.search(r"5 published points not drawn: no Sp in this dialect \(needs L_(body|tail)\)", texts(app))


def test_a_switch_takes_them_away_where_there_are_any(page):
    app = page()
    app.toggle(key="trends:published").set_value(False).run()
    assert value(app, "published") == "off" and points_of(app) == []
    assert "published" not in texts(app)
    assert not [t for t in page(x="Re", y="stride").toggle if t.key == "trends:published"]


def test_the_switch_is_there_where_all_are_lost(demo_copy, page, monkeypatch):
    with Book.open(demo_copy) as book:
        book.withdraw("published", "tarn-2017", why="it gives lengths, the other none", by="wren")
    monkeypatch.setenv("LABBOOK_OPEN", str(demo_copy))
    app = page(dialect="Sp=length:L_body")
    assert [t for t in app.toggle if t.key == "trends:published"] and points_of(app) == []
    assert "5 published points not drawn: no Sp in this dialect" in texts(app)
    assert "not runs" not in texts(app)


def test_a_touch_on_a_published_point_opens_nothing(page):
    app = page()
    app.session_state["picked by the test"] = {"pick": [{"code": ""}]}
    app.run()
    assert "run" not in app.query_params and "several runs" not in texts(app)


def test_they_are_drawn_where_no_run_is(demo_copy, page, monkeypatch):
    with Book.open(demo_copy) as book:
        book.stock("published", series="mere-2022", citation="Mere (2022), invented", x="Sp", x_value="2.0", y="De",
                   y_value="0.50", by="wren")  # fmt: skip
    monkeypatch.setenv("LABBOOK_OPEN", str(demo_copy))
    app = page(x="Sp", y="De")  # no fluid of the demo has a relaxation time
    assert "No run that was found" in texts(app)
    assert [(p["x"], p["y"]) for p in points_of(app)] == [(2.0, 0.5)]


def test_a_new_point_is_drawn_at_once(demo_copy, page, monkeypatch):
    monkeypatch.setenv("LABBOOK_OPEN", str(demo_copy))
    assert len(points_of(page())) == 11
    with Book.open(demo_copy) as book:
        book.withdraw("published", "marsh-2014", why="wrong axes", by="wren")
    assert len(points_of(page())) == 6


def test_the_theory_can_be_taken_away(page):
    assert any(p["mark"]["type"] == "line" for p in chart(page())["layer"])
    assert not any(p["mark"]["type"] == "line" for p in chart(page(theory="off"))["layer"])


def test_axes_that_no_run_has_say_so(page):
    app = page(x="T", y="De")  # no fluid of the demo has a relaxation time
    assert "No run that was found" in texts(app) and "without De" in texts(app)


def test_an_empty_book_says_what_to_do_first(tmp_path, monkeypatch):
    Book.new(tmp_path / "empty.db").close()
    monkeypatch.setenv("LABBOOK_OPEN", str(tmp_path / "empty.db"))
    app = AppTest.from_string(PAGE, default_timeout=60).run()
    assert not app.exception
    assert "no runs yet" in texts(app)


FIGURE = """
import streamlit as st
from labbook.app import session, trend_figure
from labbook.app.trend_choices import chosen
from labbook.book.asking import Question
from labbook.book.plotting import plot_frame
from labbook.book.published_points import points
registry = session.registry()
choices, _ = chosen(registry)
asked = Question(fluids=("sil5000-a",))
rows = session.book().ask(plot_frame, asked, choices.x, choices.y, choices.group, dialects=choices.dialects)
others = session.book().ask(points, choices.x, choices.y, choices.dialects) if choices.published else None
figure = trend_figure.Figure(rows, choices, asked, None, others, session.book(), registry)
st.session_state["files"] = {"svg": figure.svg(), "png": figure.png(), "csv": figure.csv()}
"""


@pytest.fixture
def files(demo_book, monkeypatch):
    def saved(book=demo_book, **address):
        monkeypatch.setenv("LABBOOK_OPEN", str(book))
        app = AppTest.from_string(FIGURE, default_timeout=60)
        for name, given in address.items():
            app.query_params[name] = given
        app.run()
        assert not app.exception
        return app.session_state["files"]

    return saved


def test_saved_figures_carry_filter_dialect_date_and_book(files, demo_book):
    saved = files()
    assert saved["png"].startswith(b"\x89PNG")
    first, header, *rows = saved["csv"].decode().splitlines()
    for said in ("in sil5000-a", "power: 1/4", "demo.db", "drawn"):
        assert said in first
    assert "in sil5000-a" in saved["svg"].decode() and "demo.db" in saved["svg"].decode()
    assert header.startswith("code,at,by,swimmer") and "dialect" not in header
    (kept,), = by_hand(demo_book, """select count(*) from run join fluid on fluid.id = fluid_id
        where fluid.code = 'sil5000-a' and state = 'kept'""")  # fmt: skip
    assert len(rows) == kept


def test_saved_figures_name_the_published_series_and_hold_no_row_of_them(files):
    saved = files()
    drawn = re.sub(r"<[^>]*>", " ", saved["svg"].decode())
    first, *table = saved["csv"].decode().splitlines()
    for said in ("tarn-2017", "Annals of Invented Swimming 3, 140 (2017)"):
        assert said in first and all(word in drawn for word in said.split())
    assert not [line for line in table if "tarn-2017" in line]
    without = files(published="off")
    assert "tarn-2017" not in without["csv"].decode() and "tarn-2017" not in without["svg"].decode()
    assert table == without["csv"].decode().splitlines()[1:]


def test_files_in_another_dialect_hold_the_restated_values_and_say_so(files, demo_book):
    saved = files(dialect="Sp=length:L_body")
    first, *table = saved["csv"].decode().splitlines()
    rows = list(csv.DictReader(table))
    assert {row["dialect"] for row in rows} == {"Sp: length L_body"}
    assert "dialect length L_body" in first and "Regimes and ranges are read in the house dialect" in first
    drawn = re.sub(r"<[^>]*>", " ", saved["svg"].decode())
    assert "L_body (ζ_n ω/EI)^(1/4), dialect length L_body" in drawn
    restated = "select run.code, Sp * L_body / L_tail from run join resolved on run_id = run.id"
    house = dict(by_hand(demo_book, restated))
    compared = [(float(r["Sp"]), house[r["code"]]) for r in rows if r["Sp"]]
    assert len(compared) > 50
    for given, wanted in compared:  # a ratio of two stored floats: rounding alone
        assert given == pytest.approx(wanted, rel=1e-12)


def test_a_number_of_the_groups_own_is_an_axis_and_files_name_its_version(files, demo_copy, page, monkeypatch):
    own = dict(key="Lm", name="slimness", formula="L_tail / L_body", compares="tail to whole", source="own",
               example="L_tail = 20 mm, L_body = 25 mm", answer="0.80")  # fmt: skip
    with Book.open(demo_copy) as book:
        book.define_number(**own, by="wren")
        book.define_number(**(own | {"name": "tail's share"}), by="wren", why="a better name")
    first = files(book=demo_copy, x="Lm")["csv"].decode().splitlines()[0]
    assert "Lm = L_tail/L_body, tail's share, the group's own number, version 2" in first
    app = page(x="Lm")
    assert "Lm = L_tail/L_body, the group's own" in str(layers(chart(app))["runs"]["encoding"]["x"])
    assert "runs drawn" in texts(app)
