"""An audit against an earlier report, as text, HTML lines and plain JSON values."""

from html import escape
from pathlib import PurePath

from ..against import path_words
from .noted import day, visible
from .scene import plain

_ORDER = ("new", "worse", "better", "gone")
_SAID = {"new": "New", "worse": "Worse", "better": "Better", "gone": "Gone"}


def compared_lines(found) -> list:
    """(words in front, sentence) of each line: the signature first, then inputs, path, verdict, findings; worst news first."""
    lines = [] if found.signature is None else [_signature(found)]
    if found.same:
        return [*lines, ("Unchanged", f"nothing differs from {PurePath(found.file).name}.")]
    lines += [("Given otherwise", f"{words}.") for words in found.inputs]
    if path_words(found):
        lines.append(("Path", f"{path_words(found)}."))
    if found.was != found.now:
        lines.append(("Verdict", f"was {found.was} and is {found.now}."))
    lines += [(_SAID[what], f"{change.words}.") for what in _ORDER for change in found.findings if change.what == what]
    kept = sum(change.what == "same" for change in found.findings)
    if kept:
        lines.append(("As before", f"{kept} finding{'s' * (kept > 1)}."))
    return lines


def compared_text(found) -> str:
    """The section for a terminal."""
    lines = [f"Against {PurePath(found.file).name}"]
    return "\n".join([*lines, *(f"      {visible(head)}: {visible(words)}" for head, words in compared_lines(found))])


def compared_html(found) -> str:
    """The same for a page or a notebook, a div for each line."""
    head = f"<div><b>Against {escape(PurePath(found.file).name)}</b></div>"
    return head + "".join(f"<div><b>{escape(visible(front))}</b> &nbsp; {escape(visible(words))}</div>" for front, words in compared_lines(found))


def compared_values(found) -> dict:
    """The same as plain values."""
    signature = found.signature
    return plain({
        "file": found.file, "verdict_before": found.was, "same": found.same, "worse": found.worse, "inputs": list(found.inputs),
        "path_moved_mm": found.moved_mm, "path_longer_mm": found.length_mm, "path_longer_s": found.duration_s,
        "findings": [{"change": change.what, "words": change.words} for change in found.findings],
        "signed": None if signature is None else {"by": signature.by, "on": signature.on, "remark": signature.remark, "holds": not found.void, "void": list(found.void)},
    })  # fmt: skip


def _signature(found):
    signature = found.signature
    who = f"by {signature.by}, {day(signature.on)}" + (f": {signature.remark}" if signature.remark else "")
    if not found.void:
        return "Signed", f"{who}. It holds: nothing that it covers has changed."
    more = f" (and {len(found.void) - 1} more)" if len(found.void) > 1 else ""
    return "VOID", f"signed {who}. It no longer holds: {found.void[0]}{more}."
