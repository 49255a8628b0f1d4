"""Other times for the same poses: one even slower speed, or the least time under joint limits; never faster than programmed.

The programmed time is the path parameter: with the factor f = du/dt <= 1 on it, joint speed is q' f and joint acceleration q'' f^2 + q' f f'
(Hollerbach 1984), so a path that nothing limits keeps its times exactly, and dwells need no special case.
"""

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from .conventions import frozen
from .findings import TRAVEL_SLACK, peak_shares
from .measures import Rates, measure
from .proof import shares_of_halves
from .runs import runs

AIM = 1.0 - 1e-6  # share of the limits that a retiming aims at, so that rounding never shows as an overrun
SPARE = 5e-7  # of what AIM leaves, the part that a measured excess may use up
ROUNDS = 12  # of tightening before the rest is given as one even factor
STUCK = 0.8  # an excess that keeps more than this of itself in a round comes from the samples beside
HIDDEN = 1e-7  # of a share: what a peak between samples must exceed it by to be more than rounding
STANDSTILL = 1e-3  # a factor below this is no speed to weld or dispense at, but a stop
EVEN_ENOUGH = 0.7  # an even factor below this costs so much that the local retiming is offered first


@dataclass(frozen=True, eq=False)
class Retiming:
    """Times for the same poses. time (N,) s from the path's own start; factor (N,) fraction of the programmed speed, in (0, 1].

    style "even", "local" or "by hand"; possible: nothing stands in the way that no times can change; why: a sentence; again: the measures at the new times.
    """

    rates: Rates
    style: str
    time: np.ndarray
    factor: np.ndarray
    possible: bool
    why: str
    again: Rates

    @cached_property
    def feasible(self) -> bool:
        """Whether the joint speed and acceleration limits hold everywhere. A retiming by hand promises nothing: it is measured."""
        if not self.possible or self.style != "by hand":
            return self.possible
        return bool(max(np.nan_to_num(self.speed_share).max(), np.nan_to_num(self.acceleration_share).max()) <= 1.0)

    @cached_property
    def _shares(self):
        return tuple(map(frozen, whole_shares(self.again)))

    @property
    def speed_share(self) -> np.ndarray:
        """(N, n) at the new times, with the peaks between samples told at the nearer one"""
        return self._shares[0]

    @property
    def acceleration_share(self) -> np.ndarray:
        """(N, n) likewise"""
        return self._shares[1]

    @property
    def duration(self) -> float:
        """s"""
        return float(self.time[-1] - self.time[0])

    @property
    def slowest(self) -> float:
        """Smallest fraction of the programmed speed"""
        return float(self.factor.min())

    @cached_property
    def least_duration(self) -> float:
        """s, a lower bound: no times for these poses that are nowhere faster than programmed and keep the joint limits take less.

        Proven for clocks whose squared factor is linear between samples, with the speed limits at the samples and the acceleration limits at both ends
        of every interval: at no sample can such a clock be faster than `clocks.largest_anywhere`, and the time falls with every factor. What this
        retiming takes more is the price of its style, of peaks between the samples and of the audit's own measures of the new times.
        """
        from .kernels import clocks

        arm, limits = self.rates.motion.cell.arm, self.rates.motion.cell.thresholds
        share = np.nan_to_num(self.rates.speed_share).max(axis=1) / min(limits.speed_share_fail, 1.0)
        limit = np.where(np.isnan(arm.acceleration), np.inf, arm.acceleration * min(limits.acceleration_share_fail, 1.0))
        u, rate, bend = self.rates.motion.path.time, np.nan_to_num(self.rates.joint_speed), np.nan_to_num(self.rates.joint_acceleration)
        return float(clocks.durations(u, clocks.largest_anywhere(u, rate, bend, limit, 1.0 / np.maximum(share, 1.0) ** 2)).sum())

    @property
    def gap(self) -> float:
        """The share by which this retiming takes longer than `least_duration`; negative where it does not keep the limits."""
        return self.duration / self.least_duration - 1.0

    @property
    def certificate(self) -> str:
        """How much time could still be gained, in a sentence; '' where the limits are not kept."""
        if not self.feasible:
            return ""
        more = f"{100.0 * self.gap:.2g} % more" if self.gap > 5e-7 else "no more"
        return f"No times that keep these joint limits take less than {self.least_duration:.3f} s; these take {more}."

    @cached_property
    def binding(self) -> tuple:
        """For each sample what limits it there, in words; '' where the programmed speed stands."""
        names = self.rates.motion.cell.arm.joint_names
        shares = np.nan_to_num(np.hstack([self.speed_share, self.acceleration_share]))
        worst, slowed = shares.argmax(axis=1), self.factor < 1.0 - 1e-9
        words = [f"speed of joint {name}" for name in names] + [f"acceleration of joint {name}" for name in names]
        if self.style == "even":
            top = int(shares.max(axis=1).argmax())
            return tuple(words[worst[top]] if k == top else "one even speed" if slow else "" for k, slow in enumerate(slowed))
        limited = shares.max(axis=1) > 0.99
        return tuple("" if not s else words[worst[k]] if limited[k] else "ramp" for k, s in enumerate(slowed.tolist()))

    def path(self):
        """The path with the new times."""
        return replace(self.rates.motion.path, time=self.time)

    def audit(self, told=lambda words: None):
        """The retimed path audited with the same cell, in the same posture. told: as `pipeline.audit` takes it.

        The joints are those of the audit that was retimed: they follow from the poses, whatever the times are.
        """
        from .pipeline import judge

        motion = replace(self.again.motion, start_reason="Starts in the posture of the audit that was retimed.")
        return judge(replace(self.again, motion=motion), told)


def retime(rates: Rates, style=None) -> Retiming:
    """The retiming of `style` "even" or "local"; without one, the better suited of the two, with the reason."""
    if style not in (None, "even", "local"):
        raise ValueError(f"style is {style!r}, expected 'even', 'local' or None")
    plan = Plan.of(rates)
    if not plan.needed:
        return plan.finish("even" if style is None else style, np.ones(len(plan.u)), "Nothing has to be slowed down: no joint speed or acceleration limit is passed.")
    if style is not None:
        return plan.even() if style == "even" else plan.local()
    even, local = plan.even(), plan.local()
    process = rates.motion.path.process
    slowed = local.factor[process].min() < 1.0 - 1e-6 if process.any() else False
    times = f"{even.duration:.2f} s with one even speed, {local.duration:.2f} s slowing only where needed, {plan.u[-1] - plan.u[0]:.2f} s as programmed"
    if not slowed:
        return replace(local, why=f"{local.why} Only air moves are slowed, so the process keeps its speed ({times}).")
    factor = even.factor[process].min()
    if factor < EVEN_ENOUGH:
        return replace(local, why=f"{local.why} One even speed would have to be {100 * factor:.0f} % of programmed all along ({times}).")
    return replace(even, why=f"{even.why} An even speed keeps heat input and bead size even ({times}).")


def slowed_stretches(factor) -> list:
    """[first, last] of each run of samples that a retiming slows: factor (N,) below 1."""
    return runs(np.asarray(factor) < 1.0 - 1e-9).tolist()


def whole_shares(rates: Rates, spread=False):
    """Speed and acceleration shares (N, n) at the samples, raised to the peak on the nearer half of an interval that neither of its samples shows.

    spread: also to one that the farther sample shows, so that both samples of an interval have a part in what is too much on it.
    """
    speed, acceleration = shares_of_halves(rates)
    return _raised(peak_shares(rates), speed, spread), _raised(rates.acceleration_share, acceleration, spread)


def _raised(shares, between, spread):
    out = shares.copy()
    with np.errstate(invalid="ignore"):
        seen = np.maximum(shares[1:], shares[:-1])
        for peak, rows in ((between[0], slice(None, -1)), (between[1], slice(1, None))):
            higher = peak * (1.0 - HIDDEN) > (shares[rows] if spread else seen)
            out[rows][higher] = np.maximum(out[rows], peak)[higher]
    return out


@dataclass(frozen=True, eq=False)
class Plan:
    """What a retiming works with: programmed times u (N,), joint rates and their rates (N, n), limits, ceilings of b = f^2.

    whole: the `whole_shares` as programmed; hardest (N, n): such accelerations, which a factor that stays the same scales as it does the rates.
    """

    rates: Rates
    u: np.ndarray
    speed: np.ndarray
    bend: np.ndarray
    limit: np.ndarray

    @classmethod
    def of(cls, rates):
        arm, limits = rates.motion.cell.arm, rates.motion.cell.thresholds
        limit = np.where(np.isnan(arm.acceleration), np.inf, arm.acceleration * min(limits.acceleration_share_fail, 1.0) * AIM)
        return cls(rates, rates.motion.path.time, np.nan_to_num(rates.joint_speed), np.nan_to_num(rates.joint_acceleration), limit)

    @cached_property
    def whole(self):
        return whole_shares(self.rates)

    @cached_property
    def ceiling(self):
        worst = np.nan_to_num(self.whole[0]).max(axis=1) / min(self.rates.motion.cell.thresholds.speed_share_fail, 1.0)
        return np.where(worst > 1.0, (AIM / np.maximum(worst, 1.0)) ** 2, 1.0)

    @cached_property
    def hardest(self):
        return np.nan_to_num(self.whole[1] * self.rates.motion.cell.arm.acceleration)

    @property
    def needed(self):
        return bool((self.ceiling < 1.0).any() or (self.hardest > self.limit / AIM).any())

    def local(self):
        """Least time with the programmed speed as ceiling."""
        b = self.settle(self.ceiling)
        slow = np.flatnonzero(b < 1.0 - 1e-9)
        path = self.rates.motion.path
        length = 1000.0 * np.diff(path.distance)[np.unique(np.clip(np.r_[slow - 1, slow], 0, path.samples - 2))].sum() if len(slow) else 0.0
        why = f"Slows {length:.0f} mm of the path, down to {100 * np.sqrt(b.min()):.0f} % of programmed at {self.u[np.argmin(b)]:.2f} s."
        return self.finish("local", b, why)

    def even(self):
        """One factor for each process stretch; air moves are slowed only where they need it."""
        process = self.rates.motion.path.process
        with np.errstate(divide="ignore"):
            own = np.minimum(self.ceiling, (self.limit / self.hardest).min(axis=1))
        stretches = [slice(first, last + 1) for first, last in runs(process)]
        ceiling = self.ceiling.copy()
        for run in stretches:
            ceiling[run] = min(1.0, own[run].min())
        for _ in range(ROUNDS):
            b = self.settle(ceiling, even=True)
            uneven = [run for run in stretches if b[run].min() < b[run].max() * (1.0 - 1e-9)]
            if not uneven:
                break
            for run in uneven:
                ceiling[run] = b[run].min()
        else:
            # ramps of air moves still reach into the process: one factor for the whole path settles it
            b = np.full(len(b), b.min())
        k = int(np.argmin(own)) if process.any() else int(np.argmin(b))
        factor = np.sqrt(b[process].min()) if process.any() else np.sqrt(b.min())
        return self.finish("even", b, f"One even speed of {100 * factor:.1f} % of programmed, which the place at {self.u[k]:.2f} s asks for.")

    def settle(self, ceiling, even=False):
        """The fastest b below `ceiling`, tightened until the audit's own measures of the new times keep the limits."""
        from .kernels import clocks

        ceiling, margin, before = ceiling.copy(), np.ones_like(self.speed), np.full_like(self.speed, np.inf)
        for turn in range(ROUNDS):
            b = np.maximum(clocks.sweep(self.u, self.speed, self.bend, self.limit * margin, ceiling), 1e-12)
            speed, acceleration = self.shares(self.times(b))
            flat = max(speed.max(), np.sqrt(acceleration.max()))
            if flat <= 1.0 + SPARE or even:
                break
            over = np.maximum(speed.max(axis=1), 1.0)
            ceiling = np.where(over > 1.0, np.minimum(ceiling, b) / over ** (2 if turn < 2 else 4), ceiling)
            excess = np.maximum(acceleration - 1.0, 0.0)
            stuck = np.where((excess > STUCK * before) & (before > 0.0), excess, 0.0)
            wide, before = 1.0 + excess, excess
            wide[1:] = np.maximum(wide[1:], 1.0 + stuck[:-1])
            wide[:-1] = np.maximum(wide[:-1], 1.0 + stuck[1:])
            margin /= np.minimum(wide, 2.0)
        if flat > 1.0 + SPARE:
            # a factor on all times scales every share exactly: speeds by it, accelerations by its square
            b = b / flat**2
        return b

    def times(self, b):
        from .kernels import clocks

        return self.u[0] + np.concatenate([[0.0], np.cumsum(clocks.durations(self.u, b))])

    def shares(self, time):
        """Speed and acceleration shares (N, n) at new times, of what the retiming aims at, measured as an audit would."""
        limits = self.rates.motion.cell.thresholds
        speed, acceleration = whole_shares(self.measured(time), spread=True)
        speed, acceleration = speed / (AIM * min(limits.speed_share_fail, 1.0)), acceleration / (AIM * min(limits.acceleration_share_fail, 1.0))
        return np.nan_to_num(speed), np.nan_to_num(acceleration)

    def measured(self, time):
        from .kernels.rates import twists

        motion = self.rates.motion
        twist, twist_rate = twists(time, motion.path.position, motion.path.rotation)
        path = replace(motion.path, time=frozen(time))
        return measure(replace(motion, path=path, twist=frozen(twist), twist_rate=frozen(twist_rate)))

    def finish(self, style, b, why):
        motion = self.rates.motion
        untouched = bool((b == 1.0).all())
        time = self.u if untouched else self.times(b)
        again = self.rates if untouched else self.measured(time)
        hindered = []
        lost = int((~motion.reached).sum())
        if lost:
            hindered.append(f"{lost} sample{'s' * (lost > 1)} cannot be reached at any speed")
        if motion.jumps:
            hindered.append(f"the posture jumps at {self.u[motion.jumps[0]]:.2f} s, which takes the arm off the path at any speed")
        if b.min() < STANDSTILL**2:
            hindered.append(f"the arm would have to come to a stop at {self.u[np.argmin(b)]:.2f} s")
        stays = self.untouched_by_times()
        if stays and not untouched:
            why = f"{why} What other times do not change: {stays}."
        if hindered:
            why = f"No retiming can help: {'; '.join(hindered)}. {why}"
        return Retiming(self.rates, style, frozen(time), frozen(np.sqrt(b)), not hindered, why, again)

    def untouched_by_times(self):
        """What fails at any speed, in words."""
        rates, limits = self.rates, self.rates.motion.cell.thresholds
        with np.errstate(invalid="ignore"):
            singular = bool((rates.sigma_min < limits.sigma_min_fail).any())
            beyond = bool((rates.travel_left < -TRAVEL_SLACK).any())
        return " and ".join(words for words, holds in (("the near-singular stretch", singular), ("the joint travel passed", beyond)) if holds)
