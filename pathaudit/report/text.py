"""An audit as a short plain text for a terminal."""

import os
import textwrap

import numpy as np

from . import noted, origin
from .compared import compared_text
from .scene import significant, worst_text

WIDTH = 110
SHARES = ("joint speed", "joint acceleration", "joint torque", "tool speed")
"""Kinds whose value is a share of their limit."""


def summary(audit, notes=(), compared=None) -> str:
    """Verdict, what changed since an earlier report, findings with where, how much and why, the suggested retiming, placed notes, what was not
    judged, cautions."""
    parts = [_head(audit), compared_text(compared) if compared else "", *(_finding(audit, finding) for finding in audit.finding_list)]
    parts += [_retiming(audit), between_text(audit), _made(audit), notes_text(notes, audit), _not_judged(audit), _cautions(audit)]
    return "\n\n".join(part for part in parts if part) + "\n"


def _head(audit):
    path, findings = audit.path, audit.finding_list
    fails = sum(finding.severity == "fail" for finding in findings)
    counts = f"{fails} fail, {len(findings) - fails} warn" if findings else "nothing flagged"
    line = f"{audit.verdict.upper()}  {os.path.basename(path.file)} in {audit.cell.name}: {counts}"
    given = f"{path.samples} samples, {path.duration:.2f} s, {1000 * path.length:.1f} mm. {audit.motion.start_reason}"
    return f"{line}\n{_indented(given)}"


def _finding(audit, finding):
    who = f"{finding.kind}, {finding.joint}" if finding.joint else finding.kind
    where = f"{finding.t_start:.3f} to {finding.t_end:.3f} s, {finding.from_mm:.1f} to {finding.to_mm:.1f} mm"
    return f"{finding.severity.upper():4s}  {who}: {where}: {_measure(finding)}\n{_indented(finding.why)}{_origin(audit, finding)}"


def _origin(audit, finding):
    words = origin.sentence(audit, finding)
    return f"\n{_indented(words)}" if words else ""


def _measure(finding):
    """The worst value, its limit, how much over, and when."""
    text = worst_text(finding)
    if finding.kind == "near-singular" or (finding.kind == "unproven" and finding.joint is None):
        text = f"sigma_min {text}"
    elif finding.kind == "unreachable":
        text = f"off the path by {significant(finding.value)} {finding.unit}"
    elif finding.kind in SHARES and finding.limit > 0:
        text += f", {_share(finding.value / finding.limit)}"
    return f"{text} at {finding.worst_t:.3f} s"


def _share(share):
    if share <= 1:
        return f"{significant(100 * share, 3)} % of the limit"
    return f"{significant(100 * (share - 1), 3)} % over" if share < 3 else f"{significant(share, 3)} times the limit"


def _retiming(audit):
    again, programmed = audit.suggestion, audit.path.duration
    if not again.feasible:
        return f"No retiming helps\n{_indented(again.why)}"
    if again.slowest == 1.0 and again.duration == programmed:
        return ""
    line = f"Suggested retiming ({again.style}): {again.duration:.3f} s in place of {programmed:.3f} s, at the slowest {100 * again.slowest:.3g} % of the programmed speed"
    return "\n".join([line, _indented(again.why), *([_indented(again.certificate)] if again.certificate else [])])


def notes_text(notes, audit=None) -> str:
    """Notes for a terminal; without an audit, where they were written."""
    if not notes:
        return ""
    return "\n".join([f"Notes: {noted.counted(notes)}", *("\n".join(_note(k, placed, audit)) for k, placed in enumerate(notes, 1))])


def _note(number, placed, audit):
    yield textwrap.fill(noted.head(number, placed, audit), WIDTH, subsequent_indent="      ")
    yield from map(_indented, noted.body(placed))


def _made(audit):
    return "\n".join(["How the path was made", *map(_indented, audit.path.made)]) if audit.path.made else ""


def between_text(audit) -> str:
    """What is certain between the samples."""
    proof = audit.proof
    if not proof.known.any():
        return ""
    clear, far, turned = proof.whole
    off = f"{significant(1000.0 * far, 2)} mm and {significant(np.degrees(turned), 2)} deg"
    certain = f"sigma_min stays above {significant(clear, 3)}; the tool is within {off} of the straight way from pose to pose."
    return f"Between the samples\n{_indented(f'For certain {certain} {proof.motion}')}"


def _not_judged(audit):
    return "\n".join(["Not judged", *(_indented(f"{rule}: {why}") for rule, why in audit.not_judged)]) if audit.not_judged else ""


def _cautions(audit):
    return "\n".join(["Cautions", *map(_indented, audit.cautions)])


def _indented(text):
    return textwrap.fill(text, WIDTH, initial_indent="      ", subsequent_indent="      ", break_long_words=False, break_on_hyphens=False)
