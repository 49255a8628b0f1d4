"""What the readers of untimed geometry share: lengths in the units of a file, and words about a tool axis that was asked for."""

from ..conventions import INCH, MM

UNIT_OF = {"mm": MM, "inch": INCH}
"""The units that may be asked for, in metres."""


def metres(value, unit):
    """The decimal number of a file in metres, rounded once for millimetres."""
    return value / 1000.0 if unit == MM else value * unit


def axis_asked(axis) -> str:
    """What a path says of a tool whose axis comes from the option, not from the file."""
    return f"The tool stands at i,j,k = {', '.join(f'{value:.6g}' for value in axis)} all along, as asked; the turn about it is free."
