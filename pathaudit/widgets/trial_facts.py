"""What the instrument's panel for trying shows of a session, as plain JSON values."""

from ..changes import changes
from ..report.scene import plain
from ..retiming import slowed_stretches

MOST_OFFERS = 100  # stretches of a suggestion that can be taken over one by one; more only as a whole


def trial_facts(session):
    """Edits, stretches on offer, what became better and worse, variants; stretches as sample numbers."""
    undo, redo = session.steps
    retiming = session.shown.retiming
    return plain({
        "edits": [_edit(item) for item in session.edits.items], "offers": _offers(session), "undo": undo, "redo": redo, "busy": session.busy,
        "why": "" if retiming is None else retiming.why,
        "changes": [] if retiming is None else [{"what": c.what, "words": c.words} for c in changes(session.given, session.shown.audit)],
        "variants": [{"name": name, "shown": shown, **numbers} for name, shown, numbers in session.outlines()],
    })  # fmt: skip


def _edit(item):
    return {"kind": type(item).__name__.lower(), "first": item.first, "last": item.last, "percent": 100.0 * getattr(item, "factor", 1.0)}


def _offers(session):
    again, edits = session.given.suggestion, session.edits
    if not again.feasible:
        return []
    stretches = slowed_stretches(again.factor)[:MOST_OFFERS]
    return [{"first": a, "last": b, "slowest_percent": 100 * float(again.factor[a : b + 1].min()), "state": _state(edits, a, b)} for a, b in stretches]


def _state(edits, first, last):
    return "accepted" if edits.accepted(first, last) else "rejected" if edits.declined(first, last) else "open"
