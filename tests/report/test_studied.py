"""A study as text and JSON, and from the command line."""

import json
from pathlib import Path

import pytest
from tolerant_cells import near_a_limit, wrist_bench

import pathaudit as pa
from pathaudit import cli
from pathaudit.report.studied import _down, study_text, study_values
from pathaudit.report.tables import report_text
from pathaudit.spread.study import study

DEMO = Path(pa.__file__).parent / "demo"
STATED = {"part_xyz_mm": 1.0, "part_rpy_deg": 0.1, "speed_percent": {"sigma": 5.0}}


@pytest.fixture(scope="module")
def close():
    return study(near_a_limit(1, 0.85, every=10, **STATED), draws=200)


def test_the_text_says_chances_dimensions_and_reserves(close):
    text = study_text(close)
    assert "as stated PASS" in text and "200 draws of 7 dimensions, seed 0" in text
    fail = close.chance("fail")
    assert f"{100 * fail.share:.2f}" in text or f"{100 * fail.share:.1f}" in text
    for i, w in enumerate(close.watched):
        assert (close.name(i) + ":" in text.split("Measure better")[0]) == (close.chance_of(i, "warn").draws > 0)
    assert "programmed speed" in text and "stated sigma 5 %" in text and "% of the limit per %" in text
    assert "before anything is flagged" in text and "Audited in full" not in text.split("Together")[0]
    assert "The draws are judged at the samples" in text and "not a risk assessment" in text
    assert max(map(len, text.splitlines())) <= 125


def test_the_json_holds_all_of_it_and_no_nan(close):
    values = json.loads(report_text(study_values(close)))
    assert values["format"] == "pathaudit.study/1" and values["draws"] == 200 and values["verdict"] == close.verdict
    assert sum(values["chances"][v]["share"] for v in ("pass", "warn", "fail")) == pytest.approx(1.0)
    assert len(values["findings"]) == len(close.watched) and len(values["dimensions"]) == 7
    speed = next(f for f in values["findings"] if f["kind"] == "joint speed" and f["joint"] == "j1")
    i = next(i for i, w in enumerate(close.watched) if (w.kind, w.joint) == ("joint speed", 0))
    assert speed["as_stated"] == pytest.approx(100 * close.nominal[i]) and speed["worst"] == pytest.approx(100 * close.levels[:, i].max())
    assert speed["worst_off"]["programmed speed"] == close.values[speed["worst_draw"], -1]
    assert {s["name"] for s in speed["sensitivities"]} == {d["name"] for d in values["dimensions"]}
    assert len(values["bands"]["sample"]) == len(values["bands"]["sigma_min_50"]) == close.audit.path.samples
    for reserve, r in zip(values["reserves"], close.reserves, strict=True):
        assert (reserve["plus"], reserve["minus"]) == (r.plus, r.minus)
    assert values["worst_direction_of_part"]["verdict_audited_in_full"] in ("warn", "fail")


def test_what_is_said_to_be_allowed_is_never_rounded_up():
    for value in (35.557, 0.0123987, 1.0, 999.99, 4.2038, 0.1, 50.0):
        assert value - 0.01 * value < float(_down(value)) <= value


def test_where_nothing_is_stated_only_the_reserves_are_told():
    audit = wrist_bench(35.0)
    text = study_text(study(audit))
    assert "Nothing is stated under [tolerance]" in text and "Chance of" not in text and "Measure better" not in text
    assert "part x" in text and "joint travel, j2" in text


def test_a_cell_that_fails_is_told_how_far_it_is_from_passing():
    text = study_text(study(wrist_bench(37.6, part_xyz_mm=[2.0, 0.0, 0.0]), draws=100))
    assert "as stated FAIL" in text or "as stated PASS" in text
    if "as stated FAIL" in text:
        assert "until it fails no more" in text and "Together" not in text


def test_slopes_that_mislead_are_called_so(close):
    from dataclasses import replace

    text = study_text(replace(close, slopes=-close.slopes))
    assert "rely on the draws" in text and "rely on the draws" not in study_text(close)


@pytest.fixture
def folder(tmp_path):
    assert cli.main(["demo", str(tmp_path / "demo")]) == 0
    seam, cell = tmp_path / "demo" / "seam.csv", tmp_path / "demo" / "cell-moved.toml"
    lines = seam.read_text("utf-8").splitlines()
    head = next(k for k, line in enumerate(lines) if line.startswith("t_"))
    seam.write_text("\n".join([*lines[: head + 1], *lines[head + 1 :: 12]]) + "\n", "utf-8")
    cell.write_text(cell.read_text("utf-8") + "\n[tolerance]\npart_xyz_mm = 1.0\nspeed_percent = 2\n", "utf-8")
    return tmp_path / "demo"


def run(folder, *more, cell="cell-moved.toml"):
    return cli.main(["study", str(folder / "seam.csv"), "--cell", str(folder / cell), "--draws", "100", *more])


def test_the_command_writes_the_same_as_the_functions(folder, capsys):
    status = run(folder, "--seed", "3", "--json", str(folder / "out.json"))
    found = study(pa.audit(pa.read_path(folder / "seam.csv"), pa.read_cell(folder / "cell-moved.toml")), 100, 3)
    assert capsys.readouterr().out == study_text(found)
    assert (folder / "out.json").read_text("utf-8") == report_text(study_values(found))
    assert status == (1 if found.chance("fail").draws or found.verdict == "fail" or found.audit.verdict == "fail" else 0)


def test_json_to_the_standard_output_and_failing_cells(folder, capsys):
    cell = folder / "cell.toml"
    cell.write_text(cell.read_text("utf-8") + "\n[tolerance]\npart_xyz_mm = 1.0\n", "utf-8")
    assert run(folder, "--json", "-", cell="cell.toml") == 1
    out, err = capsys.readouterr()
    assert json.loads(out)["chances"]["fail"]["share"] > 0.9 and err.startswith("STUDY")


@pytest.mark.parametrize(
    "options, words",
    [
        (["--draws", "many"], "--draws: found 'many', expected a whole number"),
        (["--draws", "5"], "--draws: found 5, expected a whole number from 100"),
        (["--seed", "-1"], "--seed: found -1, expected"),
        (["--json", ""], "--json: found"),
    ],
)
def test_unusable_options_are_one_line(folder, capsys, options, words):
    assert run(folder, *options) == 2
    err = capsys.readouterr().err
    assert words in err and err.count("\n") == 1


def test_public_names():
    assert pa.study is study and pa.Tolerances and pa.Study
