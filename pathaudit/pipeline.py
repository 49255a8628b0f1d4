"""The one pipeline: path and cell in, audit out; and the frozen Audit."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from . import conventions, findings, hidden, retiming
from .against import against
from .cell import Cell
from .earlier import read_earlier
from .measures import Rates, measure
from .motion import Motion, follow
from .proof import Proof, prove
from .taskpath import Path


@dataclass(frozen=True, eq=False)
class Audit:
    """A path judged with a cell: the motion, its measures, what is flagged, what is proven between the samples. `retime` gives other times, in another value."""

    path: Path
    cell: Cell
    motion: Motion
    rates: Rates
    finding_list: tuple
    not_judged: tuple
    proof: Proof

    @property
    def time(self) -> np.ndarray:
        """(N,) s"""
        return self.path.time

    @property
    def joints(self) -> np.ndarray:
        """(N, n) rad or m; rows of NaN where the pose cannot be reached"""
        return self.motion.joints

    @property
    def verdict(self) -> str:
        """ "pass", "warn" or "fail": the worst severity among the findings"""
        levels = {f.severity for f in self.finding_list}
        return "fail" if "fail" in levels else "warn" if "warn" in levels else "pass"

    @property
    def cautions(self) -> tuple:
        """What a verdict does not say"""
        return conventions.CAUTIONS

    @cached_property
    def findings(self):
        """pandas.DataFrame, one row a finding, in order of time"""
        from .report.frames import findings_frame

        return findings_frame(self)

    @cached_property
    def measures(self):
        """pandas.DataFrame, one row a sample, units in the column names"""
        from .report.frames import measures_frame

        return measures_frame(self)

    def retime(self, style=None) -> retiming.Retiming:
        """Slower times that keep the joint limits: "even", "local", or the better suited of both with the reason."""
        return retiming.retime(self.rates, style)

    @cached_property
    def suggestion(self) -> retiming.Retiming:
        """The better suited retiming"""
        return self.retime()

    def against(self, file):
        """What changed since the report in `file` (of `check --json`): an Against, which shows itself. Raises ReadError."""
        return against(read_earlier(file), self)

    def _ipython_display_(self):
        from .widgets.timeline import show

        show(self)

    def __repr__(self):
        return f"<Audit of {self.path.file} with {self.cell.name}: {self.verdict}, {len(self.finding_list)} findings>"


def audit(path: Path, cell: Cell, *, start=None, start_reason="", told=lambda words: None) -> Audit:
    """Judge whether the arm of `cell` can run `path` as programmed.

    start (n,) rad or m: the posture to start near; else the cell's; else of those found for the first pose the one with the best worst
    reserve. start_reason: the sentence to give for a start that is known to fit. told(words) hears what is begun; what it raises ends the audit.
    """
    told("following the path")
    motion = follow(path, cell, start=start, start_reason=start_reason)
    told("measuring every sample")
    return judge(measure(motion), told)


def judge(rates: Rates, told=lambda words: None) -> Audit:
    """The audit of measures that are there already: what is flagged, and what is proven between the samples."""
    told("judging")
    found, not_judged = findings.find(rates)
    told("looking between the samples")
    proof = prove(rates)
    found = findings.in_order([*found, *hidden.find(proof, found)])
    motion = rates.motion
    return Audit(motion.path, motion.cell, motion, rates, found, not_judged, proof)
