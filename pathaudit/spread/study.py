"""An audited path under the tolerances of its cell: the draws, and everything that is read from them."""

from dataclasses import dataclass, replace
from functools import cached_property
from statistics import NormalDist

import numpy as np

from ..conventions import frozen, owned
from ..errors import ModelError
from ..pipeline import Audit, audit
from ..tolerances import part_placement
from .bands import Bands, bands, kept_draws, kept_samples
from .chances import SCRAMBLINGS, Chance, chance, scrambling_of
from .halton import halton
from .judging import Course
from .placing import cell_off, path_off
from .reserves import Verdicts, Worst, alone, together, worst_direction
from .sharing import TASK, Job, Shared, threads
from .slopes import sensitivities, slopes, spread

VERDICTS = ("pass", "warn", "fail")
LEAST, LARGEST = 10 * SCRAMBLINGS, 1_000_000  # draws
START = "Starts in the posture of the audit whose cell is off."
MEANING = (
    "Each draw moves every toleranced dimension at random, independently of the others, and audits the cell as it then is: the tool still follows the path "
    "on the part, as a programme does that was corrected to the real part, in the posture of the audit.",
    "The draws are judged at the samples of the path. What lies between two samples is judged for the cell as stated, and for a draw that is audited in full.",
    "An interval says where the probability lies, 95 times of 100, if the dimensions vary as stated. It knows nothing of what was not stated.",
)


@dataclass(frozen=True, eq=False)
class Study:
    """The draws of `audit` under tolerances: M draws, D dimensions, L levels that are watched.

    values (M, D): how far each dimension is off, in its unit. levels (M, L), nominal (L,): the worst over the path of what is watched (judging.Watched),
    NaN where nothing was reached. slopes (L, D): changes of the levels by the dimensions. reserves: reserves.Reserve of each dimension of the study and
    of where the part stands. all_at_once, worst: reserves.Worst or None. bands: bands.Bands along the path.
    """

    audit: Audit
    dimensions: tuple
    seed: int
    watched: tuple
    nominal: np.ndarray
    values: np.ndarray
    levels: np.ndarray
    bands: Bands
    slopes: np.ndarray
    reserves: tuple
    all_at_once: Worst | None
    worst: Worst | None

    @property
    def draws(self) -> int:
        return len(self.values)

    @property
    def judge(self) -> Verdicts:
        """What makes a verdict of levels"""
        return Verdicts(self.watched, self.nominal)

    @property
    def verdict(self) -> str:
        """Of the cell as stated, at the samples"""
        return VERDICTS[self.judge.now]

    @cached_property
    def verdicts(self) -> np.ndarray:
        """(M,) 0 pass, 1 warn, 2 fail"""
        return owned(self.judge.of(self.levels))

    def chance(self, verdict) -> Chance:
        """Of the verdict "pass", "warn" or "fail" """
        return self._chance(self.verdicts == VERDICTS.index(verdict))

    def chance_of(self, i, severity="fail") -> Chance:
        """Of a finding of what is watched as number i, at least as severe"""
        return self._chance(self.watched[i].beyond(self.levels[:, i], severity))

    def _chance(self, events):
        return chance(events, scrambling_of(self.draws))

    def worst_draw(self, i=None) -> int:
        """The draw whose level i is worst; without i, the one that comes closest to failing or fails by most, over all levels, by its own spread."""
        if i is not None:
            return int(np.nanargmax(self.watched[i].sense * self.levels[:, i])) if np.isfinite(self.levels[:, i]).any() else 0
        return int(np.argmax(self.levels[:, 0])) if self.levels[:, 0].any() else self.worst_draw(self.deciding)

    @cached_property
    def spread(self) -> np.ndarray:
        """(L,) standard deviations of the levels over the draws"""
        return owned(np.nan_to_num(np.nanstd(self.levels, axis=0)))

    @cached_property
    def first_order(self) -> np.ndarray:
        """(L,) the same to first order, from the slopes"""
        return owned(spread(self.slopes, self.dimensions))

    @cached_property
    def straight(self) -> np.ndarray:
        """(L,) the share of each level's variance over the draws that its slopes explain, 1 where it does not vary; below 0 they mislead"""
        rest = np.nanvar(self.levels - self.values @ self.slopes.T, axis=0)
        varies = self.spread**2
        return owned(np.where(varies > 1e-18, 1.0 - rest / np.maximum(varies, 1e-300), 1.0))

    @cached_property
    def deciding(self) -> int:
        """The number of what is watched that stands nearest to its bound of failing, by how much it varies"""
        distance = [abs(w.fail - level) / max(s, 1e-12) if w.fail is not None and np.isfinite(level) and s > 0.0 else np.inf
                    for w, level, s in zip(self.watched, self.nominal, self.spread, strict=True)]  # fmt: skip
        return int(np.argmin(distance))

    def sensitivities(self, i=None) -> tuple:
        """What each dimension does to level i, by default the deciding one, the most telling first: slopes.Sensitivity"""
        i = self.deciding if i is None else i
        return sensitivities(self.slopes[i], self.watched[i], self.dimensions)

    def name(self, i) -> str:
        """What is watched as number i, for people: "joint speed, j4" """
        w = self.watched[i]
        return w.kind if w.joint is None else f"{w.kind}, {self.audit.cell.arm.joint_names[w.joint]}"

    def audit_of(self, draw) -> Audit:
        """The whole audit of one draw, what lies between the samples included"""
        return audit_off(self.audit, self.dimensions, self.values[draw])

    def __repr__(self):
        fail = self.chance("fail")
        return f"<Study of {self.draws} draws: fails in {100 * fail.share:.3g} % ({100 * fail.low:.3g} to {100 * fail.high:.3g} %)>"


def audit_off(nominal: Audit, dimensions, values) -> Audit:
    """The audit of the same path with `dimensions` off by values (D,), each in its unit."""
    path, cell = path_off(nominal.path, dimensions, values), cell_off(nominal.cell, dimensions, values)
    return audit(path, cell, start=nominal.motion.closest[0], start_reason=START)


def drawn(dimensions, draws, seed) -> np.ndarray:
    """(draws, D): each dimension's value in its unit, from SCRAMBLINGS independent scramblings of the Halton sequence."""
    counts = np.bincount(scrambling_of(draws), minlength=SCRAMBLINGS)
    generators = np.random.SeedSequence(seed).spawn(SCRAMBLINGS)
    parts = [halton(count, len(dimensions), np.random.Generator(np.random.PCG64(g))) for count, g in zip(counts, generators, strict=True)]
    cube = np.concatenate(parts)
    for column, d in zip(cube.T, dimensions, strict=True):
        column[:] = d.size * (_normal(column) if d.normal else 2.0 * column - 1.0)
    return cube


def _normal(uniform):
    """The standard normal quantiles (M. J. Wichura, Algorithm AS 241, Applied Statistics 37, 1988, as the standard library has it)."""
    quantile = NormalDist().inv_cdf
    return np.array([quantile(u) for u in np.clip(uniform, 1e-15, 1.0 - 1e-15).tolist()])


def study(nominal: Audit, draws=2000, seed=0, told=None, map=None) -> Study:
    """Study an audited path under the tolerances that its cell states.

    told(words, share) hears what goes on and how much of that part is done, last ("done", 1.0); what it raises ends the study. map(function, tasks) runs the tasks in order, by
    default on a thread a core; for a Dask client: lambda f, tasks: client.gather(client.map(f, tasks)). The result is the same, bit for bit.
    Without tolerances only the reserves tell anything: then there are SCRAMBLINGS draws, all of them the cell as stated. Raises ModelError.
    """
    if isinstance(draws, bool) or not isinstance(draws, (int, np.integer)) or not LEAST <= draws <= LARGEST:
        raise ModelError("draws", repr(draws), f"a whole number from {LEAST} to {LARGEST:,}")
    if isinstance(seed, bool) or not isinstance(seed, (int, np.integer)) or seed < 0:
        raise ModelError("seed", repr(seed), "a whole number of 0 or more")
    told = told or (lambda words, share: None)
    if map is not None:
        return _study(nominal, int(draws), int(seed), told, map)
    with threads() as pool_map:
        return _study(nominal, int(draws), int(seed), told, pool_map)


def _study(nominal, draws, seed, told, map):
    dimensions, cell = nominal.cell.tolerances.dimensions, nominal.cell
    course = Course.of(nominal, kept_samples(nominal.rates))
    shared = Shared(Job(course, cell, dimensions), map)
    told("judging the cell as stated", 0.0)
    level = shared.levels(np.zeros((1, len(dimensions))))[0]
    values = drawn(dimensions, draws if dimensions else SCRAMBLINGS, seed)
    levels, band = _run(shared, values, course, told)
    told("how much each dimension tells", 0.0)
    slope = slopes(shared, dimensions) if dimensions else np.zeros((len(level), 0))
    single, *found = _reserves(Shared(Job(course, cell, _wider(dimensions)), map), Verdicts(course.watched, level), cell, len(dimensions), slope, told)
    told("full audits of what was found", 0.9)
    rest = single, *(w and replace(w, audited=audit_off(nominal, w.dimensions, w.values).verdict) for w in found)
    told("done", 1.0)
    arrays = (owned(a) for a in (values, levels))
    return Study(nominal, dimensions, seed, course.watched, frozen(level), *arrays, band, frozen(slope), *rest)


def _run(shared, values, course, told):
    levels, kept, sigma, share, done = [], kept_draws(len(values)), [], [], 0
    for part in shared.tasks(values):
        which = kept[done : done + len(part.levels)]
        levels.append(part.levels)
        sigma.append(part.sigma[which])
        share.append(part.share[which])
        done += len(part.levels)
        told(f"{done:,} of {len(values):,} draws", done / len(values))
    return np.concatenate(levels), bands(course.keep, np.concatenate(sigma), np.concatenate(share))


def _wider(dimensions):
    """The dimensions, and of where the part stands those that are not among them."""
    stated = {(d.key, d.index) for d in dimensions}
    return (*dimensions, *(d for d in part_placement() if (d.key, d.index) not in stated))


def _reserves(shared, verdicts, cell, stated, slope, told):
    """Each dimension alone, all that are stated at once, and the worst direction of where the part stands."""
    dimensions = shared.job.dimensions
    told("how far off each dimension may be", 0.0)
    single = alone(shared.levels, verdicts, cell, dimensions)
    if verdicts.now == 2:
        return single, None, None

    def placed(among):
        """Levels of draws of some of the dimensions"""
        where = [dimensions.index(d) for d in among]

        def levels(values, size=TASK):
            values = np.asarray(values, dtype=float)
            full = np.zeros((len(values), len(dimensions)))
            full[:, where] = values
            return shared.levels(full, size)

        return levels

    told("how far off all may be at once", 0.4)
    given = dimensions[:stated]
    once = together(placed(given), verdicts, given, slope) if given else None
    told("the worst direction of where the part stands", 0.7)
    part = tuple(d for d in dimensions if d.key in ("part_xyz_mm", "part_rpy_deg"))
    some = _Some(placed(part))
    return single, once, worst_direction(some, verdicts, part, slopes(some, part))


@dataclass(frozen=True, eq=False)
class _Some:
    """Levels of some of the dimensions, where the others are as stated"""

    levels: object
