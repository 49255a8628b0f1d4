"""An audit-like value made from a known joint motion, for any number of joints and samples: what the pictures draw, with nothing judged."""

from types import SimpleNamespace

import numpy as np

from pathaudit.arm import Chain
from pathaudit.cell import Thresholds
from pathaudit.proof import Proof
from pathaudit.tolerances import Tolerances

SPEED_DEG_S = (200.0, 180.0, 200.0, 400.0, 400.0, 600.0)


def dh(alpha, a, d):
    c, s = np.cos(alpha), np.sin(alpha)
    return np.array([[1, 0, 0, a], [0, c, -s, 0], [0, s, c, d], [0, 0, 0, 1.0]])


def six_axis_links():
    half = np.pi / 2
    return np.array([dh(0, 0, 0.45), dh(half, 0.15, 0), dh(0, 0.65, 0), dh(half, 0.12, 0.7), dh(-half, 0, 0), dh(half, 0, 0), dh(0, 0, 0.1)])


def planar_links(n, length=0.3):
    links = [dh(0, 0, 0.3)] + [dh(0.3 * (-1) ** k, length, 0) for k in range(n)]
    return np.array(links)


def frames(links, q):
    at = np.broadcast_to(links[0], (len(q), 4, 4))
    for i in range(q.shape[1]):
        turn = np.zeros((len(q), 4, 4))
        turn[:, 0, 0] = turn[:, 1, 1] = np.cos(q[:, i])
        turn[:, 1, 0] = np.sin(q[:, i])
        turn[:, 0, 1] = -turn[:, 1, 0]
        turn[:, 2, 2] = turn[:, 3, 3] = 1
        at = at @ turn @ links[i + 1]
    return at


def jacobian(links, q):
    step = 1e-6
    columns = []
    here = frames(links, q)
    for i in range(q.shape[1]):
        more = q.copy()
        more[:, i] += step
        there = frames(links, more)
        turn = (there[:, :3, :3] - here[:, :3, :3]) / step @ np.swapaxes(here[:, :3, :3], 1, 2)
        columns.append(np.column_stack([(there[:, :3, 3] - here[:, :3, 3]) / step / 0.5, turn[:, 2, 1], turn[:, 0, 2], turn[:, 1, 0]]))
    return np.stack(columns, axis=2)


def motion(samples, n, duration):
    u = np.linspace(0, 1, samples)
    if n == 6:
        wrist = np.deg2rad(34) * (0.5 - u) * 2
        swing = np.arctan2(np.sin(np.deg2rad(1.4)), -wrist)
        q = np.column_stack([np.deg2rad(-24 + 42 * u), np.deg2rad(62 - 6 * np.sin(np.pi * u)), np.deg2rad(-32 + 9 * np.sin(np.pi * u)),
                             swing - np.pi / 2, np.hypot(wrist, np.deg2rad(1.4)), -swing + np.deg2rad(60 * u)])
    else:
        q = np.column_stack([0.4 * np.sin(2 * np.pi * (u + k / n)) + 0.5 / (k + 1) for k in range(n)])
    return q, duration * u


def finding(kind, severity, time, distance, mask, score, value, limit, unit, joint, why):
    first, last = np.flatnonzero(mask)[[0, -1]]
    worst = first + int(np.nanargmax(score[first:last + 1]))
    return SimpleNamespace(kind=kind, severity=severity, joint=joint, t_start=time[first], t_end=time[last], worst_t=time[worst], value=value,
                           limit=limit, unit=unit, why=why, first=int(first), last=int(last), worst=int(worst),
                           from_mm=1e3 * distance[first], to_mm=1e3 * distance[last])


def fake_audit(samples=2000, n=6, duration=14.0, gap=True, seed=0, tight=False):
    """tight: the second joint comes close to the end of its travel, and the last but one has an acceleration limit that it passes."""
    q, time = motion(samples, n, duration)
    links = six_axis_links() if n == 6 else planar_links(n)
    tool = np.eye(4)
    tool[:3, 3] = 0.05, 0, 0.3
    placement = np.eye(4)
    placement[2, 3] = 0.3
    poses = placement @ frames(links, q) @ tool
    part = np.eye(4)
    part[:3, 3] = poses[samples // 2, :3, 3] + np.array([0.1, -0.2, -0.1])
    position = poses[:, :3, 3] - part[:3, 3]
    steps = np.linalg.norm(np.diff(position, axis=0), axis=1)
    distance = np.r_[0, np.cumsum(steps)]
    limit = np.deg2rad(np.resize(SPEED_DEG_S, n)) * (0.35 if n == 6 else 1)
    dt = np.gradient(time) if samples > 1 else np.ones(1)
    speed = np.gradient(q, axis=0) / dt[:, None]
    share = np.abs(speed) / limit
    share *= 1 + 0.02 * np.random.default_rng(seed).standard_normal(share.shape)
    bend = np.abs(np.gradient(speed, axis=0) / dt[:, None])
    lower, upper, acceleration = np.full(n, -np.pi), np.full(n, np.pi), np.full(n, np.nan)
    if tight:
        upper[1], acceleration[-2] = np.max(q[:, 1]) + np.deg2rad(2), 0.6 * np.max(bend[:, -2])
    room, bend = np.minimum(q - lower, upper - q), bend / acceleration
    tool_speed = np.gradient(distance) / dt
    sigma = np.linalg.svd(jacobian(links, q), compute_uv=False)[:, -1]
    reached = np.ones(samples, dtype=bool)
    if gap and samples > 100:
        reached[int(0.88 * samples):int(0.92 * samples)] = False
    closest = q.copy()
    for values in (q, share, sigma, bend, room):
        values[~reached] = np.nan
    worst = np.nanmax(np.where(np.isnan(share), -1, share), axis=1)
    worst[~reached] = np.nan
    names = tuple(f"j{k + 1}" for k in range(n))
    found = findings_of(time, distance, share, sigma, reached, names, np.rad2deg(limit))
    if tight:
        found = sorted([*found, *tight_findings(time, distance, room, bend, names)], key=lambda f: f.t_start)
    factor = np.minimum(1, 0.95 / np.where(np.isnan(worst), 0.1, np.maximum(worst, 0.1)))
    wide = int(0.05 * samples) + 1
    factor = np.array([factor[max(0, k - wide):k + wide].min() for k in range(samples)]) if samples <= 20000 else factor
    process = np.ones(samples, dtype=bool)
    process[:int(0.08 * samples)] = process[int(0.95 * samples):] = False
    thresholds = Thresholds()
    arm = SimpleNamespace(name="invented arm", joint_names=names, chain=SimpleNamespace(links=links, prismatic=np.zeros(n, dtype=bool)),
                          lower=lower, upper=upper, speed=limit, acceleration=acceleration,
                          effort=np.full(n, np.nan), n=n, prismatic=np.zeros(n, dtype=bool), reach=1.9)
    ends = np.array(links)
    ends[0], ends[-1] = np.linalg.inv(part) @ placement @ links[0], links[-1] @ tool
    cell = SimpleNamespace(chain=Chain(ends, np.zeros(n, dtype=np.uint8)), name="Bracket cell <7>", arm=arm, placement=placement, tool=tool, part=part, start=None, thresholds=thresholds, tolerances=Tolerances(),
                           file="cell.toml", sha256="a" * 64, sources=(("cell.toml", "a" * 64),), characteristic_length=0.95)
    path = SimpleNamespace(source_line=None, made=(), time=time, position=position, process=process, samples=samples, duration=float(time[-1] - time[0]),
                           distance=distance, length=float(distance[-1]), file="seam.csv", sha256="b" * 64, spin_free=False,
                           rotation=poses[:, :3, :3], label=("",) * samples, columns=(), cells=())
    retiming = SimpleNamespace(time=np.cumsum(np.r_[0, np.diff(time) / factor[1:]]), factor=factor, style="local", feasible=True,
                               why="Slows 130 mm of the path, down to 65 % of programmed at 7.00 s.", slowest=float(factor.min()),
                               duration=float(np.sum(np.diff(time) / factor[1:])), binding=("",) * samples,
                               least_duration=0.999 * float(np.sum(np.diff(time) / factor[1:])), gap=0.001001, certificate="No times take 0.1 % less.",
                               audit=lambda: fake_audit(samples, n, 1.3 * duration, gap, seed, tight))
    followed = SimpleNamespace(cell=cell, closest=closest, reached=reached, rows=6, joints=q)
    rates = SimpleNamespace(motion=followed, speed_share=share, acceleration_share=bend, travel_left=room, sigma_min=sigma, tool_speed=tool_speed, tool_speed_limit=tool_speed / worst, reserve=1 / worst)
    between = np.fmin(sigma[1:], sigma[:-1]) * np.where(reached[1:] & reached[:-1], 0.99, np.nan)
    proof = SimpleNamespace(motion="Between two samples the joints run smoothly.", known=np.isfinite(between), sigma_bound=between,
                            unproven=np.zeros(samples - 1, dtype=bool), stray_m=0.0 * between + 1e-6, stray_rad=0.0 * between + 1e-6)
    proof.whole = Proof.whole.fget(proof)
    return SimpleNamespace(proof=proof, path=path, cell=cell, time=time, joints=q, rates=rates, finding_list=tuple(found), suggestion=retiming,
                           motion=SimpleNamespace(reached=reached, reasons={}, start_reason="start_deg of the cell"),
                           verdict="fail" if any(f.severity == "fail" for f in found) else "warn" if found else "pass",
                           cautions=("This is not a risk assessment.",), not_judged=(("joint acceleration", "no limit is given"),))


def tight_findings(time, distance, room, bend, names):
    near, fast = room[:, 1] < np.deg2rad(5), np.nan_to_num(bend[:, -2]) > 1
    left, most = np.rad2deg(np.nanmin(room[:, 1])), 100 * np.nanmax(bend[:, -2])
    return [finding("joint travel", "warn", time, distance, near, -room[:, 1], left, 0.0, "deg", names[1],
                    f"Joint {names[1]} comes within {left:.1f} deg of the end of its travel."),
            finding("joint acceleration", "fail", time, distance, fast, bend[:, -2], most, 100.0, "%", names[-2],
                    f"Joint {names[-2]} must speed up or slow down at {most:.0f} % of its limit.")]


def findings_of(time, distance, share, sigma, reached, names, limit_deg):
    found = []
    for j, name in enumerate(names):
        for bound, severity in ((1.0, "fail"), (0.9, "warn")):
            mask = np.nan_to_num(share[:, j]) > bound
            if mask.any():
                peak = float(np.nanmax(share[:, j])) * limit_deg[j]
                found.append(finding("joint speed", severity, time, distance, mask, share[:, j], peak, limit_deg[j], "deg/s", name,
                                     f"Joint {name[1:]} must turn 96 degrees in 0.9 s because joints 4 and 6 are within 2.2 degrees of lining up while the tool tips over them."))
                break
    for bound, severity in ((0.02, "fail"), (0.06, "warn")):
        mask = np.nan_to_num(sigma, nan=1) < bound
        if mask.any():
            found.append(finding("near-singular", severity, time, distance, mask, -sigma, float(np.nanmin(sigma)), bound, "", None,
                                 "Joints 4 and 6 nearly line up, so the tool can hardly tip about the part's X axis here."))
            break
    if not reached.all():
        found.append(finding("unreachable", "fail", time, distance, ~reached, np.where(reached, 0.0, 1.0), 12.0, 0.0, "mm", None,
                             "The tool centre point is 12 mm too far away for the arm to reach."))
    return sorted(found, key=lambda f: f.t_start)
