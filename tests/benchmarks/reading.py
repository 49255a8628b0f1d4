"""Reading large files: a timed CSV of 5 million rows against pandas.read_csv of the same file, in turns, in one fresh process; and its memory."""

import tempfile
from pathlib import Path

import numpy as np

from .in_subprocess import run
from .timing import Row

MEASURE = """
import sys, warnings
from statistics import median
from time import perf_counter
warnings.simplefilter("ignore")
if {bare}:
    sys.modules["pyarrow"] = None
import pandas
import pathaudit as pa

def held(key):
    return int(next(line for line in open("/proc/self/status") if line.startswith(key)).split()[1]) / 1024

def timed(work):
    start = perf_counter()
    work()
    return perf_counter() - start

pa.read_path({small!r})
before = held("VmRSS")
path = pa.read_path({file!r})
peak = held("VmHWM") - before
arrays = sum(a.nbytes for a in (path.time, path.position, path.rotation, path.process, path.source_line)) / 2**20
assert path.samples == {rows}
del path
taken = [(timed(lambda: pa.read_path({file!r})), timed(lambda: pandas.read_csv({file!r}))) for _ in range({rounds})]
print(median(t[0] for t in taken), median(t[1] for t in taken), min(t[0] for t in taken), min(t[1] for t in taken), peak, arrays)
"""


def write(file, rows):
    """A helix of poses at 250 Hz, as a controller would log them."""
    import pyarrow
    from pyarrow import csv

    t = 0.004 * np.arange(rows)
    half = 0.15 * np.sin(0.02 * t)
    columns = [t, 500 * np.cos(0.25 * t), 500 * np.sin(0.25 * t), 0.01 * t, np.cos(half), 0.6 * np.sin(half), 0.8 * np.sin(half), 0 * half]
    table = pyarrow.table([np.round(values, 4 if k < 4 else 7) for k, values in enumerate(columns)], names="t_s x_mm y_mm z_mm qw qx qy qz".split())
    csv.write_csv(table, file, csv.WriteOptions(quoting_style="none"))


def reading(rows=5_000_000, rounds=5):
    with tempfile.TemporaryDirectory() as folder:
        file, small = str(Path(folder) / "long.csv"), str(Path(folder) / "short.csv")
        write(file, rows)
        write(small, 100_000)
        size = Path(file).stat().st_size / 1e6
        for bare, engine in ((False, "pyarrow"), (True, "pandas")):
            _, done = run(MEASURE.format(file=file, small=small, rows=rows, rounds=rounds, bare=bare))
            own, reference, best, best_reference, peak, arrays = map(float, done.stdout.split())
            note = f"{own / reference:.2f} times pandas.read_csv ({reference:.2g} s) in turns, the best of each {best / best_reference:.2f} ({best:.2g} and {best_reference:.2g} s); "
            note += f"peak memory {peak / arrays:.1f} times the arrays' {arrays:.0f} MiB"
            yield Row(f"read {rows:,} poses from CSV ({size:.0f} MB), engine: {engine}", own, None, "<= 10 s, <= 1.5 times, <= 3 times the arrays", note)
