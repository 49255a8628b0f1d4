"""Intervals of probabilities: against SciPy's, and how often they hold a probability that is known."""

import numpy as np
import pytest
from scipy.stats import binomtest, t
from tolerant_cells import wrist_bench

from pathaudit.spread.chances import NORMAL, SCRAMBLINGS, STUDENT, chance, scrambling_of, wilson
from pathaudit.spread.judging import Course
from pathaudit.spread.sharing import Job, Shared
from pathaudit.spread.study import drawn


def test_quantiles():
    from statistics import NormalDist

    assert pytest.approx(t.ppf(0.975, SCRAMBLINGS - 1), rel=1e-12) == STUDENT
    assert pytest.approx(NormalDist().inv_cdf(0.975), rel=1e-12) == NORMAL


@pytest.mark.parametrize("hits, draws", [(0, 200), (3, 200), (200, 200), (1000, 2000)])
def test_wilsons_interval_is_scipys(hits, draws):
    reference = binomtest(hits, draws).proportion_ci(method="wilson")
    assert wilson(hits, draws) == pytest.approx((reference.low, reference.high), abs=1e-12)


def test_scramblings_are_as_equal_as_can_be():
    for draws in (100, 2000, 1234):
        counts = np.bincount(scrambling_of(draws))
        assert len(counts) == SCRAMBLINGS and counts.sum() == draws and counts.max() - counts.min() <= 1


def test_an_event_that_was_never_seen_is_not_ruled_out():
    none, every = (chance(np.full(2000, seen), scrambling_of(2000)) for seen in (False, True))
    assert (none.share, none.low, none.draws) == (0.0, 0.0, 0) and none.high == pytest.approx(wilson(0, 2000)[1])
    assert (every.share, every.high, every.draws) == (1.0, 1.0, 2000) and every.low < 1.0


def test_a_common_event_has_students_interval():
    random = np.random.default_rng(1)
    events, which = random.random(2000) < 0.4, scrambling_of(2000)
    shares = events.reshape(SCRAMBLINGS, -1).mean(axis=1)
    reference = t.interval(0.95, SCRAMBLINGS - 1, loc=shares.mean(), scale=shares.std(ddof=1) / np.sqrt(SCRAMBLINGS))
    found = chance(events, which)
    assert (found.low, found.high) == pytest.approx(reference) and found.share == pytest.approx(events.mean())


def beyond_circle(mm, radius, center=0.85):
    """The share of a square of displacements within +-mm whose wrist, at (center, 0) m, is then farther than `radius` from the base."""
    y = (np.arange(200_000) + 0.5) / 100_000 - 1.0
    # the part moves the wrist by (x, y): beyond where x > sqrt(radius^2 - y^2) - center
    edge = np.sqrt(radius**2 - (y * mm / 1000.0) ** 2) - center
    return float(np.clip(0.5 * (1.0 - edge / (mm / 1000.0)), 0.0, 1.0).mean())


def of_limit(limit_deg):
    return np.sqrt(0.5**2 + 0.4**2 + 2 * 0.5 * 0.4 * np.cos(np.radians(limit_deg)))


@pytest.mark.parametrize("limit_deg, draws", [(37.5, 200), (35.0, 200), (40.0, 300)])
def test_the_interval_holds_the_known_probability_as_often_as_it_says(limit_deg, draws):
    """A planar arm whose elbow comes too straight where the wrist is beyond a circle: the probability is an area."""
    audit = wrist_bench(limit_deg, part_xyz_mm=[10.0, 10.0, 0.0])
    truth = beyond_circle(10.0, of_limit(limit_deg))
    course, dimensions = Course.of(audit), audit.cell.tolerances.dimensions
    shared = Shared(Job(course, audit.cell, dimensions), map)
    elbow = next(i for i, w in enumerate(course.watched) if (w.kind, w.joint) == ("joint travel", 1))
    held, widths, errors = 0, [], []
    for seed in range(60):
        levels = shared.levels(drawn(dimensions, draws, seed))[:, elbow]
        found = chance(course.watched[elbow].beyond(levels, "fail"), scrambling_of(draws))
        held += found.low <= truth <= found.high
        widths.append(found.high - found.low)
        errors.append(found.share - truth)
    assert 0.01 < truth < 0.9
    assert held >= 52  # of 60 that hold it 95 times of 100 fewer do once in 200 such tests
    random = np.sqrt(truth * (1.0 - truth) / draws)
    assert abs(np.mean(errors)) < 3.0 * np.std(errors) / np.sqrt(60) and np.std(errors) < 0.8 * random
    assert np.mean(widths) < 1.3 * 2.0 * STUDENT * random
