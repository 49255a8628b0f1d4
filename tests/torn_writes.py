"""python tests/torn_writes.py [KILLS]: kill -9 while files are written; after each kill the old or the new file stands, whole.

A child writes two contents in turn to one file, as fast as it can, and is killed at a random moment (1,000 times by default).
"""

import os
import random
import signal
import subprocess
import sys
import tempfile
from pathlib import Path
from time import sleep

CONTENTS = [bytes([65 + k]) * size for k, size in enumerate((40_000, 3_000_000))]

CHILD = """
import itertools, sys
from pathaudit.writing import write_whole
contents = [b"A" * 40_000, b"B" * 3_000_000]
for k in itertools.count():
    write_whole(sys.argv[1], contents[k % 2])
    if k == 0:
        print("on", flush=True)
"""


def writer(file, code=CHILD):
    """A child that writes and has written once."""
    child = subprocess.Popen([sys.executable, "-c", code, str(file)], stdout=subprocess.PIPE, text=True)
    assert child.stdout.readline() == "on\n"
    return child


def kills(count, folder, seed=1):
    """Kill a writer `count` times; gives how often each content stood, and how many unfinished files lay beside it."""
    rng, file, stood, beside = random.Random(seed), Path(folder) / "out.bin", [0, 0], 0
    for _ in range(count):
        child = writer(file)
        sleep(rng.uniform(0.0, 0.02))
        child.send_signal(signal.SIGKILL)
        child.wait()
        child.stdout.close()
        stood[CONTENTS.index(file.read_bytes())] += 1  # ValueError: a torn file
        left = [name for name in os.listdir(folder) if name != file.name]
        assert len(left) <= 1 and all(name.startswith(".pathaudit-") for name in left), left  # the child has swept what the one before it left
        beside += len(left)
    return stood, beside


def main(count):
    with tempfile.TemporaryDirectory() as folder:
        stood, beside = kills(count, folder, seed=None)
    print(f"{count:,} kills: the first content stood {stood[0]:,} times, the second {stood[1]:,} times, never a torn file; {beside:,} unfinished files lay beside it")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 1000)
