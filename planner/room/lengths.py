"""Lengths and areas as people write them: metres, centimetres, feet and inches."""

from __future__ import annotations

import re
from fractions import Fraction

from planner.errors import RoomError

METRES_PER: dict[str, float] = {
    "m": 1.0, "cm": 0.01, "mm": 0.001, "ft": 0.3048, "'": 0.3048, "in": 0.0254, '"': 0.0254,
}  # fmt: skip
"""Metres in each unit; foot and inch are the international ones, exact by definition. [m]"""

_QUOTES = str.maketrans({"′": "'", "’": "'", "‘": "'", "″": '"', "”": '"', "“": '"'})
_NUMBER = r"\d+(?:[.,]\d+)?(?:\s+\d+/\d+)?|\d+/\d+|[.,]\d+"
_METRIC = re.compile(rf"({_NUMBER})\s*(mm|cm|m)?")
_IMPERIAL = re.compile(
    rf"""(?:(?P<feet>{_NUMBER})\s*(?:ft|feet|foot|'))?\s*-?\s*
         (?:(?P<inches>{_NUMBER})\s*(?:in|inch|inches|"|''|(?=$)))?""",
    re.VERBOSE,
)


def parse_length(value: float | int | str, units: str = "m") -> float:
    r"""Length in metres from what a person wrote.

    Parameters
    ----------
    value
        A number in `units`, or text with its own unit: ``3.75``, ``"3,75 m"``, ``"375 cm"``,
        ``"12' 6 1/2\""``, ``"12ft6"``, ``"12 ft"``, ``"78 in"``.
    units
        ``"m"`` or ``"ft"``: the unit of bare numbers.

    Returns
    -------
    length
        [m]

    Raises
    ------
    RoomError
        Text that is no length.
    """
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise _not_a_length(value)
    if isinstance(value, int | float):
        return float(value) * METRES_PER[units]
    text = value.strip().lower().translate(_QUOTES)
    sign = -1.0 if text.startswith(("-", "−")) else 1.0
    text = text.lstrip("-−").strip()
    metric = _METRIC.fullmatch(text)
    if metric:
        return sign * _number(metric[1]) * METRES_PER[metric[2] or units]
    imperial = _IMPERIAL.fullmatch(text)
    if imperial and (imperial["feet"] or imperial["inches"]):
        feet = _number(imperial["feet"]) if imperial["feet"] else 0.0
        inches = _number(imperial["inches"]) if imperial["inches"] else 0.0
        return sign * (feet * METRES_PER["ft"] + inches * METRES_PER["in"])
    raise _not_a_length(value)


def _number(text: str) -> float:
    """Value of ``6``, ``6.5``, ``6,5``, ``1/2`` or ``6 1/2``."""
    total = 0.0
    for part in text.split():
        if "/" in part and part.endswith("/0"):
            raise _not_a_length(text)
        total += float(Fraction(part)) if "/" in part else float(part.replace(",", "."))
    return total


def _not_a_length(value: object) -> RoomError:
    return RoomError(
        f"{value!r} is not a length",
        cure="""Write a number in the file's units, or text such as "3.75 m", "375 cm" or "12' 6 1/2\\"".""",
    )


def feet_and_inches(length: float) -> str:
    """A length in metres as feet and inches to the nearest eighth: ``12' 6 1/2"``."""
    eighths = round(abs(length) / METRES_PER["in"] * 8)
    feet, rest = divmod(eighths, 96)
    inches, part = divmod(rest, 8)
    fraction = f" {Fraction(part, 8)}" if part else ""
    sign = "-" if length < 0 and eighths else ""
    return f"""{sign}{feet}' {inches}{fraction}\""""


def shown_length(length: float, units: str = "m") -> str:
    """A length for reading, with its unit: ``3.75 m`` or ``12' 3 5/8"``."""
    return feet_and_inches(length) if units == "ft" else f"{length:.2f} m"
