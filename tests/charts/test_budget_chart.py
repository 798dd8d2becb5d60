"""The bars of an uncertainty budget: two looks under two headings, the shares in numbers, small ones together."""

import pytest

from labbook.charts.budget_chart import budget_chart, share_in_words

ROWS = [
    dict(name="swimmer: D tube outer diameter", own=False, share=0.50),
    dict(name="material: E modulus readings", own=False, share=0.24),
    dict(name="f drive frequency", own=True, share=0.20),
    dict(name="fluid: viscosity readings", own=False, share=0.053),
    dict(name="swimmer: d_in tube inner diameter", own=False, share=0.004),
    dict(name="fluid: density correlation", own=False, share=0.002),
    dict(name="T fluid temperature", own=True, share=0.001),
]  # fmt: skip


def drawn(rows=ROWS, **options):
    return budget_chart(rows, **options).to_dict()


def test_each_source_has_a_bar_as_long_as_its_share_and_its_share_written(samples):
    spec = drawn()
    own, shared = samples.rows(spec, "budget_own"), samples.rows(spec, "budget_shared")
    assert [bar["share"] for bar in own] == [0.20, 0.001]
    assert [bar["share"] for bar in shared] == [0.50, 0.24, 0.053, 0.006]  # the last two together
    names = samples.rows(spec, "budget_names")
    assert [(row["name"], row["text"]) for row in names] == [
        ("f drive frequency", "20 %"), ("T fluid temperature", "0.1 %"),
        ("swimmer: D tube outer diameter", "50 %"), ("material: E modulus readings", "24 %"),
        ("fluid: viscosity readings", "5 %"), ("2 smaller ones", "0.6 %"),
    ]  # fmt: skip
    # the whole width is the whole variance
    for name in ("budget_own", "budget_shared"):
        assert samples.layer(spec, name)["encoding"]["x"]["scale"]["domain"] == [0, 1]


def test_own_and_shared_differ_by_pattern_and_heading_as_well_as_by_colour(samples):
    spec = drawn()
    solid, striped = samples.layer(spec, "budget_own")["mark"], samples.layer(spec, "budget_shared")["mark"]
    assert solid["type"] == "rect" and "strokeDash" not in solid
    assert striped["strokeDash"] == [3, 2]
    headings = samples.rows(spec, "budget_headings")
    assert [(row["name"], row["text"]) for row in headings] == [
        ("this run's own", "20 %"), ("shared with other runs", "80 %")
    ]  # fmt: skip
    at = {row["name"]: row["at"] for row in (*headings, *samples.rows(spec, "budget_names"))}
    own = [at["f drive frequency"], at["T fluid temperature"]]
    assert headings[0]["at"] < min(own) and max(own) < headings[1]["at"]


def test_nothing_overlaps_and_everything_is_inside(samples):
    spec = drawn()
    marks = sorted(
        [(bar["top"], bar["bottom"]) for k in ("own", "shared") for bar in samples.rows(spec, f"budget_{k}")]
        # letters of 12 pixels reach 6 above and below their middle
        + [(r["at"] - 6, r["at"] + 6) for k in ("headings", "names") for r in samples.rows(spec, f"budget_{k}")]
    )
    assert all(bottom <= top for (_, bottom), (top, _) in zip(marks, marks[1:], strict=False))
    assert 0 <= marks[0][0] and marks[-1][1] <= spec["height"]


def test_a_group_without_a_source_says_so(samples):
    spec = drawn([row for row in ROWS if not row["own"]])
    assert [row["text"] for row in samples.rows(spec, "budget_headings")] == ["nothing", "80 %"]
    assert samples.rows(spec, "budget_own") == []


def test_both_themes_and_no_outside_address(samples):
    light, dark = drawn(), drawn(dark=True)
    assert light["config"] != dark["config"]
    assert samples.layer(light, "budget_own")["mark"]["fill"] != samples.layer(dark, "budget_own")["mark"]["fill"]
    assert samples.addresses(light) == []


@pytest.mark.parametrize(("share", "text"), [
    (1.0, "100 %"), (0.594, "59 %"), (0.0096, "1 %"), (0.0094, "0.9 %"), (0.003, "0.3 %"), (0.0005, "0.1 %"),
    (0.0004, "below 0.1 %"),
])  # fmt: skip
def test_a_share_in_words(share, text):
    assert share_in_words(share) == text
