"""What every page shares: what an attempt leaves at its fields."""

import pytest
import streamlit as st

from labbook.app import session
from labbook.errors import Refusal, Refusals, Unconfirmed


@pytest.fixture
def left(monkeypatch):
    """A session's state of its own."""
    state: dict = {}
    monkeypatch.setattr(st, "session_state", state)
    return state


def raising(error):
    def act():
        raise error

    return act


def test_every_finding_of_a_field_is_kept(left):
    number, unit = Refusal("f", "x", "is no number"), Refusal("f", "x", "has no unit")
    found = Refusals([number, Refusal("U", None, "is missing"), unit])
    assert not session.attempt(raising(found), "here")
    assert session.refused("here") == {"f": "f 'x': is no number. f 'x': has no unit.", "U": "U: is missing."}


def test_an_attempt_that_is_done_forgets_what_was_refused_and_warned(left):
    session.attempt(raising(Refusal("f", "x", "is no number")), "here")
    session.attempt(raising(Unconfirmed(["fast for this swimmer."], ["U"])), "here")
    assert session.refused("here") == {} and session.warned("here") == ["fast for this swimmer."]
    assert session.attempt(lambda: None, "here")
    assert session.warned("here") == []
