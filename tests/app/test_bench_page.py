"""The bench page, run without a browser: why a strip is empty, and warnings that stand once."""

import re
from html import unescape

import pytest

from labbook.app import live
from labbook.book.preview import Preview
from labbook.registry.catalogue import NUMBERS

WHY = "needs rho: no density"


@pytest.fixture
def seen():
    """A preview that lacks what needs a density."""
    return Preview(values={"Sp": 2.0}, why_absent={"Re_omega": WHY, "Re": WHY, "St": "needs A_tip: it was not typed"})


def warned(page):
    """The sentences about a value that is far from the swimmer's others."""
    return re.findall(r"<div>([^<]* times the largest [^<]*)</div>", unescape(page.words()))


def test_an_empty_strip_says_why_once_everything_it_takes_is_typed(seen):
    cells = {"f": "1 Hz", "T": "20 degC"}
    assert live.lacking(cells, seen, NUMBERS) == [f"Re_ω: {WHY}"]
    assert live.lacking({**cells, "U": "1 mm/s"}, seen, NUMBERS) == [f"Re_ω, Re: {WHY}"]


def test_what_is_not_typed_yet_is_not_asked_for(seen):
    assert live.lacking({"f": "1 Hz"}, seen, NUMBERS) == [] and live.lacking({"T": "20 degC"}, seen, NUMBERS) == []


def test_a_warning_that_waits_stands_once_and_goes_with_the_value(open_page, demo_copy):
    page = open_page(demo_copy, "bench")
    for key, text in {"f": "0.57 Hz", "theta0": "12 deg", "T": "22 degC", "U": "900 mm/s"}.items():
        page.at.text_input(key=f"bench:{key}").set_value(text)
    page.run()
    before = warned(page)
    assert before
    page.press("Log trial")
    assert "It is right, log it" in [b.label for b in page.at.button]
    assert sorted(warned(page)) == sorted(set(before))
    page.at.text_input(key="bench:U").set_value("0.02 mm/s")
    page.run()
    assert not warned(page)
    assert "Log trial" in [b.label for b in page.at.button]
