"""An audit as JSON and CSV text."""

import json
import math

import numpy as np

from .. import given
from ..arm import units_of
from ..converting import csv_text, texts
from ..earlier import FORMAT
from ..taskpath import TIME
from . import origin
from .compared import compared_values
from .noted import json_text, note_values
from .scene import plain


def check_json(audit, notes=(), compared=None) -> str:
    """The verdict, the findings, the suggested retiming, placed notes and what changed since an earlier report, as JSON."""
    return report_text(check_values(audit, notes, compared))


def report_text(values) -> str:
    """A report's values as JSON text; null where a number is not known or not finite."""
    return json_text(json.dumps(plain(values), indent=1, allow_nan=False, ensure_ascii=False)) + "\n"


def check_values(audit, notes=(), compared=None) -> dict:
    """What `check_json` writes."""
    path, cell, again = audit.path, audit.cell, audit.suggestion
    return {
        "format": FORMAT,
        "path": {
            "file": path.file, "sha256": path.sha256, "samples": path.samples, "duration_s": path.duration,
            "length_mm": 1000.0 * path.length, "samples_unreached": int((~audit.motion.reached).sum()),
            "made": list(path.made), "shape_mm": given.path_shape(path),
        },
        "cell": {
            "name": cell.name, "joints": list(cell.arm.joint_names), "characteristic_length_mm": 1000.0 * cell.characteristic_length,
            "sources": [{"file": file, "sha256": sha256} for file, sha256 in cell.sources], "start": audit.motion.start_reason,
            "given": given.cell_values(cell),
        },
        "verdict": audit.verdict,
        "findings": [_finding(audit, finding) for finding in audit.finding_list],
        "not_judged": [{"rule": rule, "why": why} for rule, why in audit.not_judged],
        "retiming": {
            "style": again.style, "duration_s": again.duration, "slowest_fraction_of_programmed_speed": again.slowest,
            "feasible": bool(again.feasible), "why": again.why,
            "least_duration_s": again.least_duration, "gap": again.gap, "certificate": again.certificate,
        },
        "proof": _proof(audit.proof),
        "notes": [note_values(k, placed, audit) for k, placed in enumerate(notes, 1)],
        **({} if compared is None else {"against": compared_values(compared)}),
        "cautions": list(audit.cautions),
    }  # fmt: skip


def _proof(proof):
    """What is certain between the samples, over the whole path; null where no motion leads from any sample to the next."""
    known, (above, off_line, off_turn) = proof.known, proof.whole
    return {
        "motion": proof.motion, "intervals": len(known), "intervals_without_motion": int((~known).sum()), "intervals_unproven": int(proof.unproven.sum()),
        "sigma_min_above": above, "off_line_mm_below": 1000.0 * off_line, "off_turn_deg_below": float(np.degrees(off_turn)),
    }  # fmt: skip


def _finding(audit, finding):
    return {
        "kind": finding.kind, "severity": finding.severity, "joint": finding.joint,
        "t_start_s": finding.t_start, "t_end_s": finding.t_end, "worst_t_s": finding.worst_t,
        "value": finding.value, "limit": finding.limit, "unit": finding.unit, "why": finding.why,
        "from_mm": finding.from_mm, "to_mm": finding.to_mm, **origin.keys(audit, finding),
    }  # fmt: skip


def joints_csv(audit) -> str:
    """One row a sample: t_s, each joint in deg or mm, each joint's speed, sigma_min, speed_use; empty where nothing was reached."""
    rates, arm = audit.rates, audit.cell.arm
    scale, units = units_of(arm)
    header = ["t_s", *(f"{name}_{unit}" for name, unit in zip(arm.joint_names, units))]
    header += [*(f"{name}_{unit}_s" for name, unit in zip(arm.joint_names, units)), "sigma_min", "speed_use"]
    measured = np.column_stack([audit.joints * scale, rates.joint_speed * scale, rates.sigma_min, rates.speed_share.max(axis=1)])
    return csv_text(header, [_spelled(audit.time), *(list(map(_digits, column)) for column in measured.T.tolist())])


def _digits(value):
    """12 significant digits: 1e-9 deg and better, far below what a joint can do."""
    return format(value, ".12g") if math.isfinite(value) else ""


def retimed_csv(retiming) -> str:
    """The path's own columns, in their order and units, with the retiming's times in place of the programmed ones."""
    path = retiming.rates.motion.path
    name = next(name for name in TIME if name in path.columns)
    per_second = 1000.0 if name == "t_ms" else 1.0
    columns = [_spelled(retiming.time * per_second) if column == name else texts(cells) for column, cells in zip(path.columns, path.cells)]
    return csv_text(path.columns, columns)


def _spelled(values):
    """Numbers as texts that are read as the same doubles."""
    return list(map(repr, values.tolist()))
