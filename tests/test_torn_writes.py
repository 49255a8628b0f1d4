"""Every output is there whole or not at all: kill -9, a full disk, two writers at once."""

import ast
import os
import signal
import subprocess
import sys
from pathlib import Path
from time import monotonic

import pytest
import torn_writes

from pathaudit import cli
from pathaudit.writing import write_whole

PACKAGE = Path(cli.__file__).parent
linux = pytest.mark.skipif(not sys.platform.startswith("linux"), reason="signals and file systems of Linux")


@linux
def test_a_killed_writer_leaves_one_whole_file(tmp_path):
    stood, _ = torn_writes.kills(25, tmp_path)
    assert sum(stood) == 25


@linux
def test_two_writers_and_a_reader_at_once(tmp_path):
    file = tmp_path / "out.bin"
    write_whole(file, torn_writes.CONTENTS[0])
    children = [torn_writes.writer(file) for _ in range(2)]
    end, seen = monotonic() + 3.0, set()
    while monotonic() < end:
        seen.add(torn_writes.CONTENTS.index(file.read_bytes()))
    assert all(child.poll() is None for child in children)  # neither of them has failed
    for child in children:
        child.send_signal(signal.SIGKILL)
        child.wait()
        child.stdout.close()
    assert seen == {0, 1} and file.read_bytes() in torn_writes.CONTENTS


@pytest.fixture
def small_disk(tmp_path):
    """A file system of 256 KiB."""
    disk = tmp_path / "disk"
    disk.mkdir()
    if subprocess.run(["mount", "-t", "tmpfs", "-o", "size=256k", "pathaudit-test", str(disk)], capture_output=True).returncode:
        pytest.skip("mounting needs root")
    yield disk
    subprocess.run(["umount", str(disk)], check=True)


@linux
def test_a_full_disk_leaves_the_old_file(small_disk, tmp_path, capsys):
    source = tmp_path / "seam.csv"
    source.write_text("t_s,x_mm,y_mm,z_mm,i,j,k\n" + "".join(f"{k},{k**0.5!r},{k / 7!r},{k / 3!r},0,0,1\n" for k in range(20_000)))
    for name in ("out.csv", "out.jsonl", "out.parquet", "out.feather"):
        if name.endswith(("parquet", "feather")):
            pytest.importorskip("pyarrow")
        (small_disk / name).write_text("old")
        assert cli.main(["convert", str(source), str(small_disk / name)]) == 2
        assert capsys.readouterr().err == f"pathaudit: {small_disk / name}: cannot be written: No space left on device\n"
        assert (small_disk / name).read_text() == "old" and not [other for other in os.listdir(small_disk) if other.startswith(".")]


def test_every_file_is_written_by_the_one_function_that_writes_whole():
    """Nothing else in the package opens a file to write it."""
    for file in PACKAGE.rglob("*.py"):
        if file.name == "writing.py" or "demo" in file.parts:
            continue
        for node in ast.walk(ast.parse(file.read_text("utf-8"))):
            if isinstance(node, ast.Call):
                name = getattr(node.func, "attr", getattr(node.func, "id", ""))
                assert name not in ("write_text", "write_bytes", "to_csv", "to_json", "savetxt", "tofile"), f"{file.name}:{node.lineno}"
                modes = [word.value for word in [*node.args, *(keyword.value for keyword in node.keywords)] if isinstance(word, ast.Constant)]
                assert not (name == "open" and {"w", "wb", "a", "x", "ab", "xb", "w+", "r+"} & set(map(str, modes))), f"{file.name}:{node.lineno}"
