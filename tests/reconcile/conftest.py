"""Rooms made up from known "true" coefficients, with formulas of their own.

Nothing here calls the planner's physics: the tests compare it with what is simulated here.
"""

from dataclasses import dataclass
from types import SimpleNamespace

import numpy as np
import pytest

from planner.absorption.library import Coefficients
from planner.room.surfaces import Part, RoomSurfaces

HZ = np.array([63.0, 125, 250, 500, 1000, 2000, 4000, 8000])

# Invented, of the size that textbooks print for such things.
FLOORS = {
    "boards": [0.14, 0.15, 0.11, 0.10, 0.07, 0.06, 0.07, 0.07],
    "carpet": [0.03, 0.05, 0.10, 0.22, 0.37, 0.50, 0.58, 0.60],
    "screed": [0.01, 0.01, 0.02, 0.02, 0.02, 0.03, 0.03, 0.04],
}
CEILINGS = {
    "plasterboard": [0.25, 0.28, 0.14, 0.09, 0.06, 0.05, 0.06, 0.06],
    "slab": [0.01, 0.01, 0.01, 0.02, 0.02, 0.02, 0.03, 0.03],
    "planks": [0.12, 0.18, 0.14, 0.10, 0.09, 0.08, 0.08, 0.08],
}
WALLS = {
    "studs": [0.27, 0.26, 0.10, 0.06, 0.05, 0.06, 0.07, 0.07],
    "brick": [0.02, 0.02, 0.03, 0.03, 0.04, 0.05, 0.06, 0.07],
    "panelling": [0.20, 0.30, 0.20, 0.15, 0.10, 0.09, 0.09, 0.09],
}
DOOR = [0.14, 0.14, 0.10, 0.08, 0.06, 0.06, 0.06, 0.06]
GLASS = [0.30, 0.30, 0.20, 0.15, 0.10, 0.07, 0.05, 0.04]
PERSON = [0.15, 0.23, 0.37, 0.44, 0.45, 0.45, 0.45, 0.45]
PANELS = {
    "thin": [0.05, 0.12, 0.40, 0.75, 0.90, 0.92, 0.90, 0.88],
    "thick": [0.25, 0.50, 0.85, 0.98, 0.95, 0.92, 0.90, 0.88],
    "trap": [0.45, 0.70, 0.50, 0.30, 0.20, 0.12, 0.10, 0.10],
}
# At 20 °C and 50 %, rounded from ISO 9613-1.
AIR_M = np.array([3e-5, 1e-4, 3e-4, 6e-4, 1.1e-3, 2.3e-3, 6.8e-3, 2.4e-2])
SPEED = 343.2


def eyring(volume, surface, area, m=AIR_M):
    """T = 24 ln(10) V / (c (−S ln(1 − A/S) + 4 m V)), written out here once more."""
    return (
        24
        * np.log(10)
        * volume
        / (SPEED * (-surface * np.log(1 - area / surface) + 4 * m * volume))
    )


def book_u(alpha):
    """Spread of nominally equal finishes: a quarter of the value, and 0.015."""
    return np.sqrt((0.25 * np.asarray(alpha)) ** 2 + 0.015**2)


def product_u(alpha):
    """Spread of one tested product: 6 % of the value, and 0.02."""
    return np.sqrt((0.06 * np.asarray(alpha)) ** 2 + 0.02**2)


def truth(random, value, u, top=1.3):
    """A true curve: smooth over neighbouring bands, never below 0 nor above `top`."""
    rho = random.uniform(0.4, 0.8)
    out = np.empty(8)
    step = 0.0
    for band in range(8):
        for _ in range(1000):
            fresh = random.standard_normal()
            new = fresh if band == 0 else rho * step + np.sqrt(1 - rho**2) * fresh
            if 0 <= value[band] + u[band] * new <= top:
                break
        step = new
        out[band] = value[band] + u[band] * new
    return out


@dataclass
class Simulated:
    """One room: as described, its truth, and a measurement of it."""

    surfaces: RoomSurfaces
    treated: RoomSurfaces
    truth: dict
    t_true: np.ndarray
    t_treated: np.ndarray
    measured: SimpleNamespace
    measured_treated: SimpleNamespace
    panels: list

    def formula(self, area):
        return eyring(self.surfaces.volume, self.surfaces.surface_area, area)

    def treat(self, surfaces):
        """Any description of this room with its panels in place."""
        for place, name, alpha, area in self.panels:
            values = Coefficients(alpha, product_u(alpha), np.zeros(8, bool))
            surfaces = surfaces.covered(place, f"{name} on {place}", name, area, values)
        return surfaces


def simulated_room(seed):
    random = np.random.default_rng(seed)
    length, width, height = random.uniform(3, 8), random.uniform(2.5, 6), random.uniform(2.3, 3.3)
    volume = length * width * height
    surface = 2 * (length * width + length * height + width * height)
    chosen = {}
    for place, table in (("floor", FLOORS), ("ceiling", CEILINGS), ("walls", WALLS)):
        name = random.choice(list(table))
        chosen[place] = (name, np.array(table[name]))
    walls = 2 * height * (length + width)
    door, glass = 1.8, random.uniform(0.0, 3.0)
    rows = [
        ("floor", *chosen["floor"], length * width),
        ("ceiling", *chosen["ceiling"], length * width),
        ("front", *chosen["walls"], walls - door - glass),
        ("front", "door", np.array(DOOR), door),
        ("front", "glass", np.array(GLASS), glass),
    ]
    persons = int(random.integers(0, 4))
    surfaces = described(rows, volume, surface, (length, width, height), persons)
    true = {name: truth(random, alpha, book_u(alpha)) for _, name, alpha, _ in rows}
    true["person"] = truth(random, np.array(PERSON), 0.1 * np.array(PERSON), top=9)

    panels = []
    hidden = {"ceiling": 0.0, "front": 0.0}
    for name, share, place in (
        (random.choice(["thin", "thick"]), random.uniform(0.1, 0.35), "ceiling"),
        (random.choice(["thin", "thick"]), random.uniform(0.05, 0.2), "front"),
        ("trap", random.uniform(0.02, 0.1), "front"),
    ):
        alpha = np.array(PANELS[name])
        area = share * (length * width if place == "ceiling" else walls - door - glass)
        hidden[place] += area
        panels.append((place, name, alpha, area))
        true.setdefault(name, truth(random, alpha, product_u(alpha)))
    bare = [
        (on, name, alpha, area - (hidden.get(on, 0.0) if number in (1, 2) else 0.0))
        for number, (on, name, alpha, area) in enumerate(rows)
    ]
    treated = described(
        [*bare, *panels], volume, surface, (length, width, height), persons, first_panel=len(bare)
    )

    def time(room):
        area = sum(
            a * np.minimum(true[p.material], 0.99)
            for p, a in zip(room.parts, room.area, strict=True)
        )
        area = area + sum(room.item_count) * true["person"] if room.items else area
        return eyring(volume, surface, area)

    def formula_error():
        """No diffuse field: 3 %, and more where a few modes make the band."""
        below = np.maximum(np.log2(2000 * np.sqrt(0.5 / volume) / HZ), 0)
        return np.exp(random.standard_normal(8) * np.hypot(0.03, 0.06 * below))

    t_true, t_treated = time(surfaces) * formula_error(), time(treated) * formula_error()

    def measure(t):
        u = t * (0.02 + 0.03 * np.sqrt(125 / HZ))
        values = t + u * random.standard_normal(8)
        return SimpleNamespace(
            bands_hz=tuple(int(hz) for hz in HZ), t_s=values, u_s=u, state="", air=None
        )

    return Simulated(
        surfaces, treated, true, t_true, t_treated, measure(t_true), measure(t_treated), panels
    )


def described(rows, volume, surface, dimensions, persons, first_panel=99):
    alpha = np.array([row[2] for row in rows])
    u = np.array(
        [
            (product_u if number >= first_panel else book_u)(row[2])
            for number, row in enumerate(rows)
        ]
    )
    items = {}
    if persons:
        items = {
            "items": ("person",),
            "item_count": np.array([float(persons)]),
            "item_area": np.array([PERSON]),
            "item_u": 0.1 * np.array([PERSON]),
            "item_assumed": np.zeros((1, 8), bool),
        }
    return RoomSurfaces(
        volume=volume,
        surface_area=surface,
        parts=tuple(
            Part(f"{name} {n}", on, name, "panel" if n >= first_panel else "base", (0.0, 0.0, 1.0))
            for n, (on, name, _, _) in enumerate(rows)
        ),
        area=np.array([row[3] for row in rows]),
        alpha=alpha,
        u=u,
        assumed=np.zeros(alpha.shape, bool),
        dimensions=dimensions,
        **items,
    )


@pytest.fixture(scope="session")
def simulate():
    """Function from a seed to a `Simulated` room."""
    return simulated_room
