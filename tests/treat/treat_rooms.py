"""Rooms and products that the tests of treatments are made with."""

from __future__ import annotations

import numpy as np

from planner.absorption.library import Coefficients
from planner.predict.targets import own_limits
from planner.room.surfaces import Part, RoomSurfaces
from planner.treat.catalogue import Product

BANDS = 8
HZ = (63, 125, 250, 500, 1000, 2000, 4000, 8000)
NORMALS = {
    "floor": (0.0, 0.0, 1.0), "ceiling": (0.0, 0.0, -1.0), "front": (1.0, 0.0, 0.0),
    "back": (-1.0, 0.0, 0.0), "left": (0.0, 1.0, 0.0), "right": (0.0, -1.0, 0.0),
}  # fmt: skip


def coefficients(alpha, u=0.05):
    alpha = np.asarray(alpha, float)
    return Coefficients(alpha, np.full(BANDS, u), np.zeros(BANDS, bool))


def make_room(areas: dict[str, float], alpha: dict[str, np.ndarray], volume: float) -> RoomSurfaces:
    names = list(areas)
    return RoomSurfaces(
        volume=volume,
        surface_area=sum(areas.values()),
        parts=tuple(Part(n, n, f"material of {n}", "base", NORMALS[n]) for n in names),
        area=np.array([areas[n] for n in names]),
        alpha=np.array([alpha[n] for n in names]),
        u=np.full((len(names), BANDS), 0.02),
        assumed=np.zeros((len(names), BANDS), bool),
        dimensions=(5.0, 4.0, 2.5),
    )


def box(length=5.0, width=4.0, height=2.5, alpha=0.08) -> RoomSurfaces:
    areas = {
        "floor": length * width, "ceiling": length * width, "front": width * height,
        "back": width * height, "left": length * height, "right": length * height,
    }  # fmt: skip
    return make_room(areas, {n: np.full(BANDS, alpha) for n in areas}, length * width * height)


def panel(name="panel", alpha=0.9, *, price=40.0, pack=1, width=1.0, height=0.6, **more) -> Product:
    values = {
        "description": f"a {name}", "unit": "piece", "thickness_mm": 50.0, "gap_mm": 0.0,
        "mounting": "direct", "surfaces": ("wall", "ceiling"), "currency": "EUR",
        "weight_kg": 4.0, "fire_class_declared": "",
    }  # fmt: skip
    values |= more
    return Product(
        id=name, width=width, height=height, pack=float(pack), price_per_pack=price,
        coefficients=coefficients(np.broadcast_to(alpha, (BANDS,)).copy()), **values,
    )  # fmt: skip


def target(low, high):
    """The same limits in every band, or one per band."""
    lows, highs = np.broadcast_to(low, BANDS), np.broadcast_to(high, BANDS)
    return own_limits(
        {hz: float(v) for hz, v in zip(HZ, lows, strict=True) if np.isfinite(v)},
        {hz: float(v) for hz, v in zip(HZ, highs, strict=True) if np.isfinite(v)},
    )
