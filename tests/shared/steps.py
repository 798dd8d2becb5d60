"""What a user does on a page, as browser tests do it: wait until it has run, type into a field."""

from playwright.sync_api import expect

WAIT = 30_000  # ms: a busy machine is no reason for red


def settled(tab) -> None:
    """Wait until the page has run again."""
    tab.wait_for_timeout(400)
    expect(tab.get_by_test_id("stStatusWidget")).to_have_count(0, timeout=WAIT)


def typed(tab, label: str, text: str) -> None:
    """Type into a field and leave it; the page has run again when the field still holds the text."""
    field = tab.get_by_label(label, exact=True)
    field.fill(text)
    field.press("Tab")
    settled(tab)
    expect(field).to_have_value(text)
