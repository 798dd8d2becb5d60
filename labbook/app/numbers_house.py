"""Numbers, a change of house dialect: options, what would change, a confirming touch, before and after."""

from collections.abc import Mapping

import streamlit as st

from labbook.app import session
from labbook.book.asking import Question
from labbook.book.ledger import reason
from labbook.book.queries import count
from labbook.book.registry_effects import Effect, dialect_effect, takers_of_drag
from labbook.errors import Refusal, Refusals
from labbook.registry.dialect_words import CHOICE_WORDS, dialect_words, option_words
from labbook.registry.dialects import CHOICES, formula_of
from labbook.registry.formula import parse
from labbook.registry.group import Registry
from labbook.registry.latex import formula_latex
from labbook.registry.quantities import QUANTITIES
from labbook.registry.written import written

DONE = "house:done"


@st.cache_data(max_entries=32, show_spinner="Restating the kept runs")
def _effect(state: str, number: str, choices: dict) -> tuple[Effect, int]:
    """What a dialect would do to a number, and how many runs the book has in all."""
    book = session.book()
    return book.ask(dialect_effect, number, choices), book.ask(count, Question(state="all"))


def change(number: str, registry: Registry) -> None:
    """The form that changes a number's house dialect."""
    with st.container(border=True):
        st.html("<b>Change the group's house dialect</b>")
        _done(number)
        place = f"house:{st.session_state.get('house:version', 0)}:{number}"
        refused = session.refused(place)
        chosen = _options(number, registry, place, refused)
        st.latex(formula_latex(parse(formula_of(number, chosen), QUANTITIES).tree), width="content")
        if chosen == registry.choices(number):
            session.note(
                "This is the house dialect: choose another option and see here what it would change."
            )
            _rest(refused, ("why", "confirm", *CHOICES[number]))
            return
        effect, runs = _effect(session.state_of_book(), number, chosen)
        _foretell(number, effect, takers_of_drag(registry, number, chosen))
        why = st.text_input("Why", key=f"{place}:why", placeholder="kept in the ledger")
        if not why.strip():
            _refusal(refused, "why")
        agreed = st.checkbox(
            f"The book's {runs} run{'s are' if runs != 1 else ' is'} derived again; bands keep their printed "
            "limits and now hold on the new values.", key=f"{place}:agreed:{sorted(chosen.items())}",
        )  # fmt: skip
        if not agreed:
            _refusal(refused, "confirm")
        _rest(refused, ("why", "confirm", *CHOICES[number]))
        if st.button("Make it the house dialect", type="primary", key=f"{place}:go"):
            _adopt(number, chosen, why, agreed, runs, place)
            st.rerun()


def _options(number: str, registry: Registry, place: str, refused: Mapping[str, str]) -> dict[str, object]:
    """A box for each choice, the house's option first chosen."""
    house, chosen = registry.choices(number), {}
    for name, options in CHOICES[number].items():
        chosen[name] = st.selectbox(
            f"{name}: {CHOICE_WORDS[name]}", options, index=options.index(house[name]), key=f"{place}:{name}",
            format_func=lambda o, name=name: f"{o}: {option_words(name, o)}",
        )  # fmt: skip
        _refusal(refused, name)
    return chosen


def _refusal(refused: Mapping[str, str], field: str) -> None:
    if field in refused:
        session.say_refused(refused[field])


def _rest(refused: Mapping[str, str], shown: tuple[str, ...]) -> None:
    """What was refused and has no field of its own."""
    for field in refused:
        if field not in shown:
            session.say_refused(refused[field])


def _adopt(number: str, chosen: dict, why: str, agreed: bool, runs: int, place: str) -> None:
    """One attempt, with its progress; leaving the page before it is done changes nothing."""

    def act():
        _ready(why, agreed)
        bar, done = st.progress(0.0, text="deriving the book again"), [0]

        def step(n):
            done[0] += n
            bar.progress(min(done[0] / max(runs, 1), 1.0), text=f"derived {done[0]} of {runs} runs")

        told = session.book().adopt_dialect(number, chosen, why=why, by=session.handle(), progress=step)
        st.session_state[DONE] = (number, told)
        st.session_state["house:version"] = st.session_state.get("house:version", 0) + 1
        n = told["after"]["derived runs"]
        again = f"{n} run{'s were' if n != 1 else ' was'} derived again"
        session.keep_message(f"{number} is now {dialect_words(chosen)}; {again}")

    session.attempt(act, place)


def _ready(why: str, agreed: bool) -> None:
    """Refusals, said together, where the reason or the confirming touch is missing."""
    found = [] if agreed else [Refusal("confirm", None, "is not touched yet", "touch the box")]
    try:
        reason(why)
    except Refusal as refusal:
        found.append(refusal)
    if found:
        raise Refusals(found)


def _foretell(number: str, effect: Effect, others: tuple[str, ...]) -> None:
    """What the change would do, computed on the kept runs and written nowhere."""
    now, then = effect.now, effect.then
    rows = [("kept runs that have it", str(now.runs), str(then.runs)),
            *_span(now.lowest, now.highest, then.lowest, then.highest),
            *_regimes(now.regimes, then.regimes)]  # fmt: skip
    session.table((number, "now", "then"), rows, numeric=(1, 2))
    for sentence, n in effect.lost.items():
        session.note(f"{n} run{'s' if n != 1 else ''} would have no {number}: {sentence}.")
    if others:
        session.note(f"ζ_n and ζ_t follow the drag model, and with them {', '.join(others)}.")


def _done(number: str) -> None:
    """Before and after of the change that was made last, as the book itself counted."""
    of, told = st.session_state.get(DONE, ("", None))
    if of != number:
        st.session_state.pop(DONE, None)
        return
    before, after = told["before"], told["after"]
    session.note(f"{number} was {dialect_words(before['choices'])}; it is {dialect_words(after['choices'])}.")
    rows = [*_span(before["lowest"], before["highest"], after["lowest"], after["highest"]),
            *_regimes(before["regimes"], after["regimes"])]  # fmt: skip
    session.table((number, "before", "after"), rows, numeric=(1, 2))


def _span(*values: float | None) -> list[tuple[str, str, str]]:
    low, high, new_low, new_high = (written(v) or "–" for v in values)
    return [("smallest value", low, new_low), ("largest value", high, new_high)]


def _regimes(before: Mapping[str, int], after: Mapping[str, int]) -> list[tuple[str, str, str]]:
    return [(f"runs in {name}", str(n), str(after.get(name, 0))) for name, n in before.items()]
