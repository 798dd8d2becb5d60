"""A group's own number as one adds it: refused, saved, filtered by, plotted, changed, in the ledger."""

import re
import shutil

import numpy as np
import pytest
from playwright.sync_api import expect
from steps import settled, typed

from labbook import Book

WAIT = 20_000
# 1 Pa.s x 2 Hz x (0.02 m)^4/8e-8 N.m2 = 4, worked by hand
FIELDS = {
    "key *": "Vf", "name *": "viscous stretch", "compares *": "drag to bending", "source *": "own definition",
    "worked example *": "mu = 1 Pa.s, f = 2 Hz, L_tail = 20 mm, EI = 8e-8 N.m2", "its answer *": "4.00",
}  # fmt: skip


@pytest.fixture
def book(demo_book, tmp_path):
    """A demo book of this test's own."""
    return shutil.copy(demo_book, tmp_path / "own.db")


def save(tab) -> None:
    tab.get_by_role("button", name="Save the number").click()


def expected(path):
    """The number of every kept run by the bare expression over the book's columns."""
    with Book.open(path) as opened:
        runs = opened.runs(columns=("mu", "f", "L_tail", "EI"))
    return (runs["mu"] * runs["f"] * runs["L_tail"] ** 4 / runs["EI"]).to_numpy()


def test_an_own_number_from_form_to_ledger(page, served, book, shot):
    values = expected(book)
    address = served(book)
    tab = page(width=1024, height=768)
    tab.goto(f"{address}/numbers?part=new")
    for label, text in FIELDS.items():
        typed(tab, label, text)

    # a torque per length: one sentence, nothing saved, everything kept
    typed(tab, "formula *", "mu * f * L_tail**3 / EI")
    refusal = tab.get_by_text("not a pure number: L^-1 is left over")
    expect(refusal).to_have_count(1, timeout=WAIT)
    save(tab)
    expect(refusal).to_have_count(2, timeout=WAIT)  # beside the proof and at the field
    expect(tab.get_by_label("name *", exact=True)).to_have_value("viscous stretch")
    shot(tab, "number-refused-1024-light")
    with Book.open(book) as opened:
        assert opened.registry.own == {}

    typed(tab, "formula *", "mu * f * L_tail**4 / EI")
    expect(tab.get_by_text("a pure number", exact=True)).to_be_visible(timeout=WAIT)
    expect(refusal).to_have_count(0)
    expect(tab.get_by_text("The worked example gives its answer.")).to_be_visible()
    expect(tab.get_by_text(f"{np.isfinite(values).sum()} kept runs have all its inputs")).to_be_visible()
    expect(tab.get_by_text("Inputs are taken as independent here")).to_be_visible(timeout=WAIT)
    shot(tab, "number-proved-1024-light")
    save(tab)
    expect(tab.get_by_text(re.compile("Vf is in the registry, version 1"))).to_be_visible(timeout=WAIT)
    shot(tab, "number-saved-1024-light")

    # filter the runs by it: a lower limit typed into the range
    tab.get_by_role("link", name="Runs with it").click()
    every = re.compile(f"any Vf, kept: {np.isfinite(values).sum()} of")
    expect(tab.get_by_text(every)).to_be_visible(timeout=WAIT)
    tab.get_by_role("button", name=re.compile("any Vf|^Range")).first.click()
    tab.get_by_label("from", exact=True).fill("10")
    tab.get_by_label("from", exact=True).press("Enter")
    settled(tab)
    tab.keyboard.press("Escape")
    n = int((values >= 10).sum())
    assert 0 < n < np.isfinite(values).sum()
    expect(tab.get_by_text(re.compile(rf"Vf (>=|≥) 10, kept: {n} of"))).to_be_visible(timeout=WAIT)
    expect(tab.locator("[role=columnheader]", has_text="Vf")).to_be_attached(timeout=WAIT)
    shot(tab, "number-runs-1024-light")

    # plot it
    wide = page(width=1600, height=1000, scheme="dark")
    wide.goto(f"{address}/trends?x=Sp&y=Vf")
    expect(wide.get_by_text(re.compile(r"\d runs drawn")).first).to_be_visible(timeout=WAIT)
    expect(wide.get_by_test_id("stException")).to_have_count(0)
    expect(wide.locator("canvas, svg.marks").first).to_be_visible(timeout=WAIT)
    shot(wide, "number-trend-1600-dark")

    # another version, with a reason
    wide.goto(f"{address}/numbers?number=Vf")
    wide.get_by_role("button", name="Edit").click()
    field = wide.get_by_label("formula *", exact=True)
    expect(field).to_have_value("mu * f * L_tail**4 / EI", timeout=WAIT)
    typed(wide, "formula *", "2 * mu * f * L_tail**4 / EI")
    typed(wide, "its answer *", "8.00")
    save(wide)
    expect(wide.get_by_text(re.compile("why: is missing"))).to_be_visible(timeout=WAIT)
    typed(wide, "reason *", "both sides of the tail")
    save(wide)
    expect(wide.get_by_text(re.compile("Vf is in the registry, version 2"))).to_be_visible(timeout=WAIT)
    wide.get_by_role("button", name="in the list").click()
    expect(wide.get_by_text("own, version 2")).to_be_visible(timeout=WAIT)
    wide.get_by_text("2 versions").click()
    expect(wide.get_by_text(re.compile("because: both sides of the tail"))).to_be_visible()
    expect(wide.get_by_text("2 * mu * f * L_tail**4 / EI", exact=True)).to_be_visible()
    expect(wide.get_by_text("mu * f * L_tail**4 / EI", exact=True)).to_be_visible()
    shot(wide, "number-versions-1600-dark")

    wide.goto(f"{address}/ledger?code=Vf")
    expect(wide.get_by_text(re.compile("both sides of the tail")).first).to_be_visible(timeout=WAIT)
    expect(wide.get_by_text(re.compile("amend number")).first).to_be_visible()
    expect(wide.get_by_text(re.compile("define number")).first).to_be_visible()
    shot(wide, "number-ledger-1600-dark")
    for one in (tab, wide):
        assert one.problems == []
    with Book.open(book) as opened:
        again = opened.runs(columns=("Vf",))["Vf"].to_numpy()
        assert opened.check() == []
    np.testing.assert_allclose(again, 2 * values, rtol=1e-12)


@pytest.mark.parametrize(("size", "scheme"), [((1024, 768), "dark"), ((1600, 1000), "light")])
def test_every_part_stands_in_other_sizes_and_themes(page, served, book, shot, size, scheme):
    with Book.open(book) as opened:
        cells = {"key": "Vf", "name": "viscous stretch", "formula": "mu * f * L_tail**4 / EI",
                 "compares": "drag to bending", "source": "own definition", "answer": "4.00",
                 "example": FIELDS["worked example *"]}  # fmt: skip
        opened.define_number(**cells, by="wren")
    tab = page(width=size[0], height=size[1], scheme=scheme)
    address = served(book)
    for part, word in {"numbers": "Ticks: up to", "numbers&number=Vf": "own, version 1",
                       "new": "Or start from quantities", "new&number=Vf": "Or start from quantities",
                       "regimes": "regime", "dialects": "ialect",
                       "quantities": "accepted units"}.items():  # fmt: skip
        tab.goto(f"{address}/numbers?part={part}")
        expect(tab.get_by_text(re.compile(word)).first).to_be_visible(timeout=WAIT)
        settled(tab)
        expect(tab.get_by_test_id("stException")).to_have_count(0)
        shot(tab, f"numbers-{re.sub('[^a-z]+', '-', part.lower())}-{size[0]}-{scheme}")
        wide = tab.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth")
        assert wide <= 0, f"{part} scrolls sideways by {wide} px"
    assert tab.problems == []
