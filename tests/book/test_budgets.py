"""A run's uncertainty budget and its Monte Carlo, against differences, exact results and a draw by hand."""

import math
from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy import select

from labbook import Book
from labbook.book.block_spread import needed
from labbook.book.budgets import budgets, simulate
from labbook.book.derive import derive
from labbook.book.run_rows import FACTS, facts_of, shelf_for
from labbook.book.tables import run
from labbook.errors import Refusal
from labbook.registry.monte_carlo import DRAWS

# Sampling, as in tests/registry/test_monte_carlo.py: five standard errors of what n draws give, so that a right
# program fails once in a million. Of a standard deviation (normal; a rectangle's is half of that):
FIVE_OF_U = 5 / math.sqrt(2 * DRAWS)
# of an end of the 95 % interval of a normal result, in units of u (density 0.0584 there)
FIVE_OF_AN_END = 5 * math.sqrt(0.025 * 0.975 / DRAWS) / 0.0584
# of an end of a rectangle's, in units of its whole width
FIVE_OF_A_RECTANGLE = 5 * math.sqrt(0.025 * 0.975 / DRAWS)

# a shelf with hardly any error of its own (readings need one: 1e-7 of the value or less), so that one source at a
# time can be looked at
SHELF = {
    "fluids": """code,kind,glycerol [wt%],rho [kg/m3],made
exact,measured,,1380(0),2026-01-05
thin,measured,,1380(0),2026-01-05
kinematic,measured,,1400(140),2026-01-05
gly,glycerol-water,85.0(20),1220(0),2026-01-05
""",
    "materials": """code,rho_s [g/cm3],made
sil,1.07(0),2026-01-05
""",
    "swimmers": """code,form,material,L_body [mm],L_tail [mm],section,d [mm],b [mm],m_mag [mA.m2]
rod,flexible tail,sil,34.0(0),30.0(0),rod,1.00(0),2.00(0),4.2(0)
blunt,flexible tail,sil,34.0(0),30.0(0),rod,1.00(0),2.0,4.2(0)
eel,undulating,,300(9),,,,,
""",
    "rigs": """code,kind,current_to_B [mT/A],u_f,calibrated
coils,Helmholtz pair,1,0.1 %,2026-01-06
""",
    "readings": """of,key,value,T,on
exact,mu,6.0000000(1) Pa.s,18.0(0) degC,2026-03-01
exact,mu,3.0000000(1) Pa.s,26.0(0) degC,2026-03-01
thin,mu,1.0(4) Pa.s,22.0(0) degC,2026-03-01
kinematic,nu,1.0000000(1)e-3 m2/s,22.0(0) degC,2026-03-01
sil,E,1.5000000(1) MPa,,2026-02-20
""",
}


@pytest.fixture(scope="module")
def shelved(tmp_path_factory):
    folder = tmp_path_factory.mktemp("exact")
    for name, text in SHELF.items():
        (folder / f"{name}.csv").write_text(text, encoding="utf-8")
    with Book.new(folder / "exact.db") as book:
        book.load(folder, by="tester")
        yield book


def logged(book, **cells):
    exact = dict(fluid="exact", f="0.500(0) Hz", theta0="0.300(0) rad", U="0.0500(0) mm/s", T="22.0(0) degC",
                 A_tip="2.00(0) mm", h_wall="20.0(0) mm", at="2026-03-02T10:00")  # fmt: skip
    cells = {k: v for k, v in ({"swimmer": "rod"} | exact | cells).items() if v is not None}
    return book.record(**cells, confirm=True)


def ends(simulated):
    return simulated.sample.low, simulated.sample.high


# ---- what a budget adds up to


def test_the_parts_of_every_number_add_up_and_are_those_of_the_stored_run(filled):
    seen = set()
    for code in [f"R-{i:04d}" for i in range(1, 11)]:
        sheet, found = filled.sheet(code), filled.ask(budgets, code)
        assert set(found) == {k for k in filled.registry.numbers if sheet.values[k] is not None}
        for key, one in found.items():
            parts = one.contributions
            assert math.fsum(c.part**2 for c in parts) == pytest.approx(one.u**2, rel=1e-12)
            assert math.fsum(c.share for c in parts) == pytest.approx(1.0, rel=1e-12)
            own, shared = (math.hypot(*(c.part for c in parts if c.own is mine)) for mine in (True, False))
            # a source that cancels is left out of the parts, and the stored value keeps its rounding
            room = dict(rel=1e-9, abs=1e-12 * one.u)
            assert (own, shared) == pytest.approx((sheet.u_own[key], sheet.u_shared[key]), **room)
            assert one.value == pytest.approx(sheet.values[key], rel=1e-9)
            assert [c.share for c in parts] == sorted((c.share for c in parts), reverse=True)
            seen |= {(c.source, c.belongs) for c in parts}
    whose = {"f": "run", "T": "run", "I_coil": "run", "mu_readings": "fluid", "grade": "fluid", "E": "material",
             "d": "swimmer", "L_tail": "swimmer", "m_mag": "swimmer", "current_to_B": "rig"}  # fmt: skip
    assert whose.items() <= dict(seen).items()


def derived(facts, shelf, registry, number):
    return derive(facts, shelf, registry, (number,)).of(number)[0][0]


def moved(facts, shelf, source, size):
    """The facts and the shelf with one typed input changed by size (SI)."""
    if source in facts.values and np.isfinite(facts.values[source][0]):
        # T and T_end are read from one thermometer
        keys = ("T", "T_end") if source == "T" else (source,)
        return replace(facts, values=facts.values | {k: facts.values[k] + size for k in keys}), shelf
    key = {"rho_batch": "rho"}.get(source, source)
    for name in ("swimmers", "fluids", "rigs"):
        for i, item in getattr(shelf, name).items():
            if key in item.typed:
                cell = list(item.typed[key])
                cell[2] += size
                return facts, replace(shelf, **{name: {i: replace(item, typed=item.typed | {key: cell})}})
    for i, item in shelf.materials.items():  # every reading of a set is off by as much as their mean
        if source == "E":
            readings = tuple(replace(r, value=r.value + size) for r in item.readings)
            return facts, replace(shelf, materials={i: replace(item, readings=readings)})
    return None


def test_each_contribution_is_what_one_u_of_the_typed_input_changes(filled):
    """Values alone, derived again with the input a little higher and lower: no complex step has a part in it."""
    looked_at = set()
    registry = filled.registry
    for code in ("R-0001", "R-0002", "R-0004", "R-0005", "R-0006", "R-0008"):
        query = select(*FACTS).where(run.c.code == code)
        row = filled.ask(lambda c, query=query: c.execute(query).one())
        facts, shelf = facts_of([row]), filled.ask(shelf_for, [row])
        sizes = typed_u(facts, shelf)
        for number, one in filled.ask(budgets, code).items():
            for c in one.contributions:
                u = sizes.get(c.source)
                if u is None:
                    continue
                # a hundredth of u: the third derivative then brings less than 1e-5, rounding less than 1e-9.
                # The composition's slope is itself taken across 2 u, so the step is u; within it a mu that
                # changes by 3.7 % enters the numbers by its powers, which bend by (0.037)^2 or so
                step = u if c.source == "glycerol" else u / 100
                high, low = (
                    derived(*moved(facts, shelf, c.source, s * step), registry, number) for s in (1, -1)
                )
                change = (high - low) / 2 * u / step
                room = 2e-3 if c.source == "glycerol" else 2e-5
                assert change == pytest.approx(c.part, rel=room, abs=1e-7 * one.u), (code, number, c.source)
                looked_at.add(c.source)
    assert looked_at >= {"f", "theta0", "U", "A_tip", "T", "B", "I_coil", "current_to_B", "L_tail", "L_body", "d",
                         "w", "t", "D", "d_in", "R_helix", "pitch", "b", "m_mag", "E", "glycerol",
                         "grade"}  # fmt: skip


def typed_u(facts, shelf):
    """Source -> the standard uncertainty that the sheets state (conftest), read past the propagation."""
    sizes = {k: float(facts.u[k][0]) for k in facts.u if np.isfinite(facts.values[k][0])}
    rig = next(iter(shelf.rigs.values()), None)
    if rig is not None:  # 0.1 % of f, where the digits alone tell
        for key in ("f", "theta0", "B", "T"):
            if f"u_{key}" in rig.typed and facts.digits[key][0]:
                size = rig.typed[f"u_{key}"]
                sizes[key] = size[2] * (facts.values[key][0] if size[4] == "relative" else 1.0)
    for items in (shelf.swimmers, shelf.fluids, shelf.rigs):
        for item in items.values():
            sizes |= {k: typed[3] for k, typed in item.typed.items() if not k.startswith("u_")}
    for item in shelf.fluids.values():
        sizes["rho_batch"] = item.typed["rho"][3] if "rho" in item.typed else 0.0
        if item.texts["kind"] == "silicone-oil":
            sizes["grade"] = item.typed["grade"][2] * 0.05 / math.sqrt(3)  # physics sheet, section 3: +-5 %
    for item in shelf.materials.values():  # one reading each
        sizes["E"] = item.readings[0].u
    sizes.pop("T_end", None)
    return sizes


def test_the_advice_names_the_largest_source_and_whose_it_is(filled, shelved):
    one = filled.ask(budgets, "R-0001")["Re"]
    # u(U)/U = 0.003/0.051 = 5.9 % beside 1 % or so of mu: 97 % and more of the variance
    assert one.contributions[0].source == "U"
    assert one.advice.endswith(" % of the variance comes from this run's speed along the swimming axis: measure that "
                               "better first")  # fmt: skip
    code = logged(shelved, fluid="gly")
    assert shelved.ask(budgets, code)["Sp"].advice == (
        "99 % of the variance comes from the fluid's glycerol share: "
        "measure its viscosity, or that share better, first"
    )
    exact = shelved.ask(budgets, logged(shelved))["slenderness"]
    assert exact.u == 0 and exact.contributions == () and exact.advice == exact.caution == ""


def test_inputs_beyond_fifteen_per_cent_are_told_where_they_matter(shelved):
    found = shelved.ask(budgets, logged(shelved, theta0="0.30(7) rad", U="0.050(8) mm/s"))
    assert dict(found["U_scaled"].wide) == pytest.approx({"theta0": 0.07 / 0.3, "U": 0.16})
    assert found["U_scaled"].caution == "θ₀ carries 23 %, U carries 16 %: first order may mislead"
    assert [k for k, _ in found["stride"].wide] == ["U"]
    assert found["Sp"].wide == () and found["Sp"].caution == ""
    thin = shelved.ask(budgets, logged(shelved, fluid="thin"))
    assert dict(thin["Sp"].wide) == pytest.approx({"mu": 0.4})
    assert thin["stride"].wide == ()


def test_a_wide_density_is_told_only_where_it_enters(stocked):
    stocked.stock("fluid", code="murky", kind="measured", rho="1300(300) kg/m3", made="2026-01-10")
    stocked.stock("reading", of="murky", key="mu", value="4.00(4) Pa.s", T="22.0(1) degC", on="2026-03-01")
    code = stocked.record(swimmer="reed-1", fluid="murky", f="0.50(1) Hz", theta0="0.30(1) rad", T="22.0(1) degC",
                          U="0.051(1) mm/s", at="2026-03-02T10:00", confirm=True)  # fmt: skip
    found = stocked.ask(budgets, code)
    assert [k for k, _ in found["Re"].wide] == ["rho"]
    assert found["Sp"].wide == ()  # its viscosity was read as such


# ---- Monte Carlo against first order


@pytest.mark.parametrize(("cells", "numbers"), [
    (dict(swimmer="reed-1", fluid="syrup", rig="coil-1", f="0.50 Hz", B="2.00(3) mT", theta0="0.300(5) rad",
          U="0.0510(8) mm/s", A_tip="2.00(3) mm"), ("Sp", "Re_omega", "St", "Mn", "U_scaled", "stride", "zeta_ratio")),
    (dict(swimmer="ribbon-1", fluid="syrup", f="2.00(2) Hz", theta0="0.300(5) rad", U="0.400(6) mm/s"),
     ("Sp", "Re_omega", "slenderness")),
    (dict(swimmer="eel-1", fluid="water-1", f="2.50(3) Hz", U="0.300(4) m/s", A_tip="40.0(6) mm"),
     ("Re_omega", "St", "Sw", "Re")),
    (dict(swimmer="screw-1", fluid="syrup", rig="coil-1", f="1.00 Hz", B="2.00(3) mT", U="0.120(2) mm/s"),
     ("Re_omega", "f_ratio")),
])  # fmt: skip
def test_small_inputs_make_both_agree(stocked, cells, numbers):
    code = stocked.record(**({"T": "22.0(1) degC", "at": "2026-03-02T10:00"} | cells), confirm=True)
    first = stocked.ask(budgets, code)
    for number in numbers:
        found = stocked.ask(simulate, code, number)
        assert (found.value, found.u) == (first[number].value, first[number].u)
        assert found.sample.undefined == 0
        # five standard errors of 200,000 draws are 0.8 %. Curvature: 1/x with u(x)/x = s has a standard deviation
        # of s (1 + 4 s^2), and 0.2 % more is s = 2.2 %, which no input of these numbers exceeds
        assert found.sample.u == pytest.approx(first[number].u, rel=FIVE_OF_U + 0.002), number
        assert found.sample.mean == pytest.approx(first[number].value, abs=0.05 * first[number].u)
        if number in ("Sp", "Re_omega"):
            assert found.warning == ""


def test_a_wide_amplitude_is_flagged_and_a_good_one_is_not(shelved):
    # U/(omega L theta0^2) with theta0 = 0.30 +- 30 %. With u = 2 x 0.3 the first-order ends are 1 -+ 1.96 x 0.6;
    # 1/x^2 is monotone for x > 0, so the ends are those of theta0: (1 +- 1.96 x 0.3)^-2 = 0.397 and 5.89. Few
    # draws (4e-4) lie below zero and move the upper end by less than its sampling error of a few per cent
    found = shelved.ask(simulate, logged(shelved, theta0="0.30(9) rad"), "U_scaled")
    assert found.u == pytest.approx(0.6 * found.value, rel=1e-12)
    low, high = (end / found.value for end in ends(found))
    assert low == pytest.approx(1.588**-2, rel=0.01) and high == pytest.approx(0.412**-2, rel=0.06)
    assert found.warning.startswith("first order misleads: it gives -")
    assert shelved.ask(simulate, logged(shelved, theta0="0.300(3) rad"), "U_scaled").warning == ""


def test_the_same_seed_gives_the_same_result(filled):
    one, again, other = (filled.ask(simulate, "R-0001", "Sp", draws=2000, seed=s) for s in (4, 4, 5))
    assert one == again and one.sample != other.sample


# ---- Monte Carlo against exact distributions


def test_digits_alone_are_a_rectangle_and_a_rigs_statement_is_not(shelved):
    # St = f A/U with f = 0.5 from its digits: 0.45 to 0.55, of which 95 % lie within +- 0.0475
    found = shelved.ask(simulate, logged(shelved, f="0.5 Hz"), "St")
    middle, width = found.value, 0.1 / 0.5 * found.value
    assert ends(found) == pytest.approx(
        (middle - 0.475 * width, middle + 0.475 * width), abs=FIVE_OF_A_RECTANGLE * width
    )
    # the rig states 0.1 %: normal
    found = shelved.ask(simulate, logged(shelved, f="0.5 Hz", rig="coils"), "St")
    u = 1e-3 * found.value
    assert ends(found) == pytest.approx((found.value - 1.96 * u, found.value + 1.96 * u), abs=FIVE_OF_AN_END * u)


def test_a_swimmers_digits_are_a_rectangle_too(shelved):
    # wall = b/h_wall with b = 2.0 mm from its digits: 1.95 to 2.05
    found = shelved.ask(simulate, logged(shelved, swimmer="blunt"), "wall")
    width = 0.1 / 20
    assert ends(found) == pytest.approx((0.1 - 0.475 * width, 0.1 + 0.475 * width), abs=FIVE_OF_A_RECTANGLE * width)


def test_the_flux_density_of_a_current_is_drawn_as_a_product(shelved):
    # Mn = m B L/EI with B = k I, k = 1 mT/A and I = 2 A from their digits: two rectangles of relative u 0.289 and
    # 0.144. Of a product of independent factors u^2 = a^2 + b^2 + a^2 b^2, whose last term first order lacks
    a, b = 0.5 / math.sqrt(3), 0.25 / math.sqrt(3)
    found = shelved.ask(simulate, logged(shelved, rig="coils", I_coil="2 A", f="0.500(0) Hz"), "Mn")
    assert found.u / found.value == pytest.approx(math.hypot(a, b), rel=1e-9)
    exact = math.sqrt(a * a + b * b + a * a * b * b)
    # kurtosis of two added rectangles, one twice as wide: 3 - 1.2 (4^2 + 1)/(4 + 1)^2 = 2.18, so that the relative
    # standard error of the standard deviation is sqrt((2.18 - 1)/(4 n)); the last term is worth 0.8 %
    five = 5 * math.sqrt(1.18 / (4 * DRAWS))
    assert found.sample.u / found.value == pytest.approx(exact, rel=five)
    assert exact / math.hypot(a, b) > 1 + five  # so the two are told apart
    low, high = ends(found)
    assert low / found.value > 0.75 * 0.5 and high / found.value < 1.25 * 1.5  # no rectangle reaches further


def test_a_drift_of_temperature_is_drawn_through_the_viscosity(shelved):
    # T from 20 to 24 degC, rectangular: the middle 95 % are 20.1 to 23.9 degC, and Re_omega, which only rises
    # with T, has its ends there. Andrade through (18 degC, 6 Pa.s) and (26 degC, 3 Pa.s)
    found = shelved.ask(simulate, logged(shelved, T="20.00(0) degC", T_end="24.00(0) degC"), "Re_omega")
    slope = math.log(2) / (1 / 291.15 - 1 / 299.15)

    def re_omega(t):
        mu = 3.0 * math.exp(slope * (1 / (t + 273.15) - 1 / 299.15))
        return 1380 * math.pi * 0.030**2 / mu

    assert found.value == pytest.approx(re_omega(22.0), rel=1e-9)
    assert found.sample.low == pytest.approx(re_omega(20.1), abs=FIVE_OF_A_RECTANGLE * 4 * 0.09 * found.value)
    assert found.sample.high == pytest.approx(re_omega(23.9), abs=FIVE_OF_A_RECTANGLE * 4 * 0.11 * found.value)
    # a thermometer's own error is normal and joins it: u^2 adds
    both = shelved.ask(simulate, logged(shelved, T="20.0(10) degC", T_end="24.0(10) degC"), "Re_omega")
    assert both.u / found.u == pytest.approx(math.sqrt(1 + 3 / 4), rel=1e-9)  # 1^2 beside 2^2/3
    assert both.sample.u / found.sample.u == pytest.approx(math.sqrt(7 / 4), rel=0.01)


def test_a_composition_is_drawn_through_the_correlation(shelved):
    """85 +- 2 wt% is +- 24 % of mu, and its exponential is lopsided; the draw by hand shares no code with ours."""
    found = shelved.ask(simulate, logged(shelved, fluid="gly", T="22.0(2) degC"), "Re_omega")
    chance = np.random.default_rng(7)
    n = 2_000_000
    w, t = chance.normal(0.85, 0.02, n), chance.normal(22.0, 0.2, n)
    # Cheng, Ind. Eng. Chem. Res. 47:3285 (2008), with its 2 %; rho = 1220 kg/m3 as stated
    a, b = 0.705 - 0.0017 * t, (4.9 + 0.036 * t) * (0.705 - 0.0017 * t) ** 2.5
    alpha = 1 - w + a * b * w * (1 - w) / (a * w + b * (1 - w))
    mu_w = 1.790e-3 * np.exp((-1230 - t) * t / (36100 + 360 * t))
    mu_g = 12.100 * np.exp((-1233 + t) * t / (9900 + 70 * t))
    mu = mu_w**alpha * mu_g ** (1 - alpha) * (1 + 0.02 * chance.standard_normal(n))
    by_hand = 1220 * math.pi * 0.030**2 / mu
    low, high = np.quantile(by_hand, (0.025, 0.975))
    # the ends' own sampling, a lognormal's upper tail being twice as wide; rounding to u/10 adds 0.04 % of u
    assert ends(found) == pytest.approx((low, high), abs=2.5 * FIVE_OF_AN_END * found.u)
    assert found.sample.u == pytest.approx(by_hand.std(), rel=2 * FIVE_OF_U)
    assert found.warning.startswith("first order misleads")
    assert abs(high - found.value - 1.96 * found.u) > 10 * FIVE_OF_AN_END * found.u  # and first order is far off


def test_a_composition_cannot_exceed_the_whole(shelved):
    shelved.stock("fluid", code="pure", kind="glycerol-water", glycerol="99.5(10) wt%", made="2026-01-10")
    found = shelved.ask(simulate, logged(shelved, fluid="pure", T="22.0(0) degC"), "Sp")
    assert found.sample.undefined == 0


# ---- one source has one draw wherever it enters


def test_a_density_in_viscosity_and_density_cancels(shelved):
    # mu = nu rho: with nu = 1e-3 to 1e-7 and rho to 10 %, the Womersley number L sqrt(omega/nu) has no u
    code = logged(shelved, fluid="kinematic")
    assert {c.source for c in shelved.ask(budgets, code)["Wo"].contributions} == {"mu_readings"}
    found = shelved.ask(simulate, code, "Wo")
    assert found.value == pytest.approx(0.030 * math.sqrt(math.pi / 1e-3), rel=1e-12)
    assert found.sample.high - found.sample.low < 1e-6 * found.value
    assert shelved.ask(simulate, code, "Sp").sample.u > 0.01  # while a number of mu alone does carry it


def test_an_undulating_bodys_tail_is_its_body_in_every_draw(shelved):
    shelved.define_number(
        key="L_share", symbol="L_share", name="tail's share of the body", formula="L_tail / L_body",
        compares="lengths", source="a test", example="L_tail = 20 mm, L_body = 25 mm", answer="0.80",
        why="a test", by="tester",
    )  # fmt: skip
    code = logged(shelved, swimmer="eel", theta0=None, h_wall=None, U="0.300(0) m/s")
    found = shelved.ask(simulate, code, "L_share")
    assert (found.value, found.sample.low, found.sample.high) == pytest.approx((1.0, 1.0, 1.0), abs=1e-12)
    assert shelved.ask(budgets, code)["L_share"].u < 1e-15
    # Re_omega goes as L_tail^2, and so as L_body^2: u = 2 x 3 %, and the square of a normal adds u^4/2
    found = shelved.ask(simulate, code, "Re_omega")
    assert found.sample.u / found.value == pytest.approx(0.03 * math.sqrt(4 + 2 * 0.03**2), rel=FIVE_OF_U)


# ---- draws without a result, and refusals


def test_draws_below_zero_viscosity_are_counted(shelved):
    # mu = 1.0 +- 0.4: a normal draw lies below zero in 0.62097 % of cases (Phi(-2.5))
    found = shelved.ask(simulate, logged(shelved, fluid="thin"), "Sp")
    expected = 0.0062097 * DRAWS
    assert found.sample.undefined == pytest.approx(expected, abs=5 * math.sqrt(expected))
    assert found.warning.startswith("first order misleads")


@pytest.mark.parametrize(("code", "number", "field", "words"), [
    ("R-9999", "Sp", "run", "no such run"), ("R-0001", "Spp", "key", "no number has this key"),
    ("R-0001", "f_ratio", "number", "R-0001 has none"), ("R-0009", "St", "number", "R-0009 has none"),
])  # fmt: skip
def test_what_cannot_be_drawn_is_refused(filled, code, number, field, words):
    with pytest.raises(Refusal, match=words) as refused:
        filled.ask(simulate, code, number)
    assert refused.value.field == field


def test_unknown_runs_and_too_few_draws_are_refused(filled):
    with pytest.raises(Refusal, match="no such run"):
        filled.ask(budgets, "R-9999")
    with pytest.raises(Refusal, match="at least 1000"):
        filled.ask(simulate, "R-0001", "Sp", draws=999)


def test_a_rotating_drives_number_is_there_for_rotating_drives_alone(filled):
    assert "f_ratio" in filled.ask(budgets, "R-0008") and "f_ratio" not in filled.ask(budgets, "R-0001")
    sources = {c.source for c in filled.ask(budgets, "R-0008")["f_ratio"].contributions}
    assert {"f", "B", "m_mag", "R_helix"} <= sources


def test_a_group_that_speaks_another_dialect_gets_its_budget(filled):
    before = filled.ask(budgets, "R-0001")["Sp"]
    filled.adopt_dialect("Sp", {"power": 1}, why="a test", by="tester")
    after = filled.ask(budgets, "R-0001")["Sp"]
    assert after.value == pytest.approx(before.value**4, rel=1e-12)
    # the fourth power has four times the relative u, from the same sources in the same shares
    assert after.u / after.value == pytest.approx(4 * before.u / before.value, rel=1e-9)
    assert {c.source: c.share for c in after.contributions} == pytest.approx(
        {c.source: c.share for c in before.contributions}, rel=1e-9
    )
    assert needed(filled.registry, ("Sp",)) >= {"mu", "L_tail"}
