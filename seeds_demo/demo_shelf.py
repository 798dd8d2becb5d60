"""The invented shelf: what stands on it (true values, hidden from the sheets) and what its readings say."""

from dataclasses import dataclass
from datetime import date, timedelta

import demo_cells as cells
import numpy as np

from labbook.physics import fluids, magnets, rods, sections

FIRST, LAST = date(2025, 11, 24), date(2026, 11, 27)


@dataclass(frozen=True)
class Fluid:
    """A batch. truth: mass fraction at the start, grade in m2/s at 25 degC, or (A, B, C) of the syrup.

    drift: change of mass fraction per 30 days; sets: pairs (date, temperatures in degC); until: last use.
    """

    code: str
    kind: str
    truth: object
    made: date
    until: date
    sets: tuple = ()
    glycerol: str = ""
    grade: str = ""
    rho: str = ""
    drift: float = 0.0
    factor: float = 1.0
    note: str = ""

    def mu(self, T, day):
        """True viscosity, Pa.s."""
        months = (day - self.made).days / 30.0
        if self.kind == "water":
            return float(fluids.water_viscosity(T=T))
        if self.kind == "glycerol-water":
            w = self.truth - self.drift * months
            return self.factor * float(fluids.glycerol_water_viscosity(w=w, T=T))
        if self.kind == "silicone-oil":
            return float(fluids.silicone_oil_kinematic_viscosity(nu25=self.truth, T=T)) * self.density(T)
        A, B, C = self.truth
        return A * np.exp(B / (T - C)) * (1.0 + 0.012 * months)

    def density(self, T):
        """Density, kg/m3."""
        if self.kind == "water":
            return float(fluids.water_density(T=T))
        if self.kind == "glycerol-water":
            return float(fluids.glycerol_water_density(w=self.truth, T=T))
        return float(fluids.silicone_oil_density(T=T)) if self.kind == "silicone-oil" else 1382.0


@dataclass(frozen=True)
class Material:
    """A cast batch. E: true modulus when made, Pa; stiffening per year; bias of the group's own readings."""

    code: str
    kind: str
    rho_s: str
    made: date
    E: float
    stiffening: float = 0.0
    bias: float = 0.0
    sets: tuple = ()
    note: str = ""

    def modulus(self, day):
        return self.E * (1.0 + self.stiffening * (day - self.made).days / 365.0)


@dataclass(frozen=True)
class Swimmer:
    """One build; lengths in mm. size: (d,), (w, t) or (D, d_in); helix: (R, pitch); m_mag in A.m2."""

    code: str
    form: str
    material: str
    section: str
    L_tail: float
    size: tuple
    b: float
    built: date
    helix: tuple = ()
    L_body: float = 0.0
    m_mag: float = 0.0
    parent: str = ""
    note: str = ""

    def area_moment(self):
        size = [1e-3 * x for x in self.size]
        if self.section == "rod":
            return float(sections.rod_second_moment(d=size[0]))
        if self.section == "strip":
            return float(sections.strip_second_moment(w=size[0], t=size[1]))
        return float(sections.tube_second_moment(D=size[0], d_in=size[1]))

    def zetas(self, mu):
        """House drag coefficients at viscosity mu, Pa.s."""
        flatness = self.size[1] / sum(self.size) if self.section == "strip" else 0.5
        a = sum(self.size) / 4.0 if self.section == "strip" else self.size[0] / 2.0
        return rods.resistive_coefficients(model=rods.HOUSE_MODEL, L=self.L_tail * 1e-3, a=a * 1e-3, mu=mu,
                                           flatness=flatness)


def _days(*texts):
    return [date.fromisoformat(text) for text in texts]


def _sets(temperatures, *texts):
    return tuple((day, temperatures) for day in _days(*texts))


_ROOM, _WIDE, _PAIR = (20.0, 25.0, 30.0), (10.0, 15.0, 20.0, 25.0, 30.0, 40.0), (18.0, 26.0)

FLUIDS = (
    Fluid("water-1", "water", None, FIRST, LAST, note="deionised, changed weekly"),
    Fluid("gly60-a", "glycerol-water", 0.601, date(2025, 12, 1), LAST,
          _sets(_PAIR, "2025-12-02", "2026-05-19", "2026-10-12"),
          glycerol="60.0(3)", drift=0.001, factor=1.006, note="glycerol tank"),
    Fluid("gly88-a", "glycerol-water", 0.882, FIRST, date(2026, 5, 29),
          _sets(_ROOM, "2025-11-24", "2026-01-12", "2026-02-23", "2026-04-13"),
          glycerol="88.0(3)", drift=0.0030, factor=0.992, note="lid does not close well"),
    Fluid("gly88-b", "glycerol-water", 0.879, date(2026, 5, 18), LAST,
          _sets(_ROOM, "2026-05-18", "2026-07-06", "2026-09-14", "2026-10-26"),
          glycerol="88.0(3)", drift=0.0025, factor=1.008),
    Fluid("gly96-a", "glycerol-water", 0.961, date(2026, 1, 12), LAST,
          (*_sets(_WIDE, "2026-01-13"), *_sets(_ROOM, "2026-03-23", "2026-06-15", "2026-09-21")),
          glycerol="96.0(3)", drift=0.0024, factor=0.985, note="under a film between sessions"),
    Fluid("sil1000-a", "silicone-oil", 1.022e-3, FIRST, LAST,
          (*_sets((15.0, 25.0, 35.0, 50.0), "2025-11-25"), *_sets(_ROOM, "2026-06-02")), grade="1000"),
    Fluid("sil1000-b", "silicone-oil", 0.981e-3, date(2026, 6, 22), LAST, grade="1000",
          note="not measured yet"),
    Fluid("sil5000-a", "silicone-oil", 5.13e-3, FIRST, LAST,
          (*_sets((10.0, 20.0, 25.0, 30.0, 40.0), "2025-11-27"), *_sets(_PAIR, "2026-08-31")), grade="5000"),
    Fluid("sil12500-a", "silicone-oil", 12.2e-3, date(2026, 2, 2), LAST, _sets(_PAIR, "2026-02-03"),
          grade="12500"),
    Fluid("sil350-a", "silicone-oil", 3.58e-4, date(2026, 3, 2), LAST, _sets((23.0,), "2026-03-03"),
          grade="350"),
    Fluid("syrup-a", "measured", (4.55e-4, 867.0, 200.0), date(2026, 1, 26), LAST,
          (*_sets((12.0, 20.0, 30.0, 40.0), "2026-01-27"), *_sets(_ROOM, "2026-05-11", "2026-10-05")),
          rho="1382(3)", note="corn syrup, strained"),
)

_CASTS = ("2025-11-24", "2026-02-16", "2026-05-26", "2026-09-07", "2026-11-02")


def _cast(code, kind, made, E, stiffening, bias, rho_s, note=""):
    made = date.fromisoformat(made)
    days = [made + timedelta(days=2)] + [day for day in _days(*_CASTS) if day > made + timedelta(days=30)]
    return Material(code, kind, rho_s, made, E, stiffening, bias, tuple(days), note)


MATERIALS = (
    _cast("soft-a", "silicone rubber, soft", "2025-11-17", 0.24e6, 0.09, 0.02, "1.06"),
    _cast("soft-b", "silicone rubber, soft", "2026-03-16", 0.27e6, 0.10, -0.03, "1.06"),
    _cast("mid-a", "silicone rubber, medium", "2025-11-17", 0.72e6, 0.07, -0.02, "1.08(1)"),
    _cast("mid-b", "silicone rubber, medium", "2026-05-11", 0.80e6, 0.06, 0.03, "1.08(1)"),
    _cast("firm-a", "silicone rubber, firm", "2025-11-18", 1.55e6, 0.05, 0.015, "1.12(1)"),
    _cast("firm-b", "silicone rubber, firm", "2026-06-08", 2.85e6, 0.04, -0.025, "1.14(1)", "extra hardener"),
    Material("steel-1", "spring steel wire", "7.85", date(2025, 11, 17), 2.0e11, sets=(date(2025, 11, 26),)),
    Material("wire-1", "brass wire, wound", "8.5", date(2025, 11, 17), 0.0),
    Material("print-1", "printed resin", "1.18", date(2025, 12, 1), 0.0),
)

_MAGNET = magnets.sphere_moment(diameter=2e-3, remanence=1.25)  # the 2 mm magnet in most heads


def _tail(number, family, section, material, built, L_tail, size, b, **more):
    form = more.pop("form", "flexible tail")
    return Swimmer(f"{family}-{number:02d}", form, material, section, L_tail, size, b,
                   date.fromisoformat(built), m_mag=float(_MAGNET), **more)


SWIMMERS = (
    _tail(1, "reed", "rod", "mid-a", "2025-11-24", 20.0, (1.02,), 2.0),
    _tail(2, "reed", "rod", "firm-a", "2025-11-24", 24.0, (1.50,), 2.5),
    _tail(3, "reed", "rod", "soft-a", "2025-11-26", 28.0, (0.98,), 2.5),
    _tail(4, "reed", "rod", "firm-a", "2025-12-03", 14.0, (1.22,), 1.5),
    _tail(5, "reed", "rod", "mid-a", "2026-01-08", 34.0, (1.60,), 3.5),
    _tail(6, "reed", "rod", "firm-a", "2026-02-10", 18.0, (1.50,), 2.5, parent="reed-02", note="trimmed"),
    _tail(7, "reed", "rod", "soft-b", "2026-03-20", 40.0, (1.24,), 4.0),
    _tail(8, "reed", "rod", "mid-b", "2026-05-18", 16.0, (0.82,), 1.6),
    _tail(9, "reed", "rod", "firm-b", "2026-06-15", 22.0, (1.52,), 2.2),
    _tail(10, "reed", "rod", "firm-b", "2026-06-15", 12.0, (1.20,), 1.5),
    _tail(1, "sedge", "strip", "mid-a", "2025-12-08", 22.0, (3.0, 0.80), 2.2),
    _tail(2, "sedge", "strip", "firm-a", "2025-12-08", 26.0, (3.0, 1.00), 2.8),
    _tail(3, "sedge", "strip", "soft-a", "2026-01-15", 18.0, (2.5, 0.90), 2.0),
    _tail(4, "sedge", "strip", "mid-b", "2026-05-20", 30.0, (4.0, 1.10), 3.0),
    _tail(5, "sedge", "strip", "firm-b", "2026-06-16", 20.0, (2.0, 0.80), 2.0),
    _tail(6, "sedge", "strip", "mid-b", "2026-07-14", 24.0, (4.0, 1.10), 3.0, parent="sedge-04",
          note="trimmed"),
    _tail(1, "rush", "tube", "mid-a", "2026-01-19", 26.0, (2.0, 1.0), 2.6),
    _tail(2, "rush", "tube", "firm-a", "2026-01-19", 34.0, (2.2, 1.2), 3.2),
    _tail(3, "rush", "tube", "soft-b", "2026-03-23", 24.0, (2.4, 1.2), 2.5),
    _tail(4, "rush", "tube", "mid-b", "2026-05-21", 18.0, (1.5, 0.8), 2.0),
    _tail(5, "rush", "tube", "firm-b", "2026-06-17", 30.0, (2.0, 1.4), 3.0),
    _tail(1, "thorn", "rod", "steel-1", "2025-11-27", 20.0, (1.00,), 2.0, form="rigid tail"),
    _tail(2, "thorn", "rod", "steel-1", "2026-02-05", 26.0, (0.80,), 2.5, form="rigid tail"),
    _tail(3, "thorn", "rod", "steel-1", "2026-06-18", 16.0, (1.00,), 1.6, form="rigid tail"),
    _tail(1, "hop", "rod", "wire-1", "2025-12-10", 20.0, (0.40,), 1.5, form="helix", helix=(2.0, 8.0)),
    _tail(2, "hop", "rod", "wire-1", "2026-02-12", 24.0, (0.50,), 1.5, form="helix", helix=(1.5, 12.0)),
    _tail(3, "hop", "rod", "wire-1", "2026-04-20", 16.0, (0.40,), 1.5, form="helix", helix=(2.0, 16.0)),
    _tail(4, "hop", "rod", "wire-1", "2026-08-24", 30.0, (0.50,), 2.0, form="helix", helix=(2.5, 10.0)),
    Swimmer("kelp-01", "undulating", "soft-a", "", 0.0, (), 0.0, date(2026, 1, 28), L_body=90.0),
    Swimmer("kelp-02", "undulating", "mid-a", "", 0.0, (), 0.0, date(2026, 4, 15), L_body=140.0),
    Swimmer("kelp-03", "undulating", "mid-b", "", 0.0, (), 0.0, date(2026, 9, 2), L_body=180.0),
    Swimmer("kelp-04", "undulating", "soft-b", "", 0.0, (), 0.0, date(2026, 4, 15), L_body=120.0,
            note="for the glycerol tank"),
    Swimmer("clover-01", "hinged", "print-1", "", 18.0, (), 2.0, date(2025, 12, 15), L_body=24.0),
    Swimmer("clover-02", "hinged", "print-1", "", 24.0, (), 2.5, date(2026, 3, 26), L_body=32.0),
)

RIGS = (
    dict(code="coil-1", kind="Helmholtz pair, oscillating", turns="120", radius="95", current_to_B="1.12(1)",
         scale="21.4(1)", fps="30.000(3)", u_f="0.001", u_theta0="0.006", u_B="0.03", u_T="0.15",
         calibrated="2025-11-20", note="check coil temperature after 30 min"),
    dict(code="coil-2", kind="three coil pairs, rotating", turns="140", radius="120", current_to_B="1.04(1)",
         scale="26.8(2)", fps="60.000(6)", u_f="0.001", u_theta0="0.006", u_B="0.04", u_T="0.15",
         calibrated="2025-12-04"),
    dict(code="tank-1", kind="motor, swimming tank", scale="182(1)", fps="120.00(2)", u_f="0.01",
         u_theta0="0.02", u_T="0.2", calibrated="2026-01-22"),
    dict(code="bench-1", kind="motor, oil tank", scale="24.9(2)", fps="25.000(3)", u_f="0.002",
         u_theta0="0.01", u_T="0.15", calibrated="2025-06-30", note="for hinged bodies"),
)


def readings(rng):
    """Rows of the readings sheet, by date: viscosities with 0.8 % of instrument noise, moduli with 2.5 %."""
    rows = []
    for fluid in FLUIDS:
        for day, temperatures in fluid.sets:
            kinematic = fluid.kind == "silicone-oil"
            for t in temperatures:
                value = fluid.mu(t + 273.15, day) * (1.0 + 0.008 * rng.standard_normal())
                if kinematic:
                    nu = value / fluid.density(t + 273.15) * 1e6
                    text, how = cells.shorthand(nu, 0.008 * nu, "cSt"), "capillary"
                elif value < 0.5:
                    text, how = cells.shorthand(value * 1e3, 8.0 * value, "mPa.s"), "cone and plate"
                else:
                    text, how = cells.plus_minus(value, 0.008 * value, "Pa.s"), "cone and plate"
                rows.append(dict(of=fluid.code, key="nu" if kinematic else "mu", value=text, T=f"{t:.1f}",
                                 on=day.isoformat(), how=how))
            if fluid.kind == "glycerol-water" and day == fluid.sets[0][0]:
                rho = fluid.density(293.15) + 0.6 * rng.standard_normal()
                rows.append(dict(of=fluid.code, key="rho", value=f"{rho:.1f}(8) kg/m3", T="20.0",
                                 on=day.isoformat(), how="density bottle"))
    for material in MATERIALS:
        for day in material.sets:
            for how in ("sag", "ring-down") if material.E < 1e9 else ("tensile",):
                E = material.modulus(day) * (1.0 + material.bias + 0.02 * rng.standard_normal())
                scale, unit = (1e-9, "GPa") if E > 1e9 else (1e-6, "MPa")
                text = cells.shorthand(E * scale, 0.025 * E * scale, unit)
                t = 22.0 + rng.uniform(-1.5, 1.5)
                rows.append(dict(of=material.code, key="E", value=text, T=f"{t:.1f}", on=day.isoformat(),
                                 how=how))
    return sorted(rows, key=lambda row: (row["on"], row["of"]))
