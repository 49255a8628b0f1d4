"""Inverse kinematics by damped Jacobian pseudo-inverse (Newton) steps: one pose, and a whole path followed sample by sample.

Step and damping: Whitney 1969; Wampler 1986; Nakamura and Hanafusa 1986. Damping by trial: Levenberg 1944, Marquardt 1963. Step control
along a branch of solutions: Allgower and Georg 1990.
"""

from math import sqrt

import numpy as np

from .compiled import dense, helper, kernel
from .frames import place
from .task import damped_step, factor, pose_error, rotation_log, substitute, task_jacobian

TOLERANCE = 1e-10  # of a solved pose, metres and radians: ten times tighter than what is promised
RENEW = 32  # samples after which a step is taken even where the prediction hits, to renew the inverse and see the determinant
CLEAR = 0.05  # smallest pivot of a Jacobian that is far enough from singular
THROUGH = 1e-5  # how far from the path, rad and characteristic lengths, the smooth way through a singular place may leave the tool
LOOSE = 1e-5  # of an arm with fewer joints than the task has rows, which can only come close to rounded poses
REACHED, CROSSED, JUMPED, UNREACHED = 0, 1, 2, 3


@helper
def largest_of(a, n):
    largest = 0.0
    for i in range(n):
        largest = max(largest, abs(a[i]))
    return largest


@helper
def largest_move(a, b):
    largest = 0.0
    for i in range(a.shape[0]):
        largest = max(largest, abs(a[i] - b[i]))
    return largest


@helper
def copy(source, target, count):
    # an element at a time: assigning a slice would compile Numba's messages on unequal shapes into every kernel
    for i in range(count):
        target[i] = source[i]


@helper
def settle(
    links, prismatic, position, rotation, rows, inverse_length, limit, damping, q, most,
    axes, origins, tool, jacobian, work, spare, error, step, vector, base, kept,
):  # fmt: skip
    """Steps on q (n,) in place towards one pose; returns (solved, pivot, metres left, radians left).

    No joint moves more than `limit` in a step. With damping 0 the steps are plain Newton steps where the Jacobian is square and regular
    and damped ones elsewhere; with a damping to begin with, a step that does not come closer is taken back and damped more
    (Levenberg-Marquardt), so that q ends at the pose or as close to it as can be. One step is taken at least, `most` at the most. The
    pivot is the smallest one of the last Jacobian, with the sign of the determinant: 0 where the Jacobian is singular or not square.
    """
    n = q.shape[0]
    guarded = damping > 0.0
    pivot, cost, best_far, best_turned, dull = 0.0, np.inf, np.inf, np.inf, 0
    for turn in range(most + 1):
        place(links, prismatic, q, axes, origins, tool)
        far, turned = pose_error(tool, position, rotation, rows, inverse_length, spare, error)
        if far < TOLERANCE and turned < TOLERANCE and turn > 0:
            return True, pivot, far, turned
        if n < rows and turn > 0 and far < LOOSE and turned < LOOSE and largest_of(step, n) < 1e-9:
            return True, pivot, far, turned
        now = (far * inverse_length) ** 2 + turned**2
        if guarded and not now < cost:
            copy(base, q, n)
            copy(kept, error, 6)
            damping = 10.0 * max(damping, 1e-9)
            if damping > 1e6:
                break
        else:
            dull = dull + 1 if now > 0.999999 * cost else 0
            if turn == most or dull > 5 or not far < 1e6:
                return False, pivot, far, turned
            cost, best_far, best_turned, damping = now, far, turned, 0.1 * damping
            if guarded:
                copy(q, base, n)
                copy(error, kept, 6)
            task_jacobian(prismatic, axes, origins, tool, rows, inverse_length, jacobian)
        within = False
        if n == rows and damping < 1e-6:
            determinant, smallest = factor(jacobian, n, work, vector)
            if smallest > 0.0:
                substitute(work, vector, error, n, step)
            pivot = 0.0 if smallest < 1e-7 else (smallest if determinant > 0.0 else -smallest)
            within = smallest > 1e-6 and largest_of(step, n) < limit
        lift = damping if guarded or n != rows else 1e-8
        while not within and lift < 1e8:
            damped_step(jacobian, error, rows, n, lift, work, vector, step)
            within = largest_of(step, n) < limit
            lift = 10.0 * max(lift, 1e-10)
        for i in range(n):
            q[i] += step[i]
    if guarded:
        copy(base, q, n)
    return False, pivot, best_far, best_turned


@helper
def rotate(v, out):
    """Fill out (3, 3) with the rotation whose rotation vector is v (3,); Rodrigues' formula by half angles, exact near zero."""
    x, y, z = v[0], v[1], v[2]
    square = x * x + y * y + z * z
    angle = sqrt(square)
    half = np.sin(0.5 * angle)
    s = np.sin(angle) / angle if angle > 1e-8 else 1.0
    c = 2.0 * half * half / square if angle > 1e-8 else 0.5
    out[0, 0], out[0, 1], out[0, 2] = 1.0 - c * (y * y + z * z), c * x * y - s * z, c * x * z + s * y
    out[1, 0], out[1, 1], out[1, 2] = c * x * y + s * z, 1.0 - c * (x * x + z * z), c * y * z - s * x
    out[2, 0], out[2, 1], out[2, 2] = c * x * z - s * y, c * y * z + s * x, 1.0 - c * (x * x + y * y)


@helper
def between(p0, r0, v0, p1, r1, v1, span, u, position, rotation, spare, phi, w0, w1, vector):
    """The pose at the fraction u of an interval of the path parameter, `span` long: cubic Hermite in position and in the rotation vector from r0.

    v0 and v1 (6,) are the tool twists by the parameter at the ends, in part axes; phi, w0, w1, vector (3,) and spare (3, 3) are room.
    """
    h00, h10 = (1.0 + 2.0 * u) * (1.0 - u) ** 2, u * (1.0 - u) ** 2
    h01, h11 = u * u * (3.0 - 2.0 * u), u * u * (u - 1.0)
    for i in range(3):
        position[i] = h00 * p0[i] + h10 * span * v0[i] + h01 * p1[i] + h11 * span * v1[i]
        for j in range(3):
            spare[i, j] = r0[0, i] * r1[0, j] + r0[1, i] * r1[1, j] + r0[2, i] * r1[2, j]
    rotation_log(spare, phi)
    for i in range(3):
        w0[i] = r0[0, i] * v0[3] + r0[1, i] * v0[4] + r0[2, i] * v0[5]
        w1[i] = r1[0, i] * v1[3] + r1[1, i] * v1[4] + r1[2, i] * v1[5]
    # rate of the rotation vector at the far end: inverse right Jacobian to second order (the interval turns little)
    c = (phi[1] * w1[2] - phi[2] * w1[1], phi[2] * w1[0] - phi[0] * w1[2], phi[0] * w1[1] - phi[1] * w1[0])
    d = (phi[1] * c[2] - phi[2] * c[1], phi[2] * c[0] - phi[0] * c[2], phi[0] * c[1] - phi[1] * c[0])
    for i in range(3):
        vector[i] = h10 * span * w0[i] + h01 * phi[i] + h11 * span * (w1[i] + 0.5 * c[i] + d[i] / 12.0)
    rotate(vector, spare)
    for i in range(3):
        for j in range(3):
            rotation[i, j] = r0[i, 0] * spare[0, j] + r0[i, 1] * spare[1, j] + r0[i, 2] * spare[2, j]


@helper
def slope_before(time, joints, k, known, span, slope):
    """Fill slope (n,): joint change per `span` just after sample k - 1, by the parabola through three samples; zero where there are fewer."""
    n = slope.shape[0]
    for i in range(n):
        slope[i] = 0.0
    if known >= 3:
        t0, t1, t2 = time[k - 3], time[k - 2], time[k - 1]
        a = span * (t2 - t1) / ((t0 - t1) * (t0 - t2))
        b = span * (t2 - t0) / ((t1 - t0) * (t1 - t2))
        for i in range(n):
            slope[i] = a * (joints[k - 3, i] - joints[k - 1, i]) + b * (joints[k - 2, i] - joints[k - 1, i])


@helper
def passes_through(
    links, prismatic, p0, r0, v0, p1, r1, v1, span, rows, inverse_length, time, joints, k, here, position, rotation, turning, trial,
    axes, origins, tool, spare, error, vector, kept,
):  # fmt: skip
    """Whether the joints can go on smoothly from sample k - 1 to `here` (n,) beyond a singular place with the tool on its path.

    The cubic through the last three samples and `here` must keep the tool within THROUGH of the path between the two samples. A pass
    closer to the singular place than that is one through it; a wider one has to go round, which is another motion.
    """
    n = here.shape[0]
    for part in range(1, 4):
        u = 0.25 * part
        at = time[k - 1] + u * (time[k] - time[k - 1])
        for i in range(n):
            trial[i] = 0.0
        for a in range(4):
            weight = 1.0
            for b in range(4):
                if b != a:
                    weight *= (at - time[k - 3 + b]) / (time[k - 3 + a] - time[k - 3 + b])
            for i in range(n):
                trial[i] += weight * (here[i] if a == 3 else joints[k - 3 + a, i])
        between(p0, r0, v0, p1, r1, v1, span, u, position, rotation, spare, error, vector, kept, turning)
        place(links, prismatic, trial, axes, origins, tool)
        far, turned = pose_error(tool, position, rotation, rows, inverse_length, spare, error)
        if far * inverse_length + turned > THROUGH:
            return False
    return True


@helper
def creep(
    links, prismatic, p0, r0, v0, p1, r1, v1, span, rows, inverse_length, sign, q, slope, position, rotation, turning, trial, ahead,
    axes, origins, tool, jacobian, work, spare, error, step, vector, base, kept,
):  # fmt: skip
    """Follow the motion between two samples in small steps, q in place; (done, sign). Not done: no smooth way on was found.

    Each step starts from the last one carried on, and is taken only where the solution is close to that, so that speeds stay
    continuous; the first may instead be a small one, for the slope to start with comes from coarser steps. A singular place is crossed
    (the sign of the determinant changes) only in a step too small to leap to another branch.
    """
    n = q.shape[0]
    most = np.int64(4)
    u, h, steps = 0.0, 0.25, 0
    while u < 1.0 and steps < 4000:
        steps += 1
        goal = min(1.0, u + h)
        between(p0, r0, v0, p1, r1, v1, span, goal, position, rotation, spare, error, vector, kept, turning)
        if goal == 1.0:
            copy(p1, position, 3)
            for i in range(3):
                copy(r1[i], rotation[i], 3)
        for i in range(n):
            ahead[i] = q[i] + (goal - u) * slope[i]
            trial[i] = ahead[i]
        solved, now, _, _ = settle(
            links, prismatic, position, rotation, rows, inverse_length, 0.2, 0.0, trial, most,
            axes, origins, tool, jacobian, work, spare, error, step, vector, base, kept,
        )  # fmt: skip
        move = largest_move(trial, q)
        same = now * sign >= 0.0
        smooth = solved and move < 0.1 and largest_move(trial, ahead) < 0.3 * move + 1e-8
        if (smooth and (same or move < 2e-5)) or (u == 0.0 and solved and same and move < 1e-3):
            for i in range(n):
                slope[i] = (trial[i] - q[i]) / (goal - u)
            copy(trial, q, n)
            u = goal
            h *= 1.7
            if now != 0.0:
                sign = now
        else:
            h *= 0.4
            if h < 1e-7:
                return False, sign
    return u >= 1.0, sign


@helper
def lean(jacobian, rows, n, lower, upper, q, move, work, vector, step, pull):
    """Fill pull (n,): null-space motion away from travel limits, as large as `move` at a limit, none in the middle 70 % of the travel."""
    near = False
    for i in range(n):
        pull[i] = 0.0
        if np.isfinite(lower[i]) and np.isfinite(upper[i]):
            share = (2.0 * q[i] - lower[i] - upper[i]) / (upper[i] - lower[i])
            if abs(share) > 0.7:
                near = True
                pull[i] = -move * min((abs(share) - 0.7) / 0.3, 2.0) * (1.0 if share > 0.0 else -1.0)
    if not near:
        return False
    for i in range(rows):
        vector[i] = 0.0
        for j in range(n):
            vector[i] += jacobian[i, j] * pull[j]
    damped_step(jacobian, vector, rows, n, 0.0, work, vector, step)
    for i in range(n):
        pull[i] -= step[i]
    return True


@helper
def extrapolate(time, joints, k, count, even, weight, guess):
    """Fill guess (n,) with the polynomial through the `count` joint rows before k, unless the time step grows too fast to trust it."""
    first = k - count
    if even and count == 5:
        for i in range(guess.shape[0]):
            outer, middle = joints[k - 1, i] - joints[k - 4, i], joints[k - 3, i] - joints[k - 2, i]
            guess[i] = joints[k - 5, i] + 5.0 * outer + 10.0 * middle
        return
    for i in range(first, k - 1):
        if time[i + 2] - time[i + 1] > 3.0 * (time[i + 1] - time[i]):
            return
    for i in range(count):
        weight[i] = 1.0
        for j in range(count):
            if j != i:
                weight[i] *= (time[k] - time[first + j]) / (time[first + i] - time[first + j])
    for i in range(guess.shape[0]):
        total = 0.0
        for j in range(count):
            total += weight[j] * joints[first + j, i]
        guess[i] = total


@helper
def invert(jacobian, n, work, order, right, column, inverse):
    factor(jacobian, n, work, order)
    for j in range(n):
        for i in range(n):
            right[i] = 1.0 if i == j else 0.0
        substitute(work, order, right, n, column)
        for i in range(n):
            inverse[i, j] = column[i]


@helper
def correct(inverse, error, q):
    """A step by an inverse that is some samples old: it need not be exact, it only keeps predictions from adding up their errors."""
    for i in range(q.shape[0]):
        for j in range(q.shape[0]):
            q[i] += inverse[i, j] * error[j]


@kernel(
    "void(f8[:,:,::1], u1[::1], f8, i8, f8[::1], f8[::1], f8[::1], f8[:,::1], f8[:,:,::1], f8[:,::1],"
    " f8[::1], f8[::1], f8[:,::1], u1[::1], f8[:,::1])"
)
def _follow(links, prismatic, length, rows, lower, upper, time, position, rotation, twist, start, allow, joints, outcome, left):
    n = prismatic.shape[0]
    axes, origins, tool, jacobian = np.empty((n, 3)), np.empty((n, 3)), np.empty((3, 4)), np.empty((6, n))
    wide = max(n, 6)
    work, spare, error, kept = np.empty((wide, wide)), np.empty((3, 3)), np.empty(6), np.empty(6)
    step, vector, base = np.empty(n), np.empty(wide), np.empty(n)
    scale = 1.0 / length
    guess, here, walked, pull, q = np.empty(n), np.empty(n), np.empty(n), np.empty(n), np.empty(n)
    goal_position, goal_rotation, way_position, way_rotation = np.empty(3), np.empty((3, 3)), np.empty(3), np.empty((3, 3))
    turning, trial, ahead = np.empty(3), np.empty(n), np.empty(n)
    copy(start, q, n)
    even = 0  # how many time steps before this sample were alike
    inverse, age = np.empty((n, n)), RENEW  # of the Jacobian some samples ago, and how many
    hopeful = False  # whether predictions have hit the pose lately; only a square Jacobian has an inverse to begin with
    clear = True  # beside a singular place an error of the pose grows in the joints: there every sample is solved to the last digit
    sign, known = 0.0, 0  # known: how many samples just before this one were followed smoothly; sign: of the determinant
    for k in range(time.shape[0]):
        for i in range(3):
            goal_position[i] = position[k, i]
            for j in range(3):
                goal_rotation[i, j] = rotation[k, i, j]
        copy(q, guess, n)
        if k >= 2:
            lately = time[k] - time[k - 1]
            even = even + 1 if abs(lately - (time[k - 1] - time[k - 2])) < 1e-6 * lately else 0
        if n <= rows and known >= 3:
            extrapolate(time, joints, k, 5 if known >= 5 else 3, even >= 4, vector, guess)
        elif n > rows and known >= 1:
            place(links, prismatic, q, axes, origins, tool)
            far, turned = pose_error(tool, goal_position, goal_rotation, rows, scale, spare, error)
            task_jacobian(prismatic, axes, origins, tool, rows, scale, jacobian)
            if lean(jacobian, rows, n, lower, upper, q, far * scale + turned, work, vector, step, pull):
                for i in range(n):
                    guess[i] += pull[i]
        copy(guess, here, n)
        hit = False
        if hopeful and clear and known >= 5 and age < RENEW:
            place(links, prismatic, here, axes, origins, tool)
            far, turned = pose_error(tool, goal_position, goal_rotation, rows, scale, spare, error)
            hopeful = hit = far < TOLERANCE and turned < TOLERANCE
        if hit:  # a prediction that hits is enough
            solved, now = True, 0.0
            correct(inverse, error, here)
        else:
            most = np.int64(8)  # of this type, for a literal would have settle compiled once more
            solved, now, far, turned = settle(
                links, prismatic, goal_position, goal_rotation, rows, scale, 0.5, 0.0, here, most,
                axes, origins, tool, jacobian, work, spare, error, step, vector, base, kept,
            )  # fmt: skip
        near = solved and largest_move(here, guess) < 0.05 and largest_move(here, q) < 0.5
        same = now * sign >= 0.0
        outcome[k] = REACHED
        if known == 0:
            followed = solved and k == 0  # after a gap there is nothing to be continuous with
        elif near and same:
            followed = True
            age += 1
            if now != 0.0 and age >= RENEW:
                invert(jacobian, n, work, vector, error, step, inverse)
                age, hopeful = 0, True
        elif near and known >= 3 and passes_through(
            links, prismatic, position[k - 1], rotation[k - 1], twist[k - 1], goal_position, goal_rotation, twist[k],
            time[k] - time[k - 1], rows, scale, time, joints, k, here, way_position, way_rotation, turning, trial,
            axes, origins, tool, spare, error, vector, kept,
        ):  # fmt: skip
            followed, outcome[k] = True, CROSSED
        else:
            copy(q, walked, n)
            span = time[k] - time[k - 1]
            slope_before(time, joints, k, known, span, pull)
            followed, arrived = creep(
                links, prismatic, position[k - 1], rotation[k - 1], twist[k - 1], goal_position, goal_rotation, twist[k],
                span, rows, scale, sign, walked, pull, way_position, way_rotation, turning, trial, ahead,
                axes, origins, tool, jacobian, work, spare, error, step, vector, base, kept,
            )  # fmt: skip
            if followed:
                copy(walked, here, n)
                outcome[k] = CROSSED if arrived * sign < 0.0 else REACHED
                now, known, far, turned = arrived, 0, 0.0, 0.0
            elif near:
                followed, outcome[k], known = True, CROSSED, 0
        if not followed:
            copy(q, here, n)
            most = np.int64(300)
            solved, now, far, turned = settle(
                links, prismatic, goal_position, goal_rotation, rows, scale, 0.7, 1e-3, here, most,
                axes, origins, tool, jacobian, work, spare, error, step, vector, base, kept,
            )  # fmt: skip
            if not (solved or (far < allow[0] and turned < allow[1])):
                outcome[k], known = UNREACHED, -1
            elif known > 0:
                outcome[k], known = JUMPED, 0
        left[k, 0], left[k, 1] = far, turned
        if now != 0.0:
            sign, clear = now, abs(now) > CLEAR
        for i in range(n):
            joints[k, i] = q[i] = here[i]
        known += 1


def follow(chain, length, rows, limits, time, position, rotation, twist, start, allow):
    """Follow a path from `start` (n,), a solution of its first pose or close to one.

    chain (links, prismatic), length in m, rows 6 or 5 (spin free), limits (lower, upper) of the joints, the path as time (N,) or any
    other increasing parameter, position (N, 3), rotation (N, 3, 3) and twist (N, 6) by that parameter in part axes; allow (m, rad) is
    how far off still counts as reached where no exact solution is found. Returns joints (N, n), outcome (N,) uint8 (REACHED; CROSSED: a
    singular place was passed on the smooth branch; JUMPED: reached, though not from the sample before; UNREACHED: the closest found)
    and left (N, 2), the metres and radians left to the pose.
    """
    samples, n = time.shape[0], chain.prismatic.shape[0]
    joints, outcome = np.empty((samples, n)), np.zeros(samples, np.uint8)
    left, given = np.zeros((samples, 2)), (*limits, time, position, rotation, twist, start, allow)
    _follow(dense(chain.links), dense(chain.prismatic, np.uint8), float(length), rows, *map(dense, given), joints, outcome, left)
    return joints, outcome, left


def solve(chain, length, rows, position, rotation, seeds):
    """From each of seeds (M, n) to one pose: joints (M, n) and left (M, 2), the metres and radians that remain."""
    n = chain.prismatic.shape[0]
    free, once = np.full(n, np.inf), np.zeros(1)  # a path of one sample, without travel limits
    pose = np.reshape(position, (1, 3)), np.reshape(rotation, (1, 3, 3)), np.zeros((1, 6))
    found = [follow(chain, length, rows, (-free, free), once, *pose, seed, np.zeros(2)) for seed in seeds]
    return np.array([joints[0] for joints, *_ in found]).reshape(-1, n), np.array([left[0] for *_, left in found]).reshape(-1, 2)
