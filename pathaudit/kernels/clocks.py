"""The fastest clock along a path whose joint motion is given, under joint speed and acceleration limits and a ceiling.

The path is q(u) at nodes u_0 < ... < u_N with rates q' and q''; b = (du/dt)^2 is linear between nodes, so d2u/dt2 = a = b'/2 is constant
on an interval, and joint speed and acceleration are q' sqrt(b) and q'' b + q' a (Bobrow 1985; Shin and McKay 1985; Verscheure 2009).
Each interval is a set of linear rows in (b_k, b_k+1), with the acceleration rows at BOTH of its ends: rows at its middle let the result
come out faster than the true optimum. A backward sweep finds the largest b at each node from which the rest can be run, a forward sweep
takes the largest b that stays below: exact two-variable linear programmes, a constant number of passes over the rows.
"""

import numpy as np

from .compiled import dense, helper, kernel


LARGEST = 1e12  # of b, where nothing bounds it


@helper
def largest_before(left, right, x, y):
    """Largest b_k in [0, x] with some b_k+1 in [0, y] such that |left[i, 0] b_k + left[i, 1] b_k+1| <= left[i, 2], and so for right.

    The gap between the lowest upper and the highest lower bound on b_k+1 is concave in b_k and not negative at 0, so Newton steps on
    it from the right end in its root, exactly, in a few turns.
    """
    for _ in range(100):
        low, low_slope, low_base = 0.0, 0.0, 0.0
        high, high_slope, high_base = y, 0.0, y
        alone = False
        for rows in (left, right):
            for i in range(rows.shape[0]):
                p, q, c = rows[i, 0], rows[i, 1], rows[i, 2]
                if q < 0.0:
                    p, q = -p, -q
                if q * y > 1e-12 * c:  # else rounding, of a joint that stands still at full acceleration: the row binds b_k alone
                    slope = -p / q
                    up, down = c / q + slope * x, -c / q + slope * x
                    if up < high:
                        high, high_slope, high_base = up, slope, c / q
                    if down > low:
                        low, low_slope, low_base = down, slope, -c / q
                elif abs(p) * x > c * (1.0 + 1e-12):
                    x, alone = c / abs(p), True
        if alone:
            continue
        if high - low >= -1e-14 * (abs(high) + abs(low)):
            return x
        if not high_slope < low_slope:
            return 0.0
        x = max((high_base - low_base) / (low_slope - high_slope), 0.0)
    return x


@helper
def interval_rows(rate, bend, limit, half, near, rows):
    """Fill rows (n, 3): p b_k + q b_k+1 within c at one end of an interval; near (1 or 0) tells whether that end is b_k's.

    half is 1 / (2 (u_k+1 - u_k)), so that a = (b_k+1 - b_k) half.
    """
    for i in range(rate.shape[0]):
        if limit[i] < 1e300:
            rows[i, 0] = bend[i] * near - rate[i] * half
            rows[i, 1] = bend[i] * (1.0 - near) + rate[i] * half
            rows[i, 2] = limit[i]
        else:
            rows[i, 0], rows[i, 1], rows[i, 2] = 0.0, 0.0, 1.0


@kernel("void(f8[::1], f8[:,::1], f8[:,::1], f8[:,::1], f8[::1], f8[::1], f8[::1])")
def _sweep(u, rate, bend, limit, ceiling, b, top):
    count, n = rate.shape
    left, right = np.empty((n, 3)), np.empty((n, 3))
    b[count - 1] = ceiling[count - 1]
    for k in range(count - 2, -1, -1):
        half = 0.5 / (u[k + 1] - u[k])
        interval_rows(rate[k], bend[k], limit[k], half, 1.0, left)
        interval_rows(rate[k + 1], bend[k + 1], limit[k + 1], half, 0.0, right)
        b[k] = largest_before(left, right, ceiling[k], b[k + 1])
    for k in range(count):
        top[k] = b[k]
    for k in range(count - 1):
        half = 0.5 / (u[k + 1] - u[k])
        interval_rows(rate[k], bend[k], limit[k], half, 1.0, left)
        interval_rows(rate[k + 1], bend[k + 1], limit[k + 1], half, 0.0, right)
        low, high, top = 0.0, b[k + 1], b[k + 1]
        for i in range(n):
            for j in range(2):
                rows = left if j == 0 else right
                p, q, c = rows[i, 0], rows[i, 1], rows[i, 2]
                if q < 0.0:
                    p, q = -p, -q
                if q * top > 1e-12 * c:
                    high = min(high, (c - p * b[k]) / q)
                    low = max(low, (-c - p * b[k]) / q)
        b[k + 1] = min(max(high, low), top)


def sweep(u, rate, bend, limit, ceiling):
    """Largest b (N,) = (du/dt)^2 under |q'' b + q' a| <= limit and 0 <= b <= ceiling.

    u (N,) increasing, rate and bend (N, n) the first and second derivative of the joints by u, limit (N, n) or (n,) joint accelerations
    (inf where there is none), ceiling (N,), which holds the speed limits: b <= (limit / |q'|)^2, inf where nothing moves.
    """
    return _both(u, rate, bend, limit, ceiling)[0]


def _both(u, rate, bend, limit, ceiling):
    """What `sweep` gives, and from its backward sweep the largest b (N,) at each node from which the rest can be run at all."""
    rate = dense(rate)
    limit = dense(np.broadcast_to(limit, rate.shape))
    b, top = np.empty(rate.shape[0]), np.empty(rate.shape[0])
    _sweep(
        dense(u), rate, dense(bend), limit,
        dense(np.minimum(ceiling, LARGEST)), b, top,
    )  # fmt: skip
    return b, top


def largest_anywhere(u, rate, bend, limit, ceiling):
    """(N,) for each node a bound that b exceeds in no clock that keeps the limits; arguments as `sweep` takes them.

    The reachable-set argument: by induction from the last node no such clock has a larger b than the largest from which some b of the next
    node, itself within its bound, can be reached; and likewise from the first node onwards, which is the same sweep on the path run
    backwards. Moved outwards by 1e-9 for rounding.
    """
    given = [np.asarray(a)[::-1] for a in (rate, bend, np.broadcast_to(limit, np.shape(rate)), ceiling)]
    onwards = _both(-np.asarray(u)[::-1], -given[0], *given[1:])[1][::-1]
    return np.minimum(onwards, _both(u, rate, bend, limit, ceiling)[1]) * (1.0 + 1e-9)


def durations(u, b):
    """Time (N - 1,) over each interval for b (N,) linear between nodes u (N,); infinite where both ends stand still."""
    root = np.sqrt(b)
    with np.errstate(divide="ignore"):
        return 2.0 * np.diff(u) / (root[1:] + root[:-1])
