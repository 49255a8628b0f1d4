"""A path followed and measured once more with a chain that is a little different, close to joints that are known.

Where a chain is millimetres off, so are the joints, and by amounts that change slowly along the path: one Newton step from there is mostly enough,
and what that step has prepared serves the measures. It is the same branch of solutions: the determinant keeps its sign, and no joint moves off what
its last displacements foretell. Where that cannot be said, it is left to `steps.follow`.
"""

import numpy as np

from .compiled import dense, helper, kernel
from .frames import place
from .rates import coasting, smallest_singular_value
from .steps import TOLERANCE, copy, largest_move, largest_of
from .task import factor, in_tool_axes, pose_error, substitute, task_jacobian

FAR = 0.2  # rad or m that a joint may be off the known one
ASIDE = 0.01  # rad or m that it may be off what the displacements before foretell
LEAST = 1e-3  # smallest pivot of the Jacobian, and smallest singular value, of a pose that is clear of singular ones
ENOUGH = 1e-7  # rad or m: a step no larger leaves far less than TOLERANCE, and is no larger than what the measures may be off
TRIES = 6


BEFORE = 4  # samples whose displacements foretell the next: a cubic


@helper
def foretell(weights, near, joints, k, guess):
    """Fill guess (n,): the known joints of sample k, displaced as the samples before foretell."""
    for i in range(guess.shape[0]):
        guess[i] = near[k, i]
    for j in range(BEFORE):
        if weights[k, j] != 0.0:
            for i in range(guess.shape[0]):
                guess[i] += weights[k, j] * (joints[k - 1 - j, i] - near[k - 1 - j, i])


@helper
def distance(a, b):
    """Frobenius norm of a - b (n, n): no singular value differs more (Weyl 1912)."""
    total = 0.0
    for i in range(a.shape[0]):
        for j in range(a.shape[1]):
            total += (a[i, j] - b[i, j]) ** 2
    return np.sqrt(total)


@kernel(
    "i8(f8[:,:,::1], u1[::1], f8, f8[:,::1], f8[:,::1], f8[:,:,::1], f8[:,::1], f8[:,::1], f8[:,::1], f8[:,:,::1], f8[::1],"
    " f8[:,::1], f8[:,::1], f8[:,::1], f8[::1])"
)
def _draw(
    links, prismatic, length, weights, position, rotation, twist, twist_rate, near, near_jacobians, near_sigma, joints, speed, acceleration, sigma
):  # fmt: skip
    n = prismatic.shape[0]
    axes, origins, tool, jacobian = np.empty((n, 3)), np.empty((n, 3)), np.empty((3, 4)), np.empty((n, n))
    goal_position, goal_rotation, spare, error = np.empty(3), np.empty((3, 3)), np.empty((3, 3)), np.empty(6)
    q, guess, step, order, rate, change = np.empty(n), np.empty(n), np.empty(n), np.empty(n), np.empty(n), np.empty(n)
    work, d, e, now, demand, known = np.empty((n, n)), np.empty(n), np.empty(n), np.empty(6), np.empty(6), np.empty((n, n))
    scale, sign = 1.0 / length, 0.0
    for k in range(position.shape[0]):
        for i in range(3):
            goal_position[i] = position[k, i]
            for j in range(3):
                goal_rotation[i, j] = rotation[k, i, j]
        foretell(weights, near, joints, k, guess)
        copy(guess, q, n)
        solved = False
        for turn in range(TRIES):
            place(links, prismatic, q, axes, origins, tool)
            far, turned = pose_error(tool, goal_position, goal_rotation, n, scale, spare, error)
            task_jacobian(prismatic, axes, origins, tool, n, scale, jacobian)
            determinant, smallest = factor(jacobian, n, work, order)
            if smallest < LEAST:
                return k
            substitute(work, order, error, n, step)
            if not largest_of(step, n) < 0.1:
                return k
            for i in range(n):
                q[i] += step[i]
            solved = largest_of(step, n) < ENOUGH or (far < TOLERANCE and turned < TOLERANCE)
            if solved:
                break
        if not solved or sign * determinant < 0.0 or not largest_move(q, guess) < (FAR if k == 0 else ASIDE):
            return k
        sign = determinant
        for i in range(n):
            joints[k, i] = q[i]
            if not abs(q[i] - near[k, i]) < FAR:
                return k
        for i in range(6):
            now[i] = twist[k, i]
        in_tool_axes(now, tool, scale, demand)
        substitute(work, order, demand, n, rate)
        coasting(prismatic, axes, origins, tool, rate, now)
        for i in range(6):
            now[i] = twist_rate[k, i] - now[i]
        in_tool_axes(now, tool, scale, demand)
        substitute(work, order, demand, n, change)
        for i in range(n):
            speed[k, i], acceleration[k, i] = rate[i], change[i]
            for j in range(n):
                known[i, j] = near_jacobians[k, i, j]
        bound = max(0.999 * (near_sigma[k] - distance(jacobian, known)), 0.0)
        sigma[k] = smallest_singular_value(jacobian, n, n, bound, work, d, e)
        if sigma[k] < LEAST:
            return k
    return -1


def foretelling(along) -> np.ndarray:
    """(N, BEFORE) weights of the samples before each, the last one first: the polynomial through them by the parameter along (N,), of a lower degree at
    the start and where its steps grow threefold."""
    weights, step = np.zeros((len(along), BEFORE)), np.diff(along)
    for k in range(1, len(along)):
        before = along[k - 1 :: -1][:BEFORE] if k > 1 else along[:1]
        grows = step[k - 1] > 3.0 * step[max(k - len(before), 0) : k].min()
        before = before[:1] if grows else before
        for j, at in enumerate(before):
            others = np.delete(before, j)
            weights[k, j] = np.prod((along[k] - others) / (at - others))
    return weights


def draw(chain, length, weights, path, near, near_jacobians, near_sigma, joints, speed, acceleration, sigma) -> bool:
    """Fill joints, speed, acceleration (N, n) and sigma (N,) for a chain close to the one whose joints are `near` (N, n); False where it has to be followed.

    chain (links, prismatic) with as many joints as the task has rows, 5 or 6; length in m; path (position (N, 3), rotation (N, 3, 3), twist and
    twist_rate (N, 6)); weights as `foretelling` gives them; near_jacobians (N, n, n) the scaled task Jacobians of the known chain there and near_sigma (N,)
    their smallest singular values, which only say where to look first. All arrays as a kernel takes them: float64, C order, writable.
    """
    n = chain.prismatic.shape[0]
    if near.shape[1:] != (n,) or near_jacobians.shape[1:] != (n, n):
        raise ValueError(f"joints have shape {near.shape} and Jacobians {near_jacobians.shape}, expected (N, {n}) and (N, {n}, {n})")
    position, rotation, twist, twist_rate = path
    out = joints, speed, acceleration, sigma
    return _draw(dense(chain.links), dense(chain.prismatic, np.uint8), length, weights, position, rotation, twist, twist_rate, near, near_jacobians, near_sigma, *out) < 0
