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
        monkeypatch.setattr(writing, "open", lambda file, *a, **k: Failing(open(file, *a)) if isinstance(file, int) else open(file, *a, **k), raising=False)
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
    file = tmp_path / "a.txt"
    file.write_text("old")
    assert subprocess.run([sys.executable, "-c", KILLED, str(file)]).returncode == -9
    assert file.read_text() == "old"


KILLED = """
import os, signal, sys
from pathaudit.writing import write_whole
os.fsync = lambda handle: os.kill(os.getpid(), signal.SIGKILL)
write_whole(sys.argv[1], b"x" * 100_000)
"""
WAITING = """
import os, sys
from pathaudit.writing import write_whole
sync = os.fsync
os.fsync = lambda handle: print("on", flush=True) or sys.stdin.readline() and sync(handle)
write_whole(sys.argv[1], "from the other")
"""
linux = pytest.mark.skipif(not sys.platform.startswith("linux"), reason="elsewhere nothing is swept")


def beside(folder):
    return [name for name in os.listdir(folder) if name.startswith(".pathaudit-")]


@linux
def test_what_a_killed_process_left_goes_with_the_next_output_in_the_folder(tmp_path):
    for k in range(2):
        assert subprocess.run([sys.executable, "-c", KILLED, str(tmp_path / f"{k}.txt")]).returncode == -9
        assert len(beside(tmp_path)) == 1  # the second swept the first one's
    (tmp_path / "there").mkdir()
    write_whole(tmp_path / "there" / "a.txt", "x")
    assert len(beside(tmp_path)) == 1
    write_whole(tmp_path / "a.txt", "x")
    assert sorted(os.listdir(tmp_path)) == ["a.txt", "there"]


@linux
def test_a_living_process_s_unfinished_file_stays(tmp_path):
    other = subprocess.Popen([sys.executable, "-c", WAITING, str(tmp_path / "a.txt")], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
    assert other.stdout.readline() == "on\n"
    unfinished = beside(tmp_path)
    for file in ("a.txt", "b.txt"):
        write_whole(tmp_path / file, "mine")
    assert beside(tmp_path) == unfinished and len(unfinished) == 1
    other.communicate("go on\n")
    assert other.returncode == 0 and (tmp_path / "a.txt").read_text() == "from the other" and not beside(tmp_path)


@linux
@pytest.mark.parametrize("kind", ["host", "start", "numbers", "old name", "longer name", "folder", "link", "another user"])
def test_what_may_be_somebody_else_s_stays(tmp_path, monkeypatch, kind):
    """Each is named by a process that is gone, but one thing is not as it must be."""
    gone = subprocess.Popen([sys.executable, "-c", ""])
    gone.wait()
    if kind == "host":
        monkeypatch.setattr(writing.socket, "gethostname", lambda: "another")
    name = f".pathaudit-{writing._system()}-{gone.pid}-0123456789ab"
    monkeypatch.undo()
    if kind == "start":
        name = name.replace(writing._system(), "0" * 16)
    elif kind == "numbers":
        name = name.replace(f"-{gone.pid}-", f"-{gone.pid}{gone.pid}{gone.pid}{gone.pid}-")  # no process can have it: nothing is known
    elif kind == "old name":
        name = ".pathaudit-0123456789ab"
    elif kind == "longer name":
        name += ".csv"
    elif kind == "another user":
        monkeypatch.setattr(os, "kill", lambda *_: (_ for _ in ()).throw(PermissionError(1, "Operation not permitted")))
    file = tmp_path / name
    if kind == "folder":
        file.mkdir()
    elif kind == "link":
        file.symlink_to(tmp_path / "a.txt")
    else:
        file.write_text("x")
    write_whole(tmp_path / "a.txt", "x")
    assert sorted(os.listdir(tmp_path)) == sorted([name, "a.txt"])


def test_where_the_system_does_not_say_who_it_is_nothing_is_swept(tmp_path, monkeypatch):
    monkeypatch.setattr(writing, "_system", lambda: "")
    (tmp_path / ".pathaudit--1-0123456789ab").write_text("x")
    write_whole(tmp_path / "a.txt", "x")
    assert len(beside(tmp_path)) == 1 and (tmp_path / "a.txt").read_text() == "x"


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
