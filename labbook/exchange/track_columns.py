"""A tracker's columns: which header means what, and in which unit its numbers are."""

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from labbook.errors import Refusal
from labbook.registry.units import accepted, to_si

NAMES = {
    "t": ("t", "time"), "frame": ("frame",), "x": ("x",), "y": ("y",), "heading": ("heading",),
    "head_x": ("head_x",), "head_y": ("head_y",), "tip_x": ("tip_x",), "tip_y": ("tip_y",),
}  # fmt: skip
ROLES = tuple(NAMES)
LENGTHS = ("x", "y", "head_x", "head_y", "tip_x", "tip_y")
PAIRS = (("head_x", "head_y"), ("tip_x", "tip_y"))
PIXELS = ("px", "pix", "pixel", "pixels")
# any length, time and angle of the vocabulary reads the same units
_KEYS = {"t": "lam", "heading": "theta0"} | dict.fromkeys(LENGTHS, "A_tip")
_HEADER = re.compile(r"\s*(.*?)\s*(?:\[([^\]]*)\]|\(([^)]*)\))?\s*", re.DOTALL)
MOST_NAMED = 24


@dataclass(frozen=True)
class Column:
    """One column in use: place in the file, header (with the unit that was asked for), unit and slope to SI.

    unit: house spelling; 'px' of a length without unit or in pixels, whose slope of 1 waits for the scale;
    's?' of a time without unit; '' of a frame. Asking for `header` finds the same column in the same unit
    again.
    """

    place: int
    header: str
    unit: str
    slope: float


def found(header: Sequence[str], asked: Mapping[str, str] | None = None) -> dict[str, Column]:
    """{role: Column} of what the header holds; roles as in NAMES, x and y and one of t, frame at least.

    asked: role -> column of the file, with or without its unit; a unit given here counts where the header has
    none. Errors: Refusal for a role or column that does not exist, a needed one that is missing, half of a
    pair, a unit of the wrong kind, a heading without unit, and lengths of which only some have a unit.
    """
    asked = dict(asked or {})
    for role in asked:
        if role not in NAMES:
            raise Refusal("columns", role, "is no column that a track has", f"one of {', '.join(ROLES)}")
    split = [_split(cell) for cell in header]
    places = {role: _asked(role, asked[role], header, split) if role in asked else _by_name(role, header, split)
              for role in ROLES}  # fmt: skip
    places = {role: place for role, place in places.items() if place is not None}
    if "frame" in asked and "t" not in asked:
        places.pop("t", None)
    if "t" in places:
        places.pop("frame", None)
    for role in ("x", "y"):
        if role not in places:
            raise _missing(role, role, header)
    if not {"t", "frame"} & set(places):
        raise _missing("t", "t or frame", header)
    for pair in PAIRS:
        if len(set(pair) & set(places)) == 1:
            have, lacks = sorted(pair, key=lambda role: role not in places)
            raise Refusal(lacks, None, f"is missing beside {have}", f"the file has {named(header)}")
    columns = {role: _column(role, place, header, split, asked) for role, place in places.items()}
    bare = [role for role in LENGTHS if role in columns and columns[role].unit == "px"]
    said = [role for role in LENGTHS if role in columns and columns[role].unit != "px"]
    if bare and said:
        raise Refusal(bare[0], columns[bare[0]].header, f"has no length unit, but {said[0]} has one",
                      "head all lengths with a unit, or none")  # fmt: skip
    return columns


def named(header: Sequence[str]) -> str:
    """The file's columns for a refusal: 't [s]', 'X_pos' and so on."""
    shown = [repr(cell.strip()[:40]) for cell in header[:MOST_NAMED]]
    more = len(header) - len(shown)
    return ", ".join(shown) + (f" and {more} more" if more else "")


def _split(cell: str) -> tuple[str, str]:
    match = _HEADER.fullmatch(cell)
    return match[1], (match[2] or match[3] or "").strip()


def _by_name(role, header, split):
    for same in (str, str.lower):  # 'x' before 'X'
        for name in NAMES[role]:
            places = [i for i, (cell, _) in enumerate(split) if same(cell) == name]
            if len(places) > 1:
                raise Refusal(role, name, "stands twice in the header", f"the file has {named(header)}")
            if places:
                return places[0]
    return None


def _asked(role, wanted, header, split):
    whole, (name, _) = wanted.strip(), _split(wanted)
    for cells in ([cell.strip() for cell in header], [cell for cell, _ in split]):
        for text in dict.fromkeys((whole, name)):
            places = [i for i, cell in enumerate(cells) if cell == text]
            if len(places) > 1:
                raise Refusal(role, wanted, "stands twice in the header", f"the file has {named(header)}")
            if places:
                return places[0]
    raise Refusal(role, wanted, "the track has no such column", f"it has {named(header)}")


def _missing(role, words, header):
    return Refusal(
        role, None, f"the track has no column {words}", f"it has {named(header)}; say which one it is"
    )


def _column(role, place, header, split, asked):
    cell, unit = header[place].strip(), split[place][1]
    if role in asked and asked[role].strip() != cell:
        own = _split(asked[role])[1]
        if own and unit and own != unit:
            raise Refusal(role, asked[role], f"its header says {unit}", "leave the unit out")
        if own and not unit:
            cell, unit = f"{cell} [{own}]", own
    if role == "frame" or (role == "t" and not unit):
        return Column(place, cell, "" if role == "frame" else "s?", 1.0)
    if role in LENGTHS and unit.lower() in ("", *PIXELS):
        return Column(place, cell, "px", 1.0)
    if not unit:
        raise Refusal(role, cell, "degrees or radians?", f"head it {role} [deg] or {role} [rad]")
    try:
        house = accepted(_KEYS[role], unit)
    except Refusal as refusal:
        raise Refusal(role, cell, f"{refusal.typed} {refusal.reason}", refusal.remedy) from None
    return Column(place, cell, house, to_si(_KEYS[role], 1.0, house))
