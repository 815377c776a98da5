"""First reflections between a loudspeaker and a seat, by image sources up to second order.

Surfaces are flat and reflect as mirrors. An image counts only where it can be seen: every touch
point must lie on its surface and nothing may stand in between, which matters in rooms that are no
convex polygon.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise, product

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.bands import OCTAVES
from planner.room.geometry import Frame

Array = NDArray[np.float64]

HEAD = 0.3
"""How far a head moves either way from the seat (common practice, no source). [m]"""

EARLY_S = 0.015
"""Reflections within this after the direct sound are to be weak: ITU-R BS.1116, from memory. [s]"""

WEAK_DB = -10.0
"""Against the direct sound, 1 to 8 kHz: ITU-R BS.1116, from memory. [dB]"""

JUDGED = np.array([1000 <= hz <= 8000 for hz in OCTAVES])
"""Octaves that the rule looks at."""

_TINY = 1e-9


@dataclass(frozen=True, slots=True)
class Reflection:
    """One way from a source by one or two surfaces to a receiver."""

    surfaces: tuple[str, ...]
    """In the order in which the sound meets them."""
    image: Array
    """Position of the image source. [m]"""
    points: Array
    """Where it touches each surface, shape ``(order, 3)``. [m]"""
    delay: float
    """After the direct sound. [s]"""
    distance: float
    """Of the whole way. [m]"""
    level_db: Array
    """Against the direct sound after distance and coefficients, shape ``(band,)``. [dB]"""
    direction: Array
    """Unit vector from the receiver to where it comes from."""

    @property
    def order(self) -> int:
        """Number of surfaces."""
        return len(self.surfaces)

    @property
    def judged_db(self) -> float:
        """Mean level over 1 to 8 kHz, of energies. [dB]."""
        return float(10.0 * np.log10(np.mean(10.0 ** (self.level_db[JUDGED] / 10.0))))

    @property
    def is_early_and_strong(self) -> bool:
        """Breaks the rule: within 15 ms and less than 10 dB down."""
        return self.delay <= EARLY_S and self.judged_db > WEAK_DB


@dataclass(frozen=True, slots=True)
class Area:
    """The rectangle of a surface that serves a seat."""

    surface: str
    left: float
    """[m]"""
    bottom: float
    """[m]"""
    width: float
    """[m]"""
    height: float
    """[m]"""


def mirrored(point: ArrayLike, frame: Frame) -> Array:
    """Mirror image of points ``(..., 3)`` behind a surface. [m]."""
    p = np.asarray(point, float)
    distance = (p - frame.origin) @ frame.normal
    image: Array = p - 2.0 * distance[..., None] * frame.normal
    return image


def touch_point(start: Array, end: Array, frame: Frame) -> Array | None:
    """Where the straight line from `start` to `end` passes through a surface, or None. [m]."""
    before = float((start - frame.origin) @ frame.normal)
    after = float((end - frame.origin) @ frame.normal)
    if before * after > 0 or abs(before - after) < _TINY:
        return None
    point: Array = start + before / (before - after) * (end - start)
    return point if _inside(frame.to_surface(point), frame.outline) else None


def _inside(point: Array, outline: Array) -> bool:
    """Is a point ``(u, v)`` inside a polygon (even-odd rule); its edge counts as inside."""
    x, y = point
    start, end = outline, np.roll(outline, -1, axis=0)
    edge = end - start
    length = np.hypot(*edge.T)
    offset = point - start
    along = (offset * edge).sum(axis=1) / length
    beside = np.abs(offset[:, 0] * edge[:, 1] - offset[:, 1] * edge[:, 0]) / length
    if np.any((beside < 1e-7) & (along > -1e-7) & (along < length + 1e-7)):
        return True
    crosses = (start[:, 1] > y) != (end[:, 1] > y)
    with np.errstate(divide="ignore", invalid="ignore"):
        at = start[:, 0] + (y - start[:, 1]) / (end[:, 1] - start[:, 1]) * edge[:, 0]
    return bool(np.count_nonzero(crosses & (x < at)) % 2)


def _blocked(start: Array, end: Array, frames: Mapping[str, Frame], but: Sequence[str]) -> bool:
    """Does a surface stand between two points; those the path touches do not count."""
    return any(
        touch_point(start, end, frame) is not None
        for name, frame in frames.items()
        if name not in but
    )


def reflections(
    frames: Mapping[str, Frame],
    source: ArrayLike,
    receiver: ArrayLike,
    alpha: Mapping[str, Array],
    *,
    order: int = 2,
    speed_of_sound: float = 343.0,
) -> list[Reflection]:
    """Every reflection that can be seen, up to second order, earliest first.

    Parameters
    ----------
    frames
        Surfaces of the room by name, facing into it.
    source, receiver
        Inside the room, not on a surface. [m]
    alpha
        Coefficient of each surface, shape ``(band,)``; above 0.99 it counts as 0.99. [-]
    order
        1 or 2. [-]
    speed_of_sound
        [m/s]

    Returns
    -------
    reflections
        Levels are after spreading (20 lg of the distances) and 10 lg(1 − α) per surface.
    """
    begin, end = np.asarray(source, float), np.asarray(receiver, float)
    direct = float(np.linalg.norm(end - begin))
    found: list[Reflection] = []
    names = list(frames)
    chains: list[tuple[str, ...]] = [(name,) for name in names]
    if order > 1:
        chains += [pair for pair in product(names, names) if pair[0] != pair[1]]
    for chain in chains:
        path = _path(frames, chain, begin, end)
        if path is None:
            continue
        image, points = path
        distance = float(np.linalg.norm(end - image))
        taken = sum(
            10.0 * np.log10(1.0 - np.clip(np.asarray(alpha[name], float), 0.0, 0.99))
            for name in chain
        )
        found.append(
            Reflection(
                surfaces=chain,
                image=image,
                points=points,
                delay=(distance - direct) / speed_of_sound,
                distance=distance,
                level_db=20.0 * np.log10(direct / distance) + taken,
                direction=(image - end) / distance,
            )
        )
    return sorted(found, key=lambda one: one.delay)


def _path(
    frames: Mapping[str, Frame], chain: tuple[str, ...], source: Array, receiver: Array
) -> tuple[Array, Array] | None:
    """Image and touch points of a chain of surfaces, or None where it cannot be seen."""
    images = [source]
    for name in chain:
        frame = frames[name]
        if float((images[-1] - frame.origin) @ frame.normal) <= _TINY:
            return None  # behind the surface there is nothing to reflect
        images.append(mirrored(images[-1], frame))
    points: list[Array] = []
    towards = receiver
    for name, image in zip(reversed(chain), reversed(images[1:]), strict=True):
        point = touch_point(image, towards, frames[name])
        if point is None:
            return None
        points.insert(0, point)
        towards = point
    stops = [source, *points, receiver]
    for n, (start, end) in enumerate(pairwise(stops)):
        touched = [chain[k] for k in (n - 1, n) if 0 <= k < len(chain)]
        if _blocked(start, end, frames, touched):
            return None
    return images[-1], np.array(points)


def serving_area(
    frame: Frame, source: ArrayLike, receiver: ArrayLike, *, head: float = HEAD
) -> Area | None:
    """The rectangle of a surface that reflects a source to a seat wherever the head moves.

    Parameters
    ----------
    frame
        The surface.
    source, receiver
        [m]
    head
        How far the head moves either way along each axis. [m]

    Returns
    -------
    area
        Clipped to the surface's bounding box; None where nothing of it is left.
    """
    image = mirrored(np.asarray(source, float), frame)
    corners = np.asarray(receiver, float) + head * np.array(list(product((-1, 1), repeat=3)))
    before = (image - frame.origin) @ frame.normal
    after = (corners - frame.origin) @ frame.normal
    seen = after > _TINY
    if before >= 0 or not seen.any():
        return None
    share = (before / (before - after[seen]))[:, None]
    touched = frame.to_surface(image + share * (corners[seen] - image))
    low = np.clip(touched.min(axis=0), 0.0, [frame.width, frame.height])
    high = np.clip(touched.max(axis=0), 0.0, [frame.width, frame.height])
    if np.any(high - low < 0.01):
        return None
    return Area(frame.name, *low.tolist(), *(high - low).tolist())
