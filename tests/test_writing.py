"""Output files appear whole or not at all."""

import os
import subprocess
import sys
import threading

import pytest

from pathaudit import writing
from pathaudit.errors import WriteError
from pathaudit.writing import write_whole


def test_text_and_bytes(tmp_path):
    write_whole(tmp_path / "a.txt", "Größe\n")
    write_whole(tmp_path / "b.bin", b"\0\xff")
    assert (tmp_path / "a.txt").read_bytes() == "Größe\n".encode() and (tmp_path / "b.bin").read_bytes() == b"\0\xff"
    assert sorted(os.listdir(tmp_path)) == ["a.txt", "b.bin"]


def test_an_existing_file_is_replaced_and_keeps_its_permissions(tmp_path):
    file = tmp_path / "a.txt"
    file.write_text("old")
    file.chmod(0o640)
    write_whole(file, "new")
    assert file.read_text() == "new" and file.stat().st_mode & 0o777 == 0o640


def test_a_new_file_gets_the_usual_permissions(tmp_path):
    write_whole(tmp_path / "a.txt", "x")
    (tmp_path / "b.txt").write_text("x")
    assert (tmp_path / "a.txt").stat().st_mode == (tmp_path / "b.txt").stat().st_mode


def test_a_link_stays_a_link(tmp_path):
    (tmp_path / "there").mkdir()
    (tmp_path / "link.txt").symlink_to(tmp_path / "there" / "a.txt")
    write_whole(tmp_path / "link.txt", "x")
    assert (tmp_path / "link.txt").is_symlink() and (tmp_path / "there" / "a.txt").read_text() == "x"


@pytest.mark.parametrize("failing", ["write", "fsync", "replace"])
def test_a_failure_at_any_step_leaves_the_old_file_and_nothing_beside_it(tmp_path, monkeypatch, failing):
    file = tmp_path / "a.txt"
    file.write_text("old")

    def fail(*_):
        raise OSError(28, "No space left on device")

    if failing == "write":
        real = os.fdopen
        monkeypatch.setattr(writing, "open", lambda *a: Failing(real(*a)), raising=False)
    else:
        monkeypatch.setattr(os, failing, fail)
    with pytest.raises(WriteError, match="a.txt: cannot be written: No space left on device"):
        write_whole(file, "new")
    assert file.read_text() == "old" and os.listdir(tmp_path) == ["a.txt"]


class Failing:
    """A file on a disk that is full after three bytes."""

    def __init__(self, stream):
        self.stream = stream

    def __enter__(self):
        self.stream.__enter__()
        return self

    def __exit__(self, *error):
        return self.stream.__exit__(*error)

    def write(self, data):
        self.stream.write(data[:3])
        raise OSError(28, "No space left on device")


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="a size limit on files")
def test_a_real_limit_on_the_file_s_size(tmp_path):
    """The kernel itself refuses the bytes past a limit, as a full disk does."""
    code = """
import resource, signal, sys
signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
resource.setrlimit(resource.RLIMIT_FSIZE, (1000, 1000))
from pathaudit.errors import WriteError
from pathaudit.writing import write_whole
try:
    write_whole(sys.argv[1], b"x" * 100_000)
except WriteError as error:
    sys.exit(str(error))
"""
    file = tmp_path / "a.txt"
    file.write_text("old")
    run = subprocess.run([sys.executable, "-c", code, str(file)], capture_output=True, text=True)
    assert run.returncode == 1 and run.stderr == f"{file}: cannot be written: File too large\n"
    assert file.read_text() == "old" and os.listdir(tmp_path) == ["a.txt"]


def test_a_process_killed_while_it_writes_leaves_the_old_file(tmp_path):
    code = """
import os, signal, sys
from pathaudit.writing import write_whole
os.fsync = lambda handle: os.kill(os.getpid(), signal.SIGKILL)
write_whole(sys.argv[1], b"x" * 100_000)
"""
    file = tmp_path / "a.txt"
    file.write_text("old")
    assert subprocess.run([sys.executable, "-c", code, str(file)]).returncode == -9
    assert file.read_text() == "old"


@pytest.mark.parametrize("name, reason", [("no/a.txt", "No such file"), (".", "Is a directory"), ("x" * 300, "name too long"), ("a\0b", "null byte")])
def test_places_that_cannot_be_written(tmp_path, name, reason):
    with pytest.raises(WriteError, match=f"cannot be written: .*{reason}"):
        write_whole(os.path.join(tmp_path, name), "x")
    assert os.listdir(tmp_path) == []


def test_a_pipe_is_written_directly(tmp_path):
    pipe, got = tmp_path / "pipe", []
    os.mkfifo(pipe)
    reader = threading.Thread(target=lambda: got.append(pipe.read_text()))
    reader.start()
    write_whole(pipe, "through")
    reader.join()
    assert got == ["through"]
