"""Repeat groups: who is alike, and scatter against the bars, by the Particle Data Group's kaon mass."""

import numpy as np
import pytest
from scipy.stats import chi2, chisquare

from labbook.errors import Refusal
from labbook.physics.repeats import alike, repeats

# charged kaon mass, MeV, Review of Particle Physics: Denisov, Gall, Barkov, Cheng, Backenstoss; its rule on
# imprecise values leaves Lum's 0.054 out of the scale factor; values from memory
KAON = np.array([493.696, 493.636, 493.670, 493.657, 493.691])
U_KAON = np.array([0.007, 0.011, 0.029, 0.020, 0.040])


def test_kaon_mass_and_its_scale_factor():
    r = repeats(y=KAON, u_own=U_KAON, sets=np.zeros(5, int))
    # pdgLive S010, read: 493.677 +- 0.013 MeV, S = 2.4, given to these digits
    assert r.mean[0] == pytest.approx(493.677, abs=5e-4)
    assert r.birge[0] == pytest.approx(2.4, abs=0.05)
    assert r.u_mean[0] * r.birge[0] == pytest.approx(0.013, abs=5e-4)
    assert r.pooled_birge == pytest.approx(r.birge[0])


def test_probability_is_that_of_the_tables():
    # chi-square of 7.815 with 3 degrees of freedom: 5 % (any table; scipy.stats.chisquare agrees)
    y = np.array([0.0, 0.0, 1.0, 1.0]) * np.sqrt(7.815)
    r = repeats(y=y, u_own=1.0, sets=np.zeros(4, int))
    assert r.chi_square[0] == pytest.approx(7.815, rel=1e-12)
    assert r.p[0] == pytest.approx(0.05, abs=2e-5)
    counts = np.array([18.0, 25.0, 30.0, 27.0])
    r = repeats(y=counts, u_own=np.sqrt(counts.mean()), sets=np.zeros(4, int))
    assert r.p[0] == pytest.approx(chisquare(counts).pvalue, rel=1e-12)


def test_means_and_scatter_are_numpys():
    rng = np.random.default_rng(0)
    sets, y, u = rng.integers(0, 5, 60), rng.normal(size=60), rng.uniform(0.5, 2.0, 60)
    r = repeats(y=y, u_own=u, sets=sets)
    for g in range(len(r.n)):
        of = r.group == g
        assert len(set(sets[of])) == 1 and r.n[g] == of.sum()
        assert r.mean[g] == pytest.approx(np.average(y[of], weights=u[of] ** -2))
        assert r.plain_mean[g] == pytest.approx(y[of].mean())
        assert r.scatter[g] == pytest.approx(y[of].std(ddof=1))
        assert r.over_stated[g] == pytest.approx(y[of].std(ddof=1) / np.sqrt(np.mean(u[of] ** 2)))
        assert r.u_mean[g] == pytest.approx(np.sum(u[of] ** -2) ** -0.5)
    assert r.pooled_p == pytest.approx(chi2.sf(r.chi_square.sum(), np.sum(r.n - 1)))


def test_what_a_group_shares_cancels():
    # a shared error of any size moves a group as one; only own u is asked for, and nothing changes
    rng = np.random.default_rng(1)
    y, sets = rng.normal(size=40), np.repeat(np.arange(10), 4)
    a = repeats(y=y, u_own=1.0, sets=sets)
    b = repeats(y=y + 100.0 * rng.normal(size=10)[sets], u_own=1.0, sets=sets)
    assert b.chi_square == pytest.approx(a.chi_square, abs=1e-9)
    assert b.pooled_p == pytest.approx(a.pooled_p, abs=1e-9)


def test_honest_bars_are_called_too_short_at_the_stated_rate():
    rng = np.random.default_rng(2)
    r = repeats(y=rng.normal(size=6000), u_own=1.0, sets=np.repeat(np.arange(2000), 3))
    assert 0.05 - 4 * 0.0049 < np.mean(r.p < 0.05) < 0.05 + 4 * 0.0049  # four binomial standard deviations
    short = repeats(y=rng.normal(size=90), u_own=0.5, sets=np.repeat(np.arange(30), 3))
    assert short.pooled_p < 1e-6 and short.pooled_birge == pytest.approx(2.0, rel=0.3)


def test_runs_by_themselves_and_without_speed_are_in_no_group():
    r = repeats(y=[1.0, 2.0, np.nan, 3.0, 4.0], u_own=0.1, sets=[7, 7, 7, 3, 5])
    assert r.group.tolist() == [0, 0, -1, -1, -1] and r.n.tolist() == [2]
    none = repeats(y=[1.0, 2.0], u_own=0.1, sets=[1, 2])
    assert len(none.n) == 0 and none.pooled_dof == 0 and np.isnan(none.pooled_p)


def test_without_bars_scatter_is_not_compared():
    r = repeats(y=[1.0, 2.0, 5.0, 5.5], u_own=[0.0, 0.1, 0.1, 0.1], sets=[0, 0, 1, 1])
    assert np.isnan(r.p[0]) and np.isnan(r.over_stated[0]) and r.scatter[0] == pytest.approx(0.5**0.5)
    assert r.pooled_dof == 1 and r.pooled_p == pytest.approx(r.p[1])


def sets(f, swimmer=None, **more):
    return alike(identities=[swimmer or ["a"] * len(f)], settings=[np.array(f, float)], **more).tolist()


def test_settings_within_the_tolerance_are_alike():
    assert sets([0.5, 0.502, 0.51, 0.5]) == [0, 0, 1, 0]
    assert sets([0.5, 0.502, 0.51, 0.5], tolerance=0.0) == [0, 1, 2, 0]
    assert sets([0.1 + 0.2, 0.3], tolerance=0.0) == [0, 0]  # 0.30000000000000004
    assert sets([0.5, 0.502, 0.51], tolerance=0.03) == [0, 0, 0]


def test_groups_do_not_creep():
    # each is 0.4 % above the last: within the tolerance of its neighbour, not of the first
    assert sets(1.004 ** np.arange(5)) == [0, 0, 1, 1, 2]


def test_unwritten_settings_equal_only_unwritten_ones():
    assert sets([np.nan, 0.5, np.nan]) == [0, 1, 0]
    assert sets([0.0, 0.0, 1e-9]) == [0, 0, 1]


def test_every_key_counts():
    number = alike(
        identities=[["a", "a", "b", "a"], ["oil"] * 4],
        settings=[[1.0, 1.0, 1.0, 1.0], [0.1, 0.2, 0.1, 0.1], [np.nan] * 4],
    )
    assert number.tolist() == [0, 1, 2, 0]


def test_each_setting_can_have_its_tolerance():
    number = alike(identities=[["a"] * 2], settings=[[1.0, 1.02], [0.1, 0.1001]], tolerance=[0.03, 0.0])
    assert number.tolist() == [0, 1]


@pytest.mark.parametrize(
    "given",
    [
        {"identities": [["a"]], "settings": [[1.0, 2.0]]},
        {"identities": [], "settings": []},
        {"identities": [["a"]], "settings": [[1.0]], "tolerance": -0.1},
    ],
)
def test_keys_that_do_not_fit_are_refused(given):
    with pytest.raises(Refusal):
        alike(**given)


@pytest.mark.parametrize(
    "given",
    [
        {"y": [1.0, 2.0], "u_own": [0.1, 0.1, 0.1], "sets": [0, 0]},
        {"y": [1.0, 2.0], "u_own": 0.1, "sets": [0]},
        {"y": [1.0, 2.0], "u_own": -0.1, "sets": [0, 0]},
    ],
)
def test_values_that_do_not_fit_are_refused(given):
    with pytest.raises(Refusal):
        repeats(**given)
