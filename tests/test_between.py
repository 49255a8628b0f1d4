"""Every bound between two samples against dense sampling of the same motion, and against exact and interval arithmetic."""

from fractions import Fraction
from math import comb

import dense_sampling as reference
import mpmath
import numpy as np
import pytest

from pathaudit import between
from pathaudit.arm import Chain
from pathaudit.measures import tool_jacobians

UNDECIDED = (-np.inf, -np.inf)


def segments(random, n, count, largest=0.3):
    """A random arm with its chain, and the joint motion on `count` intervals that have nothing to do with each other."""
    links, slides, length = reference.random_chain(random, n)
    ends = reference.random_segments(random, slides, count, largest)
    return (links, slides, length), Chain(links, slides.astype(np.uint8)), ends, joints_of(ends)


def joints_of(ends):
    """Each interval by itself, as two samples a row: every other interval of `joints_between` is one between strangers and is dropped."""
    q0, q1, v0, v1, a0, a1, span = ends
    woven = [np.stack(pair, axis=1).reshape(-1, q0.shape[1]) for pair in ((q0, q1), (v0, v1), (a0, a1))]
    return between.joints_between(np.cumsum(np.stack([np.ones(len(span)), span[:, 0]], axis=1).ravel()), *woven).part(slice(0, None, 2))


def samples_of(chain, length, rows, ends):
    both = [tool_jacobians(chain, length, rows, q) for q in ends[:2]]
    task = np.stack([found[2] for found in both], axis=1)
    return both, task, np.linalg.svd(task, compute_uv=False)[..., -1]


def bounds(chain, length, rows, ends, joints, goals):
    """The Sigma of the segments, with the bounds that lie open at the samples."""
    _, task, sigma = samples_of(chain, length, rows, ends)
    h = joints.span_s[:, None]
    speed, acceleration = between.peaks(joints)
    arms = between.lever_arms(chain, np.abs(np.stack(between.span(joints.position))).max(axis=0))
    least = sigma.min(axis=1)
    first = np.where(least >= goals[0], goals[0], np.where(least >= goals[1], goals[1], -np.inf))
    second = np.where(least >= goals[1], goals[1], -np.inf)
    return between.certify(chain, length, rows, joints, arms, sigma, task, speed * h, acceleration * h**2, np.stack([first, second], axis=1)), least


def densely(arm, rows, ends, joints, places=33):
    """Least sigma_min, and how far joints go beyond their extremes, on `places` places of every segment: by code that is not the package's."""
    links, slides, length = arm
    q0, q1, v0, v1, a0, a1, span = ends
    power = reference.quintic(joints.span_s[:, None], q0, q1, v0, v1, a0, a1)
    low, high = between.span(joints.position)
    speed, acceleration = between.peaks(joints)
    size = [np.abs(c).max(axis=0) for c in (joints.position, joints.speed, joints.acceleration)]
    least, over = np.full(len(q0), np.inf), -np.inf
    for t in np.linspace(0.0, 1.0, places):
        q, v, a = (reference.value(power, t * joints.span_s[:, None], order) for order in range(3))
        h = joints.span_s[:, None]
        over = max(
            over, ((q - high) / (1.0 + size[0])).max(), ((low - q) / (1.0 + size[0])).max(),
            ((np.abs(v) - speed) * h / (size[1] + size[0] * 1e-3)).max(), ((np.abs(a) - acceleration) * h**2 / (size[2] + size[0] * 1e-3)).max(),
        )  # fmt: skip
        least = np.minimum(least, reference.sigma_min(links, slides, length, rows, q))
    return least, over


def worst_of(random, rounds, count):
    """Over arms and segments drawn at random: the worst excess of joints and of sigma_min, and the slack of the latter by size of step."""
    over, beyond, slack = -np.inf, -np.inf, []
    for _ in range(rounds):
        n, rows = int(random.integers(2, 10)), int(random.choice([5, 6]))
        arm, chain, ends, joints = segments(random, n, count)
        least, excess = densely(arm, rows, ends, joints)
        over = max(over, excess)
        for goals in (UNDECIDED, (0.06, 0.02)):
            found, _ = bounds(chain, arm[2], rows, ends, joints, goals)
            beyond = max(beyond, (found.bound - least).max())
            assert (found.bound <= found.least).all()
            if goals == UNDECIDED:
                slack.append(np.stack([np.abs(ends[1] - ends[0]).max(axis=1), 1.0 - found.bound / np.maximum(least, 1e-300)], axis=1)[least > 0.01])
    return over, beyond, np.concatenate(slack)


def test_no_bound_is_ever_passed():
    over, beyond, _ = worst_of(np.random.default_rng(1), rounds=40, count=60)
    assert over <= 1e-14 and beyond <= 1e-13


def test_the_dense_sampling_would_tell():
    """A bound that is too high by a thousandth, or a bending that is left out, is passed: the adversary above has teeth."""
    random, higher, straight = np.random.default_rng(2), 0, 0
    for _ in range(20):
        arm, chain, ends, joints = segments(random, 6, 60)
        least, _ = densely(arm, 6, ends, joints)
        higher += (bounds(chain, arm[2], 6, ends, joints, UNDECIDED)[0].bound * 1.001 > least).sum()
        _, task, sigma = samples_of(chain, arm[2], 6, ends)
        change = np.linalg.norm(task[:, 1] - task[:, 0], axis=(1, 2))
        straight += (between.chord_bound(sigma[:, 0], sigma[:, 1], change, np.zeros(60)) > least * (1 + 1e-9)).sum()
    assert higher > 10 and straight > 3


def test_small_steps_are_bounded_closely():
    """At steps up to 0.01 rad the bound is mostly within 5 percent of the least, without looking at any posture between."""
    _, _, slack = worst_of(np.random.default_rng(3), rounds=20, count=60)
    assert np.median(slack[slack[:, 0] < 0.01, 1]) < 0.05


def test_extremes_hold_in_exact_arithmetic():
    """OUTWARD against rational numbers: the polynomial that the floats state, at places all over the interval."""
    _, _, ends, _ = segments(np.random.default_rng(4), 5, 40)
    joints = joints_of(ends)
    low, high = between.span(joints.position)
    speed, acceleration = between.peaks(joints)
    for k in range(0, 40, 2):
        for j in range(5):
            h = Fraction(float(joints.span_s[k]))
            q0, q1, v0, v1, a0, a1 = (Fraction(float(values[k, j])) for values in ends[:6])
            c = [q0, q0 + h * v0 / 5, q0 + 2 * h * v0 / 5 + h * h * a0 / 20, q1 - 2 * h * v1 / 5 + h * h * a1 / 20, q1 - h * v1 / 5, q1]
            for t in (Fraction(i, 24) for i in range(25)):
                b = [comb(5, i) * t**i * (1 - t) ** (5 - i) for i in range(6)]
                place = sum(x * y for x, y in zip(b, c, strict=True))
                rate = sum(comb(4, i) * t**i * (1 - t) ** (4 - i) * 5 * (c[i + 1] - c[i]) for i in range(5)) / h
                change = sum(comb(3, i) * t**i * (1 - t) ** (3 - i) * 20 * (c[i + 2] - 2 * c[i + 1] + c[i]) for i in range(4)) / h**2
                assert Fraction(float(low[k, j])) <= place <= Fraction(float(high[k, j]))
                assert abs(rate) <= Fraction(float(speed[k, j])) and abs(change) <= Fraction(float(acceleration[k, j]))


@pytest.mark.parametrize("degree", [3, 4, 5])
def test_extremes_are_reached(degree):
    c = np.random.default_rng(degree).normal(0.0, 1.0, (degree + 1, 400))
    values = between.bernstein(c[:, None], np.linspace(0.0, 1.0, 2001)[:, None])
    low, high = between.span(c)
    peak = np.abs(values).max(axis=0)
    assert np.all(between.largest(c) >= peak) and np.all(between.largest(c) <= peak + 1e-4)
    assert np.all(low <= values.min(axis=0)) and np.all(high >= values.max(axis=0)) and np.all(high - low <= np.ptp(values, axis=0) + 1e-4)
    first, second = between.halves(c)
    np.testing.assert_allclose(np.maximum(between.largest(first), between.largest(second)), between.largest(c), rtol=1e-9)


def test_what_an_end_shows_is_exact():
    """Nothing is searched for, and nothing lost, where a joint moves evenly."""
    still = np.zeros((2, 1))
    joints = between.joints_between(np.array([0.0, 0.1]), np.array([[1.0], [1.2]]), np.full((2, 1), 2.0), still)
    speed, acceleration = between.peaks(joints)
    assert speed[0, 0] == pytest.approx(2.0, rel=1e-11) and acceleration[0, 0] < 1e-10
    low, high = between.span(joints.position)
    assert (low[0, 0], high[0, 0]) == (pytest.approx(1.0, abs=1e-11), pytest.approx(1.2, abs=1e-11))


# -------------------------------------------------------------------------------------------- rounding, and interval arithmetic


def exact_jacobian(number, arm, rows, q):
    """Task Jacobian as nested lists, in the arithmetic of `number` (mpmath's mp or iv)."""
    links, slides, length = arm
    m = number.matrix
    exact = [[[number.mpf(float(x)) for x in row] for row in link] for link in links]
    pose, axes, origins = m(exact[0]), [], []
    for i, slide in enumerate(slides):
        axes.append([pose[r, 2] for r in range(3)])
        origins.append([pose[r, 3] for r in range(3)])
        move = number.eye(4)
        if slide:
            move[2, 3] = q[i]
        else:
            c, s = number.cos(q[i]), number.sin(q[i])
            move[0, 0], move[0, 1], move[1, 0], move[1, 1] = c, -s, s, c
        pose = pose * move * m(exact[i + 1])
    rows_of = []
    for i, slide in enumerate(slides):
        x, y, z = axes[i]
        r = [pose[j, 3] - origins[i][j] for j in range(3)]
        linear = axes[i] if slide else [y * r[2] - z * r[1], z * r[0] - x * r[2], x * r[1] - y * r[0]]
        both = [part / number.mpf(float(length)) for part in linear], [number.mpf(0)] * 3 if slide else axes[i]
        rows_of.append([sum((pose[j, c] * part[j] for j in range(3)), number.mpf(0)) for part in both for c in range(3)][:rows])
    return [[rows_of[i][r] for i in range(len(slides))] for r in range(rows)]


def test_the_margin_covers_rounding():
    """sigma_min of the package against 40 digits: what MARGIN takes off is at least ten times what rounding does, beside singular places too."""
    from pathaudit.kernels import rates

    random, worst = np.random.default_rng(5), 0.0
    for _ in range(12):
        n = int(random.integers(2, 9))
        arm, chain, ends, _ = segments(random, n, 3)
        q = ends[0]
        still = np.zeros((3, n))
        ours = rates.rates(chain, arm[2], 6, np.ones(n), q, np.zeros((3, 6)), np.zeros((3, 6)), still, still)[2][:, 0]
        again, task, _ = samples_of(chain, arm[2], 6, (q, q))
        with mpmath.workdps(40):
            for k in range(3):
                exact = mpmath.matrix(exact_jacobian(mpmath.mp, arm, 6, [mpmath.mpf(float(x)) for x in q[k]]))
                sigma = float(min(mpmath.svd_r(exact, compute_uv=False)))
                norm = np.linalg.norm(task[k, 0])
                for value in (ours[k], np.linalg.svd(task[k, 0], compute_uv=False)[-1]):
                    worst = max(worst, (value - sigma) / (between.MARGIN * (1.0 + norm)))
    assert worst < 0.1


def positive(matrix):
    """Whether a symmetric matrix of intervals is positive definite for certain: all pivots of its elimination are."""
    a, size = [list(row) for row in matrix], len(matrix)
    for k in range(size):
        if not a[k][k].a > 0:
            return False
        for i in range(k + 1, size):
            factor = a[i][k] / a[k][k]
            for j in range(k + 1, size):
                a[i][j] -= factor * a[k][j]
    return True


def holds_in_intervals(arm, rows, ends, span, k, bound):
    """sigma_min >= bound on segment k for certain, by halving it until interval arithmetic says so on every piece."""
    iv = mpmath.iv
    n = ends[0].shape[1]
    h = iv.mpf(float(span))
    q0, q1, v0, v1, a0, a1 = ([iv.mpf(float(x)) for x in values[k]] for values in ends[:6])
    control = [
        [q0[j], q0[j] + h * v0[j] / 5, q0[j] + 2 * h * v0[j] / 5 + h * h * a0[j] / 20, q1[j] - 2 * h * v1[j] / 5 + h * h * a1[j] / 20,
         q1[j] - h * v1[j] / 5, q1[j]]
        for j in range(n)
    ]  # fmt: skip

    def holds(control, depth):
        hull = [iv.mpf([min(float(c.a) for c in joint), max(float(c.b) for c in joint)]) for joint in control]
        jacobian = exact_jacobian(iv, arm, rows, hull)
        wide = n >= rows
        vectors = jacobian if wide else [[jacobian[r][i] for r in range(rows)] for i in range(n)]
        gram = [[sum((x * y for x, y in zip(u, v, strict=True)), iv.mpf(0)) for v in vectors] for u in vectors]
        for i in range(len(gram)):
            gram[i][i] -= iv.mpf(float(bound)) ** 2
        if positive(gram):
            return True
        if depth == 0:
            return False
        left, right = [], []
        for joint in control:
            rows_, first, last = joint, [joint[0]], [joint[-1]]
            while len(rows_) > 1:
                rows_ = [(x + y) / 2 for x, y in zip(rows_[:-1], rows_[1:], strict=True)]
                first.append(rows_[0])
                last.append(rows_[-1])
            left.append(first)
            right.append(last[::-1])
        return holds(left, depth - 1) and holds(right, depth - 1)

    return holds(control, 12)


@pytest.mark.parametrize("n, rows", [(2, 6), (3, 6), (6, 6), (6, 5)])
def test_the_certificate_holds_in_interval_arithmetic(n, rows):
    """Nothing of the certificate is used: sines, products and an elimination, all in intervals."""
    random, checked = np.random.default_rng(10 * n + rows), 0
    while checked < (1 if n == 6 else 3):
        arm, chain, ends, joints = segments(random, n, 40)
        found, least = bounds(chain, arm[2], rows, ends, joints, UNDECIDED)
        dense, _ = densely(arm, rows, ends, joints)
        step = np.abs(ends[1] - ends[0]).max(axis=1)
        loose = np.flatnonzero((found.bound > 0.05) & (found.bound < 0.93 * dense) & (step > 0.01))  # what intervals can tell in reasonable time
        if len(loose):
            k = loose[0]
            assert holds_in_intervals(arm, rows, ends, joints.span_s[k], k, found.bound[k])
            checked += 1


# ------------------------------------------------------------------------------------------------------------------- the tool


@pytest.mark.parametrize("free", [False, True])
def test_the_tool_strays_no_farther_than_the_bound(free):
    random, shares = np.random.default_rng(6), []
    for _ in range(10):
        n = int(random.integers(2, 10))
        arm, chain, ends, joints = segments(random, n, 24)
        both, _, _ = samples_of(chain, arm[2], 6, ends)
        h = joints.span_s[:, None]
        speed, acceleration = between.peaks(joints)
        power = reference.quintic(joints.span_s[:, None], *ends[:6])
        t = np.linspace(0.0, 1.0, 33)
        for k in range(24):
            one = joints.part(slice(k, k + 1))
            poses, jacobians = (np.stack([found[i][k] for found in both]) for i in (0, 1))
            off, turned = (values[0] for values in between.stray(chain, free, one, poses, jacobians, (speed * h)[k : k + 1], (acceleration * h**2)[k : k + 1]))
            q = reference.value(power[:, k][:, None], (t * joints.span_s[k])[:, None])
            path = reference.forward(arm[0], arm[1], q)[0]
            true = reference.off_line(path[:, :3, 3], path[0, :3, 3], path[-1, :3, 3]).max()
            assert true <= off + 1e-13
            shares.append(true / off if true > 1e-7 else np.nan)
            if turned < 0.5 * np.pi:
                first, last = path[0, :3, :3], path[-1, :3, :3]
                beside = reference.off_arc(path[:, :3, 2], first[:, 2], last[:, 2]) if free else reference.off_turn(path[:, :3, :3], first, last)
                grain = 0.0 if free else np.arccos(np.clip((np.trace(first.T @ last) - 1) / 2, -1, 1)) / 199  # between the places tried on the turn
                assert beside.max() <= turned + grain + 3e-8
    assert np.nanmedian(shares) > 0.5  # and mostly not much farther
