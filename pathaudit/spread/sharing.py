"""Draws shared out: to threads here, or to whatever else runs a function over a list."""

import os
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass

import numpy as np

from ..cell import Cell
from .judging import Course, Judged, judge
from .placing import frames

ROUND = 80  # tasks handed over at once: their results are what memory has to hold
TASK = 25  # draws of a task: some 20 ms at 500 samples, against 2 ms that a task costs on a cluster


@dataclass(frozen=True, eq=False)
class Job:
    """Judges draws whose `dimensions` are off by values (M, D). It holds plain values alone, so that it can be sent to another process."""

    course: Course
    cell: Cell
    dimensions: tuple

    def __call__(self, values) -> Judged:
        off = frames(self.cell, self.dimensions, values)
        return judge(self.course, off.chains, off.speed)


@dataclass(frozen=True, eq=False)
class Shared:
    """A job and the `map` that runs it over a list of tasks: map(function, tasks) gives the results in order."""

    job: Job
    map: Callable

    def tasks(self, values):
        """The results of values (M, D), TASK draws each, as they come."""
        tasks = [values[first : first + TASK] for first in range(0, len(values), TASK)]
        for first in range(0, len(tasks), ROUND):
            yield from self.map(self.job, tasks[first : first + ROUND])

    def levels(self, values, size=TASK) -> np.ndarray:
        """(M, L) levels of what is watched"""
        values = np.asarray(values, dtype=float)
        parts = [part.levels for part in self.map(self.job, [values[first : first + size] for first in range(0, len(values), size)])]
        return np.concatenate(parts) if parts else np.empty((0, len(self.job.course.watched)))


@contextmanager
def threads():
    """A map over as many threads as there are cores; leaving it drops what was not begun."""
    pool = ThreadPoolExecutor(os.cpu_count() or 1)
    try:
        yield pool.map
    finally:
        pool.shutdown(cancel_futures=True)
