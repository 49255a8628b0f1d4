"""First order: how much each dimension changes what is judged, and what that says of the whole spread."""

from dataclasses import dataclass

import numpy as np

STEP = 0.02  # of a dimension's size: far above rounding, far below where the spread bends


@dataclass(frozen=True)
class Sensitivity:
    """How a level hangs on one dimension: `slope` in what the level is shown in, by the dimension's unit; share of the level's variance."""

    dimension: object
    slope: float
    share: float


def slopes(shared, dimensions, around=None) -> np.ndarray:
    """(L, D) changes of the levels by each dimension's unit, by central differences around the values (D,), 0 without."""
    count = len(dimensions)
    middle = np.zeros(count) if around is None else np.asarray(around, dtype=float)
    step = STEP * np.array([d.size for d in dimensions])
    both = shared.levels(np.concatenate([middle + np.diag(step), middle - np.diag(step)]), size=max(1, count // 2))
    return ((both[:count] - both[count:]) / (2.0 * step[:, None])).T


def spread(slope, dimensions) -> np.ndarray:
    """(L,) standard deviations of the levels to first order, of independent dimensions (Gauss' law of the propagation of errors)."""
    return np.sqrt(((slope * [d.deviation for d in dimensions]) ** 2).sum(axis=1))


def sensitivities(slope, watched, dimensions) -> tuple:
    """Of one level, whose slope (D,): what each dimension does to it, the most telling first."""
    parts = (slope * [d.deviation for d in dimensions]) ** 2
    total = parts.sum() or 1.0
    order = np.argsort(-parts, kind="stable")
    return tuple(Sensitivity(dimensions[i], float(slope[i] * watched.scale), float(parts[i] / total)) for i in order)
