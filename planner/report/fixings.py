"""How many fixings each panel needs, by its weight and what it is fixed into.

Rated loads are common practice without a source and stand on the list as assumptions: what counts
is the rating on the fixing's own package, for the wall that is really there.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from planner.report.quantities import Quantities

SAFETY_FACTOR = 4.0
"""Rated load over the load it carries. Common practice, no source. [-]"""
RATED_KG: dict[str, tuple[str, float]] = {
    "plasterboard": ("hollow-wall anchor in board", 5.0),
    "timber": ("wood screw into a stud or joist", 20.0),
    "masonry": ("plug and screw in masonry", 20.0),
    "concrete": ("plug and screw in concrete", 25.0),
    "unknown": ("any fixing, until the wall is known", 3.0),
}
"""Fixing and rated load by wall type. Common practice, no source. [kg]"""
BOARDED_CEILING = ("wood screw into a joist, not into the board", RATED_KG["timber"][1])
"""Nothing is hung overhead from a board alone. Common practice, no source."""
LEAST_WALL, LEAST_OVERHEAD = 2, 4
"""Fixings per panel that are never gone below."""


@dataclass(frozen=True, slots=True)
class FixingLine:
    """Fixings for the panels of one product on walls, or overhead."""

    product: str
    where: str
    """``wall`` or ``overhead``."""
    panels: int
    each: int
    """Fixings per panel."""
    kind: str
    retention: int
    """Second retentions, one per panel overhead."""
    note: str = ""

    @property
    def total(self) -> int:
        """Fixings in all, those of the second retention included."""
        return self.panels * self.each + self.retention


def fixings_per_panel(
    weight_kg: float | None, wall_type: str, *, overhead: bool, safety: float = SAFETY_FACTOR
) -> int:
    """ceil(weight · safety factor / rated load), at least two, at least four overhead.

    Parameters
    ----------
    weight_kg
        Of one panel; None where it is not known, then the least number is given. [kg]
    wall_type
        ``plasterboard``, ``timber``, ``masonry``, ``concrete`` or ``unknown``.
    overhead
        Does it hang from the ceiling.
    safety
        Rated load over load. [-]
    """
    least = LEAST_OVERHEAD if overhead else LEAST_WALL
    if weight_kg is None or not math.isfinite(weight_kg):
        return least
    rated = _fixing(wall_type, overhead)[1]
    return max(least, math.ceil(weight_kg * safety / rated - 1e-9))


def _fixing(wall_type: str, overhead: bool) -> tuple[str, float]:
    if overhead and wall_type == "plasterboard":
        return BOARDED_CEILING
    return RATED_KG.get(wall_type, RATED_KG["unknown"])


def fixing_line(
    product: str,
    panels: int,
    weight_kg: float | None,
    wall_type: str,
    *,
    overhead: bool,
    safety: float = SAFETY_FACTOR,
    show: Quantities | None = None,
) -> FixingLine:
    """The line of the list for so many panels of one weight."""
    kind, rated = _fixing(wall_type, overhead)
    note = f"assumed {(show or Quantities()).weight(rated)} rated each, safety factor {safety:g}"
    if weight_kg is None:
        note = "no weight is known: weigh a panel first"
    return FixingLine(
        product=product,
        where="overhead" if overhead else "wall",
        panels=panels,
        each=fixings_per_panel(weight_kg, wall_type, overhead=overhead, safety=safety),
        kind=kind,
        retention=panels if overhead else 0,
        note=note,
    )
