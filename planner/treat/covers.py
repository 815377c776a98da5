"""Rectangles that must be covered, such as first reflections, and what covers them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from planner.bands import OCTAVES
from planner.treat.catalogue import Product

REFLECTION_ALPHA = 0.5
"""Least coefficient, mean of 1 to 4 kHz, over a first reflection (a judgement, no source). [-]"""

_MIDDLE_HIGH = np.array([1000 <= hz <= 4000 for hz in OCTAVES])


@dataclass(frozen=True, slots=True)
class Cover:
    """A rectangle of a surface that must be covered, such as a first reflection."""

    surface: str
    left: float
    """[m]"""
    bottom: float
    """[m]"""
    width: float
    """[m]"""
    height: float
    """[m]"""


def merged(covers: Sequence[Cover]) -> list[Cover]:
    """Rectangles with those that overlap on one surface joined into their common frame."""
    rest = list(covers)
    found: list[Cover] = []
    while rest:
        one = rest.pop(0)
        other = next((c for c in rest if _overlap(one, c)), None)
        if other is None:
            found.append(one)
            continue
        rest.remove(other)
        left, bottom = min(one.left, other.left), min(one.bottom, other.bottom)
        right = max(one.left + one.width, other.left + other.width)
        top = max(one.bottom + one.height, other.bottom + other.height)
        rest.insert(0, Cover(one.surface, left, bottom, right - left, top - bottom))
    return found


def _overlap(one: Cover, other: Cover) -> bool:
    return (
        one.surface == other.surface
        and one.left < other.left + other.width
        and other.left < one.left + one.width
        and one.bottom < other.bottom + other.height
        and other.bottom < one.bottom + one.height
    )


def pieces_to_cover(product: Product, cover: Cover) -> float:
    """Pieces of one product (or square metres) that cover a rectangle, laid either way round."""
    if product.unit == "m2":
        return cover.width * cover.height
    assert product.width is not None
    assert product.height is not None
    ways = [
        np.ceil(cover.width / across - 1e-9) * np.ceil(cover.height / up - 1e-9)
        for across, up in ((product.width, product.height), (product.height, product.width))
    ]
    return float(min(ways))


def absorbs_reflections(product: Product) -> bool:
    """Takes enough of a first reflection to be counted as covering it."""
    return (
        product.unit != "item"
        and float(np.mean(product.coefficients.alpha[_MIDDLE_HIGH])) >= REFLECTION_ALPHA
    )
