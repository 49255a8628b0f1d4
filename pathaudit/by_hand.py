"""Retiming by hand: the speed that a person asks for, with ramps that the joints can follow and stretches that must stay as programmed."""

from dataclasses import replace

import numpy as np

from .edits import Edits
from .measures import Rates
from .retiming import Plan, Retiming, slowed_stretches

RAMP = 2.0  # 1/s: how fast a factor set by hand may change, so that 100 to 50 % takes a quarter of a second
DRAWN_OUT = 6  # ramps beside a locked stretch are drawn out to twice their length so many times


def by_hand(rates: Rates, edits: Edits, suggested=()) -> Retiming:
    """The retiming that `edits` ask for; suggested: the retimings that an edit may have adopted.

    Between stretches of different speed the factor changes along ramps, which lie outside a slowed stretch but never inside a locked one, as gentle as
    RAMP and the joint acceleration limits ask for: the fastest clock below the wanted factor (clocks.sweep). Where the programme itself passes an
    acceleration limit, its own acceleration is the bound there, so that slowing one place does not change another. Whether the new times keep
    the limits (`feasible`) is measured as an audit would.
    """
    plan = Plan.of(rates)
    slowed, adopted, locked = edits.factors(len(plan.u), {again.style: again.factor for again in suggested})
    for turn in range(DRAWN_OUT):
        b = _fastest(plan, _wanted(plan.u - plan.u[0], slowed, adopted, locked, RAMP / 2.0**turn))
        if not locked.any() or b[locked].min() >= 1.0 - 1e-9:
            break
    return replace(plan.finish("by hand", b, ""), why=_words(plan, b, locked))


def _wanted(u, slowed, adopted, locked, slope):
    """The factor (N,) that is asked for, which changes by no more than `slope` a second beside slowed and locked stretches."""
    factor = np.minimum(_ramped(u, slowed, slope), adopted)
    if locked.any():
        factor = np.maximum(factor, 1.0 - slope * _to_nearest(u, locked))
    return np.where(factor > 1.0 - 1e-12, 1.0, factor)


def _ramped(u, factor, slope):
    """The largest function (N,) below `factor` that changes by no more than `slope` a second."""
    rising = np.minimum.accumulate(factor - slope * u) + slope * u
    falling = np.minimum.accumulate((factor + slope * u)[::-1])[::-1] - slope * u
    return np.minimum(factor, np.minimum(rising, falling))


def _to_nearest(u, locked):
    """(N,) s to the nearest locked sample."""
    at = u[locked]
    right = np.clip(np.searchsorted(at, u), 0, len(at) - 1)
    return np.minimum(np.abs(u - at[right]), np.abs(u - at[np.maximum(right - 1, 0)]))


def _fastest(plan, factor):
    from .kernels import clocks

    held = np.maximum(plan.limit, np.abs(plan.bend))  # (N, n)
    return np.clip(clocks.sweep(plan.u, plan.speed, plan.bend, held, factor**2), 1e-12, 1.0)


def _words(plan, b, locked):
    slow, path = slowed_stretches(np.sqrt(b)), plan.rates.motion.path
    if not slow:
        return "Nothing is slowed: the path runs as programmed."
    length = 1000.0 * sum(path.distance[min(last + 1, path.samples - 1)] - path.distance[max(first - 1, 0)] for first, last in slow)
    k = int(np.argmin(b))
    words = f"Slows {length:.0f} mm of the path, down to {100 * np.sqrt(b[k]):.0f} % of programmed at {plan.u[k]:.2f} s."
    if locked.any() and b[locked].min() < 1.0 - 1e-6:
        k = int(np.flatnonzero(locked)[np.argmin(b[locked])])
        words += f" The lock at {plan.u[k]:.2f} s cannot be kept: there is no room beside it to slow down within the acceleration limits."
    return words
