"""Values as the trade writes them: 2.31(3), 0.0210(10), 4.0(3)e-4, never more digits than u allows."""

import math
import re

import uncertainties

from labbook.registry.quantities import QUANTITIES
from labbook.registry.units import from_si, spread_from_si


def written(value: float | None, u: float | None = None, unit: str = "") -> str:
    """A value with its standard uncertainty in brackets, and the unit if one is given; '' where absent."""
    if value is None or math.isnan(value):
        return ""
    tail = f" {unit}" if unit and unit != "1" else ""
    if u is None or not math.isfinite(u) or u <= 0:
        return _tidy(f"{value:.4g}") + tail
    if u < 1e-12 * abs(value):
        return _tidy(f"{value:.6g}") + tail
    mantissa, _, exponent = f"{u:.1e}".partition("e")
    if float(mantissa) >= 9.5:  # one digit would say 10: 0.099 is (10), not (9) and not (99)
        mantissa, exponent = "1.0", int(exponent) + 1
        u = float(f"1e{exponent}")
    digits = 2 if float(mantissa) < 2 else 1  # 0.0210(10) but 2.31(3)
    largest = max(abs(value), u)
    power = "e" if not 1e-3 <= largest < 1e5 else ""
    if not power and u >= 9.5:
        last = digits - 1 - math.floor(math.log10(u))
        return f"{round(value, last) + 0.0:.0f}({round(u, last):.0f})" + tail
    return _tidy(f"{uncertainties.ufloat(value, u):.{digits}u{power}S}") + tail


def _tidy(text: str) -> str:
    text = re.sub(r"\((\d+)\.(\d+)\)", r"(\1\2)", text)  # 30.0(10), as 0.0210(10), and not 30.0(1.0)
    return re.sub(r"e([+-])0*(\d)", lambda m: f"e{'-' if m[1] == '-' else ''}{m[2]}", text)


def written_in(key: str, value: float | None, u: float | None, unit: str) -> str:
    """A quantity's SI value and uncertainty written in another of its units."""
    if value is None or math.isnan(value):
        return ""
    spread = None if u is None else spread_from_si(key, u, unit)
    return written(float(from_si(key, value, unit)), spread, unit)


# the unit a value is shown in when nobody typed one
SHOWN = {
    "mu": "mPa.s", "E": "MPa", "T": "degC", "theta0": "deg", "U": "mm/s", "U_model": "mm/s", "L_tail": "mm", "L_body": "mm",
    "d": "mm", "w": "mm", "t": "mm", "D": "mm", "d_in": "mm", "b": "mm", "b_long": "mm", "h0": "mm",
    "A_tip": "mm", "h_wall": "mm", "D_tank": "mm", "R_helix": "mm", "pitch": "mm", "B": "mT", "nu": "cSt",
    "current_to_B": "mT/A", "scale": "um/px", "glycerol": "wt%", "grade": "cSt",
}  # fmt: skip


def shown(key: str, value: float | None, u: float | None = None, unit: str | None = None) -> str:
    """A quantity or number as a page writes it: in `unit`, else its usual unit, else SI."""
    row = QUANTITIES.get(key)
    if row is None:
        return written(value, u)
    unit = unit or SHOWN.get(key)
    if unit is None or not row.units:
        return written(value, u, row.unit)
    return written_in(key, value, u, unit)
