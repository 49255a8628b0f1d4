"""Retiming by hand: what is asked for is what is given, ramps that the joints can follow, locks that hold."""

import numpy as np
import pytest
from example_arms import SWAY_TIME, path_of_motion, swaying, swaying_audit
from hypothesis import given, settings
from hypothesis import strategies as st

import pathaudit as pa
from pathaudit.by_hand import RAMP, by_hand
from pathaudit.edits import Edits, Lock, Slow


@pytest.fixture(scope="module")
def audit():
    """A motion that keeps every limit as programmed."""
    cell, joints = swaying(2)[:2]
    time = 4.0 * np.asarray(SWAY_TIME)
    made = pa.audit(path_of_motion(cell, time, joints), cell, start=joints[0])
    assert not [f for f in made.finding_list if f.kind in ("joint speed", "joint acceleration")]
    return made


@pytest.fixture(scope="module")
def failing():
    """A motion that passes speed and acceleration limits as programmed."""
    return swaying_audit(2)


def test_without_edits_the_programme_stands(failing):
    again = by_hand(failing.rates, Edits())
    np.testing.assert_array_equal(again.time, failing.time)
    assert (again.factor == 1.0).all() and not again.feasible and "as programmed" in again.why


@settings(max_examples=40, deadline=None)
@given(st.data())
def test_the_stretch_runs_at_its_factor_and_the_rest_returns_to_the_programme(audit, data):
    n = audit.path.samples
    first, last = sorted(data.draw(st.tuples(st.integers(0, n - 1), st.integers(0, n - 1))))
    factor = data.draw(st.floats(0.1, 0.95))
    again = by_hand(audit.rates, Edits().plus(Slow(first, last, factor)))
    assert (again.factor <= 1.0).all() and (np.diff(again.time) >= np.diff(audit.time) * (1 - 1e-12)).all()
    assert again.factor[first : last + 1].max() <= factor * (1 + 1e-12)
    assert again.factor[first : last + 1].min() >= factor * (1 - 1e-9)  # this motion's limits leave room for it
    ramp = (1.0 - factor) / RAMP
    away = (audit.time < audit.time[first] - ramp - 1e-9) | (audit.time > audit.time[last] + ramp + 1e-9)
    np.testing.assert_allclose(again.factor[away], 1.0, atol=1e-9)


def test_slower_never_raises_a_speed_share_and_the_joints_stay(audit):
    again = by_hand(audit.rates, Edits().plus(Slow(30, 90, 0.4)))
    judged = again.audit()
    np.testing.assert_allclose(judged.joints, audit.joints, rtol=0, atol=1e-12)
    assert (again.speed_share <= audit.rates.speed_share + 1e-3).all()
    assert again.feasible and "down to 40 %" in again.why
    assert not [f for f in judged.finding_list if f.kind in ("joint speed", "joint acceleration") and f.severity == "fail"]


def test_a_stretch_far_away_does_not_change_a_place_that_fails(failing):
    n = failing.path.samples
    again = by_hand(failing.rates, Edits().plus(Slow(n - 20, n - 1, 0.5)))
    early = again.factor[: n - 120]
    np.testing.assert_array_equal(early, 1.0)
    assert not again.feasible


def test_a_lock_holds_against_ramps_from_both_sides(audit):
    value = Edits().plus(Slow(0, audit.path.samples - 1, 0.3)).plus(Lock(100, 140))
    again = by_hand(audit.rates, value)
    assert again.factor[100:141].min() >= 1.0 - 1e-9
    assert again.factor[0] == pytest.approx(0.3) and again.factor[60] < 1.0
    assert "cannot be kept" not in again.why


def test_a_lock_without_room_beside_it_is_told():
    cell, joints = swaying(2)[:2]
    audit = pa.audit(path_of_motion(cell, 1.2 * np.asarray(SWAY_TIME), joints), cell, start=joints[0])
    n = audit.path.samples
    tight = np.zeros(n, bool)
    tight[1::2] = True  # every second sample is locked
    value = Edits()
    for k in np.flatnonzero(tight):
        value = value.plus(Lock(int(k), int(k)))
    again = by_hand(audit.rates, value.plus(Slow(0, n - 1, 0.2)))
    kept = again.factor[tight].min() >= 1.0 - 1e-6
    assert kept != ("cannot be kept" in again.why)


def test_the_whole_suggestion_taken_over_is_the_suggestion(failing):
    for style in ("local", "even"):
        again = failing.retime(style)
        taken = by_hand(failing.rates, Edits().accept(0, failing.path.samples - 1, style), (again,))
        np.testing.assert_allclose(taken.time, again.time, rtol=1e-9, atol=1e-9)
        assert taken.feasible
