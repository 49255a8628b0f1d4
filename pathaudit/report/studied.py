"""A study under tolerances as text for a terminal and as JSON values; computes nothing."""

import os
import textwrap

import numpy as np

from ..spread.study import MEANING, VERDICTS
from .scene import significant

WIDTH = 110
FORMAT = "pathaudit.study/1"
SHOWN = 8  # dimensions in the text; all stand in the JSON
STRAIGHT = 0.9  # of a level's variance that its slopes have to explain to be believed alone


def study_text(study) -> str:
    """The chances, what to measure better first, how far off the cell may be, and what all this means."""
    parts = [_head(study), _chances(study), _first(study), _alone(study), _together(study), _meaning(study)]
    return "\n\n".join(part for part in parts if part) + "\n"


def _head(study):
    audit, stated = study.audit, len(study.dimensions)
    line = f"STUDY  {os.path.basename(audit.path.file)} in {audit.cell.name}: as stated {study.verdict.upper()}"
    if stated:
        line += f"; {_percent(study.chance('fail'))} fail, {_percent(study.chance('warn'))} warn"
        given = f"{study.draws:,} draws of {stated} dimension{'s' * (stated > 1)}, seed {study.seed}. In brackets: the 95 % interval."
    else:
        given = "Nothing is stated under [tolerance] in the cell, so there are no chances to tell: only how far off it may be."
    if audit.verdict != study.verdict:
        given += f" The audit of the cell as stated says {audit.verdict.upper()}, for what lies between the samples."
    return f"{line}\n{_indented(given)}"


def _percent(chance):
    return f"{_percents(chance.share)} % ({_percents(chance.low)} to {_percents(chance.high)} %)"


def _percents(share):
    return f"{100.0 * share:.2f}" if 0.0 < share < 0.1 else f"{100.0 * share:.1f}"


def _chances(study):
    if not study.dimensions:
        return ""
    rows = []
    for i, w in enumerate(study.watched):
        for severity in ("fail", "warn"):
            chance = study.chance_of(i, severity)
            if chance.draws:
                rows.append(f"{severity.upper():4s}  {study.name(i)}: {_percent(chance)}; as stated {_level(w, study.nominal[i])}, at the worst {_level(w, study.levels[study.worst_draw(i), i])}")
                break
    return "\n".join(["Chance of each finding", *map(_indented, rows or ["No draw is flagged."])])


def _level(w, level):
    return f"{significant(level * w.scale, 4)} {w.unit}".strip() if np.isfinite(level) else "not reached"


def _first(study):
    """What to measure better first."""
    rows = [s for s in study.sensitivities() if s.share > 0.0]
    if not rows:
        return ""
    i, w = study.deciding, study.watched[study.deciding]
    width = max(len(s.dimension.name) for s in rows[:SHOWN])
    told = [f"{s.dimension.name:{width}}  {100 * s.share:5.1f} % of the variance  {s.slope:+9.3g} {_per(w, s.dimension)}  stated {s.dimension.words}" for s in rows[:SHOWN]]
    more = [f"and {len(rows) - SHOWN} more, together {100 * sum(s.share for s in rows[SHOWN:]):.1f} %"] if len(rows) > SHOWN else []
    check = f"Standard deviation {_level(w, study.spread[i])} over the draws, {_level(w, study.first_order[i])} to first order."
    if study.straight[i] < STRAIGHT:
        check += f" The slopes explain only {100 * max(study.straight[i], 0.0):.0f} % of the variance: rely on the draws, not on this list."
    head = f"Measure better first, for {study.name(i)}, which is nearest to failing by how much it varies"
    return "\n".join([head, *(f"      {line}" for line in told + more), _indented(check)])


def _per(w, dimension):
    return f"{w.unit} per {dimension.unit}".strip()


def _alone(study):
    if not study.reserves:
        return ""
    width, rows = max(len(r.dimension.name) for r in study.reserves), []
    for r in study.reserves:
        low, high = _side(study, "-", r.minus, r.minus_by, r), _side(study, "+", r.plus, r.plus_by, r)
        rows.append(f"      {r.dimension.name:{width}}  {low:38}  {high}".rstrip())
    head = {"pass": "before anything is flagged", "warn": "before it fails", "fail": "until it fails no more"}[study.verdict]
    return "\n".join([f"How far off one dimension alone may be {head}", *rows])


def _side(study, sign, value, by, reserve):
    if value is None:
        return f"no change to {sign}{_down(reserve.most)} {reserve.dimension.unit}"
    return f"{sign}{_down(value)} {reserve.dimension.unit}: {study.name(by)}"


def _down(value):
    """Three significant digits, never more than the value: what is said to be allowed is."""
    unit = 10.0 ** (np.floor(np.log10(value)) - 2) if value > 0.0 else 1.0
    return significant(np.floor(value / unit + 1e-9) * unit, 3)


def _together(study):
    said = []
    if study.all_at_once:
        w = study.all_at_once
        said.append(f"All of them at once: {_down(w.size)} times what is stated, each to the side that does most harm to first order; then {study.name(w.by)} (audited in full: {w.audited.upper()}).")
    elif study.dimensions and study.verdict != "fail":
        said.append("All of them at once: no change up to 10 times what is stated, each to the side that does most harm to first order.")
    if study.worst:
        w = study.worst
        there = ", ".join(f"{d.name.removeprefix('part ')} {value:+.3g} {d.unit}" for d, value in zip(w.dimensions, w.values, strict=True))
        said.append(f"The worst direction of where the part stands: {there}; then {study.name(w.by)} (audited in full: {w.audited.upper()}). {_sizes(w)}")
    return "\n".join(["Together", *map(_indented, said)]) if said else ""


def _sizes(w):
    sizes = ", ".join(f"{d.size:g} {d.unit}" for d in w.dimensions)
    return f"That is {_down(w.size)} times {sizes}, taken together as the root of the sum of squares."


def _meaning(study):
    return "\n".join(["What this means", *map(_indented, MEANING), "", "Cautions", *map(_indented, study.audit.cautions)])


def _indented(text):
    return textwrap.fill(text, WIDTH, initial_indent="      ", subsequent_indent="      ", break_long_words=False, break_on_hyphens=False)


def study_values(study) -> dict:
    """The study as values for JSON. Lengths in mm, angles in degrees, shares of limits in percent; a draw's number counts from 0."""
    path, cell = study.audit.path, study.audit.cell
    return {
        "format": FORMAT,
        "path": {"file": path.file, "sha256": path.sha256, "samples": path.samples},
        "cell": {"name": cell.name, "sources": [{"file": file, "sha256": sha256} for file, sha256 in cell.sources]},
        "draws": study.draws, "seed": study.seed, "confidence": 0.95,
        "verdict": study.verdict, "verdict_of_audit": study.audit.verdict,
        "chances": {verdict: _chance_values(study.chance(verdict)) for verdict in VERDICTS},
        "dimensions": [{"name": d.name, "key": d.key, "unit": d.unit, "size": d.size, "law": "normal" if d.normal else "uniform"} for d in study.dimensions],
        "findings": [_finding_values(study, i) for i in range(len(study.watched))],
        "deciding": study.name(study.deciding),
        "reserves": [_reserve_values(study, r) for r in study.reserves],
        "all_at_once": _worst_values(study, study.all_at_once), "worst_direction_of_part": _worst_values(study, study.worst),
        "bands": _band_values(study),
        "meaning": list(MEANING), "cautions": list(study.audit.cautions),
    }  # fmt: skip


def _chance_values(chance):
    return {"share": chance.share, "low": chance.low, "high": chance.high, "draws": chance.draws}


def _finding_values(study, i):
    w, k = study.watched[i], study.worst_draw(i)
    return {
        "kind": w.kind, "joint": None if w.joint is None else study.audit.cell.arm.joint_names[w.joint], "unit": w.unit,
        "fail": _chance_values(study.chance_of(i, "fail")), "warn_or_fail": _chance_values(study.chance_of(i, "warn")),
        "as_stated": float(study.nominal[i] * w.scale), "worst": float(study.levels[k, i] * w.scale), "worst_draw": k,
        "worst_off": {d.name: float(value) for d, value in zip(study.dimensions, study.values[k], strict=True)},
        "deviation": float(study.spread[i] * w.scale), "deviation_first_order": float(study.first_order[i] * w.scale),
        "variance_explained_by_slopes": float(study.straight[i]),
        "sensitivities": [{"name": s.dimension.name, "slope": s.slope, "per": s.dimension.unit, "share_of_variance": s.share} for s in study.sensitivities(i)],
    }  # fmt: skip


def _reserve_values(study, r):
    by = [None if i is None else study.name(i) for i in (r.minus_by, r.plus_by)]
    return {"name": r.dimension.name, "unit": r.dimension.unit, "minus": r.minus, "minus_by": by[0], "plus": r.plus, "plus_by": by[1], "looked_to": r.most}


def _worst_values(study, w):
    if w is None:
        return None
    off = {d.name: {"value": float(value), "unit": d.unit, "size": d.size} for d, value in zip(w.dimensions, w.values, strict=True)}
    return {"times": w.size, "by": study.name(w.by), "verdict_audited_in_full": w.audited, "off": off}


def _band_values(study):
    bands = study.bands
    rows = {f"{name}_{level}": row for name, rows in (("sigma_min", bands.sigma_min), ("busiest_joint_percent", 100.0 * bands.busiest))
            for level, row in zip(("5", "50", "95"), rows, strict=True)}  # fmt: skip
    return {"sample": bands.sample.tolist(), **{name: [float(f"{value:.6g}") for value in row] for name, row in rows.items()}}
