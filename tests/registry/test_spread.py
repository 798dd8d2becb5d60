"""Propagation against the GUM's own examples, the `uncertainties` library and Monte Carlo."""

import math

import numpy as np
import pytest
import uncertainties
from uncertainties import umath

from labbook.physics import fluids, rods, sections
from labbook.registry.catalogue import NUMBERS
from labbook.registry.spread import OWN_SOURCES, Spread


def one(value):
    return np.array([float(value)])


def total(spread, key):
    return np.hypot(spread.own(key), spread.shared(key))


def test_gauge_block_of_the_gum():
    # JCGM 100:2008, H.1: l = l_S + d - l_S (dalpha theta + alpha_S dtheta), 20 degC block of 50 mm.
    # Contributions 25, 9.7, 2.9 and 16.6 nm, combined 32 nm; the inputs behind them from memory
    spread = Spread()
    for key, value, u in (
        ("l_S", 50.000623e-3, 25e-9), ("d", 215e-9, 9.7e-9), ("dalpha", 0.0, 0.58e-6), ("theta", -0.1, 0.41),
        ("alpha_S", 11.5e-6, 1.2e-6), ("dtheta", 0.0, 0.029),
    ):  # fmt: skip
        spread.measured(key, one(value), one(u))
    spread.follow(
        ("l",),
        lambda l_S, d, dalpha, theta, alpha_S, dtheta: l_S + d - l_S * (dalpha * theta + alpha_S * dtheta),
        ("l_S", "d", "dalpha", "theta", "alpha_S", "dtheta"),
    )
    budget = {source: abs(part[0]) * 1e9 for source, part in spread.budget("l").items()}
    # printed to 0.1 nm, so half of that; two inputs meet a zero and bring nothing at first order
    expected = {"l_S": 25.0, "d": 9.7, "dalpha": 2.9, "dtheta": 16.6, "theta": 0.0, "alpha_S": 0.0}
    assert budget == pytest.approx(expected, abs=0.1)
    assert total(spread, "l")[0] == pytest.approx(32e-9, abs=0.5e-9)
    assert spread.values["l"][0] == pytest.approx(50.000838e-3, abs=0.5e-9)  # H.1.7 prints 50.000 838 mm


# JCGM 100:2008, table H.2: five simultaneous observations of V (V), I (mA), phi (rad)
OBSERVED = np.array([
    [5.007, 4.994, 5.005, 4.990, 4.999],
    [19.663, 19.639, 19.640, 19.685, 19.678],
    [1.0456, 1.0438, 1.0468, 1.0428, 1.0433],
]) * [[1.0], [1e-3], [1.0]]  # fmt: skip
VIP = ("V", "I", "phi")


def impedances(V, I, phi):  # noqa: E741 (the GUM's own symbol)
    return V / I * np.cos(phi), V / I * np.sin(phi), V / I


def test_correlated_impedances_of_the_gum():
    # table H.4: R 127.732 (0.071), X 219.847 (0.295), Z 254.260 (0.236) ohm. Half of the last figure for the
    # values; a whole one for u, since the GUM went on from rounded correlations
    mean, covariance = OBSERVED.mean(axis=1), np.cov(OBSERVED) / 5
    factor = np.linalg.cholesky(covariance)
    spread = Spread()
    for name in ("z1", "z2", "z3"):  # three independent sources that the three inputs share
        spread.measured(name, one(0.0), one(1.0))
    spread.follow(
        VIP,
        lambda z1, z2, z3: tuple(
            m + row @ np.array([z1, z2, z3]) for m, row in zip(mean, factor, strict=True)
        ),
        ("z1", "z2", "z3"),
    )
    spread.follow(("R", "X", "Z"), impedances, VIP)
    for key, value, u in (("R", 127.732, 0.071), ("X", 219.847, 0.295), ("Z", 254.260, 0.236)):
        assert spread.values[key][0] == pytest.approx(value, abs=5e-4)
        assert total(spread, key)[0] == pytest.approx(u, abs=1e-3)


def test_dropped_correlations_do_not_match_the_gum():
    # the same inputs taken as independent give 0.195, 0.201, 0.204 (recomputed): far from the right answers
    spread = Spread()
    for key, value, u in zip(
        VIP, OBSERVED.mean(axis=1), OBSERVED.std(axis=1, ddof=1) / math.sqrt(5), strict=True
    ):
        spread.measured(key, one(value), one(u))
    spread.follow(("R", "X", "Z"), impedances, VIP)
    for key, u, right in (("R", 0.195, 0.071), ("X", 0.201, 0.295), ("Z", 0.204, 0.236)):
        assert total(spread, key)[0] == pytest.approx(u, abs=5e-4)
        assert abs(total(spread, key)[0] - right) > 0.03


# A rod-tailed swimmer in glycerol-water: value and standard uncertainty of what is measured
MEASURED = {
    "f": (2.0, 0.01), "T": (296.25, 0.2), "w": (0.85, 0.004), "L_tail": (0.020, 1e-4), "d": (1e-3, 1e-5),
    "E": (1.5e6, 4.5e4),
}  # fmt: skip


def sperm_number(f, T, w, L_tail, d, E, *, log, exp):
    """Sp of a rod written from the sources, without the package.

    mu: Cheng, Ind. Eng. Chem. Res. 47:3285 (2008); zeta_n: Tirado & Garcia de la Torre, J. Chem. Phys.
    71:2581 (1979); I = pi d^4/64 (Roark). Any numbers that log and exp take.
    """
    t = T - 273.15
    mu_w = 1.790e-3 * exp((-1230 - t) * t / (36100 + 360 * t))
    mu_g = 12.100 * exp((-1233 + t) * t / (9900 + 70 * t))
    a = 0.705 - 0.0017 * t
    b = (4.9 + 0.036 * t) * a**2.5
    alpha = 1 - w + a * b * w * (1 - w) / (a * w + b * (1 - w))
    mu = exp(alpha * log(mu_w) + (1 - alpha) * log(mu_g))
    p = L_tail / d
    zeta_n = 4 * math.pi * mu / (log(p) + 0.839 + 0.185 / p + 0.233 / p**2)
    EI = E * math.pi * d**4 / 64
    return L_tail * (zeta_n * 2 * math.pi * f / EI) ** 0.25


@pytest.fixture
def chain():
    """The same chain through the package, every step a `follow`."""
    spread = Spread()
    for key, (value, u) in MEASURED.items():
        spread.measured(key, np.full(3, value), np.full(3, u))
    spread.follow(("omega",), lambda f: 2 * np.pi * f, ("f",))
    spread.follow(("mu",), lambda w, T: fluids.glycerol_water_viscosity(w=w, T=T), ("w", "T"))
    spread.follow(
        ("I_area", "a"), lambda d: (sections.rod_second_moment(d=d), sections.rod_radius(d=d)), ("d",)
    )
    spread.follow(("EI",), lambda E, I_area: E * I_area, ("E", "I_area"))
    spread.follow(
        ("zeta_n", "zeta_t"),
        lambda L_tail, a, mu: rods.resistive_coefficients(model="cylinder_finite", L=L_tail, a=a, mu=mu),
        ("L_tail", "a", "mu"),
    )
    row = NUMBERS["Sp"]
    spread.follow(("Sp",), lambda **inputs: row.parsed.value(inputs), row.inputs)
    return spread


def test_the_chain_of_a_rod_agrees_with_uncertainties_source_by_source(chain):
    inputs = {key: uncertainties.ufloat(value, u) for key, (value, u) in MEASURED.items()}
    reference = sperm_number(**inputs, log=umath.log, exp=umath.exp)
    # both differentiate exactly; 1e-9 leaves room for the ill-conditioned exponentials' rounding
    assert chain.values["Sp"] == pytest.approx(np.full(3, reference.nominal_value), rel=1e-9)
    assert total(chain, "Sp") == pytest.approx(np.full(3, reference.std_dev), rel=1e-9)
    assert set(chain.budget("Sp")) == set(MEASURED)
    for key, variable in inputs.items():
        part = reference.derivatives[variable] * MEASURED[key][1]
        assert chain.budget("Sp")[key] == pytest.approx(np.full(3, part), rel=1e-9), key


def test_the_chain_of_a_rod_agrees_with_monte_carlo(chain):
    draws = 400_000
    chance = np.random.default_rng(20)
    sampled = {key: chance.normal(value, u, draws) for key, (value, u) in MEASURED.items()}
    Sp = sperm_number(**sampled, log=np.log, exp=np.exp)
    # a standard deviation of n draws has a relative standard error of 1/sqrt(2 n) = 0.11 %: five of them,
    # 0.56 %. Curvature adds less than 0.03 % here
    assert total(chain, "Sp")[0] == pytest.approx(Sp.std(), rel=5 / math.sqrt(2 * draws))
    assert chain.values["Sp"][0] == pytest.approx(Sp.mean(), rel=1e-3)  # the mean shifts by curvature, 0.02 %


def test_powers_of_the_sperm_number(chain):
    # exponents of a product: a quarter of each of omega and E (GUM 5.1.6)
    share = {
        key: chain.budget("Sp")[key][0] / chain.values["Sp"][0] / (u / v) for key, (v, u) in MEASURED.items()
    }
    assert share["f"] == pytest.approx(0.25, rel=1e-12)
    assert share["E"] == pytest.approx(-0.25, rel=1e-12)
    # d^4 in the quarter power, less what the drag takes back: 1/(4 den) (1 - 0.185/p - 0.466/p^2), the fit's
    # slope
    den = math.log(20) + 0.839 + 0.185 / 20 + 0.233 / 400
    assert share["d"] == pytest.approx(-1 + (1 - 0.185 / 20 - 2 * 0.233 / 400) / (4 * den), rel=1e-9)
    # physics sheet, section 2: +12.3 % of mu per wt% and -6.24 % per K at 85 wt% and 25 degC; here 23.1 degC,
    # where they differ by a few per cent of themselves
    assert share["w"] == pytest.approx(0.25 * 12.3 * 0.85, rel=0.05)
    assert share["T"] == pytest.approx(-0.25 * 0.0624 * 296.25, rel=0.05)


def test_own_and_shared_parts_add_up_to_the_total(chain):
    assert {"f", "T"} == OWN_SOURCES & set(MEASURED)
    for key in ("mu", "EI", "zeta_n", "Sp"):
        every = np.sqrt(sum(part**2 for part in chain.budget(key).values()))
        assert total(chain, key) == pytest.approx(every, rel=1e-12)
    own = math.hypot(*(chain.budget("Sp")[key][0] for key in ("f", "T")))
    assert chain.own("Sp")[0] == pytest.approx(own, rel=1e-12)
    assert (chain.own("EI") == 0).all()  # nothing of the run alone is in the tail's stiffness
    assert (chain.shared("omega") == 0).all()


def test_a_shared_cause_cancels_in_a_ratio(chain):
    # zeta_n/zeta_t does not know the viscosity, whatever both owe to it
    chain.follow(("zeta_ratio",), lambda zeta_n, zeta_t: zeta_n / zeta_t, ("zeta_n", "zeta_t"))
    budget = chain.budget("zeta_ratio")
    scale = abs(chain.budget("zeta_n")["w"][0] / chain.values["zeta_n"][0])
    assert abs(budget["w"]).max() < 1e-12 * scale * 10
    assert abs(budget["d"]).max() > 0


def test_a_named_source_is_counted_once():
    spread = Spread()
    spread.measured("rho", one(2.0), one(0.1), source="set 7")
    spread.measured("mu", one(4.0), one(0.2), source="set 7")
    spread.follow(("nu",), lambda mu, rho: mu / rho, ("mu", "rho"))
    assert spread.budget("nu")["set 7"] == pytest.approx([0.0], abs=1e-15)  # both 5 % high: the ratio stands


def test_an_output_that_ignores_an_input_owes_it_nothing():
    spread = Spread()
    spread.measured("f", one(2.0), one(0.1))
    spread.measured("d", one(1.0), one(0.1))
    spread.follow(("p", "q"), lambda f, d: (2 * f, 3 * d), ("f", "d"))
    assert set(spread.budget("p")) == {"f"} and set(spread.budget("q")) == {"d"}
    assert spread.own("p")[0] == pytest.approx(0.2) and spread.shared("p")[0] == 0


def test_a_block_of_runs_stays_row_by_row_and_absent_stays_absent():
    spread = Spread()
    spread.measured("f", np.array([1.0, np.nan, 3.0]), np.array([0.1, 0.1, 0.3]))
    spread.follow(("omega",), lambda f: 2 * np.pi * f, ("f",))
    assert spread.own("omega") == pytest.approx(2 * np.pi * np.array([0.1, np.nan, 0.3]), nan_ok=True)
    assert np.isnan(spread.values["omega"]).tolist() == [False, True, False]
