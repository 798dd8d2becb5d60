"""Bench tests of a clamped piece's stiffness: cells as typed to Young's modulus with its uncertainty."""

from collections.abc import Mapping

import numpy as np

from labbook.book.drafts import all_of
from labbook.errors import Refusal
from labbook.physics import sections, stiffness
from labbook.registry.spread import Spread
from labbook.registry.typed import read
from labbook.registry.written import written_in

TESTS = ("sag", "ring-down")
SECTIONS = {
    "rod": (("d",), sections.rod_area, sections.rod_second_moment),
    "strip": (("w", "t"), sections.strip_area, sections.strip_second_moment),
    "tube": (("D", "d_in"), sections.tube_area, sections.tube_second_moment),
}
# what each cell is read as: the sag is a length, the ring-down frequency a frequency
_READ_AS = {"L": "L_tail", "delta": "A_tip", "f1": "f"}


def cells_of_test(test: str, section: str) -> tuple[str, ...]:
    """The cells a test needs, in the order of the bench: section, free length, density, what was seen."""
    if test not in TESTS:
        raise Refusal("test", test, "is no bench test of stiffness", f"one of {', '.join(TESTS)}")
    if section not in SECTIONS:
        raise Refusal("section", section, "is not known here", f"one of {', '.join(SECTIONS)}")
    return (*SECTIONS[section][0], "L", "rho_s", "delta" if test == "sag" else "f1")


def modulus_from_test(test: str, section: str, cells: Mapping[str, str]) -> tuple[str, str]:
    """(E as typed text, a sentence of doubt or '') from a sag or a ring-down of a clamped piece.

    cells: as cells_of_test names them, with units. The uncertainty follows from all of them by complex steps.
    Errors: Refusal or Refusals for cells that are missing or cannot be read.
    """
    spread, refused = Spread(), []
    keys = cells_of_test(test, section)
    for key in keys:
        try:
            typed = _read(key, cells.get(key, ""))
            spread.measured(key, np.array([typed.value]), np.array([typed.u]))
        except Refusal as refusal:
            refused.append(refusal)
    if refused:
        raise all_of(refused)
    across, area, second_moment = SECTIONS[section]
    if section == "tube" and spread.values["d_in"][0] >= spread.values["D"][0]:
        raise Refusal("d_in", cells["d_in"], "a tube's bore must be smaller than D")

    def modulus(L, rho_s, **rest):
        sizes = {k: rest[k] for k in across}
        shape = {"rho_s": rho_s, "area": area(**sizes), "L": L, "I_area": second_moment(**sizes)}
        if test == "sag":
            return stiffness.modulus_from_sag(delta=rest["delta"], **shape)
        return stiffness.modulus_from_ringdown(f1=rest["f1"], **shape)

    spread.follow(("E",), modulus, keys)
    E = float(spread.values["E"][0])
    u = float(np.hypot(spread.own("E")[0], spread.shared("E")[0]))
    unit = "GPa" if E >= 1e9 else "MPa" if E >= 1e5 else "kPa"
    doubt = ""
    if test == "sag" and not stiffness.sag_is_small(delta=spread.values["delta"][0], L=spread.values["L"][0]):
        doubt = "The sag is more than a tenth of the length: the linear formula is off by more than 1 %."
    return written_in("E", E, u, unit), doubt


def _read(key: str, text: str):
    if not text.strip():
        raise Refusal(key, None, "is missing")
    try:
        return read(_READ_AS.get(key, key), text)
    except Refusal as refusal:
        raise Refusal(key, refusal.typed, refusal.reason, refusal.remedy) from None
