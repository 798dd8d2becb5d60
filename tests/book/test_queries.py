"""Questions to a book: regimes, ranges, choices, dates, text, state; the frame's shape; JSON and CSV out."""

import csv
import io
import json
import math
import shlex

import numpy as np
import pandas as pd
import pytest
from click.testing import CliRunner

from labbook import Refusal
from labbook.book.asking import Question, holds
from labbook.book.queries import count, ledger_lines, regime_counts
from labbook.book.stored_view import BIRTH_KEYS as KEYS
from labbook.cli import main
from labbook.exchange.outward import frame_as_csv
from labbook.registry.catalogue import NUMBERS
from labbook.registry.quantities import QUANTITIES
from labbook.registry.regimes import REGIMES


def codes(book, **question) -> set[str]:
    return {c.removeprefix("R-00") for c in book.runs(**question)["code"]}


# what the ten runs of conftest.py are, from their sheets: R-0010 is void, R-0009 has U consistent with 0
KEPT = {f"{i:02d}" for i in range(1, 10)}


@pytest.mark.parametrize(("question", "found"), [
    ({}, KEPT),
    ({"kept": False}, KEPT | {"10"}),
    ({"state": "void"}, {"10"}),
    ({"state": "all"}, KEPT | {"10"}),
    ({"fluid": "syrup"}, {"01", "02", "03"}),
    ({"fluid": ("syrup", "gly85")}, {"01", "02", "03", "04", "09"}),
    ({"fluid": "syrup", "swimmer": "ribbon-1"}, set()),
    ({"swimmer": ["ribbon-1", "pipe-1"]}, {"04", "05"}),
    ({"material": "sil-2"}, {"05"}),
    ({"material": ("sil-1", "sil-2")}, {"01", "02", "03", "04", "05", "09"}),
    ({"person": "knot"}, {"03", "04", "05"}),
    ({"person": ("knot", "sable")}, {"03", "04", "05", "06", "07"}),
    ({"series": "sweep"}, {"01", "02", "03"}),
    ({"series": "sweep", "person": "knot"}, {"03"}),
    ({"fluid": "nothing"}, set()),
    ({"since": "2026-03-05"}, {"08", "09"}),
    ({"until": "2026-03-02"}, {"01", "02", "03"}),
    ({"since": "2026-03-02T10:10", "until": "2026-03-02T10:10"}, {"02"}),
    ({"since": "2026-03-03", "until": "2026-03-04"}, {"04", "05", "06", "07"}),
    ({"text": "good"}, {"03"}),
    ({"text": "GOOD LIGHT"}, {"03"}),
    ({"text": "r-0004"}, {"04"}),
    ({"text": "swe"}, {"01", "02", "03"}),
    ({"text": "%"}, set()), ({"text": "_"}, set()), ({"text": "'"}, set()),
    ({"ranges": {"f": (0.5, 1.0)}}, {"01", "02", "05", "08", "09"}),  # both ends belong to it
    ({"ranges": {"f": (0.5000001, 0.9999999)}}, set()),
    ({"ranges": {"f": (2.0, math.inf)}}, {"03", "04", "06", "07"}),
    ({"ranges": {"U": (-math.inf, 0)}}, {"09"}),
    ({"ranges": {"A_tip": (-math.inf, math.inf)}}, {"01", "02", "03", "04", "06", "07", "09"}),  # those that have it
    ({"ranges": {"f": (0.5, 1.0), "T": (295, 296)}}, {"01", "02"}),
    ({"ranges": {"T": (293.15, 293.15)}}, {"06", "07"}),
])  # fmt: skip
def test_which_runs(filled, question, found):
    assert codes(filled, **question) == found


def test_regimes_mean_and(filled):
    """By hand from the sheets: Re_omega 0.95 and 0.56, 0.72 (nearly creeping), St 1/3 and 0.30 (cruising), Sp 1.75."""
    assert codes(filled, regime="nearly creeping") == {"01", "05", "08"}
    assert codes(filled, regime=["nearly creeping", "floppy tail"]) == {"01", "05"}
    assert codes(filled, regime=["cruising", "inertial"]) == {"06", "07"}
    assert codes(filled, regime=["cruising", "creeping"]) == set()
    assert codes(filled, regime="working tail") == {"09"}
    assert codes(filled, regime="working tail", swimmer="pipe-1") == set()


@pytest.mark.parametrize("question", [
    {"regime": "swimming"}, {"ranges": {"Q": (0, 1)}}, {"ranges": {"Sp": (3, 1)}}, {"ranges": {"Sp": (math.nan, 1)}},
    {"since": "March"}, {"until": "2026-13-01"}, {"state": "lost"}, {"columns": ("Sp", "Q")},
])  # fmt: skip
def test_questions_that_make_no_sense(filled, question):
    with pytest.raises(Refusal):
        filled.runs(**question)


@pytest.mark.parametrize(("number", "value", "names"), [
    ("Re_omega", 0.0999999, ["creeping"]), ("Re_omega", 0.1, ["nearly creeping"]), ("Re_omega", 1.0, ["nearly creeping"]),
    ("Re_omega", 1.0000001, ["transitional"]), ("Re_omega", 1000.0, ["transitional"]), ("Re_omega", 1000.01, ["inertial"]),
    ("Sp", 0.9999999, ["stiff tail"]), ("Sp", 1.0, ["working tail"]), ("Sp", 4.0, ["working tail"]),
    ("Sp", 4.0000001, ["floppy tail"]), ("Sp", None, []),
    ("St", 0.2, ["cruising"]), ("St", 0.4, ["cruising"]), ("St", 0.1999999, []), ("St", 0.4000001, []),
    ("St", -0.3, []),  # on the signed value: swimming backwards is not cruising
])  # fmt: skip
def test_the_bands_edges_in_the_database(filled, by_hand, number, value, names):
    """Design 2: < 0.1, 0.1 to 1, 1 to 1000, > 1000; < 1, 1 to 4, > 4; 0.2 to 0.4; closed at the printed limits."""
    by_hand(filled, "UPDATE resolved SET Re_omega=NULL, Sp=NULL, St=NULL")
    by_hand(filled, f"UPDATE resolved SET {number}=? WHERE run_id=1", value)
    found = [name for name in REGIMES if codes(filled, regime=name) == {"01"}]
    assert found == names
    assert [name for name, n in filled.ask(regime_counts, Question()).items() if n] == names


def test_the_database_and_python_agree_on_bands(filled):
    for row in filled.runs(kept=False).to_dict("records"):
        sheet = filled.sheet(row["code"])
        in_sql = [n for n in REGIMES if row["code"] in set(filled.runs(regime=n, kept=False)["code"])]
        assert sheet.regimes == in_sql
        assert holds(REGIMES["creeping"]) is not None


def test_counts(filled):
    counts = filled.ask(regime_counts, Question(regimes=("creeping",), fluids=("syrup",)))
    assert counts["nearly creeping"] == 1 and counts["transitional"] == 2, (
        "the question's own regimes are left aside"
    )
    assert filled.ask(count, Question()) == 9
    assert filled.ask(count, Question(people=("knot",), state="all")) == 3


# ---- the frame


def test_the_frame(filled):
    runs = filled.runs()
    assert runs.attrs["units"]["U"] == "m/s" and runs.attrs["units"]["Sp"] == "1"
    assert set(runs.attrs["units"]) == set(KEYS) >= set(NUMBERS)
    assert runs["at"].is_monotonic_increasing and str(runs["at"].dtype).startswith("datetime64")
    for key in KEYS:
        assert runs[key].dtype == float, key
        np.testing.assert_array_equal(
            runs[f"u_{key}"], np.hypot(runs[f"u_own_{key}"], runs[f"u_shared_{key}"])
        )
        assert (runs[key].isna() == runs[f"u_{key}"].isna()).all()
    assert runs.set_index("code").loc["R-0001", "U"] == pytest.approx(5.1e-5)
    assert runs["rig"].iloc[3] is None or pd.isna(runs["rig"].iloc[3])
    assert "kept" in runs.attrs["question"]


def test_columns_and_newest(filled):
    some = filled.runs(columns=("Sp", "U"))
    assert [c for c in some.columns if c in KEYS] == ["Sp", "U"]
    newest = filled.frame(Question(), keys=("f",), newest=3)
    assert newest["code"].tolist() == ["R-0009", "R-0008", "R-0007"]
    plain = filled.frame(Question(), keys=("f",), texts=("code",), spread=False)
    assert plain.columns.tolist() == ["code", "f"]


def test_an_empty_answer_has_the_same_columns(filled, empty):
    nothing, runs = filled.runs(fluid="nothing"), filled.runs()
    assert len(nothing) == 0 and nothing.columns.tolist() == runs.columns.tolist()
    assert nothing["Sp"].dtype == float and nothing["at"].dt.tz is not None
    assert len(empty.runs()) == 0


# ---- the same question in other words


QUESTIONS = [
    Question(),
    Question(regimes=("nearly creeping", "floppy tail"), ranges={"Sp": (1, 5), "U": (-math.inf, 1e-3)}),
    Question(fluids=("syrup", "gly85"), swimmers=("reed-1",), materials=("sil-1",), people=("wren", "knot")),
    Question(series=("sweep",), since="2026-03-02T10:05", until="2026-03-04", state="all"),
    Question(text="bubble on the tail", state="void"),
    Question(text='it\'s $HOME; `x` "y"'),
    Question(text="-x"),
    Question(ranges={"f": (0.5, 0.5), "Sp": (4.524733999999, math.inf)}),
]


@pytest.mark.parametrize("question", QUESTIONS, ids=lambda q: q.in_words())
def test_the_command_line_asks_the_same(filled, question):
    words = shlex.split(question.as_options())
    done = CliRunner().invoke(main, ["runs", filled.target, "--as", "json", *words])
    assert done.exit_code == 0, done.stderr
    assert [r["code"] for r in json.loads(done.stdout)] == filled.frame(question)["code"].tolist()


def test_a_question_in_words():
    question = Question(
        ("creeping", "working tail"), {"Sp": (1, 3), "mu": (0.5, math.inf)}, since="2026-03-01"
    )
    assert (
        question.in_words()
        == "creeping and working tail, 1 <= Sp <= 3, mu >= 0.5 Pa.s, kept, since 2026-03-01"
    )


# ---- out


def as_json(book, *words):
    done = CliRunner().invoke(main, ["runs", book.target, "--as", "json", *words])
    assert done.exit_code == 0, done.stderr
    return json.loads(done.stdout)


def test_json_says_all_of_design_5(filled):
    rows = as_json(filled, "--state", "all")
    assert [r["code"] for r in rows] == [f"R-{i:04d}" for i in range(1, 11)]
    texts = {
        "code",
        "at",
        "by",
        "swimmer",
        "fluid",
        "material",
        "rig",
        "drive",
        "series",
        "video",
        "state",
        "why",
        "note",
    }
    keys = {p + k for k in KEYS for p in ("", "u_", "u_own_", "u_shared_")}
    for row in rows:
        assert texts | keys | {"regimes", "why_absent", "marks"} <= set(row)
        for key in KEYS:
            absent = row[key] is None
            assert all((row[p + key] is None) is absent for p in ("u_", "u_own_", "u_shared_"))
            if not absent:
                assert row[f"u_{key}"] == pytest.approx(
                    math.hypot(row[f"u_own_{key}"], row[f"u_shared_{key}"])
                )
        assert all(row[n] is not None or row["why_absent"][n] for n in NUMBERS), "an absent number says why"
        assert not set(row["why_absent"]) & {k for k in KEYS if row[k] is not None}
    first, strip, void = rows[0], rows[3], rows[9]
    assert first["regimes"] == ["nearly creeping", "floppy tail"] and first["swimmer"] == "reed-1"
    assert first["rig"] == "coil-1" and strip["rig"] is None and strip["series"] is None
    assert strip["marks"]["f"] == ["from digits"]
    assert (void["state"], void["why"]) == ("void", "bubble on the tail")
    assert rows[8]["St"] is None and rows[8]["why_absent"]["St"] == "not defined (U consistent with 0)"
    assert pd.Timestamp(first["at"]).tzinfo is not None


def test_json_of_nothing(empty):
    assert as_json(empty) == []


def test_csv_can_be_read_again(filled):
    runs = filled.runs(kept=False)
    text = frame_as_csv(runs)
    again = pd.read_csv(io.StringIO(text))
    assert len(again) == 10
    for key in KEYS:
        unit = QUANTITIES[key].unit if key in QUANTITIES else "1"
        for prefix in ("", "u_", "u_own_", "u_shared_"):
            name = f"{prefix}{key} [{unit}]" if unit != "1" else prefix + key
            np.testing.assert_array_equal(
                again[name].to_numpy(float), runs[prefix + key].to_numpy()
            )  # all digits
    assert again["code"].tolist() == runs["code"].tolist()
    assert CliRunner().invoke(main, ["runs", filled.target, "--state", "all", "--as", "csv"]).stdout == text


@pytest.mark.parametrize(
    "note", ["=cmd|' /C calc'!A0", "+1+1", "-2+3", "@SUM(A1)", '=HYPERLINK("http://x","y")']
)
def test_formulas_are_made_harmless(filled, note):
    filled.amend("R-0001", why="test", note=note, series=note[:40])
    text = CliRunner().invoke(main, ["runs", filled.target, "--as", "csv"]).stdout
    (row,) = [r for r in csv.DictReader(io.StringIO(text)) if r["code"] == "R-0001"]
    assert row["note"] == "'" + note and row["series"] == "'" + note[:40]
    assert row["U [m/s]"] == "5.1e-05", "numbers are left alone"
    filled.amend("R-0001", why="back", U="-0.051(3) mm/s", confirm=True)
    text = CliRunner().invoke(main, ["runs", filled.target, "--as", "csv"]).stdout
    (row,) = [r for r in csv.DictReader(io.StringIO(text)) if r["code"] == "R-0001"]
    assert row["U [m/s]"] == "-5.1e-05"
    assert as_json(filled, "--text", "R-0001")[0]["note"] == note, "JSON keeps what was typed"


def test_a_confirmed_run_beside_an_ordinary_one_keeps_absence_apart(tmp_path):
    from labbook import Book

    with Book.new(tmp_path / "mixed.db") as book:
        book.stock("fluid", code="water-a", kind="water", by="wren")
        book.stock("swimmer", code="fin-1", form="undulating", L_body="100.0 mm", by="wren")
        for _ in range(3):
            book.record(swimmer="fin-1", fluid="water-a", f="2.0 Hz", T="21.0 degC", U="80(2) mm/s", by="wren")
        far = book.record(swimmer="fin-1", fluid="water-a", f="2.0 Hz", T="21.0 degC", U="900(20) mm/s",
                          by="wren", confirm=True)  # fmt: skip
        sheets = book.sheets(Question())
        assert [s.marks.get("U", []) for s in sheets][-1] == ["confirmed"]
        assert book.sheet(far).texts["why"] is None
        assert all(s.texts["note"] is None and s.texts["rig"] is None for s in sheets)
        assert book.ask(ledger_lines, code=far)["why"].tolist() == [None]
