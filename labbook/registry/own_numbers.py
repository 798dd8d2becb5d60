"""A group's own number from what people type: key, formula, worked example with units, answer."""

import math
import re
from collections.abc import Collection, Mapping

from labbook.errors import LabbookError, Refusal, Refusals
from labbook.registry.catalogue import Number
from labbook.registry.formula import parse
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES, RESOLVED_KEYS
from labbook.registry.typed import read

FIELDS = ("key", "symbol", "name", "formula", "compares", "source", "example", "answer")
_REQUIRED = {
    "key": "a short plain name for columns and axes, e.g. Mg",
    "name": "e.g. magnetic to viscous torque",
    "formula": "e.g. m_mag * B / (8 * pi * mu * b**3 * omega)",
    "compares": "what the number weighs against what",
    "source": "a paper or book, or 'own definition'",
    "example": "e.g. mu = 1 Pa.s, f = 2 Hz, L_tail = 20 mm",
    "answer": "what the formula must give for the worked example",
}
_KEY = re.compile(r"[A-Za-z][A-Za-z0-9_]{0,23}")
_ANSWER = re.compile(r"([+-]?)(\d+(?:\.(\d*))?|\.(\d+))(?:[eE]([+-]?\d+))?")
_BETWEEN = re.compile(r"[,;\n]\s*(?=[A-Za-z_]\w*\s*=)")
MOST_TEXT = 400


def read_number(cells: Mapping[str, str], registry: Registry, taken: Collection[str] = ()) -> Number:
    """The number that some cells describe; a key of the group's own may come again (a new version).

    taken: further names that a key may not have, blind to case. Errors: Refusal, or Refusals with every finding.
    """
    given = {k: str(v).strip() for k, v in cells.items() if v is not None and str(v).strip()}
    found = [Refusal(k, None, "a number has no such field", f"it has {', '.join(FIELDS)}")
             for k in given if k not in FIELDS]  # fmt: skip
    found += [Refusal(k, None, "is missing", hint) for k, hint in _REQUIRED.items() if k not in given]
    found += [Refusal(k, v[:40] + "...", f"is longer than {MOST_TEXT} characters")
              for k, v in given.items() if len(v) > MOST_TEXT]  # fmt: skip
    found += [Refusal(k, v[:40], "must be one line of readable characters")
              for k, v in given.items() if not v.replace("\n", " ").isprintable()]  # fmt: skip
    if found:
        raise Refusals(found) if len(found) > 1 else found[0]
    key = _free_key(given["key"], registry, taken)
    formula = parse(given["formula"], RESOLVED_KEYS)
    answer, tolerance = read_answer(given["answer"])
    return Number(
        key, given.get("symbol", key), given["name"], formula.text, given["compares"], given["source"],
        read_example(given["example"], formula.keys), answer, tolerance, dialect="the group's own",
        signed="U" in formula.keys, not_zero="U" if "U" in formula.divisors() else "",
    )  # fmt: skip


def _free_key(key: str, registry: Registry, taken: Collection[str]) -> str:
    if not _KEY.fullmatch(key):
        raise Refusal("key", key, "is no plain name", "use letters, digits and _, at most 24, a letter first")
    if key.startswith("u_") or key.lower().startswith("digest_"):
        raise Refusal("key", key, "looks like an uncertainty or a digest", "choose another name")
    others = {k.lower() for k in (*registry.keys, *QUANTITIES, *taken) if k not in registry.own}
    others |= {k.lower() for k in registry.own if k != key}
    if key.lower() in others:
        raise Refusal("key", key, "is taken (capitals do not count)", "choose another name")
    return key


def read_answer(text: str) -> tuple[float, float]:
    """(value, relative tolerance) of a worked example's answer: half its last written digit, at most 5 %."""
    match = _ANSWER.fullmatch(text.replace(",", ".") if text.count(",") == 1 and "." not in text else text)
    if match is None:
        raise Refusal("answer", text, "is no plain number", "write e.g. 4.88 or 1.2e-3")
    value = float(match[0])
    if not math.isfinite(value):
        raise Refusal("answer", text, "is too large a number")
    if value == 0:
        raise Refusal("answer", text, "zero would check nothing", "choose an example with another answer")
    half = 0.5 * 10.0 ** (int(match[5] or 0) - len(match[3] or match[4] or ""))
    if half / abs(value) > 0.05:
        raise Refusal("answer", text, "is known to no better than 5 %", "write more digits, or another example")
    return value, min(max(half / abs(value) * (1 + 1e-9), 1e-9), 0.05)


def read_example(text: str, keys: Collection[str]) -> dict[str, float]:
    """SI values of 'mu = 1 Pa.s, f = 2 Hz': what `keys` need; omega, nu and the like follow from their inputs."""
    values: dict[str, float] = {}
    found: list[LabbookError] = []
    for part in _BETWEEN.split(text):
        key, equals, written = (p.strip() for p in part.partition("="))
        try:
            if not equals or key not in QUANTITIES:
                raise Refusal("example", part.strip(), "is no 'key = value with unit' of the vocabulary")
            if key in values:
                raise Refusal(key, written, "stands twice in the worked example")
            values[key] = _value(key, written)
        except Refusal as refusal:
            found.append(Refusal("example", f"{key} = {written}", refusal.reason, refusal.remedy))
    if found:
        raise Refusals(found) if len(found) > 1 else found[0]
    for key in keys:
        _follow(key, values)
    return values


def _value(key: str, written: str) -> float:
    row = QUANTITIES[key]
    if row.units:
        return read(key, written).value
    number, _, unit = written.partition(" ")  # derived quantities are never typed elsewhere: SI alone
    try:
        value = float(number)
    except ValueError:
        raise Refusal(key, written, "is no number", f"write e.g. 1.2e-3 {row.unit}") from None
    if unit.strip() not in ("", row.unit):
        raise Refusal(key, written, f"is derived, and taken in {row.unit} only")
    return value


def _follow(key: str, values: dict[str, float]) -> None:
    """Enter a key that its own formula gives from keys that are there."""
    if key in values or not QUANTITIES[key].formula:
        return
    formula = parse(QUANTITIES[key].formula, QUANTITIES)
    for needed in formula.keys:
        _follow(needed, values)
    if all(k in values for k in formula.keys):
        values[key] = float(formula.value(values))
