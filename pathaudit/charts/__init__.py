"""An audit as plotly figures to look at, restyle and save: pure functions, each gives a new, plain `plotly.graph_objects.Figure`.

Lengths in mm, angles in degrees, forces in N. The figures draw without a network connection; plotly is loaded when one is drawn.
Along the path, at most 5,000 samples are drawn, with every peak among them; where nothing was reached, lines have gaps.

>>> from pathaudit import charts
>>> figure = charts.reserve_along_path(audit, along="distance")  # doctest: +SKIP
>>> figure.show(config=charts.image_options(figure))  # doctest: +SKIP
>>> figure.write_html("reserve.html", config=charts.image_options(figure))  # doctest: +SKIP
"""

from .force import force_capacity
from .joints import joint_over_time
from .look import image_options
from .reserve import reserve_along_path
from .speeds import speeds_along_path
from .tolerances import bands_along_path, sensitivities
from .variants import variants_compared
from .velocity import velocity_capacity

__all__ = [
    "bands_along_path", "force_capacity", "image_options", "joint_over_time", "reserve_along_path", "sensitivities", "speeds_along_path", "variants_compared",
    "velocity_capacity",
]  # fmt: skip
