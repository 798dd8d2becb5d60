"""The speed budget as ratios inside one run: derive, regime query, plot query, log one run, load a sheet."""

import sqlite3

import numpy as np
from byhand import numbers_by_hand, numbers_with_pint, sheet_as_text
from measured import RUNS, noted, timed
from synthetic import big_book, facts, ids, run_sheet, stock

from labbook import Book
from labbook.book import opening, plotting
from labbook.book.asking import Question
from labbook.book.derive import BATCH, derive
from labbook.book.queries import frame, regime_counts
from labbook.book.shelf import read_shelf
from labbook.exchange import sheets
from labbook.registry.group import at_birth

SHEET_ROWS = 100_000


def test_derive(tmp_path):
    with Book.new(tmp_path / "shelf.db") as book:
        stock(book)
        swimmers, fluids, rig = ids(book)
        shelf = book.ask(read_shelf)
    columns = facts(RUNS, swimmers, fluids, rig)

    def ours():
        for start in range(0, RUNS, BATCH):
            derive(columns.slice(start, start + BATCH), shelf, at_birth())

    strip = np.isin(columns.swimmer, [i for i, s in shelf.swimmers.items() if s.texts["section"] == "strip"])
    glycerol = columns.fluid == next(i for i, f in shelf.fluids.items() if f.code == "gly")
    typed = [columns.values[k] for k in ("f", "theta0", "U", "A_tip", "T", "B", "h_wall")]
    # the swimmers' columns as a frame of runs has them, gathered before the clock starts
    typed += [np.full(RUNS, v) for v in (0.020, 0.025, 1e-3, 2e-3, 2e-4, 2e-3, 1e-4, 1.5e6)]
    oil = (4.8 * np.exp(-1620 / 298.15), 1620.0)
    hand = timed(lambda: numbers_by_hand(typed, strip, glycerol, oil), 5)
    mine = timed(ours, 3)
    noted("derive with uncertainty : numpy by hand, values only", mine, hand, 20)
    rows = 200
    pint_row = timed(lambda: numbers_with_pint(rows), 3) / rows
    noted("derive one run : pint, one run", mine / RUNS, pint_row, 1 / 200)
    # the hand-written formulas are the same ones: their Sp and ours agree where the fluid does
    block = columns.slice(0, 1000)
    Sp = derive(block, shelf, at_birth()).of("Sp")[:, 0]
    own = numbers_by_hand([v[:1000] for v in typed], strip[:1000], glycerol[:1000], oil)["Sp"]
    assert np.allclose(Sp[glycerol[:1000]], own[glycerol[:1000]], rtol=1e-6)


def test_regime_query(big):
    question = Question(regimes=("nearly creeping", "working tail"))
    keys = ("f", "U", "T", "mu", "Sp", "Re_omega", "St", "stride")

    def ours():
        with opening.reading(big.engine) as connection:
            frame(connection, question, keys=keys, newest=200)
            regime_counts(connection, question)

    raw = sqlite3.connect(big.engine.url.database)
    columns = ", ".join(
        f"v.{p}{k}{'_cap' if len(k) == 1 and k.isupper() else ''}" for k in keys for p in ("", "u_own_", "u_shared_")
    )

    def by_hand():
        raw.execute(
            f"SELECT r.code, v.at, r.by, s.code, f.code, m.code, g.code, r.drive, r.series, r.video, v.state, r.why, "
            f"r.note, {columns} FROM resolved v JOIN run r ON r.id = v.run_id JOIN swimmer s ON s.id = v.swimmer_id "
            "JOIN fluid f ON f.id = v.fluid_id LEFT JOIN material m ON m.id = v.material_id "
            "LEFT JOIN rig g ON g.id = r.rig_id WHERE v.state = 'kept' AND v.Re_omega BETWEEN 0.1 AND 1 "
            "AND v.Sp BETWEEN 1 AND 4 ORDER BY v.at DESC, v.run_id DESC LIMIT 200"
        ).fetchall()
        raw.execute(
            "SELECT sum(Re_omega < 0.1), sum(Re_omega >= 0.1 AND Re_omega <= 1), sum(Re_omega > 1 AND Re_omega <= 1000), "
            "sum(Re_omega > 1000), sum(Sp < 1), sum(Sp >= 1 AND Sp <= 4), sum(Sp > 4), sum(St >= 0.2 AND St <= 0.4) "
            "FROM resolved WHERE state = 'kept'"
        ).fetchall()

    ours(), by_hand()
    noted("regime query, newest 200 and counts : SQL by hand", timed(ours), timed(by_hand), 1.5)


def test_plot_query(big):
    def ours():
        with opening.reading(big.engine) as connection:
            plotting.plot_columns(connection, Question(), ("Sp", "stride"), "swimmer")

    raw = sqlite3.connect(big.engine.url.database)

    def by_hand():
        raw.execute("SELECT Sp, stride, swimmer_id FROM resolved WHERE state = 'kept'").fetchall()

    ours(), by_hand()
    noted("Sp, stride and swimmer of every run : SQL by hand", timed(ours, 3), timed(by_hand, 3), 1.5)


def test_log_one_run(big, tmp_path):
    small = big_book(tmp_path / "small.db", 100)
    cells = dict(swimmer="s01", fluid="gly", rig="pair", f="0.50 Hz", theta0="12 deg", T="22.0 degC",
                 U="0.10(1) mm/s", by="knot", confirm=True)  # fmt: skip
    small.record(**cells), big.record(**cells)
    few = timed(lambda: small.record(**cells), 25)
    many = timed(lambda: big.record(**cells), 25)
    few = min(few, timed(lambda: small.record(**cells), 25))
    many = min(many, timed(lambda: big.record(**cells), 25))
    noted("log one run in the big book : in a book of 100 runs", many, few, 1.3)


def test_load_a_sheet(tmp_path):
    text = run_sheet(SHEET_ROWS)
    (tmp_path / "runs.csv").write_text(text, encoding="utf-8")
    book = Book.new(tmp_path / "load.db")
    stock(book)
    ours = timed(lambda: book.load_tables(sheets.read_tables(tmp_path / "runs.csv"), "runs.csv", by="knot"), 1)
    theirs = timed(lambda: _fresh_text(tmp_path, text), 3)
    assert book.frame(Question(), keys=("Sp",), texts=("code",)).shape[0] == SHEET_ROWS
    noted(f"load a sheet of {SHEET_ROWS} runs : csv and sqlite3, text only", ours, theirs, 15)


def _fresh_text(folder, text) -> None:
    path = folder / "text.db"
    path.unlink(missing_ok=True)
    sheet_as_text(path, text)
