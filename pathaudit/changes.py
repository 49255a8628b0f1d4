"""What became better and worse from one audit to another: findings matched by kind, joint and place, and a few numbers side by side."""

from dataclasses import dataclass

import numpy as np

from .findings import Finding

NOISE = 0.01  # a worst value that moved by less than this share of itself is the same
APART = 2.0  # mm along the path: findings nearer to each other than this are taken to be at one place


@dataclass(frozen=True)
class Change:
    """One finding before and after. what: "gone", "better", "same", "worse" or "new"; before is None for a new one, after for one that has gone."""

    what: str
    before: Finding | None
    after: Finding | None

    @property
    def words(self) -> str:
        """A short phrase, such as "joint speed, j4: 712 becomes 389 deg/s (limit 410)"."""
        now = self.after or self.before
        head = f"{now.kind}, {now.joint}" if now.joint else now.kind
        if self.what in ("gone", "new"):
            return f"{head} at {now.worst_t:.2f} s ({now.severity})"
        was, unit = self.before, f" {now.unit}" if now.unit else ""
        step = "" if was.severity == now.severity else f", {was.severity} becomes {now.severity}"
        return f"{head}: {was.value:.4g} becomes {now.value:.4g}{unit} (limit {now.limit:.4g}{step})"


def changes(before, after) -> tuple:
    """The Change of every finding of two audits of one path, in order of distance along it."""
    return matched(before.finding_list, after.finding_list)


def matched(before, after) -> tuple:
    """The Change of every Finding of two sequences, in order of distance along the path.

    Findings belong together where kind and joint are the same and their stretches, by distance along the path, come within APART of each other; the
    nearer pairs are matched first.
    """
    pairs = [(_gap(b, a), i, j) for i, b in enumerate(before) for j, a in enumerate(after) if (b.kind, b.joint) == (a.kind, a.joint)]
    left, right, found = set(range(len(before))), set(range(len(after))), []
    for gap, i, j in sorted(pairs):
        if gap <= APART and i in left and j in right:
            left.discard(i), right.discard(j)
            found.append(_change(before[i], after[j]))
    found += [Change("gone", before[i], None) for i in left] + [Change("new", None, after[j]) for j in right]
    return tuple(sorted(found, key=lambda c: ((c.after or c.before).from_mm, (c.after or c.before).kind, (c.after or c.before).joint or "")))


def outline(audit) -> dict:
    """What variants are compared by; NaN where nothing was reached."""
    rates, severities = audit.rates, [f.severity for f in audit.finding_list]
    with np.errstate(all="ignore"):
        return {
            "verdict": audit.verdict, "fail": severities.count("fail"), "warn": severities.count("warn"), "duration_s": audit.path.duration,
            "busiest_joint_percent": 100.0 * _most(rates.speed_share), "acceleration_percent": 100.0 * _most(rates.acceleration_share),
            "least_sigma_min": -_most(-rates.sigma_min), "least_reserve": -_most(-rates.reserve),
        }  # fmt: skip


def _change(before, after):
    rank = {"warn": 1, "fail": 2}
    step = rank[after.severity] - rank[before.severity]
    was, now = _strain(before), _strain(after)
    if step == 0 and abs(now - was) > NOISE * max(abs(was), 1e-9):
        step = 1 if now > was else -1
    return Change("worse" if step > 0 else "better" if step < 0 else "same", before, after)


def _strain(finding):
    """A number that grows as a finding gets worse."""
    if finding.kind == "near-singular":
        return finding.limit / max(finding.value, 1e-12)
    if finding.kind == "joint travel":
        return abs(finding.value - finding.limit) * (1.0 if finding.severity == "fail" else -1.0)
    return finding.value / finding.limit if finding.limit else finding.value


def _gap(a, b):
    return max(a.from_mm - b.to_mm, b.from_mm - a.to_mm, 0.0)


def _most(values):
    values = values[np.isfinite(values)]
    return float(values.max()) if values.size else float("nan")
