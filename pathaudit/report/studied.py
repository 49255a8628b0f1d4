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


def verdict_words(study) -> str:
    """As stated, and the chances of failing and of a warning"""
    line = f"as stated {study.verdict.upper()}"
    return f"{line}; {_percent(study.chance('fail'))} fail, {_percent(study.chance('warn'))} warn" if study.dimensions else line


def given_words(study) -> str:
    """What was drawn"""
    audit, stated = study.audit, len(study.dimensions)
    if stated:
        given = f"{study.draws:,} draws of {stated} dimension{'s' * (stated > 1)}, seed {study.seed}. In brackets: the 95 % interval."
    else:
        given = "Nothing is stated under [tolerance] in the cell, so there are no chances to tell: only how far off it may be."
    if audit.verdict != study.verdict:
        given += f" The audit of the cell as stated says {audit.verdict.upper()}, for what lies between the samples."
    return given


def _head(study):
    line = f"STUDY  {os.path.basename(study.audit.path.file)} in {study.audit.cell.name}: {verdict_words(study)}"
    return f"{line}\n{_indented(given_words(study))}"


def _percent(chance):
    return f"{_percents(chance.share)} % ({_percents(chance.low)} to {_percents(chance.high)} %)"


def _percents(share):
    return f"{100.0 * share:.2f}" if 0.0 < share < 0.1 else f"{100.0 * share:.1f}"


def chance_rows(study) -> list:
    """(severity, finding, chance, as stated, at the worst) of what is flagged in any draw"""
    rows = []
    for i, w in enumerate(study.watched):
        severity = next((name for name in ("fail", "warn") if study.chance_of(i, name).draws), None)
        if severity:
            worst = study.levels[study.worst_draw(i), i]
            rows.append((severity.upper(), study.name(i), _percent(study.chance_of(i, severity)), _level(w, study.nominal[i]), _level(w, worst)))
    return rows


def _chances(study):
    if not study.dimensions:
        return ""
    rows = [f"{severity:4s}  {name}: {chance}; as stated {stated}, at the worst {worst}" for severity, name, chance, stated, worst in chance_rows(study)]
    return "\n".join(["Chance of each finding", *map(_indented, rows or ["No draw is flagged."])])


def _level(w, level):
    return f"{significant(level * w.scale, 4)} {w.unit}".strip() if np.isfinite(level) else "not reached"


def sensitivity_rows(study) -> list:
    """(dimension, share of the variance, slope, stated) for the deciding finding, the most telling first"""
    w = study.watched[study.deciding]
    return [(s.dimension.name, f"{100 * s.share:.1f} %", f"{s.slope:+.3g} {w.unit} per {s.dimension.unit}".replace("  ", " "), s.dimension.words)
            for s in study.sensitivities() if s.share > 1e-6]  # fmt: skip


def sensitivity_head(study) -> str:
    return f"Measure better first, for {study.name(study.deciding)}, which is nearest to failing by how much it varies"


def sensitivity_check(study) -> str:
    """How far the slopes are to be believed"""
    i, w = study.deciding, study.watched[study.deciding]
    check = f"Standard deviation {_level(w, study.spread[i])} over the draws, {_level(w, study.first_order[i])} to first order."
    if study.straight[i] < STRAIGHT:
        check += f" The slopes explain only {100 * max(study.straight[i], 0.0):.0f} % of the variance: rely on the draws, not on this list."
    return check


def _first(study):
    rows = sensitivity_rows(study)
    if not rows:
        return ""
    names, slopes = (max(len(row[k]) for row in rows[:SHOWN]) for k in (0, 2))
    told = [f"{name:{names}}  {share:>7} of the variance   {slope:{slopes}}   stated {stated}" for name, share, slope, stated in rows[:SHOWN]]
    more = [f"and {len(rows) - SHOWN} more; all stand in the JSON"] if len(rows) > SHOWN else []
    return "\n".join([sensitivity_head(study), *(f"      {line}" for line in told + more), _indented(sensitivity_check(study))])


def reserve_head(study) -> str:
    until = {"pass": "before anything is flagged", "warn": "before it fails", "fail": "until it fails no more"}[study.verdict]
    return f"How far off one dimension alone may be {until}"


def reserve_rows(study) -> list:
    """(dimension, to one side, to the other)"""
    return [(r.dimension.name, _side(study, "-", r.minus, r.minus_by, r), _side(study, "+", r.plus, r.plus_by, r)) for r in study.reserves]


def _alone(study):
    rows = reserve_rows(study)
    width, low = (max(len(row[k]) for row in rows) for k in (0, 1))
    return "\n".join([reserve_head(study), *(f"      {name:{width}}   {minus:{low}}   {plus}" for name, minus, plus in rows)])


def _side(study, sign, value, by, reserve):
    if value is None:
        return f"no change to {sign}{_down(reserve.most)} {reserve.dimension.unit}"
    return f"{sign}{_down(value)} {reserve.dimension.unit}: {study.name(by)}"


def _down(value):
    """Three significant digits, never more than the value: what is said to be allowed is."""
    unit = 10.0 ** (np.floor(np.log10(value)) - 2) if value > 0.0 else 1.0
    return significant(np.floor(value / unit + 1e-9) * unit, 3)


def together_lines(study) -> list:
    """Sentences on several dimensions at once"""
    said = []
    if study.all_at_once:
        w = study.all_at_once
        said.append(f"All of them at once: {_down(w.size)} times what is stated, each to the side that does most harm to first order; then {study.name(w.by)} (audited in full: {w.audited.upper()}).")
    elif study.dimensions and study.verdict != "fail":
        said.append("All of them at once: no change up to 10 times what is stated, each to the side that does most harm to first order.")
    if study.worst:
        w = study.worst
        there = ", ".join(f"{d.name.removeprefix('part ')} {value:+.3g} {d.unit}" for d, value in zip(w.dimensions, w.values, strict=True))
        sizes = ", ".join(f"{d.size:g} {d.unit}" for d in w.dimensions)
        said.append(f"The worst direction of where the part stands: {there}; then {study.name(w.by)} (audited in full: {w.audited.upper()}). "
                    f"That is {_down(w.size)} times {sizes}, taken together as the root of the sum of squares.")  # fmt: skip
    return said


def _together(study):
    said = together_lines(study)
    return "\n".join(["Together", *map(_indented, said)]) if said else ""


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
