"""Two hundred runs in one fluid: what repeated worlds do to their mean, drawn by hand, and what the book stores."""

import math

import numpy as np
import pytest

from labbook import Book

RUNS = 200
WORLDS = 20_000
# a standard deviation over the worlds has a relative standard error of 1/sqrt(2 n) = 0.5 %: five of them
FIVE = 5 / math.sqrt(2 * WORLDS)
# Re_omega goes as 1/mu, and 1/x with u(x)/x = s has s (1 + 4 s^2): s = 2 % adds 0.16 %. Of f it is linear
CURVATURE = 0.002

L_TAIL, RHO = 0.030, 1380.0
T_READ, MU_READ, U_MU_READ = (18.0, 26.0), (6.0, 3.0), (0.15, 0.06)  # degC, Pa.s: 2.5 % and 2 %
T_RUN, U_T = 22.0, 0.1
FREQUENCIES = [round(0.4 + 0.01 * i, 2) for i in range(RUNS)]
U_F = 0.02  # Hz

SHEETS = {
    "fluids": "code,kind,rho [kg/m3],made\nsyrup,measured,1380(0),2026-01-05\n",
    "materials": "code,rho_s [g/cm3],made\nsil,1.07(0),2026-01-05\n",
    "swimmers": "code,form,material,L_body [mm],L_tail [mm],section,d [mm],b [mm]\n"
                "reed,flexible tail,sil,34.0(0),30.0(0),rod,1.00(0),2.00(0)\n",
    "readings": "of,key,value,T,on\n"
                "syrup,mu,6.00(15) Pa.s,18.0(0) degC,2026-03-01\n"
                "syrup,mu,3.00(6) Pa.s,26.0(0) degC,2026-03-01\n"
                "sil,E,1.50(1) MPa,,2026-02-20\n",
    "runs": "swimmer,fluid,at,by,f,T\n" + "".join(
        f"reed,syrup,2026-03-02T10:{i // 60:02}:{i % 60:02},wren,{f:.2f}(2) Hz,22.0(1) degC\n"
        for i, f in enumerate(FREQUENCIES)
    ),
}  # fmt: skip


@pytest.fixture(scope="module")
def stored(tmp_path_factory):
    """(values, u_own, u_shared) of Re_omega of the runs, as the book stores them."""
    folder = tmp_path_factory.mktemp("shared")
    for name, text in SHEETS.items():
        (folder / f"{name}.csv").write_text(text, encoding="utf-8")
    with Book.new(folder / "shared.db") as book:
        book.load(folder, by="wren", confirm=True)
        frame = book.runs()
    frame = frame.sort_values("f")
    assert len(frame) == RUNS
    return tuple(frame[k].to_numpy() for k in ("Re_omega", "u_own_Re_omega", "u_shared_Re_omega"))


def re_omega(f, T, mu_read):
    """rho omega L^2/mu by hand: mu on the Andrade line ln mu = p + q/T through the two readings."""
    at = np.array(T_READ) + 273.15
    ln_mu = np.log(mu_read)
    q = (ln_mu[..., 0] - ln_mu[..., 1]) / (1 / at[0] - 1 / at[1])
    mu = np.exp(ln_mu[..., 1] + q * (1 / (np.asarray(T) + 273.15) - 1 / at[1]))
    return RHO * 2 * math.pi * np.asarray(f) * L_TAIL**2 / mu


@pytest.fixture(scope="module")
def worlds():
    """(own errors alone, shared ones alone, both): Re_omega, a row a world, a column a run."""
    chance = np.random.default_rng(11)
    f = FREQUENCIES + U_F * chance.standard_normal((WORLDS, RUNS))
    T = T_RUN + U_T * chance.standard_normal((WORLDS, RUNS))
    read = np.array(MU_READ) + np.array(U_MU_READ) * chance.standard_normal((WORLDS, 1, 2))  # one pair a world
    exact = np.array(MU_READ)
    return re_omega(f, T, exact), re_omega(FREQUENCIES, T_RUN, read), re_omega(f, T, read)


def scatter(values):
    return values.std(axis=0, ddof=1)


def test_the_book_derives_the_same_values(stored):
    assert stored[0] == pytest.approx(re_omega(FREQUENCIES, T_RUN, np.array(MU_READ)), rel=1e-9)


def test_each_run_scatters_by_its_own_and_its_shared_part(stored, worlds):
    _, u_own, u_shared = stored
    own, shared, both = worlds
    assert scatter(own) == pytest.approx(u_own, rel=FIVE + CURVATURE)
    assert scatter(shared) == pytest.approx(u_shared, rel=FIVE + CURVATURE)
    assert scatter(both) == pytest.approx(np.hypot(u_own, u_shared), rel=FIVE + CURVATURE)
    assert (u_own / u_shared).min() > 0.3 and (u_shared / u_own).min() > 0.3  # both parts count here


@pytest.mark.parametrize("n", [1, 10, 50, 200])
def test_the_shared_part_stays_in_a_mean_and_the_own_part_shrinks(stored, worlds, n):
    _, u_own, u_shared = stored
    own, shared, both = worlds
    # one cause: signed parts add before they are squared, so a mean keeps the mean part; own ones add in squares
    kept = u_shared[:n].mean()
    shrunk = math.sqrt((u_own[:n] ** 2).mean() / n)
    assert scatter(shared[:, :n].mean(axis=1)) == pytest.approx(kept, rel=FIVE + CURVATURE)
    assert scatter(own[:, :n].mean(axis=1)) == pytest.approx(shrunk, rel=FIVE + CURVATURE)
    assert scatter(both[:, :n].mean(axis=1)) == pytest.approx(math.hypot(kept, shrunk), rel=FIVE + CURVATURE)


def test_a_mean_that_forgot_the_common_cause_would_be_far_too_sure(stored, worlds):
    _, u_own, u_shared = stored
    as_if_independent = math.sqrt((u_own**2 + u_shared**2).mean() / RUNS)
    # the shared part alone is 200^(1/2) = 14 times that of 200 independent runs
    assert scatter(worlds[2].mean(axis=1)) > 5 * as_if_independent
