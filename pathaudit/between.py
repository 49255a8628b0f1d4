"""The motion between two samples, and what holds on all of it: exact extremes of the joints, certified bounds of what the chain makes of them.

The motion that is meant: from one sample to the next every joint runs along the quintic in time that has, at both samples, the position, the speed
and the acceleration that were measured there. It passes through every sample just as it was judged and is smooth there; a controller may move otherwise.
N samples bound N - 1 intervals; on each the time is t in [0, 1], and derivatives are by t unless a name says otherwise.

Polynomials are kept as Bernstein coefficients, between whose least and largest they stay (Farin, Curves and Surfaces for CAGD, ch. 5 and 6).
"""

from dataclasses import dataclass
from math import comb

import numpy as np

from .measures import tool_jacobians

HALVINGS = 26  # of a bracket in [0, 1]: what is left, squared, is below rounding, and an extreme is flat
OUTWARD = 1e-12  # of its largest coefficient, by which an extreme of a polynomial is moved outwards; rounding is below 1e-14 of it
MARGIN = 1e-10  # by which, for each unit of the Jacobian's norm, a bound of sigma_min is lowered; see `certify`
FINEST = 2.0**-10  # of an interval, the smallest piece
MOST_POINTS = 100  # postures looked at inside one interval
NEAR_ENOUGH = 0.9  # of the least sigma_min met: once it is flagged, a bound that is proven to this share ends the search for a lower one
CLOSE_ENOUGH = 2.0**-6  # of an interval: the smallest piece in that search
STRAY_PIECES = 8  # at most, into which an interval is cut to bound how far the tool strays
STRAY_REST = 1e-6  # m or rad: a remainder below this needs no finer cut
BLOCK = 4096  # intervals worked on at once, so that a long path needs little more room than what it keeps


# ------------------------------------------------------------------------------------------------------------- polynomials


def bernstein(coefficients, t):
    """Values of polynomials: coefficients (d + 1, ...), t in [0, 1], broadcast against the rest."""
    degree, s = len(coefficients) - 1, 1.0 - t
    return sum(comb(degree, i) * t**i * s ** (degree - i) * c for i, c in enumerate(coefficients))


def slopes(coefficients):
    """(d, ...) coefficients of the derivative of polynomials with coefficients (d + 1, ...)."""
    return (len(coefficients) - 1) * np.diff(coefficients, axis=0)


def turning_points(coefficients):
    """(m, M) all places in [0, 1] where polynomials (d + 1, M), d of 3 or more, have a slope of zero, and places where they have not: 0, 1, others.

    Between the turning points of the slope the slope is monotone, so halving finds its zero there, if it has one.
    """
    slope = slopes(coefficients)
    if len(slope) == 3:
        return _zeros_of_parabola(*slope)
    brackets = np.sort(turning_points(slope), axis=0)
    powers = [comb(len(slope) - 1, j) * np.diff(slope, j, axis=0)[0] for j in range(len(slope))]
    low, width = brackets[:-1].copy(), np.diff(brackets, axis=0)
    falling = _horner(powers, brackets[1:]) <= 0.0
    for _ in range(HALVINGS):
        width *= 0.5
        low += width * ((_horner(powers, low + width) <= 0.0) != falling)
    return np.concatenate([brackets, low])


def _horner(powers, t):
    value = powers[-1]
    for c in powers[-2::-1]:
        value = value * t + c
    return value


def _zeros_of_parabola(first, second, third):
    """(4, M) 0, 1 and the zeros in [0, 1] of parabolas with these Bernstein coefficients, or other places."""
    b, a = second - first, first - 2.0 * second + third  # a t^2 + 2 b t + first
    q = -(b + np.copysign(np.sqrt(np.maximum(b * b - a * first, 0.0)), b))
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        zeros = np.stack([np.zeros_like(a), q / a, first / q, np.ones_like(a)])
    return np.clip(np.nan_to_num(zeros, nan=0.0), 0.0, 1.0)


def halves(coefficients):
    """Coefficients (d + 1, ...) of polynomials on [0, 1/2] and on [1/2, 1] (de Casteljau)."""
    degree = len(coefficients) - 1
    split = np.array([[comb(i, j) / 2.0**i if j <= i else 0.0 for j in range(degree + 1)] for i in range(degree + 1)])
    return np.tensordot(split, coefficients, 1), np.tensordot(split[::-1, ::-1], coefficients, 1)


def largest(coefficients):
    """(...) the largest absolute values on [0, 1] of polynomials (d + 1, ...), moved outwards.

    Where no inner coefficient is larger than both at the ends, the largest value stands at an end.
    """
    size = np.abs(coefficients)
    ends, inner = np.maximum(size[0], size[-1]), size[1:-1].max(axis=0)
    peak, hidden = ends.copy(), inner > ends
    if hidden.any():
        part = coefficients[:, hidden]
        peak[hidden] = np.maximum(ends[hidden], np.abs(bernstein(part[:, None], turning_points(part))).max(axis=0))
    return peak + OUTWARD * np.maximum(ends, inner)


def span(coefficients):
    """(...) the least and the largest values on [0, 1] of polynomials (d + 1, ...), moved outwards."""
    low, high = np.minimum(coefficients[0], coefficients[-1]), np.maximum(coefficients[0], coefficients[-1])
    with np.errstate(invalid="ignore"):
        hidden = (coefficients[1:-1].min(axis=0) < low) | (coefficients[1:-1].max(axis=0) > high)
    if hidden.any():
        part = coefficients[:, hidden]
        values = bernstein(part[:, None], turning_points(part))
        low[hidden], high[hidden] = np.minimum(low[hidden], values.min(axis=0)), np.maximum(high[hidden], values.max(axis=0))
    outward = OUTWARD * np.abs(coefficients).max(axis=0)
    return low - outward, high + outward


# ------------------------------------------------------------------------------------------------------------------ joints


@dataclass(frozen=True, eq=False)
class Joints:
    """The joint motion on K intervals: Bernstein coefficients (6, K, n), (5, K, n), (4, K, n) by t; span_s (K,) s. NaN where there is none."""

    span_s: np.ndarray
    position: np.ndarray
    speed: np.ndarray
    acceleration: np.ndarray

    def at(self, k, t):
        """(M, n) joint positions on the intervals k (M,) at t (M,)"""
        return bernstein(self.position[:, k], t[:, None])

    def part(self, rows):
        return Joints(self.span_s[rows], self.position[:, rows], self.speed[:, rows], self.acceleration[:, rows])


def joints_between(time, position, speed, acceleration) -> Joints:
    """The motion between samples at time (N,) with joint position, speed, acceleration (N, n) by time."""
    h = np.diff(time)[:, None]
    v0, v1, a0, a1 = h * speed[:-1], h * speed[1:], h * h * acceleration[:-1], h * h * acceleration[1:]
    q0, q1 = position[:-1], position[1:]
    rates = np.stack([v0, v0 + 0.25 * a0, 5.0 * (q1 - q0) - 2.0 * (v0 + v1) - 0.25 * (a0 - a1), v1 - 0.25 * a1, v1])
    places = np.stack([q0, q0 + 0.2 * v0, q0 + 0.4 * v0 + 0.05 * a0, q1 - 0.4 * v1 + 0.05 * a1, q1 - 0.2 * v1, q1])
    return Joints(h[:, 0], places, rates, np.stack([a0, 4.0 * (rates[2] - rates[1]), 4.0 * (rates[3] - rates[2]), a1]))


def peaks(joints: Joints):
    """Largest speed and acceleration, by time, of each joint on each interval (K, n each)."""
    h = joints.span_s[:, None]
    return largest(joints.speed) / h, (largest(joints.acceleration) + _rounded(joints)) / h**2


def peaks_of_halves(joints: Joints):
    """The same on the first and on the second half of each interval (2, K, n each)."""
    h, rounded = joints.span_s[:, None], _rounded(joints)
    speed, acceleration = (np.stack([largest(half) for half in halves(c)]) for c in (joints.speed, joints.acceleration))
    return speed / h, (acceleration + rounded) / h**2


def _rounded(joints):
    """(K, n) what rounding of the speeds may do to the accelerations, which are their differences."""
    return OUTWARD * np.abs(joints.speed).max(axis=0)


# --------------------------------------------------------------------------------------------------------------- sigma_min


def lever_arms(chain, slid):
    """(M, n) for joints that slid at most as far as slid (M, n): a bound of how far the tool point is from each joint's axis or origin.

    The lengths of the links from the joint to the tool, whatever the joints between them do; of the first link only what is off the axis.
    """
    length = np.linalg.norm(chain.links[1:, :3, 3], axis=1)
    off = np.linalg.norm(chain.links[1:, :2, 3], axis=1)
    slid = np.where(chain.prismatic.astype(bool), slid, 0.0)
    after = np.zeros_like(slid)
    after[:, :-1] = np.cumsum((length + slid)[:, :0:-1], axis=1)[:, ::-1]
    return after + np.where(chain.prismatic.astype(bool), length + slid, off)


def after(values):
    """(M, n) for each joint the sum of values (M, n) over the joints after it."""
    out = np.zeros_like(values)
    out[:, :-1] = np.cumsum(values[:, :0:-1], axis=1)[:, ::-1]
    return out


def bending(chain, length, arms, speed, acceleration):
    """(M,) a bound of the Frobenius norm of the second derivative by t of the task Jacobian in tool axes.

    arms (M, n) from `lever_arms`; speed, acceleration (M, n) the largest on the interval. Seen from the tool, the axis of joint i is a fixed vector
    turned by the joints j > i: every partial derivative of it has at most length 1, so its second derivative has at most
    c = sum |q_j''| + (sum |q_j'|)^2. So has, times its length, the product of the axis with each link between the joint and the tool; what slides
    out adds the derivatives of its own length.
    """
    slides = chain.prismatic.astype(bool)
    turning, turning_rate = np.where(slides, 0.0, speed), np.where(slides, 0.0, acceleration)
    w = after(turning)
    c = after(turning_rate) + w**2
    out, out_rate = after(np.where(slides, speed, 0.0)), after(np.where(slides, acceleration, 0.0))
    linear = np.where(slides, c, c * arms + 2.0 * w * out + out_rate) / length
    angular = np.where(slides, 0.0, c)
    return np.sqrt((linear**2 + angular**2).sum(axis=1))


def chord_bound(a, b, change, bend):
    """(M,) lower bounds of sigma_min on pieces: a, b at their ends, change (M,) the norm of B - A, bend (M,) of the second derivative.

    On the chord C = (1 - t) A + t B exactly C C^T = (1 - t) A A^T + t B B^T - t (1 - t) (B - A)(B - A)^T, and so for C^T C; no singular value of the
    Jacobian differs from the chord's by more than t (1 - t) / 2 bend (Weyl; Horn and Johnson, Matrix Analysis, 7.3; the remainder of linear
    interpolation). So sigma_min >= f(t) = sqrt((1 - t) a^2 + t b^2 - t (1 - t) change^2) - t (1 - t) / 2 bend. As |a - b| <= change (Weyl again), f
    is convex as long as the root exists: two tangents are below it, and a few turns bring their crossing close to its least value.
    """
    d = np.maximum(change, np.abs(a - b)) ** 2
    slope = b * b - a * a - d
    safe_a, safe_b = np.maximum(a, 1e-300), np.maximum(b, 1e-300)
    left, right = np.zeros_like(a), np.ones_like(a)
    f_left, f_right = a, b
    g_left, g_right = 0.5 * slope / safe_a - 0.5 * bend, 0.5 * (slope + 2.0 * d) / safe_b + 0.5 * bend
    lost = d >= (a + b) ** 2
    for turn in range(4):
        with np.errstate(divide="ignore", invalid="ignore"):
            cross = (f_right - f_left + g_left * left - g_right * right) / (g_left - g_right)
        cross = np.where(g_left < g_right, np.clip(np.nan_to_num(cross, nan=0.5), left, right), left)
        bound = f_left + g_left * (cross - left)
        if turn == 3:
            break
        root = np.sqrt(np.maximum(a * a + cross * (slope + cross * d), 1e-300))
        value = root - 0.5 * bend * cross * (1.0 - cross)
        grade = 0.5 * (slope + 2.0 * d * cross) / root - bend * (0.5 - cross)
        falls = grade < 0.0
        left, f_left, g_left = np.where(falls, cross, left), np.where(falls, value, f_left), np.where(falls, grade, g_left)
        right, f_right, g_right = np.where(falls, right, cross), np.where(falls, f_right, value), np.where(falls, g_right, grade)
    bound = np.where(0.5 * slope / safe_a - 0.5 * bend >= 0.0, a, np.where(0.5 * (slope + 2.0 * d) / safe_b + 0.5 * bend <= 0.0, b, bound))
    return np.where(lost, 0.0, np.maximum(bound, 0.0))


@dataclass(frozen=True, eq=False)
class Sigma:
    """Of K intervals: bound (K,) below sigma_min on the whole interval; least (K,) the least that was met on it, at t where (K,); points (K,) looked at."""

    bound: np.ndarray
    least: np.ndarray
    where: np.ndarray
    points: np.ndarray


def certify(chain, length, rows, joints: Joints, arms, sigma, task, speed, acceleration, goals) -> Sigma:
    """Bounds of sigma_min on K intervals, each halved until it is decided.

    arms (K, n): what `lever_arms` gives; sigma (K, 2) and task (K, 2, rows, n) at the samples; speed, acceleration (K, n) the largest by t. goals
    (K, 2), the larger first: what is to be shown of each interval is that sigma_min stays above the first, or, where it was met below that, above
    the second, or else about where it is least. With -inf it is bounded once.

    Rounding: kinematics and products of at most twelve transforms are good to 1e-13 of the Jacobian's norm, singular values of its square to
    eps norm^2 / sigma, which passes to the Jacobi method at 1e-4 norm: together 3e-12 of the norm. MARGIN lowers every bound by thirty times as much.
    """
    bend = bending(chain, length, arms, speed, acceleration)
    norm = np.linalg.norm(task, axis=(2, 3))
    margin = MARGIN * (1.0 + norm.max(axis=1) + bend)
    least, where = sigma.min(axis=1), np.where(sigma[:, 1] < sigma[:, 0], 1.0, 0.0)
    bound, points = np.full(len(sigma), np.inf), np.zeros(len(sigma), int)
    k, start, width = np.arange(len(sigma)), np.zeros(len(sigma)), 1.0
    low, high, left, right = sigma[:, 0], sigma[:, 1], task[:, 0], task[:, 1]
    while len(k):
        here = chord_bound(low, high, np.linalg.norm(right - left, axis=(1, 2)), bend[k] * width**2) - margin[k]
        met = least[k]
        undecided = (here < goals[k, 0]) & (met >= goals[k, 0]) | (here < goals[k, 1]) & (met >= goals[k, 1])
        unplaced = (met < goals[k, 0]) & (here < NEAR_ENOUGH * met) & (width > CLOSE_ENOUGH)
        open_ = (undecided | unplaced) & (width > FINEST) & (points[k] < MOST_POINTS)
        np.minimum.at(bound, k[~open_], here[~open_])
        k, start, width = k[open_], start[open_], 0.5 * width
        if not len(k):
            break
        middle = start + width
        _, _, inner = tool_jacobians(chain, length, rows, joints.at(k, middle))
        values = np.linalg.svd(inner, compute_uv=False)[:, -1]
        np.add.at(points, k, 1)
        order = np.argsort(-values, kind="stable")  # of several on one interval the least is written last
        lower = order[values[order] < least[k[order]]]
        least[k[lower]], where[k[lower]] = values[lower], middle[lower]
        left, right = np.concatenate([left[open_], inner]), np.concatenate([inner, right[open_]])
        low, high = np.concatenate([low[open_], values]), np.concatenate([values, high[open_]])
        k, start = np.concatenate([k, k]), np.concatenate([start, middle])
    return Sigma(np.minimum(np.maximum(bound, 0.0), least), least, where, points)


# ---------------------------------------------------------------------------------------------------------------- the tool


def fourth(w, q2, q3, q4):
    """Bound of the fourth derivative by t of a unit vector turned by joints with sums w, q2, q3, q4 of their |derivatives| (Faa di Bruno)."""
    return w**4 + 6.0 * w * w * q2 + 3.0 * q2 * q2 + 4.0 * w * q3 + q4


def beside_segment(points, end):
    """(...) distance of points (..., d) from the segment between the origin and end (..., d)."""
    square = (end * end).sum(axis=-1)
    share = np.clip((points * end).sum(axis=-1) / np.maximum(square, 1e-300), 0.0, 1.0)
    return np.linalg.norm(points - share[..., None] * end, axis=-1)


def beside_cone(points, first, second):
    """(...) distance of points (..., d) from what first and second (..., d), unit vectors less than a right angle apart, span with shares >= 0."""
    cosine = (first * second).sum(axis=-1)
    p, q = (points * first).sum(axis=-1), (points * second).sum(axis=-1)
    sine = np.maximum(1.0 - cosine**2, 1e-30)
    x, y = (p - cosine * q) / sine, (q - cosine * p) / sine
    inside = (x >= 0.0) & (y >= 0.0) & (cosine < 1.0 - 1e-15)
    plane = np.linalg.norm(points - x[..., None] * first - y[..., None] * second, axis=-1)
    rays = [np.linalg.norm(points - np.maximum(along, 0.0)[..., None] * ray, axis=-1) for along, ray in ((p, first), (q, second))]
    return np.where(inside, plane, np.minimum(*rays))


def cubic_most(ends, inner):
    """(M,) upper bound of the cubics with the coefficients ends (c + 1, M) and inner (2, c, M), piece by piece: the chord, and what is above it."""
    first, last = ends[:-1], ends[1:]
    over = np.maximum(inner[0] - (2.0 * first + last) / 3.0, inner[1] - (first + 2.0 * last) / 3.0)
    return (np.maximum(first, last) + 0.75 * np.maximum(over, 0.0)).max(axis=0)


def stray(chain, spin_free, joints: Joints, poses, jacobians, speed, acceleration):
    """Bounds (K,) of how far the tool point is from the straight line between the two poses, m, and its orientation from the least turn, rad.

    poses (N, 4, 4) and jacobians (N, 6, n) at the samples, speed and acceleration (K, n) the largest by t. On each piece the cubic through the
    position and velocity at its ends is off by at most the fourth derivative / 384 (Hermite interpolation). The distance from a convex set is
    convex: on the cubic it is at most the cubic of its control points' distances. The set is the segment, and for orientations, as unit quaternions
    or, where the spin is free, as tool axes, the cone over the great arc: the sine of (half) the angle is the distance from it.
    """
    jerk = np.abs(slopes(joints.acceleration)).max(axis=0)
    snap = np.abs(slopes(slopes(joints.acceleration))).max(axis=0)
    far, turned = remainders(chain, joints, speed, acceleration, jerk, snap, spin_free)
    with np.errstate(invalid="ignore"):
        wanted = np.sqrt(np.sqrt(np.maximum(far, turned) / STRAY_REST))
        pieces = 2 ** np.ceil(np.log2(np.clip(np.nan_to_num(wanted, nan=1.0), 1.0, STRAY_PIECES))).astype(int)
    off, off_turn = np.full(len(far), np.nan), np.full(len(far), np.nan)
    for cut in np.unique(pieces):
        k = np.flatnonzero(pieces == cut)
        knots = _knots(chain, joints, k, cut, poses, jacobians)
        off[k] = _off_line(*knots, cut) + far[k] / cut**4
        off_turn[k] = _off_turn(*knots, cut, spin_free, turned[k] / cut**4)
    off_turn[speed.sum(axis=1) >= 0.9 * np.pi] = np.pi  # more than a quaternion tells apart
    reach = np.linalg.norm(chain.links[:, :3, 3], axis=1).sum()
    return off + OUTWARD * (1.0 + reach), off_turn + OUTWARD


def remainders(chain, joints, speed, acceleration, jerk, snap, spin_free):
    """(K,) fourth derivative / 384 by t of the tool point, m, and of its quaternion, or of its axis where the spin is free."""
    slides = chain.prismatic.astype(bool)
    turning = [np.where(slides, 0.0, values) for values in (speed, acceleration, jerk, snap)]
    sums = [np.cumsum(values, axis=1) for values in turning]  # up to and with each joint
    whole = [values[:, -1] for values in sums]
    if slides.any():
        slid = np.where(slides, np.abs(joints.position).max(axis=0), 0.0)
        sliding = [np.where(slides, values, 0.0) for values in (speed, acceleration, jerk, snap)]
    w, q2, q3, q4 = sums
    own = fourth(w, q2, q3, q4)
    far = (own * np.linalg.norm(chain.links[1:, :3, 3], axis=1)).sum(axis=1)
    if slides.any():  # Leibniz: the link that slides out, times the turning that carries it
        s1, s2, s3, s4 = sliding
        turn1, turn2, turn3 = w, q2 + w**2, q3 + 3.0 * w * q2 + w**3
        far = far + (slid * own + 4.0 * s1 * turn3 + 6.0 * s2 * turn2 + 4.0 * s3 * turn1 + s4)[:, slides].sum(axis=1)
    half = 1.0 if spin_free else 0.5
    turned = fourth(*(half * values for values in whole))
    return far / 384.0, turned / 384.0


def _knots(chain, joints, k, cut, poses, jacobians):
    """Tool poses (cut + 1, M, 4, 4) and twists by t (cut + 1, M, 6) at the ends of the pieces of the intervals k (M,)."""
    from .kernels.linkage import locate

    speed = joints.speed[:, k]
    found = [(poses[k], jacobians[k], speed[0])]
    for i in range(1, cut):
        inner, their, _ = locate(*chain, joints.at(k, np.full(len(k), i / cut)))
        found.append((inner, their, bernstein(speed, i / cut)))
    found.append((poses[k + 1], jacobians[k + 1], speed[-1]))
    return np.stack([pose for pose, *_ in found]), np.stack([(jacobian @ rate[:, :, None])[:, :, 0] for _, jacobian, rate in found])


def _most(place, rate, distance):
    """(M,) upper bound of the distance of the cubics through place (c + 1, M, d), with a third of their derivative in rate, whose ends are at no distance."""
    ends = np.zeros(place.shape[:2])
    if len(place) > 2:
        ends[1:-1] = distance(place[1:-1])
    return cubic_most(ends, distance(np.stack([place[:-1] + rate[:-1], place[1:] - rate[1:]])))


def _off_line(poses, twists, cut):
    place = poses[:, :, :3, 3] - poses[0, :, :3, 3]
    return _most(place, twists[:, :, :3] / (3.0 * cut), lambda points: beside_segment(points, place[-1]))


def _off_turn(poses, twists, cut, spin_free, rest):
    first = np.swapaxes(poses[0, :, :3, :3], 1, 2)
    omega = (first @ twists[:, :, 3:, None])[..., 0]
    relative = first @ poses[1:, :, :3, :3]
    place = np.zeros((*omega.shape[:2], 3 if spin_free else 4))
    if spin_free:
        place[0, :, 2], place[1:] = 1.0, relative[..., 2]
        half, rate = 1.0, np.cross(omega, place)
    else:
        place[0, :, 0], place[1:] = 1.0, small_turn_wxyz(relative)
        w, v = place[..., :1], place[..., 1:]
        half, rate = 2.0, 0.5 * np.concatenate([-(omega * v).sum(axis=-1, keepdims=True), omega * w + np.cross(omega, v)], axis=-1)
    sine = _most(place, rate / (3.0 * cut), lambda points: beside_cone(points, place[0], place[-1])) + rest
    return half * np.arcsin(np.minimum(sine, 1.0))


def small_turn_wxyz(rotation):
    """Unit quaternions (..., 4) with w > 0 of rotations (..., 3, 3) by less than half a turn."""
    w = 0.5 * np.sqrt(np.maximum(1.0 + np.trace(rotation, axis1=-2, axis2=-1), 1e-12))
    v = np.stack([rotation[..., 2, 1] - rotation[..., 1, 2], rotation[..., 0, 2] - rotation[..., 2, 0], rotation[..., 1, 0] - rotation[..., 0, 1]], axis=-1)
    q = np.concatenate([w[..., None], v / (4.0 * w[..., None])], axis=-1)
    return q / np.linalg.norm(q, axis=-1, keepdims=True)
