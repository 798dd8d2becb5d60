"""The sources of uncertainty by name: what each is, whose it is, and what would make it smaller."""

from typing import NamedTuple

from labbook.registry.quantities import QUANTITIES
from labbook.registry.spread import OWN_SOURCES


class Source(NamedTuple):
    """name: in words; belongs: run, fluid, material, swimmer, rig or theory; better: what would help."""

    name: str
    belongs: str
    better: str


_BETTER = "measure that better first"
# sources that are no keys of run or swimmer
SOURCES = {
    "mu_readings": ("viscosity readings", "fluid", "measure its viscosity better first"),
    "mu_model": ("viscosity correlation", "fluid", "measure its viscosity first"),
    "grade": ("nominal grade", "fluid", "measure its viscosity first"),
    "glycerol": ("glycerol share", "fluid", "measure its viscosity, or that share better, first"),
    "rho_reading": ("density reading", "fluid", "measure its density better first"),
    "rho_batch": ("stated density", "fluid", "measure its density first"),
    "rho_model": ("density correlation", "fluid", "measure its density first"),
    "lam": ("relaxation time", "fluid", _BETTER), "rho_s": ("density", "material", _BETTER),
    "E": ("modulus readings", "material", "measure its modulus better first"),
    "current_to_B": ("coil constant", "rig", "calibrate that better first"),
    "scale": ("camera scale", "rig", "calibrate that better first"),
    "theory": ("model's own error", "theory", "no measurement helps: the model is what is uncertain"),
}  # fmt: skip


def source_row(source: str) -> Source:
    """The row of a source: one of the table, or a quantity typed on a run or a swimmer."""
    if source in SOURCES:
        return Source(*SOURCES[source])
    name = QUANTITIES[source].name.partition(",")[0]
    return Source(name, "run" if source in OWN_SOURCES else "swimmer", _BETTER)
