"""python -m tests.benchmarks [name ...]: all benchmarks, or those whose names are given."""

import os
import sys
from pathlib import Path

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")  # small matrices: more threads only wait for each other
sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

from . import in_browser, in_process, in_subprocess, reading, tolerances  # noqa: E402
from .timing import table  # noqa: E402

BENCHMARKS = {
    "following": in_process.following,
    "retiming": in_process.retiming,
    "measuring": in_process.measuring,
    "audit": in_process.whole_audit,
    "proof": in_process.proving,
    "tolerances": tolerances.studying,
    "command": in_subprocess.first_and_warm_check,
    "memory": in_subprocess.memory,
    "imports": in_subprocess.imports,
    "reading": lambda: list(reading.reading()),
    "browser": in_browser.in_browser,
}


def main(names):
    unknown = set(names) - set(BENCHMARKS)
    if unknown:
        sys.exit(f"no benchmark named {', '.join(sorted(unknown))}; there are {', '.join(BENCHMARKS)}")
    rows = []
    for name in names or BENCHMARKS:
        print(f"{name} ...", file=sys.stderr, flush=True)
        found = BENCHMARKS[name]()
        rows += found if isinstance(found, list) else [found]
    print(table(rows))


main(sys.argv[1:])
