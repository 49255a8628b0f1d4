"""Work that needs a process of its own: the first run, the command line, memory, the import."""

import os
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path
from statistics import median
from time import perf_counter

from .timing import Row

REPOSITORY = Path(__file__).resolve().parents[2]


def run(code_or_arguments, *, home=REPOSITORY, cache=None, accept=(0,)):
    """Wall time of a fresh interpreter that imports the package from `home`, and what it printed."""
    arguments = ["-c", code_or_arguments] if isinstance(code_or_arguments, str) else ["-m", *code_or_arguments]
    environment = os.environ | {"PYTHONPATH": f"{home}{os.pathsep}{REPOSITORY / 'tests'}"}
    if cache:
        environment |= {"XDG_CACHE_HOME": str(cache)}
    start = perf_counter()
    done = subprocess.run([sys.executable, *arguments], env=environment, cwd=home, capture_output=True, text=True)
    taken = perf_counter() - start
    if done.returncode not in accept:
        raise RuntimeError(f"{arguments} ended with {done.returncode}: {done.stderr}")
    return taken, done


def first_and_warm_check(samples=2_000):
    """A copy of the package that was never run, and the command line on a path of our own: first with all compiling, then warm."""
    with tempfile.TemporaryDirectory() as folder:
        home = Path(folder)
        shutil.copytree(REPOSITORY / "pathaudit", home / "pathaudit", ignore=shutil.ignore_patterns("__pycache__"))
        write_job(home, samples)
        check = ["pathaudit", "check", "seam.csv", "--cell", "cell.toml"]
        first, done = run(check, home=home, cache=home / "cache", accept=(0, 1))
        announced = next((line for line in done.stderr.splitlines() if "kernels" in line), "nothing announced")
        warm = median(run(check, home=home, cache=home / "cache", accept=(0, 1))[0] for _ in range(5))
    return [
        Row("first `pathaudit check` after install, compiling included", first, None, "<= 20 s", f"says: {announced.strip()}"),
        Row(f"`pathaudit check` of {samples:,} samples, warm", warm, None, "<= 2 s", "a whole process"),
    ]


def write_job(folder, samples):
    """A cell and a timed path for the command line, from an open arm."""
    import csv

    from open_arms import robot_file

    from pathaudit.kernels import linkage, rotations

    from .in_process import SIX_AXIS, smooth_motion

    cell, time, joints = smooth_motion(samples)
    poses = linkage.poses(*cell.chain, joints)
    shutil.copy(robot_file(SIX_AXIS), folder / "arm.urdf")
    (folder / "cell.toml").write_text(
        f'name = "benchmark"\n[arm]\nurdf = "arm.urdf"\ntip = "tool0"\nstart_deg = {(joints[0] * 57.29577951308232).tolist()}\n'
        "[limits]\nacceleration_deg_s2 = 400\n",
        encoding="utf-8",
    )
    with open(folder / "seam.csv", "w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file)
        writer.writerow(["t_s", "x_m", "y_m", "z_m", "qw", "qx", "qy", "qz"])
        quaternions = rotations.continuous_wxyz(rotations.wxyz_from_matrix(poses[:, :3, :3]))
        writer.writerows([t, *p, *q] for t, p, q in zip(time, poses[:, :3, 3], quaternions, strict=True))


PEAK = """
from tests.benchmarks.in_process import path_of_motion, smooth_motion
import pathaudit as pa
from time import perf_counter
cell, time, joints = smooth_motion({samples}, duration={samples} / 100)
path = path_of_motion(cell, time, joints)
start = perf_counter()
audit = pa.audit(path, cell)
taken = perf_counter() - start
audit.verdict, audit.findings, audit.measures, audit.suggestion.duration
peak = next(line for line in open("/proc/self/status") if line.startswith("VmHWM")).split()[1]
print(taken, int(peak) / 1024)
"""


def memory(samples=200_000):
    _, done = run(PEAK.format(samples=samples))
    taken, peak = map(float, done.stdout.split())
    note = f"peak memory {peak:.0f} MiB of the whole process, with findings, measures and the retiming"
    return Row(f"audit of {samples:,} samples", taken, None, "<= 1 GiB", note)


def imports():
    code = "from time import perf_counter as now; import numpy; t = now(); import pathaudit; print(now() - t)"
    public = "from time import perf_counter as now; import numpy; t = now(); from pathaudit import *; print(now() - t)"
    run(code)
    bare, everything = (median(float(run(text)[1].stdout) for _ in range(7)) for text in (code, public))
    return Row("`import pathaudit` beyond NumPy", bare, None, "<= 0.15 s", f"{everything:.3f} s with every public name loaded")
