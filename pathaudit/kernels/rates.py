"""Rates along a path: tool twists from the timed poses, joint speeds and accelerations, singular values, the largest speed.

Joint rates come from the Jacobian and the tool twist, not from differences of joint angles: beside a singularity those hide the peak.
"""

import os
from concurrent.futures import ThreadPoolExecutor
from math import sqrt

import numpy as np

from .compiled import dense, helper, kernel
from .frames import place
from .task import damped_step, factor, gram, in_tool_axes, rotation_log, substitute, task_jacobian

SHARED = 2000  # samples that are worth a thread of their own


@helper
def weights(time, k, first, count, w):
    """Fill w (3, 5): w[d, i] is the weight of sample first + i in the d-th derivative at time[k] of the polynomial through `count` samples.

    Fornberg, "Generation of finite difference formulas on arbitrarily spaced grids", Math. Comp. 51 (1988).
    """
    for d in range(3):
        for i in range(5):
            w[d, i] = 0.0
    w[0, 0] = 1.0
    c1, c4 = 1.0, time[first] - time[k]
    for i in range(1, count):
        c2, c5, c4 = 1.0, c4, time[first + i] - time[k]
        top = min(i, 2)
        for j in range(i):
            c3 = time[first + i] - time[first + j]
            c2 *= c3
            if j == i - 1:
                for d in range(top, 0, -1):
                    w[d, i] = c1 * (d * w[d - 1, i - 1] - c5 * w[d, i - 1]) / c2
                w[0, i] = -c1 * c5 * w[0, i - 1] / c2
            for d in range(top, 0, -1):
                w[d, j] = (c4 * w[d, j] - d * w[d - 1, j]) / c3
            w[0, j] = c4 * w[0, j] / c3
        c1 = c2


@helper
def window(k, total, kinks):
    """First sample and number of samples of the polynomial at sample k: five where the motion is smooth, three beside and on a kink."""
    reach = 2
    for j in range(max(k - 1, 0), min(k + 2, total)):
        if kinks[j]:
            reach = 1
    count = min(2 * reach + 1, total)
    return max(0, min(k - reach, total - count)), count


@helper
def find_kinks(time, secant, kinks):
    """Mark the samples where the velocity jumps: the change of secant (N - 1, c) there dwarfs that at both neighbours."""
    total = time.shape[0]
    before, here, jump = 0.0, 0.0, 0.0
    for j in range(1, total):
        after, jump_after = 0.0, 0.0
        if j + 1 < total:
            change = size = 0.0
            for c in range(secant.shape[1]):
                change += (secant[j, c] - secant[j - 1, c]) ** 2
                size = max(size, abs(secant[j, c]), abs(secant[j - 1, c]))
            jump_after = sqrt(change) / (size + 1e-12)
            after = sqrt(change) / (time[j + 1] - time[j - 1])
        # `here` belongs to sample j - 1
        if j > 1 and here > 5.0 * max(before, after) and jump > 0.02:
            kinks[j - 1] = 1
        before, here, jump = here, after, jump_after


@helper
def seen_from(a, b, out):
    """Fill out (3, 3) with a^T b, the orientation b as seen from a."""
    for i in range(3):
        for j in range(3):
            out[i, j] = a[0, i] * b[0, j] + a[1, i] * b[1, j] + a[2, i] * b[2, j]


@kernel("void(f8[::1], f8[:,::1], f8[:,::1], f8[:,::1])")
def _derivatives(time, values, first, second):
    total, c = values.shape
    kinks, w = np.zeros(total, np.uint8), np.empty((3, 5))
    secant = np.empty((max(total - 1, 0), c))
    for k in range(total - 1):
        for j in range(c):
            secant[k, j] = (values[k + 1, j] - values[k, j]) / (time[k + 1] - time[k])
    find_kinks(time, secant, kinks)
    for k in range(total):
        start, count = window(k, total, kinks)
        weights(time, k, start, count, w)
        for j in range(c):
            a = b = 0.0
            for i in range(count):
                offset = values[start + i, j] - values[k, j]
                a += w[1, i] * offset
                b += w[2, i] * offset
            first[k, j], second[k, j] = a, b


@kernel("void(f8[::1], f8[:,:,::1], f8[:,::1], f8[:,::1])")
def _turning(time, rotation, first, second):
    total = time.shape[0]
    kinks, w = np.zeros(total, np.uint8), np.empty((3, 5))
    relative, vector, secant = np.empty((3, 3)), np.empty(3), np.empty((max(total - 1, 0), 3))
    for k in range(total - 1):
        seen_from(rotation[k], rotation[k + 1], relative)
        rotation_log(relative, vector)
        for i in range(3):
            # the rotation vector is the same in both frames; in part axes the secants of a path can be compared
            secant[k, i] = rotation[k, i, 0] * vector[0] + rotation[k, i, 1] * vector[1] + rotation[k, i, 2] * vector[2]
            secant[k, i] /= time[k + 1] - time[k]
    find_kinks(time, secant, kinks)
    a, b = np.empty(3), np.empty(3)
    for k in range(total):
        start, count = window(k, total, kinks)
        weights(time, k, start, count, w)
        for j in range(3):
            a[j], b[j] = 0.0, 0.0
        for i in range(count):
            if start + i != k:
                seen_from(rotation[k], rotation[start + i], relative)
                rotation_log(relative, vector)
                for j in range(3):
                    a[j] += w[1, i] * vector[j]
                    b[j] += w[2, i] * vector[j]
        for i in range(3):
            first[k, i] = rotation[k, i, 0] * a[0] + rotation[k, i, 1] * a[1] + rotation[k, i, 2] * a[2]
            second[k, i] = rotation[k, i, 0] * b[0] + rotation[k, i, 1] * b[1] + rotation[k, i, 2] * b[2]


def derivatives(time, values):
    """First and second time derivative of values (N, c): the quartic through five samples, the parabola through three at a kink."""
    values = dense(values)
    first, second = np.empty_like(values), np.empty_like(values)
    _derivatives(dense(time), values, first, second)
    return first, second


def twists(time, position, rotation):
    """Tool twist and its rate, (N, 6) each, linear rows first, in part axes, of poses at time (N,), position (N, 3), rotation (N, 3, 3).

    Rotations are differentiated in the chart of rotation vectors around each sample, where the first two derivatives at the centre are
    the angular velocity and acceleration exactly.
    """
    time = dense(time)
    linear, linear_rate = derivatives(time, position)
    angular, angular_rate = np.empty((time.shape[0], 3)), np.empty((time.shape[0], 3))
    _turning(time, dense(rotation), angular, angular_rate)
    return np.hstack([linear, angular]), np.hstack([linear_rate, angular_rate])


@helper
def jacobi_smallest(jacobian, rows, n, work):
    """Smallest singular value by one-sided Jacobi rotations (Hestenes 1958), to full relative accuracy; slow, for the few that need it."""
    wide = n >= rows
    size, depth = (rows, n) if wide else (n, rows)
    for i in range(size):
        for k in range(depth):
            work[i, k] = jacobian[i, k] if wide else jacobian[k, i]
    for _ in range(40):
        off = 0.0
        for i in range(size - 1):
            for j in range(i + 1, size):
                a = b = c = 0.0
                for k in range(depth):
                    a += work[i, k] * work[i, k]
                    b += work[j, k] * work[j, k]
                    c += work[i, k] * work[j, k]
                if abs(c) <= 1e-15 * sqrt(a * b):
                    continue
                off = max(off, abs(c) / sqrt(a * b))
                zeta = (b - a) / (2.0 * c)
                t = (1.0 if zeta >= 0.0 else -1.0) / (abs(zeta) + sqrt(1.0 + zeta * zeta))
                cs = 1.0 / sqrt(1.0 + t * t)
                sn = cs * t
                for k in range(depth):
                    x, y = work[i, k], work[j, k]
                    work[i, k], work[j, k] = cs * x - sn * y, sn * x + cs * y
        if off == 0.0:
            break
    smallest = 1e300
    for i in range(size):
        total = 0.0
        for k in range(depth):
            total += work[i, k] * work[i, k]
        smallest = min(smallest, sqrt(total))
    return smallest


@helper
def laguerre(d, squares, size, x, scale):
    """The smallest eigenvalue of the tridiagonal matrix with diagonal d and squared off-diagonal `squares`, from a bound x below it."""
    for _ in range(60):
        # p, p', p'' by the three-term recurrence (entries are of order one: nothing overflows)
        p0, p1 = 1.0, d[0] - x
        g0, g1 = 0.0, -1.0
        h0, h1 = 0.0, 0.0
        for i in range(1, size):
            a, c = d[i] - x, squares[i - 1]
            p2 = a * p1 - c * p0
            g2 = a * g1 - p1 - c * g0
            h2 = a * h1 - 2.0 * g1 - c * h0
            p0, p1, g0, g1, h0, h1 = p1, p2, g1, g2, h1, h2
        if p1 == 0.0:
            return x
        inside = (size - 1.0) * ((size - 1.0) * g1 * g1 - size * p1 * h1)
        root = sqrt(inside) if inside > 0.0 else 0.0
        step = -size * p1 / (g1 - root if g1 < 0.0 else g1 + root)
        x += step
        if not step > 1e-8 * x + 1e-18 * scale:  # what is left is the cube of this, or as much again in a cluster
            return x
    return x


@helper
def change_of(jacobian, before):
    """Frobenius norm of the change since `before`, which takes the new values: no singular value changes more (Weyl 1912)."""
    total = 0.0
    for i in range(before.shape[0]):
        for j in range(before.shape[1]):
            change = jacobian[i, j] - before[i, j]
            total += change * change
            before[i, j] = jacobian[i, j]
    return sqrt(total)


@helper
def smallest_singular_value(jacobian, rows, n, bound, work, d, e):
    """Smallest singular value of jacobian (rows, n), of min(rows, n), not below `bound`, from the tridiagonal form of the Gram matrix.

    Householder tridiagonalisation, then Laguerre steps on the characteristic polynomial from below the spectrum, which converge from
    one side and cubically (Wilkinson 1965, ch. 7). Squaring costs half the digits beside zero; there one-sided Jacobi rotations take over.
    """
    size, trace = min(rows, n), gram(jacobian, rows, n, work)
    if size == 1:
        return sqrt(work[0, 0])
    for k in range(size - 2):
        norm = 0.0
        for i in range(k + 1, size):
            norm += work[i, k] * work[i, k]
        tail = norm - work[k + 1, k] * work[k + 1, k]
        e[k] = work[k + 1, k]
        if tail > 0.0:
            alpha = -sqrt(norm) if work[k + 1, k] > 0.0 else sqrt(norm)
            e[k] = alpha
            # v = x - alpha e1, beta = 2 / v.v; v replaces the column
            work[k + 1, k] -= alpha
            beta = 2.0 / (tail + work[k + 1, k] * work[k + 1, k])
            mean = 0.0
            for i in range(k + 1, size):
                total = 0.0
                for j in range(k + 1, size):
                    total += work[i, j] * work[j, k]
                d[i] = beta * total
                mean += d[i] * work[i, k]
            mean *= 0.5 * beta
            for i in range(k + 1, size):
                d[i] -= mean * work[i, k]
            for i in range(k + 1, size):
                for j in range(k + 1, i + 1):
                    work[i, j] -= work[i, k] * d[j] + d[i] * work[j, k]
                    work[j, i] = work[i, j]
    e[size - 2] = work[size - 1, size - 2]
    for i in range(size):
        d[i] = work[i, i]
        e[i] = e[i] * e[i]
    low = sqrt(max(laguerre(d, e, size, bound * bound, trace), 0.0))
    return low if low > 1e-4 * sqrt(trace) else jacobi_smallest(jacobian, rows, n, work)


@helper
def smallest_share(jacobian, rows, n, speed, limit, work, null):
    """Least over all joint motions with the same tool motion of the largest |speed| / limit, for one surplus joint (n = rows + 1).

    Discrete Chebyshev approximation in one unknown: the optimum is the largest of the bounds that pairs of joints give (the vertices of
    the dual linear programme; de la Vallee Poussin's bound).
    """
    # the null vector by Gaussian elimination with complete pivoting over the columns
    for i in range(rows):
        for j in range(n):
            work[i, j] = jacobian[i, j]
    for j in range(n):
        null[j] = j
    for k in range(rows):
        p, q, largest = k, k, 0.0
        for i in range(k, rows):
            for j in range(k, n):
                if abs(work[i, j]) > largest:
                    p, q, largest = i, j, abs(work[i, j])
        if largest < 1e-12:
            return -1.0
        for j in range(n):
            work[k, j], work[p, j] = work[p, j], work[k, j]
        for i in range(rows):
            work[i, k], work[i, q] = work[i, q], work[i, k]
        null[k], null[q] = null[q], null[k]
        for i in range(k + 1, rows):
            factor = work[i, k] / work[k, k]
            for j in range(k, n):
                work[i, j] -= factor * work[k, j]
    for k in range(rows - 1, -1, -1):
        total = -work[k, rows]
        for j in range(k + 1, rows):
            total -= work[k, j] * work[rows, j]
        work[rows, k] = total / work[k, k]
    work[rows, rows] = 1.0
    best = 0.0
    for a in range(n):
        i = int(null[a])
        for b in range(a):
            j = int(null[b])
            size = abs(work[rows, a]) * limit[j] + abs(work[rows, b]) * limit[i]
            if size > 0.0:
                best = max(best, abs(work[rows, b] * speed[i] - work[rows, a] * speed[j]) / size)
    return best


@helper
def match_rates(jacobian, demand, rows, n, low, regular, guess, out, work, order, vector, step, right):
    """Fill out (n,): the rates nearest to guess (n,) that give the demand; regular: work and order hold the factors of the Jacobian.

    Where the Jacobian is square and regular the guess does not matter. On a singular place the direction that the Jacobian cannot
    tell is left as the guess has it.
    """
    if regular:
        substitute(work, order, demand, n, out)
        return
    for i in range(rows):
        right[i] = demand[i]
        for j in range(n):
            right[i] -= jacobian[i, j] * guess[j]
    damped_step(jacobian, right, rows, n, 1e-10 if low < 1e-4 else 0.0, work, vector, step)
    for i in range(n):
        out[i] = guess[i] + step[i]


@helper
def coasting(prismatic, axes, origins, tool, speed, out):
    """Fill out (6,): the acceleration of the tool at constant joint speeds, J-dot times q-dot, in the axes of the first frame."""
    n = prismatic.shape[0]
    wx = wy = wz = vx = vy = vz = 0.0
    for i in range(6):
        out[i] = 0.0
    # the tool's own velocity first
    tx = ty = tz = 0.0
    for i in range(n):
        ax, ay, az, s = axes[i, 0], axes[i, 1], axes[i, 2], speed[i]
        if prismatic[i]:
            tx, ty, tz = tx + ax * s, ty + ay * s, tz + az * s
        else:
            dx, dy, dz = tool[0, 3] - origins[i, 0], tool[1, 3] - origins[i, 1], tool[2, 3] - origins[i, 2]
            tx, ty, tz = tx + (ay * dz - az * dy) * s, ty + (az * dx - ax * dz) * s, tz + (ax * dy - ay * dx) * s
    ox, oy, oz = origins[0, 0], origins[0, 1], origins[0, 2]
    for i in range(n):
        ax, ay, az, s = axes[i, 0], axes[i, 1], axes[i, 2], speed[i]
        # velocity of this joint's origin, carried by the joints before it
        dx, dy, dz = origins[i, 0] - ox, origins[i, 1] - oy, origins[i, 2] - oz
        vx, vy, vz = vx + wy * dz - wz * dy, vy + wz * dx - wx * dz, vz + wx * dy - wy * dx
        ox, oy, oz = origins[i, 0], origins[i, 1], origins[i, 2]
        # rate of this joint's axis
        bx, by, bz = wy * az - wz * ay, wz * ax - wx * az, wx * ay - wy * ax
        if prismatic[i]:
            # the axis turns, and the part already slid out is carried in the origins of the joints after it
            out[0] += bx * s
            out[1] += by * s
            out[2] += bz * s
            vx, vy, vz = vx + ax * s, vy + ay * s, vz + az * s
        else:
            dx, dy, dz = tool[0, 3] - ox, tool[1, 3] - oy, tool[2, 3] - oz
            ex, ey, ez = tx - vx, ty - vy, tz - vz
            out[0] += (by * dz - bz * dy + ay * ez - az * ey) * s
            out[1] += (bz * dx - bx * dz + az * ex - ax * ez) * s
            out[2] += (bx * dy - by * dx + ax * ey - ay * ex) * s
            out[3] += bx * s
            out[4] += by * s
            out[5] += bz * s
            wx, wy, wz = wx + ax * s, wy + ay * s, wz + az * s


@kernel(
    "void(f8[:,:,::1], u1[::1], f8, i8, f8[::1], f8[:,::1], f8[:,::1], f8[:,::1], f8[:,::1], f8[:,::1],"
    " f8[:,::1], f8[:,::1], f8[:,::1])"
)
def _rates(links, prismatic, length, rows, limit, joints, twist, twist_rate, slope, bend, speed, acceleration, measures):
    n = prismatic.shape[0]
    wide = max(n, 7) + 1
    axes, origins, tool, jacobian = np.empty((n, 3)), np.empty((n, 3)), np.empty((3, 4)), np.empty((rows, n))
    work, vector, step, order = np.empty((wide, wide)), np.empty(wide), np.empty(n), np.empty(wide)
    d, e, right, demand = np.empty(wide), np.empty(wide), np.empty(6), np.empty(6)
    now, change, given, rate = np.empty(6), np.empty(n), np.empty(n), np.empty(n)
    scale, low, before = 1.0 / length, 0.0, np.zeros((rows, n))
    for k in range(joints.shape[0]):
        if not np.isfinite(joints[k, 0]):
            for i in range(n):
                speed[k, i], acceleration[k, i] = np.nan, np.nan
            for i in range(3):
                measures[k, i] = np.nan
            continue
        for i in range(n):
            given[i] = joints[k, i]
        place(links, prismatic, given, axes, origins, tool)
        task_jacobian(prismatic, axes, origins, tool, rows, scale, jacobian)
        low = smallest_singular_value(jacobian, rows, n, max(0.999 * (low - change_of(jacobian, before)), 0.0), work, d, e)
        regular = False
        if n == rows and low > 1e-4:
            _, smallest = factor(jacobian, n, work, order)
            regular = smallest > 0.0
        for i in range(6):
            now[i] = twist[k, i]
        for i in range(n):
            given[i] = slope[k, i]
        in_tool_axes(now, tool, scale, demand)
        match_rates(jacobian, demand, rows, n, low, regular, given, rate, work, order, vector, step, right)
        coasting(prismatic, axes, origins, tool, rate, now)
        for i in range(6):
            now[i] = twist_rate[k, i] - now[i]
        for i in range(n):
            given[i] = bend[k, i]
        in_tool_axes(now, tool, scale, demand)
        match_rates(jacobian, demand, rows, n, low, regular, given, change, work, order, vector, step, right)
        share = 0.0
        for i in range(n):
            speed[k, i], acceleration[k, i] = rate[i], change[i]
            share = max(share, abs(rate[i]) / limit[i])
        least = share
        if n == rows + 1 and share > 0.0:
            found = smallest_share(jacobian, rows, n, rate, limit, work, vector)
            if found >= 0.0:
                least = min(found, share)
        measures[k, 0], measures[k, 1], measures[k, 2] = low, share, least


def rates(chain, length, rows, limit, joints, twist, twist_rate, slope, bend):
    """Joint rates and measures at joints (N, n), rows with NaN left out.

    length in m scales the linear rows; limit (n,) joint speeds; twist and twist_rate (N, 6) of the tool in part axes; slope and bend
    (N, n) the followed joints' own first and second time derivatives, which decide only what the tool motion leaves open. Returns
    speed, acceleration (N, n) and measures (N, 3): smallest singular value of the scaled task Jacobian, largest |speed| / limit, and
    the least that this could be for the same tool motion. Long paths are shared out to the cores; each sample is measured by
    itself.
    """
    n, samples = chain.prismatic.shape[0], len(joints)
    given = [dense(a) for a in (joints, twist, twist_rate, slope, bend)]
    out = [np.empty((samples, n)), np.empty((samples, n)), np.empty((samples, 3))]
    head = dense(chain.links), dense(chain.prismatic, np.uint8), float(length), rows, dense(limit)

    def run(piece):
        _rates(*head, *(a[piece] for a in given), *(a[piece] for a in out))

    pieces = min(os.cpu_count() or 1, samples // SHARED)
    if pieces < 2:
        run(slice(None))
    else:
        cuts = np.linspace(0, samples, pieces + 1).astype(int)
        with ThreadPoolExecutor(pieces) as pool:
            list(pool.map(run, map(slice, cuts[:-1], cuts[1:])))
    return tuple(out)
