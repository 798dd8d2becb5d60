"""What goes with a track, as typed: axis, drift, choice of columns."""

import math
import re
from collections.abc import Sequence
from typing import NamedTuple

from labbook.errors import Refusal
from labbook.exchange.track_columns import ROLES
from labbook.registry.typed import read
from labbook.registry.units import accepted

_EACH = re.compile(rf",(?=\s*(?:{'|'.join(ROLES)})\s*=)")
_ANGLE = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+))\s*(deg|°|rad)?")
_UNIT = re.compile(r"[^\d\s().,;+-][^\d();,]*$")
VECTOR = "'0.1(1),-0.2(1) um/s'"


class Velocity(NamedTuple):
    """A drift as typed: velocity (vx, vy) and its standard uncertainties, m/s."""

    velocity: tuple[float, float]
    u: tuple[float, float]


def axis_of(text: str) -> tuple[float, float] | None:
    """The unit vector of an axis in degrees from x towards y ('30', '30 deg', '0.52 rad'); None for 'auto'."""
    if text.strip().lower() == "auto":
        return None
    match = _ANGLE.fullmatch(text.strip().replace("−", "-"))
    if match is None:
        raise Refusal(
            "axis", text, "cannot be read as an angle", "type degrees from x towards y, e.g. 30, or auto"
        )
    angle = float(match[1]) if match[2] == "rad" else math.radians(float(match[1]))
    return math.cos(angle), math.sin(angle)


def velocity_of(text: str) -> Velocity:
    """A drift from two speeds, '0.1(1),-0.2(1) um/s' or a unit each; u from the digits where none is typed."""
    parts = text.split(";") if ";" in text else text.split(",")
    if len(parts) != 2 or not all(part.strip() for part in parts):
        raise Refusal("drift", text, "cannot be read as a velocity", f"type e.g. {VECTOR}, or name a track")
    unit = _UNIT.search(parts[1].strip())
    try:
        house = accepted("U", unit[0]) if unit else None
    except Refusal as refusal:
        raise Refusal("drift", text, f"{refusal.typed} {refusal.reason}", refusal.remedy) from None
    try:
        both = [read("U", part.strip(), house, ";" in text) for part in parts]
    except Refusal as refusal:
        raise Refusal("drift", text, refusal.reason, refusal.remedy or f"type e.g. {VECTOR}") from None
    return Velocity((both[0].value, both[1].value), (both[0].u, both[1].u))


def columns_of(texts: Sequence[str]) -> dict[str, str]:
    """{role: column of the file} from texts such as 'x=X_pos,y=Y_pos'."""
    chosen: dict[str, str] = {}
    for one in (part for text in texts for part in _EACH.split(text)):
        role, sign, column = (word.strip() for word in one.partition("="))
        if not sign or not column:
            raise Refusal("columns", one, "is not role=column", "type e.g. x=X_pos,y=Y_pos")
        if role in chosen:
            raise Refusal("columns", one, f"{role} is chosen twice")
        chosen[role] = column
    return chosen
