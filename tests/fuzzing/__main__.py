"""python -m tests.fuzzing READER SECONDS [--plain]: new inputs for one reader (or "all") until the time is over.

With atheris (its wheel is for Linux: `pip install atheris`) the mutations follow the code that they reach; --plain, or without it, they
are drawn by chance from good files. What fails is written to tests/reading/corpus/READER, where the tests find it; the run goes on.
"""

import hashlib
import json
import os
import random
import subprocess
import sys
import tempfile
import traceback
from pathlib import Path
from time import perf_counter

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))


class Counts:
    """What a run did; written to a file after every few executions, as the engine ends the process in its own way."""

    def __init__(self, reader, file):
        self.reader, self.file, self.start = reader, file, perf_counter()
        self.executions, self.slowest, self.failures = 0, 0.0, {}

    def run(self, data):
        from tests.fuzzing import readers

        try:
            taken = readers.one(self.reader, data)
            if taken > readers.SLOWEST:
                taken = min(readers.one(self.reader, data) for _ in range(3))  # a busy machine is no hang
                assert taken <= readers.SLOWEST, f"{taken:.1f} s"
            self.slowest = max(self.slowest, taken)
        except Exception as error:
            self.keep(data, error)
        self.executions += 1
        if self.executions % 500 == 0:
            self.write()

    def keep(self, data, error):
        place = traceback.extract_tb(error.__traceback__)[-1]
        key = f"{type(error).__name__} in {Path(place.filename).name}:{place.lineno}: {str(error)[:100]}"
        if key.split(": ")[0] not in {old.split(": ")[0] for old in self.failures}:
            from tests.fuzzing import readers

            folder = readers.CORPUS / self.reader
            folder.mkdir(parents=True, exist_ok=True)
            (folder / hashlib.sha1(data).hexdigest()[:12]).write_bytes(data)
            print(f"{self.reader}: {key}", file=sys.stderr, flush=True)
        self.failures[key] = self.failures.get(key, 0) + 1

    def write(self):
        seconds = perf_counter() - self.start
        self.file.write_text(json.dumps({"reader": self.reader, "executions": self.executions, "seconds": seconds, "slowest_s": self.slowest, "failures": self.failures}))


def guided(counts, seconds):
    import atheris

    with atheris.instrument_imports(include=["pathaudit.reading", "pathaudit.course", "pathaudit.taskpath", "pathaudit.cell", "pathaudit.arm", "json.decoder", "tomllib"]):
        from tests.fuzzing import readers

        readers.READERS  # noqa: B018
        import pathaudit.course  # noqa: F401
        from pathaudit.reading import cutter_location, json_lines, machine_code, recorded, smoothing, tables, timed_csv, waypoints  # noqa: F401
    folder = Path(tempfile.mkdtemp(prefix="fuzzing-"))
    for k, data in enumerate([*readers.good_files(counts.reader), *(file.read_bytes() for file in readers.corpus(counts.reader))]):
        (folder / f"good-{k}").write_bytes(data)
    words = folder.parent / f"{folder.name}.dict"
    from tests.fuzzing.mutating import WORDS

    words.write_text("".join('"' + "".join(f"\\x{b:02x}" for b in word) + '"\n' for word in WORDS))
    arguments = [sys.argv[0], str(folder), f"-max_total_time={seconds}", f"-dict={words}", "-max_len=8000", "-rss_limit_mb=0", "-timeout=30", "-verbosity=0", "-print_final_stats=0", "-close_fd_mask=1"]
    atheris.Setup(arguments, counts.run)
    atheris.Fuzz()


def plain(counts, seconds):
    from tests.fuzzing import readers
    from tests.fuzzing.mutating import mutated

    rng = random.Random(int.from_bytes(os.urandom(8)))
    good = [*readers.good_files(counts.reader), *(file.read_bytes() for file in readers.corpus(counts.reader))]
    while perf_counter() - counts.start < seconds:
        counts.run(mutated(rng.choice(good), rng, good))
    counts.write()


def main(arguments):
    chance = "--plain" in arguments
    names = [word for word in arguments if not word.startswith("-")]
    if len(names) != 2 and len(names) != 3:
        sys.exit(__doc__)
    reader, seconds = names[0], int(names[1])
    if reader == "all" or len(names) == 2 and not os.environ.get("PATHAUDIT_FUZZING"):
        from tests.fuzzing import readers

        chosen = list(readers.READERS) if reader == "all" else [reader]
        if unknown := set(chosen) - set(readers.READERS):
            sys.exit(f"no reader named {', '.join(unknown)}; there are all, {', '.join(readers.READERS)}")
        total = 0
        for name in chosen:
            total += in_its_own_process(name, seconds, chance)
        print(f"{total:,} executions")
        return
    counts = Counts(reader, Path(names[2]))
    try:
        import atheris  # noqa: F401
    except ImportError:
        chance = True
    (plain if chance else guided)(counts, seconds)


def in_its_own_process(reader, seconds, chance):
    """One run; prints its line and gives the number of executions."""
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "counts.json"
        command = [sys.executable, "-m", "tests.fuzzing", reader, str(seconds), str(file), *(["--plain"] if chance else [])]
        done = subprocess.run(command, env=os.environ | {"PATHAUDIT_FUZZING": "1"}, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, text=True)
        found = json.loads(file.read_text()) if file.exists() else {"executions": 0, "seconds": 0.0, "slowest_s": 0.0, "failures": {}}
    kinds = "".join(f"\n    {times:,} times {what}" for what, times in found["failures"].items())
    print(f"{reader}: {found['executions']:,} executions in {found['seconds']:.0f} s, the slowest {found['slowest_s']:.2f} s, {len(found['failures'])} kinds of failure{kinds}", flush=True)
    if not file.exists() and done.stderr and not found["executions"]:
        print(done.stderr[-2000:], file=sys.stderr)
    return found["executions"]


main(sys.argv[1:])
