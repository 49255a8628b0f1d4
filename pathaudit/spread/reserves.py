"""How far off a dimension may be before the verdict changes: one at a time, all at once, and in the worst direction of where the part stands."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..tolerances import Dimension
from .slopes import slopes

MOST = {"mm": 50.0, "deg": 5.0, "%": 50.0}  # how far is looked
MOST_TIMES = 10.0  # the stated tolerances, all at once
PLACES, HALVINGS = 16, 10  # looked at on the way out, closer together at first; then the change is enclosed
CANDIDATES, STEPS = 3, 5  # levels whose own worst direction is looked for, and steps of that


@dataclass(frozen=True)
class Reserve:
    """A dimension alone: the verdict stays down to -minus and up to plus, in its unit, None where it stays as far as was looked (`most`).

    minus_by, plus_by: what changes it there, as numbers of what is watched.
    """

    dimension: Dimension
    minus: float | None
    plus: float | None
    minus_by: int | None
    plus_by: int | None
    most: float


@dataclass(frozen=True, eq=False)
class Worst:
    """The shortest way found to another verdict: off by `values` (D,) of `dimensions`. size: how many times their sizes that is, taken together as
    the root of the sum of squares, or all of them at once so many times. by: what is flagged then, as a number of what is watched. audited: the verdict of
    the whole audit of that cell, "" where it was not audited."""

    dimensions: tuple
    values: np.ndarray
    size: float
    by: int
    audited: str = ""


@dataclass(frozen=True, eq=False)
class Verdicts:
    """What is watched, and the verdict of the cell as stated: what changes it."""

    watched: tuple
    nominal: np.ndarray

    def of(self, levels) -> np.ndarray:
        """(M,) of levels (M, L): 0 pass, 1 warn, 2 fail"""
        warn, fail = (np.any([w.beyond(levels[:, i], severity) for i, w in enumerate(self.watched)], axis=0) for severity in ("warn", "fail"))
        return np.where(fail, 2, np.where(warn, 1, 0))

    @property
    def now(self) -> int:
        return int(self.of(self.nominal[None])[0])

    def changed(self, levels) -> np.ndarray:
        """(M,) bool: worse than now; where it fails now, better"""
        found = self.of(levels)
        return found < 2 if self.now == 2 else found > self.now

    def bound(self, i) -> float | None:
        """The bound of watched i whose passing makes the verdict worse, None where it is passed already or there is none"""
        w = self.watched[i]
        bound = w.fail if self.now == 1 or w.warn is None else w.warn
        return None if bound is None or w.beyond(self.nominal[i], "fail" if self.now == 1 else "warn") else bound

    def by(self, levels) -> int:
        """Of levels (L,) with another verdict: what is flagged that was not, or no longer what was"""
        severity = "fail" if self.now else "warn"
        then, now = (np.array([bool(w.beyond(level, severity)) for w, level in zip(self.watched, row, strict=True)]) for row in (levels, self.nominal))
        return int(np.argmax(then != now))


def search(levels_of: Callable, verdicts: Verdicts, ways):
    """Along each of ways (S, D), given at the farthest place: shares of the way (S, 2) up to which the verdict was seen to stay and from which it is
    another, both 1 and inf where it stays all the way; and the levels there (S, L).

    A change that is undone again between two of the places looked at is not seen.
    """
    ends = np.tile([0.0, np.inf], (len(ways), 1))
    there = np.full((len(ways), len(verdicts.watched)), np.nan)

    def look(which, at):
        levels = levels_of(at[:, None] * ways[which])
        changed = verdicts.changed(levels)
        ends[which[changed], 1], ends[which[~changed], 0] = at[changed], at[~changed]
        there[which[changed]] = levels[changed]

    for place in (np.arange(1, PLACES + 1) / PLACES) ** 2:
        which = np.flatnonzero(np.isinf(ends[:, 1]))
        if len(which):
            look(which, np.full(len(which), place))
    found = np.flatnonzero(np.isfinite(ends[:, 1]))
    for _ in range(HALVINGS if len(found) else 0):
        look(found, ends[found].mean(axis=1))
    return ends, there


def most_of(cell, dimension) -> float:
    """How far a dimension is looked at, in its unit: a link at most by half its length."""
    if dimension.key != "link_mm":
        return MOST[dimension.unit]
    return min(MOST["mm"], 500.0 * np.linalg.norm(cell.arm.chain.links[dimension.index + 1, :3, 3]))


def alone(levels_of, verdicts, cell, dimensions) -> tuple:
    """The Reserve of each dimension."""
    most = np.array([most_of(cell, d) for d in dimensions])
    ends, there = search(levels_of, verdicts, np.concatenate([-np.diag(most), np.diag(most)]))
    count, out = len(dimensions), []
    for i, d in enumerate(dimensions):
        sides = [(None, None) if np.isinf(ends[k, 1]) else (float(ends[k, 0] * most[i]), verdicts.by(there[k])) for k in (i, count + i)]
        out.append(Reserve(d, sides[0][0], sides[1][0], sides[0][1], sides[1][1], float(most[i])))
    return tuple(out)


def together(levels_of, verdicts, dimensions, slope) -> Worst | None:
    """All dimensions off at once by the same multiple of their sizes, each to the side that does most harm to first order; None where the verdict
    stays up to MOST_TIMES the sizes."""
    sizes = np.array([d.size for d in dimensions])
    harm = [np.sign(slope[i] * verdicts.watched[i].sense) * sizes for i in _nearest(verdicts, np.abs(slope) @ sizes)]
    return _shortest(levels_of, verdicts, dimensions, [way * MOST_TIMES for way in harm if way.any()], MOST_TIMES)


def worst_direction(shared, verdicts, dimensions, slope) -> Worst | None:
    """The shortest way to another verdict in `dimensions`, whose levels are shared.levels, taken together, as multiples of their sizes; None where the verdict stays in all directions
    that were looked at.

    For the levels that come first to a bound, the point of the bound nearest to the cell as stated is looked for by linearising again and again
    (A. M. Hasofer, N. C. Lind, J. Eng. Mech. 100, 1974; R. Rackwitz, B. Fiessler, Computers & Structures 9, 1978); each dimension alone is looked at too.
    """
    sizes = np.array([d.size for d in dimensions])
    scaled = slope * sizes
    ways = [*np.eye(len(sizes)), *-np.eye(len(sizes))]
    for i in _nearest(verdicts, np.linalg.norm(scaled, axis=1)):
        ways += _towards(shared, verdicts, i, dimensions, scaled[i])
    most = min(most / size for most, size in zip((MOST[d.unit] for d in dimensions), sizes, strict=True))
    return _shortest(shared.levels, verdicts, dimensions, [way / np.linalg.norm(way) * most * sizes for way in ways], most)


def _nearest(verdicts, reach):
    """Numbers of the levels that come first to a bound, by `reach` (L,), how much they change over the dimensions' sizes."""
    bounds = [verdicts.bound(i) for i in range(len(reach))]
    known = [i for i, bound in enumerate(bounds) if bound is not None and reach[i] > 0.0 and np.isfinite(verdicts.nominal[i])]
    return sorted(known, key=lambda i: abs(bounds[i] - verdicts.nominal[i]) / reach[i])[:CANDIDATES] if verdicts.now < 2 else []


def _towards(shared, verdicts, i, dimensions, slope):
    """Directions (scaled) to the bound of level i: of the first linearisation, and of the last."""
    bound, level, at, ways = verdicts.bound(i), verdicts.nominal[i], np.zeros(len(dimensions)), []
    sizes = np.array([d.size for d in dimensions])
    for _ in range(STEPS):
        there = (slope @ at + bound - level) * slope / (slope @ slope)
        length = np.linalg.norm(there)
        if not np.isfinite(length) or length == 0.0:
            break
        at, ways = there, [*ways[:1], there]
        level = shared.levels([at * sizes])[0, i]
        slope = slopes(shared, dimensions, at * sizes)[i] * sizes
        if not np.isfinite(level) or not slope.any():
            break
    return ways


def _shortest(levels_of, verdicts, dimensions, ways, most):
    if not len(ways):
        return None
    ends, there = search(levels_of, verdicts, np.array(ways))
    best = int(np.argmin(ends[:, 1]))
    if np.isinf(ends[best, 1]):
        return None
    return Worst(tuple(dimensions), ends[best, 1] * np.array(ways[best]), float(ends[best, 0] * most), verdicts.by(there[best]))
