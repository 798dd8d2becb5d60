"""From facts to stored numbers: one run of each section against a hand computation with the `uncertainties` package.

The hand computation writes every formula of physics.md again, on ufloats, so that values and both parts of the
uncertainty come from another implementation of first-order propagation (JCGM 100:2008).
"""

import json
import math
import sqlite3
from contextlib import closing
from math import pi

import numpy as np
import pytest
from uncertainties import correlated_values, ufloat
from uncertainties.umath import exp, log, sin, sqrt

K = 273.15
OWN = {"f", "T", "U", "A_tip", "theta0", "B", "I_coil"}


def part(value, own: bool) -> float:
    return math.sqrt(sum(c**2 for v, c in value.error_components().items() if (v.tag in OWN) is own))


def var(value, u, tag):
    return ufloat(value, u, tag)


def digits(last: float) -> float:
    """Half the last written digit as a rectangular distribution."""
    return last / 2 / math.sqrt(3)


def syrup(T):
    """Andrade through the three readings of 2026-03-01, weighted by their u and u(T), and stated rho and lam."""
    at = np.array([18.0, 22.0, 26.0]) + K
    mu, u = np.array([5.20, 4.10, 3.25]), np.array([0.05, 0.04, 0.03])
    B0 = np.polyfit(1 / at, np.log(mu), 1)[0]
    sigma = np.hypot(u / mu, B0 / at**2 * 0.1)
    design = np.column_stack([np.ones(3), 1 / at]) / sigma[:, None]
    covariance = np.linalg.inv(design.T @ design)
    ln_A, B = covariance @ design.T @ (np.log(mu) / sigma)
    ln_A, B = correlated_values([ln_A, B], covariance)
    return exp(ln_A + B / T), var(1380, 2, "rho"), var(0.50, 0.02, "lam")


def gly85(T):
    """Cheng 2008 with 2 %, Volk & Kaehler 2018 with 0.1 %, at 85.0(3) wt%."""
    w, t = var(0.85, 0.003, "w"), T - K
    mu_w = 1.790 * exp((-1230 - t) * t / (36100 + 360 * t))
    mu_g = 12100 * exp((-1233 + t) * t / (9900 + 70 * t))
    a = 0.705 - 0.0017 * t
    b = (4.9 + 0.036 * t) * a**2.5
    alpha = 1 - w + a * b * w * (1 - w) / (a * w + b * (1 - w))
    mu = mu_w**alpha * mu_g ** (1 - alpha) / 1000 * var(1, 0.02, "mu_model")
    rho_w, rho_g = 1000 * (1 - ((t - 3.98) / 615) ** 1.71), 1273 - 0.612 * t
    kappa = 1 + (1.78e-6 * t**2 - 1.82e-4 * t + 1.41e-2) * sin(pi * w**1.31) ** 0.81
    rho = kappa * (rho_w + (rho_g - rho_w) / (1 + rho_g / rho_w * (1 / w - 1)))
    return mu, rho * var(1, 0.001, "rho_model"), None


def oil(T):
    """A nominal 5000 cSt, 5 %/sqrt 3, along the standard curve; density 0.5 %."""
    nu = var(5e-3, 5e-3 * 0.05 / math.sqrt(3), "grade") * 10 ** (763.1 / (T - K + 273) - 2.559)
    rho = 970 * (1 - 0.95e-3 * (T - K - 25)) * var(1, 0.005, "rho_model")
    return nu * rho, rho, None


def rod():
    d = var(1.00e-3, 1e-5, "d")
    return pi * d**4 / 64, d / 2, 0


def strip():
    w, t = var(2.00e-3, 2e-5, "w"), var(0.200e-3, 3e-6, "t")
    return w * t**3 / 12, (w + t) / 4, t / (w + t) - 0.5


def tube():
    D, d_in = var(1.00e-3, 1e-5, "D"), var(0.60e-3, 1e-5, "d_in")
    return pi * (D**4 - d_in**4) / 64, D / 2, 0


def numbers(*, f, T, U, fluid, section, E, L_tail, L_body, theta0, A_tip=None, B=None, m_mag=None):
    """Every number of a driven tail, as physics.md writes it."""
    mu, rho, lam = fluid(T)
    I_area, a, flat = section()
    omega, EI, p = 2 * pi * f, E * I_area, L_tail / (2 * a)
    zeta_t = 2 * pi * mu / (log(p) - 0.207 + 0.980 / p - 0.133 / p**2)
    zeta_n = 4 * pi * mu / (log(p) + 0.839 + 0.185 / p + 0.233 / p**2 + flat)
    found = {
        "mu": mu, "rho": rho, "nu": mu / rho, "omega": omega, "I_area": I_area, "EI": EI, "a": a, "zeta_n": zeta_n,
        "zeta_t": zeta_t, "Re": rho * U * L_body / mu, "Re_omega": rho * omega * L_tail**2 / mu,
        "Wo": L_tail * sqrt(omega * rho / mu), "Sp": L_tail * (zeta_n * omega / EI) ** 0.25,
        "stride": U / (f * L_body), "U_scaled": U / (omega * L_tail * theta0**2), "zeta_ratio": zeta_n / zeta_t,
        "slenderness": p,
    }  # fmt: skip
    if A_tip is not None:
        found |= {"St": f * A_tip / U, "Sw": omega * A_tip * L_body * rho / mu}
    if lam is not None:
        found["De"] = lam * omega
    if B is not None and m_mag is not None:
        found["Mn"] = m_mag * B * L_tail / EI
    return found


SIL_1, SIL_2 = var(1.50e6, 0.03e6, "E"), var(0.80e6, 0.02e6, "E")
REED = dict(section=rod, E=SIL_1, L_tail=var(0.030, 1e-4, "L_tail"), L_body=var(0.034, 2e-4, "L_body"),
            m_mag=var(4.2e-3, 1e-4, "m_mag"))  # fmt: skip

CASES = {
    "R-0001": dict(  # f "0.50" from digits, but the rig states 0.1 %
        f=var(0.50, 0.0005, "f"), T=var(22 + K, 0.1, "T"), U=var(5.1e-5, 3e-6, "U"), A_tip=var(2e-3, 1e-4, "A_tip"),
        theta0=var(0.30, 0.01, "theta0"), B=var(2e-3, 3e-5, "B"), fluid=syrup, **REED),
    "R-0002": dict(  # B from the coil current: I 2.0(1) A, constant 1.12(1) mT/A
        f=var(1.00, 0.001, "f"), T=var(22 + K, 0.1, "T"), U=var(6.2e-5, 3e-6, "U"),
        A_tip=var(1.5e-3, 1e-4, "A_tip"), theta0=var(0.30, 0.01, "theta0"),
        B=var(1.12e-3, 1e-5, "current_to_B") * var(2.0, 0.1, "I_coil"), fluid=syrup, **REED),
    "R-0004": dict(  # a strip, no rig: f "2.0" from digits
        f=var(2.0, digits(0.1), "f"), T=var(23 + K, 0.1, "T"), U=var(4e-4, 2e-5, "U"),
        A_tip=var(3e-3, 1e-4, "A_tip"), theta0=var(0.30, 0.01, "theta0"), fluid=gly85, section=strip, E=SIL_1,
        L_tail=var(0.020, 1e-4, "L_tail"), L_body=var(0.024, 2e-4, "L_body")),
    "R-0005": dict(  # a tube
        f=var(0.50, digits(0.01), "f"), T=var(25 + K, 0.1, "T"), U=var(4e-5, 2e-6, "U"),
        theta0=var(0.30, 0.01, "theta0"), fluid=oil, section=tube, E=SIL_2, L_tail=var(0.030, 1e-4, "L_tail"),
        L_body=var(0.034, 2e-4, "L_body")),
}  # fmt: skip


@pytest.mark.parametrize("code", CASES)
def test_values_and_both_parts_of_u_by_hand(filled, code):
    sheet, hand = filled.sheet(code), numbers(**CASES[code])
    for key, expected in hand.items():
        assert sheet.values[key] == pytest.approx(expected.n, rel=1e-9), key
        # both differentiate analytically; only the glycerol slope is a secant over +- u(w) = 0.3 wt%, whose third
        # derivative adds 4e-4 of the slope
        tolerance = 1e-3 if code == "R-0004" else 1e-7
        scale = 1e-12 * abs(expected.n)
        assert sheet.u_own[key] == pytest.approx(part(expected, True), rel=tolerance, abs=scale), key
        assert sheet.u_shared[key] == pytest.approx(part(expected, False), rel=tolerance, abs=scale), key
        assert sheet.u[key] == pytest.approx(expected.s, rel=tolerance, abs=scale), key


def test_the_hand_computation_would_see_a_broadside_strip(filled):
    """Without flatness the strip's zeta_n differs by far more than the tolerance above."""
    round_ = numbers(**{**CASES["R-0004"], "section": lambda: (*strip()[:2], 0)})
    assert filled.sheet("R-0004").values["zeta_n"] / round_["zeta_n"].n > 1.05


def test_an_undulating_bodys_tail_is_its_length(filled):
    sheet = filled.sheet("R-0006")
    L = var(0.300, 0.001, "L_body")
    T = var(20 + K, 0.1, "T")
    assert sheet.values["L_tail"] == sheet.values["L_body"] == pytest.approx(0.300)
    assert sheet.u_shared["L_tail"] == pytest.approx(0.001)
    # water at 20 degC: 998.2072 kg/m3, 1001.60 uPa.s (physics 1, three libraries); slopes are not in that table
    nu, f, A, U = 1001.60e-6 / 998.2072, var(2.50, 0.01, "f"), var(0.040, 1e-3, "A_tip"), var(0.30, 0.01, "U")
    assert sheet.values["Re_omega"] == pytest.approx((2 * pi * f * L**2 / nu).n, rel=1e-4)
    assert sheet.values["Sw"] == pytest.approx((2 * pi * f * A * L / nu).n, rel=1e-4)
    St = f * A / U
    assert sheet.values["St"] == pytest.approx(St.n) and sheet.u["St"] == pytest.approx(St.s)
    assert T.s and sheet.values["slenderness"] is None
    assert "section of eel-1 is not complete" in sheet.why_absent["slenderness"]


def test_a_length_that_enters_squared_counts_twice(filled):
    """Re_omega goes as L^2 and Wo as L: one length, so its parts add before they are squared."""
    sheet = filled.sheet("R-0006")
    wo = sheet.u_shared["Wo"] / sheet.values["Wo"]
    re = sheet.u_shared["Re_omega"] / sheet.values["Re_omega"]
    assert re == pytest.approx(2 * wo, rel=1e-9)


def test_f_ratio_belongs_to_rotating_drives(filled):
    sheet = filled.sheet("R-0008")
    mu, _, _ = oil(var(25 + K, 0.1, "T"))
    R, pitch, L, a = 2e-3, 10e-3, 24e-3, 0.4e-3
    th = math.atan(2 * pi * R / pitch)
    Ct, Cn = 2 * pi * mu.n / (math.log(2 * pitch / a) - 0.5), 4 * pi * mu.n / (math.log(2 * pitch / a) + 0.5)
    A22 = (Cn * math.cos(th) ** 2 + Ct * math.sin(th) ** 2) * R**2 * L / math.cos(th)
    assert sheet.values["A22"] == pytest.approx(A22, rel=1e-9)
    step_out = 4.2e-3 * 2e-3 / (8 * pi * mu.n * 2e-3**3 + A22)
    assert sheet.values["f_ratio"] == pytest.approx(2 * pi * 1.0 / step_out, rel=1e-9)
    still = filled.sheet("R-0001")
    assert still.values["f_ratio"] is None
    assert still.why_absent["f_ratio"] == "only for a rotating drive, and this run's is free_head_angle"


@pytest.mark.parametrize(("U", "defined"), [
    ("0.000(3) mm/s", False), ("0.006(3) mm/s", False), ("-0.006(3) mm/s", False), ("0.00601(300) mm/s", True),
    ("-0.0061(30) mm/s", True), ("0 mm/s", False),
])  # fmt: skip
def test_st_is_undefined_where_u_may_be_zero(stocked, U, defined):
    """|U| <= 2 u_U; '0 mm/s' has u = 0.29 mm/s from its digits."""
    code = stocked.record(swimmer="reed-1", fluid="syrup", f="0.50 Hz", T="22.0 degC", U=U, A_tip="2.0(1) mm")
    sheet = stocked.sheet(code)
    assert (sheet.values["St"] is not None) is defined
    assert sheet.why_absent.get("St") == (None if defined else "not defined (U consistent with 0)")
    assert sheet.values["Re"] is not None and sheet.values["stride"] is not None


def test_the_sign_of_u_is_kept(stocked):
    cells = dict(
        swimmer="reed-1", fluid="syrup", f="0.50 Hz", T="22.0 degC", theta0="0.3 rad", A_tip="2.0(1) mm"
    )
    ahead = stocked.sheet(stocked.record(**cells, U="0.051(3) mm/s"))
    back = stocked.sheet(stocked.record(**cells, U="-0.051(3) mm/s"))
    for key in ("U", "Re", "stride", "U_scaled", "St"):
        assert back.values[key] == -ahead.values[key] < 0
        assert back.u[key] == ahead.u[key] > 0
    assert back.values["Sp"] == ahead.values["Sp"]


def test_runs_that_share_a_batch_share_its_part(filled):
    runs = filled.runs(kept=False).set_index("code")
    one, two, other = runs.loc["R-0001"], runs.loc["R-0002"], runs.loc["R-0003"]  # 22.0, 22.0, 22.5 degC
    for key in ("mu", "E", "EI", "zeta_n", "rho", "lam"):
        assert one[f"u_shared_{key}"] == two[f"u_shared_{key}"]
    # f differs, so Sp does; its shared part is the same fraction, and the own part is not
    assert one["u_shared_Sp"] / one["Sp"] == pytest.approx(two["u_shared_Sp"] / two["Sp"], rel=1e-12)
    assert one["u_own_Sp"] > 0
    assert one["u_shared_mu"] / one["mu"] != pytest.approx(other["u_shared_mu"] / other["mu"], rel=1e-4)
    # what both inherit whole cancels in a ratio: nothing shared is left in zeta_ratio but the tail's own shape
    assert one["u_own_zeta_ratio"] == pytest.approx(0, abs=1e-12)


@pytest.mark.parametrize(("cells", "u_f"), [
    (dict(f="0.50 Hz", rig="coil-1"), 0.0005),  # the rig's 0.1 %
    (dict(f="0.50(2) Hz", rig="coil-1"), 0.02),  # typed wins
    (dict(f="0.50 Hz", rig="cam-1"), digits(0.01)),  # a rig that states nothing
    (dict(f="0.50 Hz"), digits(0.01)),
    (dict(f="30 rpm"), digits(1) / 60),
])  # fmt: skip
def test_where_no_uncertainty_was_typed(stocked, cells, u_f):
    sheet = stocked.sheet(stocked.record(swimmer="reed-1", fluid="syrup", **cells))
    assert sheet.values["f"] == pytest.approx(0.5)
    assert sheet.u_own["f"] == pytest.approx(u_f, rel=1e-12)
    assert ("from digits" in sheet.marks.get("f", [])) is (u_f in (digits(0.01), digits(1) / 60))


def test_a_rigs_stated_uncertainties_of_temperature_and_field(stocked):
    sheet = stocked.sheet(
        stocked.record(
            swimmer="reed-1",
            fluid="syrup",
            rig="coil-1",
            f="1 Hz",
            T="22.0 degC",
            T_end="22.4 degC",
            B="2.0 mT",
        )
    )
    assert sheet.u_own["T"] == pytest.approx(math.sqrt(0.15**2 + 0.2**2 / 3), rel=1e-9)
    assert sheet.u_own["B"] == pytest.approx(3e-5, rel=1e-12)
    assert not {"T", "B"} & set(sheet.marks)


def test_a_typed_field_wins_over_the_coil_current(stocked):
    cells = dict(swimmer="reed-1", fluid="syrup", rig="coil-1", f="1 Hz", I_coil="2.0(1) A")
    sheet = stocked.sheet(stocked.record(**cells, B="3.00(3) mT"))
    assert (sheet.values["B"], sheet.u_shared["B"]) == (pytest.approx(3e-3), 0)
    assert stocked.sheet(stocked.record(**cells)).values["B"] == pytest.approx(2.24e-3)
    del cells["rig"]
    assert stocked.sheet(stocked.record(**cells)).values["B"] is None


# ---- derived again


def rows(book):
    with closing(sqlite3.connect(book.target)) as raw:
        raw.row_factory = sqlite3.Row
        found = raw.execute("select run.code as code, resolved.* from resolved join run on run.id=run_id")
        return {r["code"]: tuple(r) for r in found}


ALL_OF_SIL_1 = {"R-0001", "R-0002", "R-0003", "R-0004", "R-0009", "R-0010"}
IN_SYRUP = {"R-0001", "R-0002", "R-0003", "R-0010"}

ACTS = {
    "a reading nearest to one run": (
        lambda b: b.stock("reading", of="syrup", key="mu", value="4.3(1) Pa.s", T="22 degC", on="2026-03-05"),
        {"R-0010"}, "R-0010"),
    "a modulus nearest to all": (
        lambda b: b.stock("reading", of="sil-1", key="E", value="1.6(1) MPa", on="2026-03-06"),
        ALL_OF_SIL_1, "R-0001..R-0004, R-0009..R-0010"),
    "a reading void": (lambda b: b.void("M-0001", why="bubble"), IN_SYRUP, "R-0001..R-0003, R-0010"),
    "fluid": (lambda b: b.stock("fluid", code="syrup", rho="1390(2) kg/m3", why="weighed again"),
              IN_SYRUP, "R-0001..R-0003, R-0010"),
    "material": (lambda b: b.stock("material", code="sil-2", rho_s="1.06(1) g/cm3", why="weighed"), {"R-0005"}, "R-0005"),
    "swimmer": (lambda b: b.stock("swimmer", code="eel-1", L_body="305(1) mm", why="measured again"),
                {"R-0006", "R-0007"}, "R-0006..R-0007"),
    "rig": (lambda b: b.stock("rig", code="coil-1", u_f="0.2 %", why="new generator"),
            {"R-0001", "R-0002", "R-0003", "R-0008", "R-0010"}, "R-0001..R-0003, R-0008, R-0010"),
    "rig constant": (lambda b: b.stock("rig", code="coil-1", current_to_B="1.15(1) mT/A", why="Hall probe"),
                     {"R-0002"}, "R-0002"),
    "a rig that states nothing": (lambda b: b.stock("rig", code="cam-1", scale="21(1) um/px", why="ruler"), set(), None),
    "a note": (lambda b: b.stock("fluid", code="syrup", note="brown", why="looked"), set(), None),
    "a run": (lambda b: b.amend("R-0003", f="2.1 Hz", why="typo"), {"R-0003"}, "R-0003"),
}  # fmt: skip


@pytest.mark.parametrize("act", ACTS)
def test_an_act_derives_exactly_the_runs_it_touches(filled, by_hand, act):
    before = rows(filled)
    do, expected, told = ACTS[act]
    do(filled)
    after = rows(filled)
    assert {code for code in before if before[code] != after[code]} == expected
    (line,) = by_hand(filled, "select id, runs from ledger order by id desc limit 1")
    assert line[1] == told
    touched = by_hand(
        filled, "select code from run join ledger_run on run.id=run_id where ledger_id=?", line[0]
    )
    assert {c for (c,) in touched} == expected
    assert filled.check() == []


def test_a_load_derives_again_what_its_readings_touch(filled, by_hand, tmp_path):
    (tmp_path / "readings.csv").write_text(
        "of,key,value,T,on\nsyrup,mu,4.3(1) Pa.s,22 degC,2026-03-05\nsil-1,E,1.6(1) MPa,,2026-03-06\n"
    )
    before = rows(filled)
    loaded = filled.load(tmp_path / "readings.csv")
    after = rows(filled)
    assert {code for code in before if before[code] != after[code]} == ALL_OF_SIL_1
    assert loaded.derived_again == len(ALL_OF_SIL_1)
    ((runs, cells),) = by_hand(filled, "select runs, after from ledger order by id desc limit 1")
    assert runs == "R-0001..R-0004, R-0009..R-0010"
    assert json.loads(cells)["added"] == {"reading": 2}
    assert filled.check() == []
