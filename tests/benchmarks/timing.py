"""Medians of repeated runs, taken in turns so that a busy moment meets both sides of a comparison."""

from statistics import median
from time import perf_counter
from typing import NamedTuple


class Row(NamedTuple):
    """One line of the table: seconds of our own work (or another measure as text) and of the reference (None without one), and a note."""

    work: str
    own: float | str
    reference: float | None
    reach: str
    note: str = ""


def seconds(work, repeats=7) -> float:
    """Median over `repeats` runs of work(), after one that is not counted."""
    work()
    return median(_once(work) for _ in range(repeats))


def side_by_side(own, reference, rounds=3, own_repeats=5) -> tuple[float, float]:
    """Medians of own() and reference(), in turns."""
    own()
    taken = [(median(_once(own) for _ in range(own_repeats)), _once(reference)) for _ in range(rounds)]
    return median(t[0] for t in taken), median(t[1] for t in taken)


def _once(work):
    start = perf_counter()
    work()
    return perf_counter() - start


def spelled(value: float) -> str:
    for size, unit in ((1.0, "s"), (1e-3, "ms"), (1e-6, "us")):
        if value >= size:
            return f"{value / size:.3g} {unit}"
    return f"{value / 1e-9:.3g} ns"


def table(rows) -> str:
    """The rows as a Markdown table."""
    lines = ["| work | pathaudit | reference | ratio | reach | note |", "| --- | --- | --- | --- | --- | --- |"]
    for row in rows:
        reference = "-" if row.reference is None else spelled(row.reference)
        ratio = "-" if row.reference is None else f"{row.reference / row.own:,.0f}"
        own = row.own if isinstance(row.own, str) else spelled(row.own)
        lines.append(f"| {row.work} | {own} | {reference} | {ratio} | {row.reach} | {row.note} |")
    return "\n".join(lines)
