"""The README's commands, tables and examples are true: they are run, read and compared here."""

import re
import shutil
import subprocess
import sys
import tomllib
from dataclasses import fields

import pytest
from make_demo import DEMO, ROOT

import pathaudit as pa
from pathaudit.cli import main
from pathaudit.findings import RULES
from pathaudit.taskpath import MEANING

README = (ROOT / "README.md").read_text("utf-8")


def blocks(language, text=README):
    return re.findall(rf"^```{language}\n(.*?)^```$", text, re.M | re.S)


def rows(heading):
    """The cells of the table rows below a heading or sentence, header and rule left out."""
    found = []
    for line in README[README.index(heading):].splitlines()[0 if heading.startswith("|") else 1:]:
        if line.startswith("|"):
            found.append([cell.strip() for cell in line.strip("|").split(" | ")])
        elif found:
            break
    return found[2:]


@pytest.fixture
def in_demo(tmp_path, monkeypatch):
    """A copy of the demo as the working folder."""
    folder = tmp_path / "my-cell"
    shutil.copytree(DEMO, folder, ignore=shutil.ignore_patterns("__pycache__", ".*"))
    monkeypatch.chdir(folder)
    return folder


def run(command, folder):
    """Run one of the README's commands with this interpreter's package."""
    program, *arguments = command.split()
    assert program == ".venv/bin/pathaudit"
    return subprocess.run([sys.executable, "-m", "pathaudit", *arguments], cwd=folder, capture_output=True, text=True)


def test_the_job_stands_at_the_top():
    title, paragraph = README.split("\n\n")[:2]
    assert title == "# pathaudit" and paragraph.startswith("`pathaudit` answers one question")


def test_there_are_two_commands_and_the_first_does_the_main_job(tmp_path):
    commands = blocks("sh")
    assert len(commands) == 2 and all(len(command.splitlines()) == 1 for command in commands)
    venv, install, demo, check = commands[0].strip().split(" && ")
    assert (venv, install) == ("python3 -m venv .venv", ".venv/bin/pip install -e .")
    assert run(demo, tmp_path).returncode == 0
    done = run(check, tmp_path)
    assert done.returncode == 1 and done.stdout.startswith("FAIL")
    assert "<html" in (tmp_path / "my-cell" / "seam.html").read_text("utf-8")


def test_the_second_command_is_what_ci_runs():
    script = (ROOT / ".ci" / "run").read_text("utf-8")
    assert script.rstrip().splitlines()[-1] == blocks("sh")[1].strip()
    assert (ROOT / ".ci" / "run").stat().st_mode & 0o111


def test_the_shown_summary_is_what_the_demo_prints(in_demo, capsys):
    assert main(["check", "seam.csv", "--cell", "cell.toml"]) == 1
    printed = iter(capsys.readouterr().out.splitlines())
    for line in blocks("text")[0].splitlines():
        assert line in printed, line  # in this order


def test_the_demo_gives_the_verdicts_of_its_table(in_demo, capsys):
    cases = rows("The demo holds four cases:")
    assert len(cases) == 4
    for command, verdict, _ in cases:
        arguments = re.match(r"`pathaudit (.*?)`", command)[1].split()
        status = main(arguments)
        if "then check" in command:
            assert status == 1
            capsys.readouterr()
            status = main(["check", "slower.csv", *arguments[2:4]])
        assert capsys.readouterr().out.split()[0] == verdict.upper()
        assert status == (verdict == "fail")


def test_the_numbers_told_of_the_demo_are_the_audits(in_demo):
    audit = pa.audit(pa.read_path("seam.csv"), pa.read_cell("cell.toml"))
    assert "joint 4 would have to turn at 174 % of its limit" in README and round(100 * audit.rates.speed_share[:, 3].max()) == 174
    assert "slowing 6 mm of the corner" in README and "Slows 6 mm of the path" in audit.suggestion.why


def test_every_threshold_is_told_with_its_default():
    told = rows("The defaults, and why they are what they are:")
    defaults = {field.name: field.default for field in fields(pa.Thresholds)}
    named = set()
    for _, keys, default, _ in told:
        keys = re.findall(r"`(\w+)`", keys)
        named |= set(keys)
        numbers = [float(number) for number in re.findall(r"\d+(?:\.\d+)?", default)]
        for key in keys:
            assert (defaults[key] in numbers) if defaults[key] is not None else default == "not judged", key
    assert named == set(defaults) - {"characteristic_length_mm"} and "`characteristic_length_mm`, by default half" in README
    assert {row[0] for row in told} == {rule.kind for rule in RULES} | {"unreachable", "posture jump", "unproven"}


def test_the_reason_of_the_near_singular_bounds_adds_up():
    thresholds = pa.Thresholds()
    assert round(1 / thresholds.sigma_min_warn) == 17 and round(25 / thresholds.sigma_min_warn) == 417
    assert round(1 / thresholds.sigma_min_fail) == 50 and 8 / thresholds.sigma_min_fail == 400


def test_every_column_with_a_meaning_is_told():
    told = " ".join(row[0] for row in rows("### The path: CSV"))
    shorthand = {f"{c}_{unit}" for c in "yz" for unit in ("m", "in")} | {"x_m", "x_in"} | {f"r{c}_rad" for c in "xyz"}
    assert {name for name in MEANING if name not in shorthand} <= set(re.findall(r"\w+", told))
    assert "`_m`, `_in`" in told and "`_rad`" in told


def test_the_path_example_reads(in_demo):
    (in_demo / "example.csv").write_text(blocks("csv")[0])
    path = pa.read_path("example.csv")
    assert path.samples == 3 and path.spin_free and path.length == pytest.approx(0.01)


def test_the_cell_examples_read(in_demo):
    cell, tolerance, rows_arm = blocks("toml")
    stated = in_demo / "stated.toml"
    stated.write_text((in_demo / "cell.toml").read_text("utf-8") + "\n" + tolerance, "utf-8")
    assert {d.key for d in pa.read_cell(stated).tolerances.dimensions} == set(tomllib.loads(tolerance)["tolerance"])
    (in_demo / "example.toml").write_text(cell)
    (in_demo / "rows.toml").write_text(rows_arm)
    read = pa.read_cell("example.toml")
    assert read.name == "Bench 3" and read.arm.joint_names[0] == "j1" and read.thresholds.travel_warn_deg == 10
    assert pa.audit(pa.read_path("seam.csv"), read).motion.start_reason.startswith("Starts")
    assert pa.read_cell("rows.toml").arm.joint_names == ("j1",)


def test_the_keys_told_are_the_keys_that_are_read():
    from pathaudit.arm import ROW_KEYS
    from pathaudit.reading.cell_toml import KEYS

    told = set(re.findall(r"\w+", README))
    assert set(ROW_KEYS) - told <= {"lower_mm", "upper_mm", "speed_mm_s", "acceleration_mm_s2", "effort_n"}
    sliding = {"speed_mm_s", "acceleration_mm_s2", "travel_mm"}
    assert not {key for table, keys in KEYS.items() if table != "thresholds" for key in keys} - told - sliding


def test_the_python_example_runs(in_demo, capsys):
    (code,) = blocks("python")
    assert len(code.strip().splitlines()) <= 16
    exec(compile(code, "README.md", "exec"), {})
    printed = capsys.readouterr().out
    assert printed.startswith("fail") and printed.rstrip().endswith("pass")


def test_every_option_and_exit_status_is_told(capsys):
    assert main(["check", "--help"]) == 0
    options = set(re.findall(r"--[a-z-]+\b", capsys.readouterr().out)) - {"--help", "--cell"}
    told = [*rows("## What you get"), *rows("| option | takes in |"), *rows("| option | how the path is read |")]
    assert {re.match(r"`(--[a-z-]+)", row[0])[1] for row in told} == options
    assert [row[0] for row in rows("Output files appear whole or not at all.")] == ["0", "1", "2"]


def test_links_and_pictures_lead_somewhere():
    for place in re.findall(r"\]\(([^)#]+)\)", README):
        assert (ROOT / place).is_file(), place
    assert (ROOT / "notebooks" / "pictures" / "seam.png").read_bytes()[:8] == b"\x89PNG\r\n\x1a\n"


def test_the_benchmark_table_has_its_marks():
    assert README.count("<!-- benchmark table: begin -->") == README.count("<!-- benchmark table: end -->") == 1


def test_the_developers_page_names_every_module_and_the_import_order():
    from test_house import ORDER

    text = (ROOT / "DEVELOPERS.md").read_text("utf-8")
    table = text[text.index("## Layout and import order"): text.index("Beside them:")]
    places = [room for room in re.findall(r"`(\w+)(?:\.py|/)`", table)]
    assert places == [room for room in ORDER if room in places]
    package = ROOT / "pathaudit"
    there = {file.stem for file in package.glob("*.py")} | {folder.name for folder in package.iterdir() if (folder / "__init__.py").exists()}
    assert there - {"__init__"} == set(places)
    assert blocks("sh", text)[0] == blocks("sh")[1]
    for kernel in (package / "kernels").glob("[a-z]*.py"):
        assert f"`{kernel.stem}`" in table
