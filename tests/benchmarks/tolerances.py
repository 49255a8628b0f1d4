"""A study under tolerances: many draws of a cell, each audited at every sample."""

from dataclasses import replace
from time import process_time

import pathaudit as pa
from example_arms import path_of_motion
from pathaudit.spread.bands import kept_samples
from pathaudit.spread.judging import Course
from pathaudit.spread.sharing import Job, Shared, threads
from pathaudit.spread.study import _run, drawn
from pathaudit.tolerances import Tolerances

from .in_process import smooth_motion
from .timing import Row, seconds

STATED = {"part_xyz_mm": 1.0, "part_rpy_deg": 0.1, "tool_xyz_mm": 0.5, "joint_zero_deg": 0.02, "link_mm": 0.1, "speed_percent": 2.0}


def studying(draws=2000, samples=500):
    """Three rows: the draws alone, on the threads of this machine and on one, and the whole study with its slopes and reserves."""
    cell, time, joints = smooth_motion(samples, duration=20.0)
    path, cell = path_of_motion(cell, time, joints), replace(cell, tolerances=Tolerances.of(cell.arm, **STATED))
    audit = pa.audit(path, cell)
    course, dimensions = Course.of(audit, kept_samples(audit.rates)), cell.tolerances.dimensions
    job = Job(course, cell, dimensions)

    def drawing(map):
        _run(Shared(job, map), drawn(dimensions, draws, 0), course, lambda words, share: None)

    with threads() as shared:
        both = seconds(lambda: drawing(shared), 5)
    start = process_time()
    alone = seconds(lambda: drawing(map), 3)
    spent = (process_time() - start) / 4
    work = f"{draws:,} draws of a cell x {samples} poses, {len(dimensions)} toleranced dimensions"
    note = f"{1e6 * spent / draws / samples:.2f} us of processor time a pose; every pose solved and measured whole, bands included"
    whole = seconds(lambda: pa.study(audit, draws), 3)
    return [Row(f"{work}, warm", both, None, "<= 1 s", note), Row("the same on one core", alone, None, "-", "the same bits"),
            Row("the whole study", whole, None, "-", "sensitivities, how far off each dimension may be, worst directions and full audits included")]  # fmt: skip
