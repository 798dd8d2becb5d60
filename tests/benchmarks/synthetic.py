"""Invented shelves and runs in bulk, for measuring only: values are right in size, and mean nothing."""

import json
from pathlib import Path

import numpy as np

from labbook import Book
from labbook.book import opening
from labbook.book.arrivals import RUN_COLUMNS
from labbook.book.bulk import write_many
from labbook.book.derive import BATCH, derive
from labbook.book.queries import shelf_table
from labbook.book.run_facts import RunFacts
from labbook.book.run_rows import stored_rows, write_stored
from labbook.book.shelf import read_shelf
from labbook.book.tables import run
from labbook.registry.group import at_birth
from labbook.registry.quantities import RUN_KEYS

SPANS = {"f": (0.1, 5.0), "theta0": (0.05, 0.3), "U": (1e-5, 1e-3), "A_tip": (1e-3, 5e-3), "T": (291.0, 298.0),
         "B": (1e-3, 5e-3), "h_wall": (0.01, 0.05)}  # fmt: skip
UNITS = {"f": "Hz", "theta0": "rad", "U": "m/s", "A_tip": "m", "T": "K", "B": "T", "h_wall": "m"}
SWIMMERS = 40
DAY_0 = 739_600


def stock(book: Book) -> None:
    """Two fluids, a material, forty swimmers (rods and strips) and a rig."""
    by = {"by": "bench"}
    book.stock("fluid", code="gly", kind="glycerol-water", glycerol="85.0(2) wt%", **by)
    book.stock("fluid", code="sil", kind="silicone-oil", grade="5000 cSt", **by)
    for T, mu in ((15, 5.6), (25, 4.8), (41, 3.6)):
        book.stock("reading", of="sil", key="mu", value=f"{mu} Pa.s +- 1 %", T=f"{T}.0 degC", on="2026-03-01", **by)
    book.stock("material", code="rubber", rho_s="1.03 g/cm3", **by)
    book.stock("reading", of="rubber", key="E", value="1.50(3) MPa", on="2026-03-01", **by)
    book.stock("rig", code="pair", current_to_B="0.90(1) mT/A", u_f="0.1 %", **by)
    for i in range(SWIMMERS):
        cut = dict(section="strip", w="2.00(2) mm", t="0.20(1) mm") if i % 3 == 0 else dict(section="rod", d="1.00(2) mm")
        book.stock("swimmer", code=f"s{i:02d}", form="flexible tail", material="rubber", L_body="25.0(1) mm",
                   L_tail="20.0(1) mm", b="2.0(1) mm", m_mag="0.10(1) mA.m2", **cut, **by)  # fmt: skip


def facts(n: int, swimmers, fluids, rig: int, seed: int = 1) -> RunFacts:
    """n runs as columns."""
    rng = np.random.default_rng(seed)
    keys = (*RUN_KEYS, "T_end")
    values = {k: rng.uniform(*SPANS[k], n) if k in SPANS else np.full(n, np.nan) for k in keys}
    u = {k: np.abs(values[k]) * 0.02 if k in SPANS else np.zeros(n) for k in keys}
    u["T"] = np.full(n, 0.1)
    digits = {k: np.zeros(n, bool) for k in keys}
    return RunFacts(
        values, u, digits, rng.choice(swimmers, n), rng.choice(fluids, n), np.full(n, rig),
        np.sort(rng.integers(DAY_0, DAY_0 + 300, n)), np.full(n, "free_head_angle", dtype=object),
    )  # fmt: skip


def ids(book: Book) -> tuple[np.ndarray, np.ndarray, int]:
    """Ids of the swimmers, the fluids and the rig."""
    return (
        *(book.ask(shelf_table, kind)["id"].to_numpy(np.int64) for kind in ("swimmer", "fluid")),
        int(book.ask(shelf_table, "rig")["id"].iloc[0]),
    )  # fmt: skip


def big_book(path: Path, n: int) -> Book:
    """A book with n runs, written through the book's own bulk functions."""
    book = Book.new(path)
    stock(book)
    swimmers, fluids, rig = ids(book)
    columns = facts(n, swimmers, fluids, rig)
    with opening.writing(book.engine) as connection:
        shelf = read_shelf(connection)
        for start in range(0, n, BATCH):
            part = columns.slice(start, start + BATCH)
            rows = [_facts_row(part, i, start + i + 1) for i in range(len(part))]
            write_many(connection, run, RUN_COLUMNS, [_run_row(r) for r in rows])
            write_stored(connection, *stored_rows(rows, derive(part, shelf, at_birth())))
    return book


def _facts_row(part: RunFacts, i: int, run_id: int) -> tuple:
    typed = {k: [f"{part.values[k][i]:.4g}", UNITS[k], float(part.values[k][i]), float(part.u[k][i]), "stated"]
             for k in SPANS}  # fmt: skip
    day = np.datetime64("1970-01-01") + (int(part.days[i]) - 719_163)
    at = f"{day}T{8 + run_id % 10:02d}:{run_id % 60:02d}:00Z"
    return (run_id, f"R-{run_id:04d}", int(part.swimmer[i]), int(part.fluid[i]), int(part.rig[i]), at,
            part.drive[i], typed, "kept", ("wren", "knot", "pike")[run_id % 3], f"sweep {run_id // 10}", None, None,
            None)  # fmt: skip


def _run_row(row: tuple) -> tuple:
    run_id, code, swimmer, fluid, rig, at, drive, typed, state, by, series, *_ = row
    return (run_id, code, run_id, swimmer, fluid, rig, at, by, drive, series, None, None, state, None, json.dumps(typed), None, at, None, None)  # fmt: skip


def run_sheet(n: int) -> str:
    """A run sheet of n rows as people type them."""
    rng = np.random.default_rng(2)
    lines = ["swimmer,fluid,rig,at,by,f [Hz],theta0 [deg],B [mT],T [degC],U [mm/s],A_tip [mm],h_wall [mm],note"]
    for i in range(n):
        f, angle, B, T = rng.uniform(0.1, 5), rng.uniform(5, 17), rng.uniform(1, 5), rng.uniform(18, 25)
        U, tip = rng.uniform(0.01, 1), rng.uniform(1, 5)
        lines.append(
            f"s{rng.integers(SWIMMERS):02d},{('gly', 'sil')[i % 2]},pair,2026-{1 + i % 9:02d}-{1 + i % 28:02d}T"
            f"{8 + i % 10:02d}:{i % 60:02d},knot,{f:.3f},{angle:.1f},{B:.2f},{T:.1f},{U:.4f}({rng.integers(2, 9)}),"
            f"{tip:.2f},30,row {i}"
        )
    return "\n".join(lines) + "\n"
