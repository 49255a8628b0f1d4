"""The command line from end to end: a known joint motion recovered, exit statuses, one line for everything that is wrong."""

import csv
import json
import os
import shlex
import signal
import subprocess
import sys
import time
from html import escape

import numpy as np
import pytest

from pathaudit import __version__, cli
from pathaudit.conventions import CAUTIONS

# An invented arm, as Denavit-Hartenberg rows (a mm, alpha deg, d mm, theta deg), a tool, and where arm and part stand.
ROWS = [(120, -90, 420, 0), (610, 0, 0, -90), (95, -90, 0, 0), (0, 90, 640, 0), (0, -90, 0, 0), (0, 0, 95, 180)]
SPEED = [180, 170, 190, 380, 380, 560]
TOOL = {"xyz_mm": [15, 0, 340], "rpy_deg": [0, 32, 0]}
PLACEMENT = {"xyz_mm": [-700, 150, 300], "rpy_deg": [0, 0, 15]}
PART = {"xyz_mm": [250, -80, 400], "rpy_deg": [5, -10, 70]}


def turn(axis, degrees):
    c, s = np.cos(np.radians(degrees)), np.sin(np.radians(degrees))
    one, nil = np.ones_like(c), np.zeros_like(c)
    rows = {"x": [[one, nil, nil], [nil, c, -s], [nil, s, c]], "y": [[c, nil, s], [nil, one, nil], [-s, nil, c]], "z": [[c, -s, nil], [s, c, nil], [nil, nil, one]]}
    m = np.zeros(np.shape(c) + (4, 4))
    m[..., :3, :3], m[..., 3, 3] = np.moveaxis(np.array(rows[axis]), (0, 1), (-2, -1)), 1
    return m


def shift(x, y, z):
    m = np.eye(4)
    m[:3, 3] = x, y, z
    return m


def frame(xyz_mm, rpy_deg):
    return shift(*xyz_mm) @ turn("z", rpy_deg[2]) @ turn("y", rpy_deg[1]) @ turn("x", rpy_deg[0])


def tool_in_part(q_deg):
    """(N, 6) degrees -> (N, 4, 4) in mm: the textbook product, from the part to the tool."""
    pose = np.linalg.inv(frame(**PART)) @ frame(**PLACEMENT)
    for (a, alpha, d, theta), angle in zip(ROWS, np.moveaxis(q_deg, -1, 0)):
        pose = pose @ turn("z", angle + theta) @ shift(a, 0, d) @ turn("x", alpha)
    return pose @ frame(**TOOL)


def quaternions(m):
    """(N, 4, 4) -> (N, 4), away from half a turn; signs as they come."""
    w = np.sqrt(1 + m[:, 0, 0] + m[:, 1, 1] + m[:, 2, 2]) / 2
    return np.stack([w, (m[:, 2, 1] - m[:, 1, 2]) / (4 * w), (m[:, 0, 2] - m[:, 2, 0]) / (4 * w), (m[:, 1, 0] - m[:, 0, 1]) / (4 * w)], axis=-1)


def motion(t, period=6.0):
    """Joint angles (N, 6) and speeds, in degrees: sums of sines, at rest nowhere in particular."""
    middle, size = np.array([10.0, -15.0, 40.0, 30.0, 60.0, -20.0]), np.array([12.0, 8.0, 9.0, 25.0, 18.0, 40.0])
    w, phase = 2 * np.pi / period, 0.7 * np.arange(6)
    return middle + size * np.sin(w * t[:, None] + phase), size * w * np.cos(w * t[:, None] + phase)


def write_path(file, poses, t, form="quaternion"):
    q = quaternions(poses)
    orientation = dict(zip(("qw", "qx", "qy", "qz"), q.T)) if form == "quaternion" else dict(zip("ijk", poses[:, :3, 2].T))
    columns = {"t_s": t, **dict(zip(("x_mm", "y_mm", "z_mm"), poses[:, :3, 3].T)), **orientation, "wire": [f"w{k}" for k in range(len(t))]}
    with open(file, "w", newline="") as stream:
        csv.writer(stream).writerows([columns, *zip(*(list(values) for values in columns.values()))])


def write_cell(file, speed=SPEED, more=""):
    def table(values):
        return "{ " + ", ".join(f"{key} = {value}" for key, value in values.items()) + " }"

    start = motion(np.zeros(1))[0][0].tolist()
    rows = "".join(
        f'[[arm.joint]]\nname = "j{k + 1}"\ntype = "revolute"\na_mm = {a}\nalpha_deg = {alpha}\nd_mm = {d}\ntheta_deg = {theta}\n'
        f"lower_deg = -200\nupper_deg = 200\nspeed_deg_s = {speed[k]}\nacceleration_deg_s2 = 2000\n"
        for k, (a, alpha, d, theta) in enumerate(ROWS)
    )
    file.write_text(f'name = "bench"\ntool = {table(TOOL)}\npart = {table(PART)}\n[arm]\ndh = "standard"\nstart_deg = {start}\nplacement = {table(PLACEMENT)}\n{rows}{more}')


@pytest.fixture
def bench(tmp_path, monkeypatch):
    """A folder with a path of 1,200 samples made from the known motion, and its cell, as the current folder."""
    t = np.linspace(0.0, 6.0, 1201)
    write_path(tmp_path / "seam.csv", tool_in_part(motion(t)[0]), t)
    write_cell(tmp_path / "cell.toml")
    monkeypatch.chdir(tmp_path)
    return tmp_path


def table(file):
    header, *rows = csv.reader(open(file, newline=""))
    return header, rows


def run(*arguments):
    return subprocess.run([sys.executable, "-m", "pathaudit", *map(str, arguments)], capture_output=True, text=True)


def test_a_known_joint_motion_is_recovered(bench):
    done = run("check", "seam.csv", "--cell", "cell.toml", "--joints", "joints.csv", "--json", "out.json", "--retimed", "retimed.csv")
    assert done.returncode == 0, done.stdout + done.stderr
    header, rows = table("joints.csv")
    values = np.array(rows, dtype=float)
    angles, speeds = motion(values[:, 0])
    np.testing.assert_allclose(values[:, 1:7], angles, rtol=0, atol=1e-6)
    np.testing.assert_allclose(values[:, 7:13], speeds, rtol=0, atol=1e-3 * np.abs(speeds).max())
    assert header == ["t_s", *(f"j{k}_deg" for k in range(1, 7)), *(f"j{k}_deg_s" for k in range(1, 7)), "sigma_min", "speed_use"]
    np.testing.assert_allclose(values[:, -1], np.abs(speeds / SPEED).max(axis=1), atol=1e-3)
    found = json.loads((bench / "out.json").read_text())
    assert found["verdict"] in ("pass", "warn") and found["path"]["samples"] == 1201
    steps = np.linalg.norm(np.diff(tool_in_part(motion(values[:, 0])[0])[:, :3, 3], axis=0), axis=1)
    assert found["path"]["length_mm"] == pytest.approx(steps.sum(), rel=1e-9)
    assert table("retimed.csv") == table("seam.csv") or found["retiming"]["slowest_fraction_of_programmed_speed"] < 1


def test_a_joint_that_must_turn_too_fast_is_found_where_it_does_and_the_retiming_cures_it(bench):
    t = np.linspace(0.0, 6.0, 1201)
    speeds = np.abs(motion(t)[1][:, 5])
    limit = 0.8 * speeds.max()
    write_cell(bench / "cell.toml", [*SPEED[:5], limit])
    done = run("check", "seam.csv", "--cell", "cell.toml", "--json", "out.json", "--retimed", "retimed.csv")
    assert done.returncode == 1 and done.stdout.startswith("FAIL") and done.stderr == ""
    found = [f for f in json.loads((bench / "out.json").read_text())["findings"] if f["kind"] == "joint speed" and f["severity"] == "fail"]
    over = t[speeds > limit]
    cuts = np.flatnonzero(np.diff(over) > 0.1)
    assert [f["joint"] for f in found] == ["j6"] * (len(cuts) + 1)
    for finding, start, end in zip(found, over[np.r_[0, cuts + 1]], over[np.r_[cuts, -1]]):
        assert finding["unit"] == "deg/s" and finding["limit"] == pytest.approx(limit)
        assert abs(finding["t_start_s"] - start) < 0.006 and abs(finding["t_end_s"] - end) < 0.006
        assert finding["value"] == pytest.approx(speeds[(t >= start) & (t <= end)].max(), rel=1e-3)
    assert run("check", "retimed.csv", "--cell", "cell.toml").returncode == 0
    header, rows = table("retimed.csv")
    before, after = table("seam.csv")[1], rows
    assert [row[1:] for row in before] == [row[1:] for row in after] and header == table("seam.csv")[0]
    assert float(after[-1][0]) > float(before[-1][0])


def test_a_tool_axis_alone_is_enough(bench):
    t = np.linspace(0.0, 6.0, 301)
    write_path(bench / "axis.csv", tool_in_part(motion(t)[0]), t, form="axis")
    done = run("check", "axis.csv", "--cell", "cell.toml", "--joints", "joints.csv")
    assert done.returncode in (0, 1)
    values = np.array(table("joints.csv")[1], dtype=float)
    truth, found = tool_in_part(motion(t)[0]), tool_in_part(values[:, 1:7])
    np.testing.assert_allclose(found[:, :3, 3], truth[:, :3, 3], atol=1e-5)
    np.testing.assert_allclose(found[:, :3, 2], truth[:, :3, 2], atol=1e-7)


def test_every_output_at_once(bench, capfd):
    assert cli.main(["check", "seam.csv", "--cell", "cell.toml", "--json", "a.json", "--joints", "b.csv", "--retimed", "c.csv", "--html", "d.html"]) == 0
    assert sorted(os.listdir(bench)) == ["a.json", "b.csv", "c.csv", "cell.toml", "d.html", "seam.csv"]
    page = (bench / "d.html").read_text()
    assert page.lstrip().lower().startswith("<!doctype html>") and "bench" in page
    out, err = capfd.readouterr()
    assert "seam.csv in bench" in out and "Traceback" not in err
    for caution in CAUTIONS:  # wherever a verdict stands
        assert caution in json.loads((bench / "a.json").read_text())["cautions"]
        assert escape(caution) in page
        assert caution in " ".join(out.split())


def test_the_cautions_say_what_must_not_be_forgotten():
    said = " ".join(CAUTIONS)
    for words in ("not a risk assessment", "250 mm/s", "ISO 10218-1", "welding procedure prevail", "controller's own interpolation", "collisions", "taken as given"):
        assert words in said


def test_json_on_stdout_and_the_summary_on_stderr(bench, capfd):
    assert cli.main(["check", "seam.csv", "--cell", "cell.toml", "--json", "-"]) == 0
    out, err = capfd.readouterr()
    assert json.loads(out)["format"] == "pathaudit.check/1" and "seam.csv in bench" in err


def one_line(capfd, *arguments):
    """What is said of arguments that are refused."""
    assert cli.main(list(map(str, arguments))) == 2
    out, err = capfd.readouterr()
    assert out == "" and err.startswith("pathaudit: ") and err.endswith("\n") and err.count("\n") == 1, err
    return err.removeprefix("pathaudit: ").rstrip("\n")


@pytest.mark.parametrize(
    "arguments, words",
    [
        ([], "the following arguments are required: COMMAND"),
        (["chek"], "invalid choice: 'chek'"),
        (["check"], "the following arguments are required: PATH, --cell (see pathaudit check --help)"),
        (["check", "seam.csv"], "the following arguments are required: --cell"),
        (["check", "seam.csv", "--cell"], "argument --cell: expected one argument"),
        (["check", "seam.csv", "--cell", "cell.toml", "--sped", "3"], "unrecognized arguments: --sped 3"),
        (["check", "seam.csv", "extra\n.csv", "--cell", "cell.toml"], "unrecognized arguments: extra .csv"),
        (["check", "none.csv", "--cell", "cell.toml"], "none.csv: found no such file, expected a timed path"),
        (["check", "seam.csv", "--cell", "none.toml"], "none.toml: found no such file, expected a cell"),
        (["check", ".", "--cell", "cell.toml"], ".: found a folder"),
        (["check", "cell.toml", "--cell", "seam.csv"], "cell.toml: found a TOML text such as a cell, expected a path"),
        (["check", "seam.csv", "--cell", "seam.csv"], "seam.csv: line 1, column 4: found text that is not TOML"),
        (["check", "seam.csv", "--cell", "cell.toml", "--json", "seam.csv"], "--json seam.csv: found the same file as the input seam.csv"),
        (["check", "seam.csv", "--cell", "cell.toml", "--html", "./cell.toml"], "--html ./cell.toml: found the same file as the input cell.toml"),
        (["check", "seam.csv", "--cell", "cell.toml", "--json", "a", "--html", "./a"], "--html ./a: found the same file as --json"),
        (["check", "seam.csv", "--cell", "cell.toml", "--json", "none/a.json"], "none/a.json: cannot be written: there is no folder none"),
        (["check", "seam.csv", "--cell", "cell.toml", "--json", "."], ".: cannot be written: it is a folder"),
        (["check", "seam.csv", "--cell", "cell.toml", "--html", "-"], "--html: found '-', expected a file name"),
        (["check", "seam.csv", "--cell", "cell.toml", "--html", ""], "--html: found '', expected a file name"),
        (["check", "seam.csv", "--cell", "cell.toml", "--notes", "none.toml"], "none.toml: found no such file, expected notes as TOML text"),
        (["check", "seam.csv", "--cell", "cell.toml", "--notes", "cell.toml"], "cell.toml: line 1, name: found 'bench', expected lines that begin with the id of a note"),
        (["notes"], "the following arguments are required: ACT (see pathaudit notes --help)"),
        (["notes", "merge", "a", "b"], "the following arguments are required: --out"),
        (["notes", "merge", "cell.toml", "none", "--out", "x"], "cell.toml: line 1, name: found 'bench', expected lines that begin with the id of a note"),
        (["notes", "list", "seam.csv"], "seam.csv: line 1, column 4: found text that is not TOML"),
        (["notes", "list", "none.toml"], "none.toml: found no such file, expected notes as TOML text"),
        (["notes", "list", "a", "seam.csv"], "notes list: found PATH without --cell, expected both or neither"),
        (["notes", "list", "a", "--cell", "cell.toml"], "notes list: found --cell without PATH, expected both or neither"),
        (["demo"], "the following arguments are required: FOLDER"),
        (["demo", "seam.csv"], "seam.csv: cannot be written"),
    ],
)
def test_what_is_wrong_is_said_in_one_line(bench, capfd, arguments, words):
    before = {name: (bench / name).read_bytes() for name in os.listdir(bench)}
    assert words in one_line(capfd, *arguments)
    assert {name: (bench / name).read_bytes() for name in os.listdir(bench)} == before


def test_a_bad_row_a_bad_key_and_a_bad_joint(bench, capfd):
    lines = (bench / "seam.csv").read_text().splitlines()
    (bench / "bad.csv").write_text("\n".join([*lines[:7], lines[7].replace(",", ",oops", 1), *lines[8:]]))
    assert "bad.csv: line 8, column x_mm: found 'oops" in one_line(capfd, "check", "bad.csv", "--cell", "cell.toml")
    write_cell(bench / "bad.toml", more="[limits]\nsped_deg_s = 3\n")
    assert one_line(capfd, "check", "seam.csv", "--cell", "bad.toml") == "bad.toml: limits.sped_deg_s: found an unknown key, expected a known one (the nearest is speed_deg_s)"
    write_cell(bench / "bad.toml", more="[limits]\nspeed_deg_s = { j7 = 3 }\n")
    assert "bad.toml: limits.speed_deg_s.j7: found an unknown joint, expected one of the arm's, the nearest is j" in one_line(capfd, "check", "seam.csv", "--cell", "bad.toml")


def test_nothing_is_left_where_writing_fails(bench, capfd, monkeypatch):
    def full(handle):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    assert one_line(capfd, "check", "seam.csv", "--cell", "cell.toml", "--json", "a.json") == "a.json: cannot be written: No space left on device"
    assert sorted(os.listdir(bench)) == ["cell.toml", "seam.csv"]


def test_version_and_help():
    done = run("--version")
    assert (done.returncode, done.stdout, done.stderr) == (0, f"pathaudit {__version__}\n", "")
    for arguments in (["--help"], ["check", "--help"]):
        done = run(*arguments)
        assert done.returncode == 0 and "pathaudit check my-cell/seam.csv --cell my-cell/cell.toml" in done.stdout and done.stderr == ""


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="a device that is always full")
def test_a_full_output_is_said_in_one_line(bench):
    with open("/dev/full", "w") as full:
        done = subprocess.run([sys.executable, "-m", "pathaudit", "check", "seam.csv", "--cell", "cell.toml"], stdout=full, stderr=subprocess.PIPE, text=True)
    assert done.returncode == 2 and done.stderr == "pathaudit: standard output: cannot be written: No space left on device\n"
    done = run("check", "seam.csv", "--cell", "cell.toml", "--json", "/dev/full")
    assert done.returncode == 2 and done.stderr == "pathaudit: /dev/full: cannot be written: No space left on device\n"


def test_a_reader_that_goes_away_is_no_error(bench):
    for arguments in (["check", "seam.csv", "--cell", "cell.toml"], ["check", "seam.csv", "--cell", "cell.toml", "--json", "-"], ["--help"]):
        reads, writes = os.pipe()
        os.close(reads)
        done = subprocess.run([sys.executable, "-m", "pathaudit", *arguments], stdout=writes, stderr=subprocess.PIPE, text=True)
        os.close(writes)
        assert done.returncode == 0 and "Traceback" not in done.stderr and "BrokenPipe" not in done.stderr


def test_an_output_without_all_characters(bench):
    (bench / "cell.toml").write_text((bench / "cell.toml").read_text().replace('"bench"', '"Prüfstand 角"'))
    done = subprocess.run(
        [sys.executable, "-m", "pathaudit", "check", "seam.csv", "--cell", "cell.toml"], capture_output=True, env={**os.environ, "PYTHONIOENCODING": "ascii"}
    )
    assert done.returncode == 0 and b"Pr?fstand ?" in done.stdout and done.stderr == b""


def test_an_interrupt_is_quiet(bench):
    os.mkfifo(bench / "pipe.csv")  # nobody writes: the program waits until it is interrupted
    waiting = subprocess.Popen([sys.executable, "-m", "pathaudit", "check", "pipe.csv", "--cell", "cell.toml"], stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    time.sleep(1.0)
    waiting.send_signal(signal.SIGINT)
    out, err = waiting.communicate(timeout=20)
    assert (waiting.returncode, out, err) == (130, b"", b"")


def test_the_demo_is_written_runs_as_it_says_and_is_never_overwritten(tmp_path, capfd):
    folder = tmp_path / "a new" / "cell"
    assert cli.main(["demo", str(folder)]) == 0
    *listed, _, hint = capfd.readouterr().out.splitlines()
    names = sorted(os.listdir(folder))
    assert listed == [str(folder / name) for name in names]
    program, *arguments = shlex.split(hint.removeprefix("Now: "))
    assert program == "pathaudit" and cli.main(arguments) in (0, 1)
    capfd.readouterr()
    before = {name: (folder / name).read_bytes() for name in names}
    assert "it exists already, and nothing is overwritten" in one_line(capfd, "demo", folder)
    (folder / names[-1]).unlink()
    one_line(capfd, "demo", folder)
    assert {name: (folder / name).read_bytes() for name in os.listdir(folder)} == {name: before[name] for name in names[:-1]}


def test_against_an_earlier_report_and_its_signature(bench, capfd):
    cell = (bench / "cell.toml").read_text()
    assert cli.main(["check", "seam.csv", "--cell", "cell.toml", "--json", "first.json"]) in (0, 1)
    assert cli.main(["sign", "first.json", "--by", "A. Weber", "--remark", "checked"]) == 0
    assert "signed by A. Weber" in capfd.readouterr().out
    status = cli.main(["check", "seam.csv", "--cell", "cell.toml", "--against", "first.json", "--json", "second.json", "--html", "page.html"])
    out = capfd.readouterr().out
    assert "It holds" in out and "Unchanged" in out
    assert json.loads((bench / "second.json").read_text())["against"]["same"] is True
    assert "It holds" in (bench / "page.html").read_text()
    (bench / "cell.toml").write_text(cell.replace("xyz_mm = [15, 0, 340]", "xyz_mm = [15, 0, 342]"))
    assert "342" in (bench / "cell.toml").read_text()
    assert cli.main(["check", "seam.csv", "--cell", "cell.toml", "--against", "first.json"]) in (0, 1)
    out = capfd.readouterr().out
    assert "VOID" in out and "tool.xyz_mm was (15, 0, 340) and is (15, 0, 342)" in out
    assert status in (0, 1)


@pytest.mark.parametrize("arguments, words", [
    (["check", "seam.csv", "--cell", "cell.toml", "--against", "missing.json"], "missing.json: found no such file"),
    (["check", "seam.csv", "--cell", "cell.toml", "--against", "cell.toml"], "no JSON"),
    (["check", "seam.csv", "--cell", "cell.toml", "--against", "r.json", "--json", "r.json"], "the same file"),
    (["sign", "r.json", "--by", "  "], "--by: the name is empty"), (["sign", "seam.csv", "--by", "A"], "no JSON"), (["sign", "r.json"], "--by"),
])
def test_what_cannot_be_compared_or_signed_is_said_in_one_line(bench, capfd, arguments, words):
    assert cli.main(["check", "seam.csv", "--cell", "cell.toml", "--json", "r.json"]) in (0, 1)
    before = (bench / "r.json").read_bytes()
    capfd.readouterr()
    assert cli.main(arguments) == 2
    out, err = capfd.readouterr()
    assert out == "" and words in err and err.count("\n") == 1
    assert (bench / "r.json").read_bytes() == before


@pytest.fixture
def noted(bench):
    """Notes on the bench's path: one at a place, one at another; beside it what two people made of them."""
    import pathaudit as pa
    from pathaudit.notes import Notes, new_note, write_notes

    audit, notes = pa.audit(pa.read_path("seam.csv"), pa.read_cell("cell.toml")), Notes()
    for sample, text in ((200, "Gas on\nbefore here?"), (900, "<script>alert(1)</script> \x1b[31mred")):
        notes = notes.put(new_note(audit, sample, text, "Ann", date="2026-12-01T09:30:00Z", taken=notes.by_id))
    write_notes("seam.notes.toml", notes)
    write_notes("bob.notes.toml", notes.put(notes.items[0].edit("Bob's", "Bob", "2026-12-01T10:00:00Z")))
    write_notes("cy.notes.toml", notes.put(notes.items[0].edit("Cy's", "Cy", "2026-12-01T11:00:00Z")).put(notes.items[1].delete("Cy")))
    return notes


def test_notes_in_every_output_of_check(bench, noted, capfd):
    before = (bench / "seam.notes.toml").read_bytes()
    assert cli.main(["check", "seam.csv", "--cell", "cell.toml", "--notes", "seam.notes.toml", "--json", "a.json", "--html", "d.html"]) == 0
    out = capfd.readouterr().out
    assert "Notes: 2 notes\n1  open; 1.00 s, " in out and "\n      Gas on\n      before here?\n" in out and "\x1b" not in out and "\\x1b[31mred" in out
    assert [note["sample"] for note in json.loads((bench / "a.json").read_text())["notes"]] == [200, 900]
    assert "before here?" in (bench / "d.html").read_text() and "<script>alert" not in (bench / "d.html").read_text()
    assert (bench / "seam.notes.toml").read_bytes() == before
    assert "--html seam.notes.toml: found the same file as the input" in one_line(
        capfd, "check", "seam.csv", "--cell", "cell.toml", "--notes", "seam.notes.toml", "--html", "seam.notes.toml")


def test_merging_notes(bench, noted, capfd):
    assert cli.main(["notes", "merge", "seam.notes.toml", "bob.notes.toml", "--out", "all.notes.toml"]) == 0
    assert capfd.readouterr().out == "all.notes.toml: 2 notes, 0 deleted, nothing to decide\n"
    assert (bench / "all.notes.toml").read_bytes() == (bench / "bob.notes.toml").read_bytes()
    for base in ([], ["--base", "seam.notes.toml"]):
        assert cli.main(["notes", "merge", "bob.notes.toml", "cy.notes.toml", *base, "--out", "bob.notes.toml"]) == 1
        assert capfd.readouterr().out.startswith("bob.notes.toml: 1 note, 1 deleted, 1 to decide\n  " + noted.items[0].id + " at ")
    text = (bench / "bob.notes.toml").read_text()
    assert "Cy's" in text and "Bob's" in text and "script" not in text
    assert "--out cell.toml: found a file that is neither OURS nor THEIRS" in one_line(capfd, "notes", "merge", "bob.notes.toml", "cy.notes.toml", "--out", "cell.toml")
    assert "none/x: cannot be written" in one_line(capfd, "notes", "merge", "bob.notes.toml", "cy.notes.toml", "--out", "none/x")


def test_as_git_s_merge_driver(bench, noted):
    """With this in its settings git makes one file of what two branches did to the notes; an empty base is what it gives where both added the file."""
    def git(*words):
        return subprocess.run(["git", "-c", "user.name=x", "-c", "user.email=x", *words], capture_output=True, text=True)

    driver = f'"{sys.executable}" -m pathaudit notes merge %A %B --base %O --out %A'
    git("init", "-q")
    git("config", "merge.pathaudit.driver", driver)
    (bench / ".gitattributes").write_text("*.notes.toml merge=pathaudit\n")
    ours, theirs = (bench / "bob.notes.toml").read_text(), (bench / "cy.notes.toml").read_text()
    for base in ((bench / "seam.notes.toml").read_text(), None):
        (bench / "seam.notes.toml").unlink()
        git("checkout", "-q", "--orphan", f"start{base is None}")
        if base:
            (bench / "seam.notes.toml").write_text(base)
        git("add", "-A")
        git("commit", "-qm", "base")
        for name, text in (("theirs", theirs), ("ours", ours)):
            git("checkout", "-q", "-b", f"{name}{base is None}", f"start{base is None}")
            (bench / "seam.notes.toml").write_text(text)
            git("add", "-A")
            git("commit", "-qm", name)
        assert git("merge", f"theirs{base is None}").returncode == 1      # something is to decide, so git does not commit by itself
        merged = (bench / "seam.notes.toml").read_text()
        assert "Cy's" in merged and "Bob's" in merged and "deleted = [" in merged and "<<<<" not in merged
        git("add", "-A")
        git("commit", "-qm", "merged")


def test_listing_notes(bench, noted, capfd):
    assert cli.main(["notes", "list", "seam.notes.toml"]) == 0
    out = capfd.readouterr().out
    assert out.startswith("Notes: 2 notes\n1  open; ") and "before here?" in out and "\x1b" not in out
    header, rows = table("seam.csv")
    with open("moved.csv", "w", newline="") as stream:
        csv.writer(stream).writerows([header, *([*row[:3], float(row[3]) + 3.0 * (k > 600), *row[4:]] for k, row in enumerate(rows))])
    assert cli.main(["notes", "list", "seam.notes.toml", "moved.csv", "--cell", "cell.toml"]) == 0
    out = capfd.readouterr().out
    assert out.startswith("Notes: 2 notes, 1 stale\n") and out.count("Stale: The path has moved by ") == 1
    (bench / "seam.notes.toml").write_text("# nothing\n")
    assert cli.main(["notes", "list", "seam.notes.toml"]) == 0 and capfd.readouterr().out == "No notes.\n"
