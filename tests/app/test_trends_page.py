"""The page of trends, run without a browser: address, controls, open run, empty book, saved figures."""

import csv
import json
import sqlite3
from contextlib import closing

import pytest
import streamlit as st
from streamlit.testing.v1 import AppTest

from labbook import Book
from labbook.book import plotting

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


def test_another_dialect_is_on_the_axis_and_takes_the_bands_away(page):
    house, spoken = chart(page()), chart(page(dialect="zeta_n eight_pi_mu"))
    assert "8π" in str(layers(spoken)["runs"]["encoding"]["x"])
    assert "bands_x" in layers(house) and "bands_x" not in layers(spoken)
    assert not any(p["mark"]["type"] == "line" for p in spoken["layer"])


def test_many_runs_are_counted_on_a_grid_and_only_in_the_house_dialect(page, monkeypatch):
    defaults = plotting.plot_frame.__kwdefaults__
    monkeypatch.setattr(plotting.plot_frame, "__kwdefaults__", defaults | {"most": 100})
    st.cache_data.clear()
    st.cache_resource.clear()
    app = page(dialect="rate f, zeta_n spheroid_asymptotic")
    st.cache_data.clear()
    st.cache_resource.clear()
    assert "in the house dialect" in texts(app) and "One mark stands for up to" in texts(app)
    assert "(ζ_n ω/EI)" in str(layers(chart(app))["runs"]["encoding"]["x"])
    assert app.selectbox(key="trends:dialect").disabled


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
choices, _ = chosen()
asked = Question(fluids=("sil5000-a",))
from labbook.charts.dialect_axis import INPUTS
rows = session.book().ask(plot_frame, asked, choices.x, choices.y, choices.group, also=INPUTS)
figure = trend_figure.Figure(rows, choices, asked, None, session.book())
st.session_state["files"] = {"svg": figure.svg(), "png": figure.png(), "csv": figure.csv()}
"""


def test_saved_figures_carry_filter_dialect_date_and_book(demo_book, monkeypatch):
    monkeypatch.setenv("LABBOOK_OPEN", str(demo_book))
    app = AppTest.from_string(FIGURE, default_timeout=60).run()
    assert not app.exception
    files = app.session_state["files"]
    assert files["png"].startswith(b"\x89PNG")
    first, header, *rows = files["csv"].decode().splitlines()
    for said in ("in sil5000-a", "power: 1/4", "demo.db", "drawn"):
        assert said in first
    assert "in sil5000-a" in files["svg"].decode() and "demo.db" in files["svg"].decode()
    assert header.startswith("code,at,by,swimmer")
    (kept,), = by_hand(demo_book, """select count(*) from run join fluid on fluid.id = fluid_id
        where fluid.code = 'sil5000-a' and state = 'kept'""")  # fmt: skip
    assert len(rows) == kept


def test_a_csv_in_another_dialect_holds_the_restated_values(demo_book, monkeypatch):
    monkeypatch.setenv("LABBOOK_OPEN", str(demo_book))
    app = AppTest.from_string(FIGURE, default_timeout=60)
    app.query_params["dialect"] = "length L_body"
    app.run()
    assert not app.exception
    first, *table = app.session_state["files"]["csv"].decode().splitlines()
    rows = list(csv.DictReader(table))
    column = "Sp (length L_body)"
    assert column in rows[0] and f"u_{column}" in rows[0] and "Sp" not in rows[0]
    assert "L_body (" in first and "house dialect of Sp" not in first
    house = dict(by_hand(demo_book, "select run.code, Sp * L_body / L_tail from run join resolved on run_id = run.id"))
    compared = [(float(r[column]), house[r["code"]]) for r in rows if r[column]]
    assert compared
    for given, wanted in compared:  # a ratio of two stored floats: rounding alone
        assert given == pytest.approx(wanted, rel=1e-12)
