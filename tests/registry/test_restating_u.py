"""Restated uncertainties against the PyPI library `uncertainties`, own and shared part."""

import itertools
import math

import numpy as np
import pytest
from uncertainties import ufloat, umath

from labbook.registry.dialects import CHOICES
from labbook.registry.restating import restate
from labbook.registry.swimmer_share import DIMENSIONS

OWN = ("f", "U", "A_tip", "theta0")  # sources of the run alone

# value and standard uncertainty of every measured input; the modulus at 7 % and the section at 1 to 3 %
MEASURED = {
    "f": (2.0, 0.02), "U": (1.2e-3, 3e-5), "A_tip": (5e-3, 1e-4), "theta0": (0.3, 0.01), "mu": (1.0, 0.03),
    "rho": (970.0, 4.0), "E": (1.5e6, 1e5), "lam": (0.5, 0.02), "m_mag": (5e-4, 1e-5), "B": (5e-3, 1e-5),
    "L_tail": (0.020, 3e-4), "L_body": (0.024, 5e-4),
}  # fmt: skip
SECTIONS = {
    "rod": {"d": (1e-3, 2e-5)},
    "strip": {"w": (2e-3, 3e-5), "t": (2e-4, 4e-6)},
    "tube": {"D": (1.2e-3, 2e-5), "d_in": (6e-4, 1.5e-5)},
    "helix": {"d": (8e-4, 2e-5), "pitch": (1.5e-2, 3e-4), "R_helix": (2.5e-3, 1e-4)},
}


def drag(name, L, a, flatness, wave):
    """zeta_n/mu, written out from the papers that the physics names."""
    log = umath.log
    match name:
        case "mu" | "four_pi_mu" | "eight_pi_mu":
            return {"mu": 1.0, "four_pi_mu": 4 * math.pi, "eight_pi_mu": 8 * math.pi}[name]
        case "log_slender":
            return 4 * math.pi / log(L / a)
        case "spheroid_asymptotic":
            below = log(L / a) + 0.5
        case "cylinder_two_term":
            below = log(2 * L / a) - 0.5
        case "cylinder_finite":
            p = L / (2 * a)
            below = log(p) + 0.839 + 0.185 / p + 0.233 / p**2
        case "gray_hancock_1955":
            below = log(2 * wave[0] / a) - 0.5
        case "lighthill":
            below = log(0.18 * wave[1] / a) + 0.5
    return 4 * math.pi / (below + flatness - 0.5)


def spoken(number, choices, m):
    """A number in a dialect, from independent inputs that carry their uncertainty."""
    length = m[choices["length"]] if "length" in choices else None
    rate = (m["f"] if choices.get("rate") == "f" else 2 * math.pi * m["f"]) if "rate" in choices else None
    amplitude = m["A_tip"] / 2 if choices.get("amplitude") == "half" else m["A_tip"]
    flatness = 0.5
    if "d" in m:
        I_area, a = math.pi * m["d"] ** 4 / 64, m["d"] / 2
    elif "D" in m:
        I_area, a = math.pi * (m["D"] ** 4 - m["d_in"] ** 4) / 64, m["D"] / 2
    else:
        I_area, a, flatness = m["w"] * m["t"] ** 3 / 12, (m["w"] + m["t"]) / 4, m["t"] / (m["w"] + m["t"])
    match number:
        case "Sp":
            wave = None
            if "pitch" in m:
                wave = m["pitch"], umath.sqrt(m["pitch"] ** 2 + (2 * math.pi * m["R_helix"]) ** 2)
            zeta = m["mu"] * drag(choices["coefficient"], m["L_tail"], a, flatness, wave)
            return (length**4 * zeta * rate / (m["E"] * I_area)) ** choices["power"]
        case "Re":
            return m["rho"] * m["U"] * length / m["mu"]
        case "Re_omega":
            return m["rho"] * rate * length**2 / m["mu"]
        case "Wo":
            return length * umath.sqrt(rate * m["rho"] / m["mu"])
        case "St":
            return rate * amplitude / m["U"]
        case "Sw":
            return rate * amplitude * length * m["rho"] / m["mu"]
        case "stride":
            return m["U"] / (rate * length)
        case "U_scaled":
            return m["U"] / (rate * length * m["theta0"] ** 2)
        case "De":
            return m["lam"] * rate
        case "Mn":
            return m["m_mag"] * m["B"] * length / (m["E"] * I_area)
        case "slenderness":
            return length / (a if choices["breadth"] == "radius" else 2 * a)


def split(quantity):
    """(value, own, shared) of a value with its components by source."""
    parts = {v.tag: s for v, s in quantity.error_components().items()}
    own = math.sqrt(sum(s**2 for key, s in parts.items() if key in OWN))
    shared = math.sqrt(sum(s**2 for key, s in parts.items() if key not in OWN))
    return quantity.nominal_value, own, shared


def every(number):
    names = CHOICES[number]
    return [dict(zip(names, options, strict=True)) for options in itertools.product(*names.values())]


def inputs_of(measured):
    nothing = dict.fromkeys(DIMENSIONS, math.nan)
    sizes = nothing | {k: v for k, (v, _) in measured.items() if k in DIMENSIONS}
    return sizes | {f"u_{k}": measured[k][1] if k in measured else math.nan for k in DIMENSIONS}


CASES = [(number, section) for number in CHOICES for section in SECTIONS
         if number in ("Sp", "slenderness", "Mn") or section == "rod"]  # fmt: skip


@pytest.mark.parametrize(("number", "section"), CASES)
def test_between_any_two_dialects(number, section):
    measured = MEASURED | SECTIONS[section]
    m = {key: ufloat(value, u, tag=key) for key, (value, u) in measured.items()}
    waves = () if section == "helix" else ("gray_hancock_1955", "lighthill")
    combinations = [c for c in every(number) if c.get("coefficient") not in waves]
    right = [(c, split(spoken(number, c, m))) for c in combinations]
    # from every dialect of Sp into every fifth: among these is each option, and it saves a minute
    news = right[:: 5 if number == "Sp" else 1]
    assert all({c[name] for c, _ in news} == {c[name] for c, _ in right} for name in CHOICES[number])
    for (old, given), (new, wanted) in itertools.product(right, news):
        found = restate(number, *given, choices=new, house=old, inputs=inputs_of(measured))
        # both are first order; a difference of variances keeps seven or more of sixteen digits here
        told = [float(found.value), float(found.u_own), float(found.u_shared)]
        assert told == pytest.approx(wanted, rel=1e-9, abs=0.0), (old, new)


def test_a_tail_that_is_the_body_is_one_source():
    # an undulating body: L_tail was not typed, so both lengths are one measurement
    measured = MEASURED | SECTIONS["rod"]
    m = {key: ufloat(value, u, tag=key) for key, (value, u) in measured.items()}
    m["L_tail"] = m["L_body"]
    house, new = every("Sp")[0], {"length": "L_body", "coefficient": "cylinder_two_term", "power": 1}
    house = house | {"coefficient": "cylinder_finite"}
    wanted = split(spoken("Sp", house | new, m))
    given = split(spoken("Sp", house, m))
    body = measured | {"L_tail": measured["L_body"]}
    inputs = inputs_of(body) | {"tail_is_body": True}
    found = restate("Sp", *given, choices=new, house=house, inputs=inputs)
    told = [float(found.value), float(found.u_own), float(found.u_shared)]
    assert told == pytest.approx(wanted, rel=1e-9)
    # L_tail left empty is the same, also where no length is exchanged
    inputs |= {"L_tail": math.nan, "u_L_tail": math.nan}
    again = restate("Sp", *given, choices=new, house=house, inputs=inputs)
    assert float(again.u_shared) == float(found.u_shared)
    mu = house | {"coefficient": "mu"}
    found = restate("Sp", *given, choices=mu, house=house, inputs=inputs)
    told = [float(found.value), float(found.u_own), float(found.u_shared)]
    assert told == pytest.approx(split(spoken("Sp", mu, m)), rel=1e-9)
    # two sources would add in squares what one adds at once: 1 % and more off
    apart = restate("Sp", *given, choices=new, house=house, inputs=inputs_of(body))
    assert float(apart.u_shared) != pytest.approx(wanted[2], rel=1e-2)


def test_a_slope_alone_would_be_wrong():
    # what the exact share is for: overall for tail length brings another measurement's uncertainty
    measured = MEASURED | SECTIONS["rod"] | {"E": (1.5e6, 1e3), "mu": (1.0, 1e-3), "L_body": (0.024, 2e-3)}
    m = {key: ufloat(value, u, tag=key) for key, (value, u) in measured.items()}
    house = every("Sp")[0]
    value, own, shared = split(spoken("Sp", house, m))
    inputs, choices = inputs_of(measured), {"length": "L_body"}
    found = restate("Sp", value, own, shared, choices=choices, house=house, inputs=inputs)
    assert float(found.u_shared) > 2 * 1.2 * shared


def test_each_length_brings_its_own_uncertainty():
    # first order by hand: 2 % of the run alone, and the tail's 3 % in place of the body's 1 %
    inputs = {"L_tail": 50e-6, "u_L_tail": 1.5e-6, "L_body": 60e-6, "u_L_body": 0.6e-6}
    found = restate("Re", 6e-3, 6e-3 * 0.02, 6e-3 * 0.01, choices={"length": "L_tail"}, inputs=inputs)
    told = [float(u / found.value) for u in (found.u_own, found.u_shared)]
    assert told == pytest.approx([0.02, 0.03], rel=1e-12)
    # a total that was never split may stand as shared: the dimensions add the same to it
    u = 6e-3 * math.hypot(0.02, 0.01)
    total = restate("Re", 6e-3, None, u, choices={"length": "L_tail"}, inputs=inputs)
    assert total.u_own is None
    assert float(total.u_shared / total.value) == pytest.approx(math.hypot(0.02, 0.03), rel=1e-12)


def test_round_trips_bring_the_parts_back():
    measured = MEASURED | SECTIONS["strip"]
    m = {key: ufloat(value, u, tag=key) for key, (value, u) in measured.items()}
    house = every("Sp")[0]
    given = split(spoken("Sp", house, m))
    for new in every("Sp"):
        if new["coefficient"] in ("gray_hancock_1955", "lighthill"):
            continue
        there = restate("Sp", *given, choices=new, house=house, inputs=inputs_of(measured))
        back = restate("Sp", there.value, there.u_own, there.u_shared, choices=house, house=new,
                       inputs=inputs_of(measured))  # fmt: skip
        told = [float(back.value), float(back.u_own), float(back.u_shared)]
        assert told == pytest.approx(given, rel=1e-12)


def test_an_uncertainty_that_leaves_out_the_dimensions_is_never_negative():
    # a published point that states less than its own length would bring
    inputs = {"L_tail": 0.02, "L_body": 0.024, "u_L_tail": 1e-3, "u_L_body": 0.0}
    found = restate("Re_omega", 1.0, 0.0, 0.0, choices={"length": "L_body"}, inputs=inputs)
    assert float(found.u_shared) == 0.0


def test_absent_stays_absent_and_a_dimension_without_u_brings_none():
    inputs = {"L_tail": np.array([0.02, 0.02]), "L_body": np.array([0.024, math.nan]), "u_L_tail": 0.0,
              "u_L_body": np.array([math.nan, math.nan])}  # fmt: skip
    found = restate("Re", [1.0, 1.0], [0.1, 0.1], [0.2, 0.2], choices={"length": "L_tail"}, inputs=inputs)
    assert found.u_own[0] == pytest.approx(0.1 * 20 / 24, rel=1e-12)
    assert found.u_shared[0] == pytest.approx(0.2 * 20 / 24, rel=1e-12)
    assert np.isnan([found.value[1], found.u_own[1], found.u_shared[1]]).all()
