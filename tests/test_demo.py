"""The demo is what its geometry says, and shows what its README and notebook tell."""

import tomllib

import make_demo
import numpy as np
import pytest
from make_demo import DEMO, MADE, NOTEBOOKS

import pathaudit as pa
from pathaudit.cli import main


@pytest.fixture(scope="module")
def seam():
    return pa.read_path(DEMO / "seam.csv")


@pytest.fixture(scope="module")
def programmed(seam):
    return pa.audit(seam, pa.read_cell(DEMO / "cell.toml"))


def part_of(path, label):
    return np.array([word == label for word in path.label])


def sampled(step):
    """The seam's poses at another sampling."""
    before, make_demo.SEAM_STEP = make_demo.SEAM_STEP, step
    try:
        columns = zip(*make_demo.steady(make_demo.seam_rows()), strict=True)
    finally:
        make_demo.SEAM_STEP = before
    names = ("t_s", "x_mm", "y_mm", "z_mm", "qw", "qx", "qy", "qz", "process", "label")
    return pa.path_from(dict(zip(names, map(np.array, columns), strict=True)))


# what is in the folders


@pytest.mark.parametrize("name", MADE)
def test_the_paths_are_what_their_geometry_gives(name):
    assert (DEMO / name).read_bytes() == MADE[name]().encode()


def test_the_demo_writes_what_lies_in_notebooks(tmp_path, capsys):
    assert main(["demo", str(tmp_path / "cell")]) == 0
    written = {file.name: file.read_bytes() for file in (tmp_path / "cell").iterdir()}
    assert set(written) >= {"cell.toml", "cell-moved.toml", "cell-bead.toml", "arm.urdf", "seam.csv", "bead.csv", *make_demo.NOTEBOOK_NAMES}
    assert written == {file.name: file.read_bytes() for file in NOTEBOOKS.iterdir() if file.is_file() and not file.name.startswith(".")}
    said = capsys.readouterr().out
    assert all(str(tmp_path / "cell" / name) in said for name in written)


def test_the_moved_fixture_is_all_that_moves():
    cell, moved = (tomllib.loads((DEMO / name).read_text("utf-8")) for name in ("cell.toml", "cell-moved.toml"))
    assert {key for key in cell if cell[key] != moved[key]} == {"name", "part"}
    assert np.subtract(moved["part"]["xyz_mm"], cell["part"]["xyz_mm"]).tolist() == [-40, 0, -60]


# the arm and the tool are of the usual kind


def test_the_arm_has_a_spherical_wrist_and_the_limits_of_a_light_arm():
    arm = pa.Arm.from_urdf(DEMO / "arm.urdf")
    q = np.random.default_rng(4).uniform(-1, 1, (20, 6))
    q[:, :3] = 0.2, -0.3, 0.5
    wrist = arm.flange_pose(q) @ [0.0, 0.0, -0.09, 1.0]
    assert np.ptp(wrist, axis=0).max() < 1e-12  # the last three joints turn about one point
    stretched = np.zeros((721, 6))
    stretched[:, 1] = np.pi / 2  # upper arm level
    stretched[:, 2] = np.linspace(-np.pi, np.pi, 721)
    assert np.abs((arm.flange_pose(stretched) @ [0.0, 0.0, -0.09, 1.0])[:, 0]).max() == pytest.approx(1.539, abs=5e-4)
    rates = np.degrees(arm.speed)
    for joints, low, high in ((slice(0, 3), 170, 260), (slice(3, 5), 350, 480), (slice(5, 6), 500, 720)):
        assert (rates[joints] >= low).all() and (rates[joints] <= high).all()
    cell = pa.read_cell(DEMO / "cell.toml")
    accelerations = np.degrees(cell.arm.acceleration)
    for joints, low, high in ((slice(0, 3), 300, 1500), (slice(3, 5), 1000, 4000), (slice(5, 6), 1500, 6000)):
        assert (accelerations[joints] >= low).all() and (accelerations[joints] <= high).all()


def test_the_torch_is_a_bent_neck():
    tool = pa.read_cell(DEMO / "cell.toml").tool
    neck = np.radians(22.0)
    assert np.allclose(tool[:3, 2], [np.sin(neck), 0.0, np.cos(neck)])
    assert np.allclose(tool[:3, 3], np.array([0.0, 0.0, 0.250]) + 0.140 * tool[:3, 2], atol=1e-7)


# the seam is a weld that a process engineer would programme


def test_the_seam_is_welded_evenly(seam):
    burning = np.flatnonzero(seam.process)
    assert seam.distance[burning[-1]] - seam.distance[burning[0]] == pytest.approx(1.2, abs=1e-3)
    speed = np.linalg.norm(np.diff(seam.position, axis=0), axis=1) / np.diff(seam.time) * 1000.0
    assert speed.max() < 200.1
    weld = speed[burning[40]: burning[-40]]
    assert weld.min() > 23.98 and weld.max() < 24.01  # coordinates are rounded to 0.1 um


def test_the_torch_stands_at_the_stated_angles(seam):
    """Travel angle asin(e.t), work angle between the floor sheet's normal and the plane of wire and seam (AWS A3.0 wording)."""
    wire = seam.rotation[1:-1, :, 2]
    along = seam.position[2:] - seam.position[:-2]
    moving = (np.linalg.norm(along, axis=1) > 1e-4) & seam.process[:-2] & seam.process[2:]
    wire, along = wire[moving], along[moving] / np.linalg.norm(along[moving], axis=1)[:, None]
    travel = np.degrees(np.arcsin(np.sum(wire * along, axis=1)))
    across = np.cross(wire, along)
    work = np.degrees(np.arcsin(np.abs(across[:, 2]) / np.linalg.norm(across, axis=1)))
    usual = ~part_of(seam, "corner")[1:-1][moving]
    usual &= np.abs(seam.distance[1:-1][moving] - seam.distance[part_of(seam, "corner")].mean()) > 0.05
    assert np.allclose(travel[usual], 10.0, atol=0.2) and np.allclose(work[usual], 45.0, atol=0.2)
    assert travel.min() > 0.0 and travel.max() < 20.0 and work.min() > 40.0 and work.max() < 50.0


def test_the_arm_side_of_the_torch_stays_inside_the_bend_and_above_the_sheet(seam):
    """The flange stands over the side that the wall bends around, well above the floor sheet."""
    flange = seam.position + seam.rotation @ np.linalg.inv(pa.read_cell(DEMO / "cell.toml").tool)[:3, 3]
    burning = np.flatnonzero(seam.process)
    foot, along = seam.position[burning, :2], np.gradient(seam.position[burning, :2], axis=0)
    for k in burning[::50]:
        near = np.argmin(np.linalg.norm(foot - flange[k, :2], axis=1))
        apart = flange[k, :2] - foot[near]
        assert np.linalg.norm(apart) > 0.06 and along[near, 0] * apart[1] - along[near, 1] * apart[0] >= 0.0
    assert flange[:, 2].min() > 0.3


# what the audit says


def test_the_programmed_seam_fails_in_the_corner_only(seam, programmed):
    assert programmed.verdict == "fail"
    assert [(f.kind, f.severity, f.joint) for f in programmed.finding_list] == [
        ("near-singular", "warn", None), ("joint acceleration", "fail", "j4"), ("joint speed", "fail", "j4"), ("joint speed", "fail", "j6"),
    ]  # fmt: skip
    corner = seam.time[part_of(seam, "corner")]
    for finding in programmed.finding_list:
        assert corner[0] < finding.t_start < finding.t_end < corner[-1]
        assert "joints j4 and j6 are within 3." in finding.why.replace("J", "j") and "(wrist)" in finding.why
    rest = ~part_of(seam, "corner")
    assert programmed.rates.speed_share[rest].max() < 0.2 and programmed.rates.sigma_min[rest].min() > 0.08
    assert programmed.rates.acceleration_share[rest].max() < 0.5


def test_the_overrun_is_in_the_motion_not_in_the_sampling(programmed):
    """Five times the samples give the same peaks, and plain differences of the joint angles show them too."""
    fine = pa.audit(sampled(make_demo.SEAM_STEP / 5), programmed.cell)
    assert fine.motion.reached.all() and not fine.motion.jumps
    by_differences = np.abs(np.diff(fine.joints, axis=0)).max(axis=0) / (make_demo.SEAM_STEP / 5)
    bends = np.abs(np.diff(fine.joints, 2, axis=0)).max(axis=0) / (make_demo.SEAM_STEP / 5) ** 2
    for j in (3, 5):
        peak = np.abs(programmed.rates.joint_speed[:, j]).max()
        assert by_differences[j] == pytest.approx(peak, rel=0.01)
        assert np.abs(programmed.rates.joint_acceleration[:, j]).max() == pytest.approx(bends[j], rel=0.02)
    assert fine.rates.sigma_min.min() == pytest.approx(programmed.rates.sigma_min.min(), rel=0.01)


def test_a_slower_corner_is_within_the_limits_and_still_near_singular(seam, programmed):
    slower = programmed.suggestion
    again = slower.audit()
    assert slower.feasible and slower.style == "local" and 0.5 < slower.slowest < 0.6
    assert again.verdict == "warn" and again.rates.speed_share.max() <= 1.0 and again.rates.acceleration_share.max() <= 1.0
    assert np.array_equal(again.path.position, seam.position) and np.array_equal(again.path.rotation, seam.rotation)
    assert any(f.kind == "near-singular" for f in again.finding_list)


def test_the_moved_fixture_passes(seam):
    moved = pa.audit(seam, pa.read_cell(DEMO / "cell-moved.toml"))
    assert moved.verdict == "pass" and not moved.finding_list
    assert moved.rates.speed_share.max() < 0.7 and moved.rates.sigma_min.min() > 0.07


def test_the_bead_passes_with_the_nozzle_free_to_turn():
    bead = pa.read_path(DEMO / "bead.csv")
    audit = pa.audit(bead, pa.read_cell(DEMO / "cell-bead.toml"))
    assert bead.spin_free and audit.verdict == "pass" and audit.motion.reached.all()
    laid = np.flatnonzero(bead.process)
    loop = 2 * (0.36 + 0.24) - 8 * 0.03 + 2 * np.pi * 0.03
    assert bead.distance[laid[-1]] - bead.distance[laid[0]] == pytest.approx(loop + 0.012, abs=1e-3)
    assert np.degrees(np.arccos(-bead.rotation[:, 2, 2])) == pytest.approx(8.0, abs=1e-4)
    gap = np.linalg.norm(bead.position[laid[-1]] - bead.position[laid[0]])
    assert gap == pytest.approx(0.012, abs=1e-6)  # it ends one overlap beyond its start
