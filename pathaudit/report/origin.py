"""Where in the path's own file a finding lies, and how the path came about: in words and as JSON keys."""

import os


def lines(audit, finding) -> str:
    """'line 9' or 'lines 9 to 12'; '' where the path does not know its lines."""
    found = _lines(audit, finding)
    if found is None:
        return ""
    first, last, _ = found
    return f"line {first}" if first == last else f"lines {first} to {last}"


def sentence(audit, finding) -> str:
    """'Line 9 of seam.nc.' with the line of the worst sample where there are several; '' where the path does not know its lines."""
    words = lines(audit, finding)
    if not words:
        return ""
    first, last, worst = _lines(audit, finding)
    return f"{words.capitalize()} of {os.path.basename(audit.path.file)}" + (f", the worst in line {worst}." if first < last else ".")


def keys(audit, finding) -> dict:
    """line, line_start, line_end: of the worst sample and of the stretch; {} where the path does not know its lines."""
    found = _lines(audit, finding)
    return {} if found is None else dict(zip(("line_start", "line_end", "line"), found, strict=True))


def _lines(audit, finding):
    """The least and the largest line of the stretch, and that of its worst sample."""
    source = audit.path.source_line
    if source is None:
        return None
    stretch = source[finding.first : finding.last + 1]
    return int(stretch.min()), int(stretch.max()), int(source[finding.worst])
