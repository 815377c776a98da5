"""Small treatment problems enumerated in full, with Sabine and Eyring written out here.

Nothing of the optimiser is used: limits are read from the room's `[treatment]` anew.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
from treat_rooms import BANDS, make_room, panel

from planner.air import Air
from planner.room.model import TreatmentLimits
from planner.room.surfaces import RoomSurfaces
from planner.treat.catalogue import Product


def air_attenuation(air: Air) -> np.ndarray:
    """M of ISO 9613-1:1993, eqs. (3) to (5), at the exact base-ten midbands; ISO 354, 8.1.2.1."""
    f = 1000.0 * 10 ** (0.3 * np.arange(-4, 4))
    kelvin, pr = air.temperature_c + 273.15, air.pressure_kpa / 101.325
    h = air.humidity_percent * 10 ** (-6.8346 * (273.16 / kelvin) ** 1.261 + 4.6151) / pr
    oxygen = pr * (24 + 4.04e4 * h * (0.02 + h) / (0.391 + h))
    t = kelvin / 293.15
    nitrogen = pr * t**-0.5 * (9 + 280 * h * np.exp(-4.170 * (t ** (-1 / 3) - 1)))
    db = 8.686 * f**2 * (
        1.84e-11 / pr * t**0.5
        + t**-2.5 * (
            0.01275 * np.exp(-2239.1 / kelvin) / (oxygen + f**2 / oxygen)
            + 0.1068 * np.exp(-3352.0 / kelvin) / (nitrogen + f**2 / nitrogen)
        )
    )  # fmt: skip
    return db / (10 * math.log10(math.e))


def time_by(formula: str, area: np.ndarray, volume: float, surface: float, air: Air) -> np.ndarray:
    """Sabine and Eyring as in any textbook, T = 24 ln 10 V / (c · decay area)."""
    c = 343.2 * math.sqrt((air.temperature_c + 273.15) / 293.15)
    decay = area if formula == "sabine" else -surface * np.log(1 - area / surface)
    return 24 * math.log(10) * volume / (c * (decay + 4 * air_attenuation(air) * volume))


@dataclass
class Instance:
    room: RoomSurfaces
    products: list[Product]
    limits: TreatmentLimits
    low: np.ndarray
    high: np.ndarray
    groups: list[tuple[str, ...]]
    slots: list[tuple[Product, tuple[str, ...], int]]
    air: Air

    @property
    def formulas(self):
        return ("eyring", "sabine") if self.limits.formula == "both" else (self.limits.formula,)


def draw_instance(rng: np.random.Generator) -> Instance:
    """One that can be enumerated in a moment."""
    while True:
        instance = draw_any(rng)
        if math.prod(most + 1 for _, _, most in instance.slots) <= 6000:
            aim_at_something(instance, rng)
            return instance


def draw_any(rng: np.random.Generator) -> Instance:
    """A small random room with a few products and limits of every kind."""
    names = ["ceiling", "left", "right", "front"][: rng.integers(2, 5)]
    areas = {n: float(rng.uniform(2.0, 5.0)) for n in names} | {"floor": float(rng.uniform(6, 12))}
    alpha = {n: rng.uniform(0.02, 0.3, BANDS) for n in areas}
    room = make_room(areas, alpha, float(rng.uniform(12, 30)))
    prices = rng.choice([10.0, 17.5, 25.0, 40.0, 60.0], size=3)
    products = [
        panel(
            f"p{n}", rng.uniform(0.1, 1.2, BANDS), price=float(prices[n]),
            pack=int(rng.integers(1, 4)), width=float(rng.uniform(0.7, 1.3)),
            height=float(rng.uniform(0.9, 1.3)), weight_kg=float(rng.uniform(3, 9)),
            surfaces=[("wall", "ceiling"), ("wall",), ("ceiling", "wall")][rng.integers(3)],
            thickness_mm=float(rng.choice([30.0, 60.0, 100.0])),
        )
        for n in range(rng.integers(1, 4))
    ]  # fmt: skip
    paired = "left" in names and "right" in names and rng.random() < 0.4
    settings: dict[str, object] = {"formula": str(rng.choice(["eyring", "sabine", "both"]))}
    if rng.random() < 0.4:
        settings["max_cover"] = {n: float(rng.uniform(0.3, 0.9)) for n in names}
    if paired:
        settings["symmetric"] = (("left", "right"),)
    if rng.random() < 0.25:
        settings["keep_clear"] = (str(rng.choice(names)),)
    if rng.random() < 0.3:
        settings["max_weight_kg"] = {str(rng.choice(names)): float(rng.uniform(8, 25))}
    if rng.random() < 0.25:
        settings["max_products"] = int(rng.integers(1, 3))
    if rng.random() < 0.2:
        settings["min_thickness_mm"] = 50.0
    if rng.random() < 0.2:
        settings["max_depth_mm"] = 80.0
    if rng.random() < 0.4:
        settings["budget"] = float(rng.uniform(40, 300))
    limits = TreatmentLimits(**settings)
    groups = ([("left", "right")] if paired else []) + [
        (n,) for n in areas if not (paired and n in ("left", "right"))
    ]
    slots = enumerable_slots(room, products, limits, groups)
    air = Air(float(rng.uniform(15, 25)), float(rng.uniform(30, 70)))
    return Instance(room, products, limits, np.zeros(BANDS), np.zeros(BANDS), groups, slots, air)


def enumerable_slots(room, products, limits, groups):
    """Which product may go on which surfaces, and how many at most: plain reading of the rules."""
    area = {part.on: float(a) for part, a in zip(room.parts, room.area, strict=True)}
    slots = []
    for product, group in itertools.product(products, groups):
        if any(g in limits.keep_clear for g in group):
            continue
        kinds = {
            "floor" if g == "floor" else "ceiling" if g == "ceiling" else "wall" for g in group
        }
        if not kinds <= set(product.surfaces):
            continue
        if limits.min_thickness_mm and product.thickness_mm < limits.min_thickness_mm:
            continue
        if limits.max_depth_mm and product.thickness_mm > limits.max_depth_mm:
            continue
        face = product.width * product.height
        most = min(math.floor(area[g] * limits.max_cover.get(g, 1.0) / face) for g in group)
        if most > 0:
            slots.append((product, group, most))
    return slots


def counts_of(instance: Instance) -> np.ndarray:
    """Every combination that the limits other than the target allow, shape (combination, slot)."""
    ranges = [range(most + 1) for _, _, most in instance.slots]
    grid = np.array(list(itertools.product(*ranges)), float)
    grid = grid.reshape(math.prod(len(r) for r in ranges), len(ranges))
    room, limits = instance.room, instance.limits
    area = {part.on: float(a) for part, a in zip(room.parts, room.area, strict=True)}
    keep = np.ones(len(grid), bool)
    for name, size in area.items():
        here = [k for k, (_, group, _) in enumerate(instance.slots) if name in group]
        face = np.array([instance.slots[k][0].width * instance.slots[k][0].height for k in here])
        weight = np.array([instance.slots[k][0].weight_kg for k in here])
        if here:
            keep &= grid[:, here] @ face <= size * limits.max_cover.get(name, 1.0) + 1e-9
            keep &= grid[:, here] @ weight <= limits.max_weight_kg.get(name, np.inf) + 1e-9
    pieces = pieces_of(instance, grid)
    if limits.max_products is not None:
        keep &= (pieces > 0).sum(axis=1) <= limits.max_products
    if limits.budget is not None:
        keep &= cost_of(instance, grid) <= limits.budget + 1e-9
    return grid[keep]


def pieces_of(instance: Instance, grid: np.ndarray) -> np.ndarray:
    pieces = np.zeros((len(grid), len(instance.products)))
    for k, (product, group, _) in enumerate(instance.slots):
        pieces[:, instance.products.index(product)] += len(group) * grid[:, k]
    return pieces


def cost_of(instance: Instance, grid: np.ndarray) -> np.ndarray:
    packs = np.ceil(pieces_of(instance, grid) / [p.pack for p in instance.products] - 1e-9)
    return packs @ np.array([p.price_per_pack for p in instance.products])


def absorption_of(instance: Instance, grid: np.ndarray, formula: str) -> np.ndarray:
    """Σ S α with each panel in place of the surface behind it; Eyring caps α at 0.99."""
    most = 0.99 if formula == "eyring" else np.inf
    base = {
        p.on: np.minimum(a, most)
        for p, a in zip(instance.room.parts, instance.room.alpha, strict=True)
    }
    total = sum(
        area * base[part.on]
        for part, area in zip(instance.room.parts, instance.room.area, strict=True)
    )
    total = np.repeat(total[None], len(grid), axis=0)
    for k, (product, group, _) in enumerate(instance.slots):
        face = product.width * product.height
        alpha = np.minimum(product.coefficients.alpha, most)
        for name in group:
            total = total + grid[:, k : k + 1] * face * (alpha - base[name])
    return total


def times_of(instance: Instance, grid: np.ndarray, formula: str) -> np.ndarray:
    room = instance.room
    area = absorption_of(instance, grid, formula)
    return time_by(formula, area, room.volume, room.surface_area, instance.air)


def aim_at_something(instance: Instance, rng: np.random.Generator) -> None:
    """Two-sided limits about a random list; sometimes too narrow or too far off to be met."""
    grid = counts_of(instance)
    chosen = grid[rng.integers(len(grid))][None]
    times = [times_of(instance, chosen, f)[0] for f in instance.formulas]
    low, high = np.min(times, axis=0), np.max(times, axis=0)
    width = rng.choice([0.02, 0.06, 0.12, 0.25])
    shift = 1.0 + rng.normal(0, 0.15, BANDS) * (rng.random() < 0.35)
    instance.low = low * shift * (1 - width * rng.uniform(0.2, 1.0, BANDS))
    instance.high = high * shift * (1 + width * rng.uniform(0.2, 1.0, BANDS))
    instance.low[rng.random(BANDS) < 0.2] = np.nan
    instance.high[rng.random(BANDS) < 0.1] = np.nan


def shortfalls(instance: Instance, grid: np.ndarray) -> np.ndarray:
    """Relative absorption area missing or too much, shape (combination, band)."""
    room, air = instance.room, instance.air
    c = 343.2 * math.sqrt((air.temperature_c + 273.15) / 293.15)
    air_area = 4 * air_attenuation(air) * room.volume
    worst = np.zeros((len(grid), BANDS))
    for formula in instance.formulas:
        area = absorption_of(instance, grid, formula)
        for limit, sign in ((instance.high, 1.0), (instance.low, -1.0)):
            need = 24 * math.log(10) * room.volume / (c * limit) - air_area
            if formula == "eyring":
                need = room.surface_area * (1 - np.exp(-need / room.surface_area))
            missing = sign * (need - area) / np.maximum(np.abs(need), 0.1)
            worst = np.fmax(worst, np.where(np.isnan(missing), 0.0, missing))
    return worst


def brute_force(instance: Instance):
    """(feasible, worst, sum, cost) of the best combination in the order of the objectives.

    The worst band counts from the least shortfall that any combination has in that band.
    """
    grid = counts_of(instance)
    short = shortfalls(instance, grid)
    worst, cost = short.max(axis=1), cost_of(instance, grid)
    inside = worst <= 1e-9
    if inside.any():
        return True, 0.0, 0.0, cost[inside].min()
    regret = (short - short.min(axis=0)).max(axis=1)
    near = regret <= regret.min() + 4e-6
    total = np.where(near, short.sum(axis=1), np.inf)
    least = total <= total.min() + 2e-6
    return False, regret.min(), total.min(), cost[least].min()
