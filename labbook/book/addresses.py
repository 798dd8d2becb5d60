"""A question as the parameters of a page's address, and back: what is not understood is said."""

import math
from collections.abc import Mapping, Sequence

from labbook.book.asking import Question
from labbook.book.clock import read_moment
from labbook.book.records import STATES
from labbook.book.stored_view import KEYS
from labbook.errors import Refusal
from labbook.registry.regimes import regime

# parameter -> field of a question, for those that name records; material, person and series likewise
CHOSEN = {
    "fluid": "fluids",
    "swimmer": "swimmers",
    "material": "materials",
    "person": "people",
    "series": "series",
}
PARAMETERS = ("regime", "range", *CHOSEN, "since", "until", "text", "state")


def parameters(question: Question) -> dict[str, list[str]]:
    """Every parameter of an address, with the texts that ask the question; [] where it leaves the address."""
    ranges = [f"{key}:{low:.12g}:{high:.12g}" for key, (low, high) in question.ranges.items()]
    found = {"regime": list(question.regimes), "range": ranges}
    found |= {name: list(getattr(question, field)) for name, field in CHOSEN.items()}
    for name in ("since", "until", "text"):
        found[name] = [getattr(question, name)] if getattr(question, name) else []
    return found | {"state": [] if question.state == "kept" else [question.state]}


def read_question(
    given: Mapping[str, Sequence[str]], known: Mapping[str, Sequence[str]]
) -> tuple[Question, list[str]]:
    """The question of an address, and one sentence for each part that could not be read and was left out.

    given: parameter -> its texts (other parameters are ignored); known: fluid, swimmer, material, person and
    series -> what the book has.
    """
    said: list[str] = []

    def kept(name, read):
        results = []
        for text in dict.fromkeys(given.get(name, ())):
            try:
                results.append(read(text))
            except Refusal as refusal:
                said.append(str(refusal))
        return results

    def one_of(name):
        def read(text):
            if text not in known[name]:
                raise Refusal(name, text, "the book has no such " + name)
            return text

        return read

    chosen = {field: tuple(kept(name, one_of(name))) for name, field in CHOSEN.items()}
    moments = {name: (kept(name, _moment(name)) or [None])[-1] for name in ("since", "until")}
    text = (kept("text", str.strip) or [None])[-1] or None
    state = (kept("state", _state) or ["kept"])[-1]
    question = Question(
        regimes=tuple(kept("regime", lambda name: regime(name).name)),
        ranges=dict(kept("range", read_range)),
        **chosen,
        **moments,
        text=text,
        state=state,
    )
    return question, said


def read_range(text: str) -> tuple[str, tuple[float, float]]:
    """(key, (low, high)) of 'Sp:1:3', in SI; an empty limit is open. Refusal for anything else."""
    parts = text.split(":")
    if len(parts) != 3:
        raise Refusal("range", text, "is not a range", "write key:low:high, e.g. Sp:1:3")
    key, low, high = parts[0].strip(), _limit(text, parts[1], -math.inf), _limit(text, parts[2], math.inf)
    if key not in KEYS:
        raise Refusal(
            "range", text, f"{key!r} is no quantity or number of a run", "the Numbers page lists them"
        )
    if low > high:
        raise Refusal("range", text, "is empty", "give the lower limit first")
    return key, (low, high)


def _limit(whole: str, text: str, absent: float) -> float:
    if not text.strip():
        return absent
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if math.isnan(value):
        raise Refusal("range", whole, f"{text.strip()!r} is no number", "write e.g. Sp:1:3, limits in SI")
    return value


def _moment(name: str):
    def read(text):
        text = text.strip()
        try:
            read_moment(name, text + "T00:00:00" if len(text) == 10 else text)
        except Refusal as refusal:
            raise Refusal(name, text, refusal.reason, "write e.g. 2026-03-01") from None
        return text

    return read


def _state(text: str) -> str:
    if text not in (*STATES, "all"):
        raise Refusal("state", text, "is no state of a run", "kept, void or all")
    return text
