"""Derivatives, kinks, singular values and surplus joints against closed forms, numpy.linalg.svd and scipy's linear programme."""

import numpy as np
import pytest
from called import called
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import linprog

from pathaudit.kernels import rates

smallest_singular_value, smallest_share = called(rates.smallest_singular_value), called(rates.smallest_share)
SEEDS = st.integers(0, 2**32 - 1)


@given(seed=SEEDS, count=st.integers(5, 40))
def test_quartics_are_differentiated_exactly_on_uneven_times(seed, count):
    random = np.random.default_rng(seed)
    time = np.cumsum(random.uniform(0.5, 1.5, count))
    time -= time.mean()
    # a straight motion with a bend to it, as tool paths are between their corners
    polynomial = np.polynomial.Polynomial([0.0, 3.0, *random.normal(size=3) / [50.0, 1e3, 1e5]])
    first, second = rates.derivatives(time, polynomial(time)[:, None])
    size = np.abs(polynomial(time)).max()
    np.testing.assert_allclose(first[:, 0], polynomial.deriv()(time), atol=1e-10 * size)
    np.testing.assert_allclose(second[:, 0], polynomial.deriv(2)(time), atol=1e-9 * size)


@pytest.mark.parametrize("count", [2, 3, 4])
def test_short_paths_use_all_their_samples(count):
    time = np.linspace(0.0, 1.0, count)
    first, second = rates.derivatives(time, np.stack([3.0 * time, time ** (count - 1)], axis=1))
    np.testing.assert_allclose(first[:, 0], 3.0)
    np.testing.assert_allclose(second[:, 0], 0.0, atol=1e-9)
    np.testing.assert_allclose(first[:, 1], (count - 1) * time ** (count - 2), atol=1e-9)


def test_a_corner_stays_where_it_is():
    """Beside a jump of velocity the rates are those of the straight pieces; at it, the mean, and the jump over one sample's time."""
    time = np.arange(41) * 0.01
    first, second = rates.derivatives(time, np.where(time < 0.2, 5.0 * time, 1.0 - 3.0 * (time - 0.2))[:, None])
    np.testing.assert_allclose(first[:20, 0], 5.0, atol=1e-9)
    np.testing.assert_allclose(first[21:, 0], -3.0, atol=1e-9)
    assert first[20, 0] == pytest.approx(1.0) and second[20, 0] == pytest.approx(-8.0 / 0.01)
    np.testing.assert_allclose(np.delete(second[:, 0], 20), 0.0, atol=1e-8)


def smallest_of(jacobian, bound=0.0):
    n = jacobian.shape[1]
    wide = max(n, 7) + 1
    return smallest_singular_value(np.ascontiguousarray(jacobian), jacobian.shape[0], jacobian.shape[1], bound, np.empty((wide, wide)), np.empty(wide), np.empty(wide))


@settings(deadline=None)
@given(seed=SEEDS, rows=st.sampled_from([5, 6]), n=st.integers(1, 12), weak=st.floats(0.0, 12.0))
def test_smallest_singular_value(seed, rows, n, weak):
    random = np.random.default_rng(seed)
    left, _, right = np.linalg.svd(random.normal(size=(rows, n)), full_matrices=False)
    sigma = np.sort(random.uniform(0.2, 2.0, min(rows, n)))[::-1]
    sigma[-1] *= 10.0**-weak
    jacobian = (left * sigma) @ right
    assert smallest_of(jacobian) == pytest.approx(sigma.min(), rel=1e-7, abs=1e-15)
    assert smallest_of(jacobian, bound=0.9 * sigma.min()) == pytest.approx(sigma.min(), rel=1e-7, abs=1e-15)


@settings(deadline=None)
@given(seed=SEEDS, rows=st.sampled_from([5, 6]))
def test_a_surplus_joint_is_used_as_well_as_it_can_be(seed, rows):
    """Least largest share of the limits over all motions with the same tool motion: scipy.optimize.linprog (HiGHS)."""
    random = np.random.default_rng(seed)
    n = rows + 1
    jacobian, speed, limit = random.normal(size=(rows, n)), random.normal(size=n), random.uniform(0.5, 2.0, n)
    found = smallest_share(jacobian, rows, n, speed, limit, np.empty((n + 1, n + 1)), np.empty(n + 1))
    cost = np.r_[np.zeros(n), 1.0]
    bounds = np.vstack([np.c_[np.eye(n), -limit], np.c_[-np.eye(n), -limit]])
    best = linprog(cost, A_ub=bounds, b_ub=np.zeros(2 * n), A_eq=np.c_[jacobian, np.zeros(rows)], b_eq=jacobian @ speed, bounds=(None, None))
    assert found == pytest.approx(best.fun, rel=1e-6)


def test_shared_out_rows_are_the_same(monkeypatch):
    from example_arms import path_of_motion, swaying

    from pathaudit.motion import follow

    cell, joints = swaying(3)[:2]
    motion = follow(path_of_motion(cell, np.linspace(0, 3, len(joints)), joints), cell, start=joints[0])
    given = cell.chain, 0.5, 6, cell.arm.speed, motion.joints, motion.twist, motion.twist_rate, 0 * joints, 0 * joints
    whole = rates.rates(*given)
    monkeypatch.setattr(rates, "SHARED", 60)
    monkeypatch.setattr(rates.os, "cpu_count", lambda: 4)
    for a, b in zip(whole, rates.rates(*given), strict=True):
        np.testing.assert_allclose(a, b, rtol=1e-12, atol=1e-13)
