"""Why a value of a run is absent, in one sentence, and which marks a value carries from what it follows from."""

import json
import math
from collections.abc import Mapping

from labbook.book.block_model import PREDICTED, model_for
from labbook.book.block_spread import FOLLOWS
from labbook.registry.catalogue import ROTATING_DRIVES
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES, RUN_KEYS, SWIMMER_KEYS

_SENTENCE_OF = {"mu": "mu_from", "rho": "rho_from", "lam": "lam_from", "E": "E_from"}


def why_absent(
    values: Mapping, sentences: Mapping[str, str], swimmer: str, form: str, drive: str, registry: Registry
) -> dict[str, str]:
    """Key -> sentence for every resolved quantity and number that a run lacks.

    values: key -> SI value or None/NaN, with u_U beside; sentences: mu_from, rho_from, lam_from, E_from; swimmer:
    its code.
    """
    found = {}
    model = model_for(form, drive, registry.coefficient)
    follows = FOLLOWS | {PREDICTED: model.needs}
    for key, row in registry.numbers.items():
        if _absent(values.get(key)):
            still = PREDICTED in row.inputs and (not model.steps or values.get(PREDICTED) == 0.0)
            found[key] = model.says if still else _number(row, values, sentences, swimmer, drive, follows)
    for key in ("mu", "rho", "nu", "E", "EI", "I_area", "a", "zeta_n", "zeta_t", PREDICTED):
        if _absent(values.get(key)):
            found[key] = _needs(_roots((key,), values, follows), sentences, swimmer)
    if PREDICTED in found and not model.steps:
        found[PREDICTED] = model.says
    return found


def _absent(value) -> bool:
    return value is None or math.isnan(value)


def _number(row, values, sentences, swimmer, drive, follows) -> str:
    if row.only_drives and drive not in row.only_drives:
        drives = "a rotating drive" if row.only_drives == ROTATING_DRIVES else " or ".join(row.only_drives)
        return f"only for {drives}, and this run's is {drive}"
    missing = _roots(row.inputs, values, follows)
    if not missing and row.not_zero and _consistent_with_zero(row.not_zero, values):
        return f"not defined ({row.not_zero} consistent with 0)"
    if not missing:
        return "outside what its formula can take"
    return _needs(missing, sentences, swimmer)


def _consistent_with_zero(key, values) -> bool:
    spread = values.get(f"u_{key}")
    return spread is None or math.isnan(spread) or abs(values[key]) <= 2 * spread


def _roots(keys, values, follows) -> list[str]:
    """The keys at the bottom that are absent."""
    found: dict[str, None] = {}
    for key in keys:
        if not _absent(values.get(key)):
            continue
        deeper = _roots(follows[key], values, follows) if key in follows else []
        found |= dict.fromkeys(deeper or [key])
    return list(found)


def _needs(missing, sentences, swimmer) -> str:
    return "; ".join(f"needs {key}: {_cause(key, sentences, swimmer)}" for key in missing)


def _cause(key, sentences, swimmer) -> str:
    if key in _SENTENCE_OF:
        said = sentences.get(_SENTENCE_OF[key]) or "absent: unknown"
        return said.removeprefix("absent: ")
    if key == "B":
        return "neither B nor a coil current with the rig's constant was typed"
    if key in RUN_KEYS:
        return "it was not typed"
    if key in ("I_area", "a"):
        return f"the section of {swimmer} is not complete"
    if key in SWIMMER_KEYS:
        return f"{swimmer} has no {QUANTITIES[key].name}"
    return "the drag model does not reach so stout a tail"


def marks_of(
    stored: str | None, confirmed: str | None, values: Mapping, registry: Registry
) -> dict[str, list[str]]:
    """Key -> marks of one run; what follows from an extrapolated value is extrapolated too, unless it is absent."""
    marks: dict[str, list[str]] = json.loads(stored) if stored else {}
    beyond = {k for k, m in marks.items() if "extrapolated" in m}
    for key, inputs in {**FOLLOWS, **{k: n.inputs for k, n in registry.numbers.items()}}.items():
        if beyond & set(inputs) and not _absent(values.get(key)):
            beyond.add(key)
            marks.setdefault(key, []).append("extrapolated")
    for column, _ in json.loads(confirmed) if confirmed else []:
        if "confirmed" not in marks.setdefault(column, []):
            marks[column].append("confirmed")
    return marks
