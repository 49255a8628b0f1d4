"""Time-optimal path tracking as a second-order cone programme: the reference for the sweeps, solved by Clarabel.

The path is q(s) with first = q'(s_k) and second = q''(s_k), (N, n) each, at the nodes s (N,). With b = (ds/dt)^2, linear between
nodes, and a = b'/2, constant on each interval: |q'_i| sqrt(b) <= speed_i and b <= ceiling at the nodes, |q'_i a + q''_i b| <=
acceleration_i at both ends of every interval. The time is the sum of 2 ds / (sqrt(b_k) + sqrt(b_k+1)).
D. Verscheure, B. Demeulenaere, J. Swevers, J. De Schutter, M. Diehl, IEEE Trans. Automatic Control 54(10), 2009.
"""

from dataclasses import dataclass

import clarabel
import cvxpy
import numpy as np
from scipy import sparse


@dataclass(frozen=True)
class Problem:
    s: np.ndarray
    first: np.ndarray
    second: np.ndarray
    speed: np.ndarray
    acceleration: np.ndarray
    start: float = 0.0
    """b at the first node"""
    end: float = 0.0
    ceiling: np.ndarray | float = np.inf

    @property
    def largest(self):
        """Upper bound of b at each node (N,), from the speeds and the ceiling; the ends are fixed elsewhere."""
        with np.errstate(divide="ignore"):
            return np.minimum(np.min((self.speed / np.abs(self.first)) ** 2, axis=1), self.ceiling)

    def rows(self):
        """Acceleration rows on the unknowns b (N,), as a sparse matrix and its bounds: rows @ b within +-bound."""
        nodes, n = self.first.shape
        steps, every = nodes - 1, np.arange(nodes - 1)
        blocks = []
        for end in (0, 1):
            slope = self.first[every + end] / (2.0 * np.diff(self.s))[:, None]
            bend = self.second[every + end]
            left, right = (bend - slope, slope) if end == 0 else (-slope, bend + slope)
            row = np.repeat(np.arange(steps * n), 2)
            column = np.stack([np.repeat(every, n), np.repeat(every + 1, n)], axis=1).ravel()
            blocks.append(sparse.csr_matrix((np.stack([left.ravel(), right.ravel()], axis=1).ravel(), (row, column)), (steps * n, nodes)))
        return sparse.vstack(blocks).tocsr(), np.tile(self.acceleration, 2 * steps)


def duration(s, b):
    """s, of b (N,) at the nodes."""
    root = np.sqrt(np.maximum(b, 0.0))
    return float(np.sum(2.0 * np.diff(s) / (root[1:] + root[:-1])))


def by_cvxpy(problem):
    """b (N,) and the optimal duration, stated as it reads."""
    b = cvxpy.Variable(len(problem.s))
    root = cvxpy.Variable(len(problem.s))
    rows, bound = problem.rows()
    inner, largest = slice(1, -1), problem.largest
    bounded = np.flatnonzero(np.isfinite(largest[inner])) + 1
    constraints = [
        b[0] == problem.start, b[-1] == problem.end, root[0] == np.sqrt(problem.start), root[-1] == np.sqrt(problem.end),
        root[inner] <= cvxpy.sqrt(b[inner]), cvxpy.abs(rows @ b) <= bound, b[bounded] <= largest[bounded],
    ]  # fmt: skip
    time = cvxpy.sum(cvxpy.multiply(2.0 * np.diff(problem.s), cvxpy.inv_pos(root[1:] + root[:-1])))
    cvxpy.Problem(cvxpy.Minimize(time), constraints).solve(solver=cvxpy.CLARABEL)
    return b.value, duration(problem.s, b.value)


def by_native_matrices(problem):
    """b (N,), the optimal duration and the solver's status: the same programme handed to Clarabel without a modelling layer.

    Unknowns: b (N,), root (N,) with root^2 <= b, and for each interval d with d (root_k + root_k+1) >= 1.
    """
    nodes = len(problem.s)
    steps = nodes - 1
    every, unknowns = np.arange(steps), 2 * nodes + steps
    rows, bound = problem.rows()
    lines = sparse.hstack([rows, sparse.csr_matrix((rows.shape[0], nodes + steps))])
    inner = np.arange(1, nodes - 1)
    bounded = inner[np.isfinite(problem.largest[inner])]
    ceiling = _pick(bounded, bounded, unknowns)

    ends = sparse.csr_matrix((np.ones(4), (np.arange(4), [0, steps, nodes, nodes + steps])), (4, unknowns))
    fixed = np.array([problem.start, problem.end, np.sqrt(problem.start), np.sqrt(problem.end)])
    under_root = _cone(
        [(0, every[1:], -1.0), (1, every[1:], -1.0), (2, nodes + every[1:], -2.0)], steps - 1, unknowns
    )  # (b + 1, b - 1, 2 root)
    first, last, inverse = nodes + every, nodes + every + 1, 2 * nodes + every
    under_line = _cone(
        [(0, first, -1.0), (0, last, -1.0), (0, inverse, -1.0), (1, first, -1.0), (1, last, -1.0), (1, inverse, 1.0)], steps, unknowns
    )  # (root_k + root_k+1 + d, root_k + root_k+1 - d, 2)
    matrix = sparse.vstack([ends, lines, -lines, ceiling, under_root, under_line]).tocsc()
    right = np.concatenate([
        fixed, bound, bound, problem.largest[bounded], np.tile([1.0, -1.0, 0.0], steps - 1), np.tile([0.0, 0.0, 2.0], steps),
    ])  # fmt: skip
    cones = [clarabel.ZeroConeT(4), clarabel.NonnegativeConeT(2 * len(bound) + len(bounded))]
    cones += [clarabel.SecondOrderConeT(3)] * (2 * steps - 1)
    settings = clarabel.DefaultSettings()
    settings.verbose = False
    cost = np.concatenate([np.zeros(2 * nodes), 2.0 * np.diff(problem.s)])
    solution = clarabel.DefaultSolver(sparse.csc_matrix((unknowns, unknowns)), cost, matrix, right, cones, settings).solve()
    b = np.array(solution.x[:nodes])
    return b, duration(problem.s, b), str(solution.status)


def _pick(rows, columns, unknowns):
    return sparse.csr_matrix((np.ones(len(rows)), (np.arange(len(rows)), columns)), (len(rows), unknowns))


def _cone(entries, count, unknowns):
    """Rows of `count` three-row cones; entries (row within the cone, column of each cone, value)."""
    row = np.concatenate([3 * np.arange(count) + offset for offset, _, _ in entries])
    column = np.concatenate([columns for _, columns, _ in entries])
    value = np.concatenate([np.full(count, value) for _, _, value in entries])
    return sparse.csr_matrix((value, (row, column)), (3 * count, unknowns))
