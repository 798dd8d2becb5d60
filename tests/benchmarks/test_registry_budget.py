"""The registry's speed budget as ratios inside one run: restating a number, adding one to a full book."""

import sqlite3

import numpy as np
import pytest
from measured import RUNS, noted, timed

from labbook.book.derive import derive
from labbook.book.opening import reading
from labbook.book.registry_rows import registry_of
from labbook.book.run_rows import batches, facts_of, shelf_for
from labbook.registry.restating import restate

OWN = dict(
    key="Mg", name="magnetic to viscous torque", formula="m_mag * B / (8 * pi * mu * b**3 * omega)",
    compares="magnetic to viscous torque on the head", source="own definition",
    # a 1.3 T sphere in 5 mT and 1 Pa.s steps out at 137.206 Hz, whatever its size
    example="m_mag = 5.41667e-4 A.m2, B = 5 mT, mu = 1 Pa.s, b = 0.5 mm, f = 68.603 Hz", answer="2.000",
)  # fmt: skip


@pytest.fixture(scope="module")
def columns():
    """Sp with its uncertainties and what it is made of, for many runs of a few swimmers."""
    rng = np.random.default_rng(5)
    swimmer = rng.integers(1, 41, RUNS)
    L_tail, d = rng.uniform(0.015, 0.03, 41)[swimmer], rng.uniform(5e-4, 2e-3, 41)[swimmer]
    made = dict(L_tail=L_tail, L_body=1.2 * L_tail, d=d, a=d / 2, mu=rng.uniform(0.1, 10.0, RUNS), swimmer=swimmer,
                f=rng.uniform(0.1, 5.0, RUNS))  # fmt: skip
    made |= {f"u_{k}": 0.01 * made[k] for k in ("L_tail", "L_body", "d")}
    p = L_tail / d
    made["zeta_n"] = 4 * np.pi * made["mu"] / (np.log(p) + 0.839 + 0.185 / p + 0.233 / p**2)
    made["EI"] = 1.5e6 * np.pi * d**4 / 64
    made["Sp"] = L_tail * (made["zeta_n"] * 2 * np.pi * made["f"] / made["EI"]) ** 0.25
    return made | {"u_own": 0.01 * made["Sp"], "u_shared": 0.05 * made["Sp"]}


def _fourth_power(c):
    return c["L_tail"] ** 4 * c["zeta_n"] * c["f"] / c["EI"]


def _spheroid(c):
    zeta_n = 4 * np.pi * c["mu"] / (np.log(c["L_tail"] / c["a"]) + 0.5)
    return c["L_tail"] * (zeta_n * 2 * np.pi * c["f"] / c["EI"]) ** 0.25


def _overall(c):
    return c["L_body"] * (c["zeta_n"] * 2 * np.pi * c["f"] / c["EI"]) ** 0.25


@pytest.mark.parametrize(
    ("choices", "bare"),
    [({"rate": "f", "power": 1}, _fourth_power), ({"coefficient": "spheroid_asymptotic"}, _spheroid),
     ({"length": "L_body"}, _overall)],
)  # fmt: skip
def test_restate(columns, choices, bare):
    def ours():
        return restate("Sp", columns["Sp"], columns["u_own"], columns["u_shared"], choices=choices, inputs=columns)

    assert np.allclose(ours().value, bare(columns), rtol=1e-9)
    mine, hand = timed(ours, 5), timed(lambda: bare(columns), 5)
    noted(f"restate Sp with uncertainty to {choices} : bare numpy expression, values only", mine, hand, 5)


def test_add_a_number(big, tmp_path):
    """Define a number on the full book against deriving that number and writing one column by hand."""
    copied = tmp_path / "by-hand.db"
    big.copy(copied)
    mine = timed(lambda: big.define_number(**OWN, by="knot"), 1)
    raw = sqlite3.connect(copied, isolation_level=None)
    raw.execute("PRAGMA synchronous=FULL")
    raw.execute("ALTER TABLE resolved ADD COLUMN Mg FLOAT")

    def by_hand():
        raw.execute("BEGIN IMMEDIATE")
        with reading(big.engine) as connection:
            registry = registry_of(connection)
            for rows in batches(connection):
                value = derive(facts_of(rows), shelf_for(connection, rows), registry, ("Mg",)).of("Mg")[:, 0]
                told = zip(value.tolist(), (r[0] for r in rows), strict=True)
                raw.executemany("UPDATE resolved SET Mg = ? WHERE run_id = ?", told)
        raw.execute("COMMIT")

    hand = timed(by_hand, 1)
    raw.close()
    noted("add a number : derive one number, write one column", mine, hand, 2)
    big.withdraw("number", "Mg", why="measured", by="knot")
