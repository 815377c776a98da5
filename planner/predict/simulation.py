"""The second opinion: image sources and ray tracing of the same room with the same coefficients.

pyroomacoustics does the tracing; the decay is read from its energy histograms per octave, never from
a synthesised response (whose filters would mix the bands). Its octave grid and its number of
threads are global settings: they are set, and put back, in one place, so this must not run from
two threads at once.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.air import Air, energy_attenuation, speed_of_sound
from planner.bands import OCTAVES, exact_midband
from planner.errors import MissingPartError
from planner.predict.tiles import Places, Tile, described_places, tiles
from planner.room.model import Room
from planner.room.surfaces import RoomSurfaces

Array = NDArray[np.float64]

RATE = 32_000
"""The library carries octaves up to half of this. [Hz]"""

LARGEST_ALPHA = 0.99
"""It takes no coefficient of 1 or more. [-]"""

SCATTERING = 0.3
"""Share of reflected energy that leaves diffusely, every surface and band; an assumption for
furnished-out rooms with reveals, frames and edges, no source. [-]"""

RAYS = 4000
BIN_S = 0.004
"""Of the energy histograms. [s]"""

MARGIN = 0.35
"""Sources and receivers keep this from surfaces where the room allows. [m]"""

_BASE_HZ = 62.5

LOTS = 4
"""Rays are sent in so many lots per source, to say how far it has got."""


@dataclass(frozen=True, slots=True)
class Simulated:
    """Reverberation time by simulation."""

    reverberation_time: Array
    """T30 of the energy decay, mean over receivers, shape ``(band,)``; NaN where it fails. [s]"""
    spread: Array
    """Standard deviation over receivers. [s]"""
    notes: tuple[str, ...]
    """Assumptions that the numbers rest on."""


def simulate_room(
    room: Room,
    surfaces: RoomSurfaces,
    air: Air,
    *,
    scattering: float = SCATTERING,
    rays: int = RAYS,
    seed: int = 1,
    places: Places | None = None,
    progress: Callable[[float, float], None] | None = None,
) -> Simulated:
    """Trace a room and read its decay.

    Parameters
    ----------
    room
        Its footprint and height; sources and microphones of the survey are used where given.
    surfaces
        Its coefficients, untreated or treated. Openings, patches and panels that have a place are
        traced there; others are averaged over what is left of their surface. Furnishings are spread
        over all surfaces.
    air
        State of the air.
    scattering
        Share of reflected energy that leaves diffusely, 0 to 1. [-]
    rays
        Per source. [-]
    seed
        Bit for bit reproducible: one thread.
    places
        Where parts of `surfaces` lie; by default what `described_places` knows.
    progress
        Called after each lot of rays with the share that is done and the seconds still needed.

    Raises
    ------
    MissingPartError
        pyroomacoustics is not installed.
    """
    try:
        import pyroomacoustics as pra
    except ImportError as error:
        raise MissingPartError(
            "pyroomacoustics is not installed: the simulation needs it. "
            "Install it with: pip install pyroomacoustics"
        ) from error
    sources, receivers = _places(room)
    walls = _walls(room, surfaces, described_places(room) if places is None else places)
    curves = np.zeros((len(sources) * len(receivers), len(OCTAVES), 1))
    began, lots = time.monotonic(), LOTS
    with _settings(pra, seed):
        for number, source in enumerate(sources):
            for lot in range(lots):
                traced = _room(pra, walls, air, scattering)
                traced.set_ray_tracing(
                    n_rays=-(-rays // lots),
                    energy_thres=1e-12,
                    receiver_radius=0.4,
                    hist_bin_size=BIN_S,
                )
                traced.add_source(list(source))
                traced.add_microphone_array(np.array(receivers).T)
                traced.image_source_model()
                traced.ray_tracing()
                for place in range(len(receivers)):
                    histogram = np.sum(
                        [np.asarray(h) for h in traced.rt_histograms[place][0]], axis=0
                    )
                    energy = np.asarray(histogram, float)[: len(OCTAVES)]
                    curves = _longer(curves, energy.shape[1])
                    curves[number * len(receivers) + place, :, : energy.shape[1]] += energy
                if progress:
                    done = (number * lots + lot + 1) / (len(sources) * lots)
                    progress(done, (time.monotonic() - began) * (1.0 - done) / done)
    curves = np.array([_with_air(curve, air) for curve in curves])
    times = np.array([[decay_time(band) for band in curve] for curve in curves])
    capped = int(np.sum(surfaces.alpha > LARGEST_ALPHA))
    notes = [
        f"Simulation: {len(sources)} sources, {len(receivers)} receivers, {rays} rays each, "
        f"scattering {scattering:g} on every surface (an assumption), seed {seed}; what has no place "
        "of its own is averaged over its surface."
    ]
    if capped:
        notes.append(f"{capped} coefficients above 0.99 were capped for the simulation.")
    good = np.isfinite(times)
    count = good.sum(axis=0)
    mean = np.where(good, times, 0.0).sum(axis=0) / np.maximum(count, 1)
    spread = np.sqrt(
        np.where(good, (times - mean) ** 2, 0.0).sum(axis=0) / np.maximum(count - 1, 1)
    )
    return Simulated(np.where(count > 0, mean, np.nan), spread, tuple(notes))


def _with_air(energy: Array, air: Air) -> Array:
    """Energy ``(band, bin)`` after the air has taken its part of every path, exp(−m c t)."""
    m = energy_attenuation(
        exact_midband(OCTAVES), air.temperature_c, air.humidity_percent, air.pressure_kpa
    )
    path = float(speed_of_sound(air.temperature_c)) * (np.arange(energy.shape[1]) + 0.5) * BIN_S
    left: Array = energy * np.exp(-m[:, None] * path)
    return left


def decay_time(energy: Array) -> float:
    """T30 of an energy histogram by backward integration. [s].

    Parameters
    ----------
    energy
        Per bin of `BIN_S`, shape ``(bin,)``.

    Returns
    -------
    time
        From −5 to −35 dB; NaN where the curve is shorter.
    """
    total = np.cumsum(energy[::-1])[::-1]
    if total[0] <= 0:
        return float("nan")
    with np.errstate(divide="ignore"):
        level = 10.0 * np.log10(total / total[0])
    used = np.flatnonzero((level <= -5.0) & (level >= -35.0))
    if len(used) < 4:
        return float("nan")
    slope = np.polyfit(used * BIN_S, level[used], 1)[0]
    return float(-60.0 / slope) if slope < 0 else float("nan")


@contextmanager
def _settings(pra: Any, seed: int) -> Iterator[None]:
    """The library's global settings for one run."""
    names = {"octave_bands_base_freq": _BASE_HZ, "num_threads": 1}
    before = {name: pra.constants.get(name) for name in names}
    try:
        for name, value in names.items():
            pra.constants.set(name, value)
        pra.random.seed(seed)
        yield
    finally:
        for name, value in before.items():
            pra.constants.set(name, value)


def _longer(curves: Array, bins: int) -> Array:
    more = bins - curves.shape[2]
    return np.pad(curves, ((0, 0), (0, 0), (0, more))) if more > 0 else curves


def _walls(room: Room, surfaces: RoomSurfaces, places: Places) -> list[Tile]:
    """Pieces of every surface, furnishings spread over all of them, below 1. [-]."""
    spread = surfaces.item_count @ surfaces.item_area / surfaces.surface_area
    return [
        replace(tile, alpha=np.clip(tile.alpha + spread, 0.0, LARGEST_ALPHA))
        for tile in tiles(room, surfaces, places)
    ]


def _room(pra: Any, walls: list[Tile], air: Air, scattering: float) -> Any:
    # As many bands as the library makes of this rate, one above ours: with fewer it reads whatever
    # lies behind them in memory.
    bands = len(pra.ShoeBox([1, 1, 1], fs=RATE).octave_bands.centers)
    above = np.arange(bands).clip(max=len(OCTAVES) - 1)
    return pra.Room(
        [
            # Its corners run the other way round, so that the normal points outwards.
            pra.wall_factory(
                np.ascontiguousarray(tile.corners[::-1].T),
                tile.alpha[above],
                np.full(bands, scattering),
                f"{tile.surface} {number}",
            )
            for number, tile in enumerate(walls)
        ],
        fs=RATE,
        max_order=1,
        ray_tracing=True,
        air_absorption=False,  # its table starts at 125 Hz whatever the grid: added afterwards
        temperature=air.temperature_c,
        humidity=air.humidity_percent,
    )


def _places(room: Room) -> tuple[list[Array], list[Array]]:
    """Two sources and three receivers: the survey's where there are some, or spread over the plan."""
    known = room.positions
    sources = [np.array(p) for p in known.sources.values()]
    receivers = [np.array(p) for p in known.microphones.values()]
    spots = _spread(room, 5)
    heights = [0.55, 0.45, 0.4, 0.5, 0.6]
    free = [np.array([*spot, room.height * h]) for spot, h in zip(spots, heights, strict=False)]
    return (sources or free[:2])[:3], (receivers or free[2:] or free[:1])[:4]


def _spread(room: Room, count: int) -> Sequence[tuple[float, float]]:
    """Points inside the plan that stand far from each other and from the walls."""
    import shapely

    plan = shapely.Polygon(room.footprint)
    inner = plan.buffer(-MARGIN)
    area = inner if not inner.is_empty else plan.buffer(-0.1)
    low_x, low_y, high_x, high_y = area.bounds
    grid = [
        (float(x), float(y))
        for x in np.linspace(low_x, high_x, 15)
        for y in np.linspace(low_y, high_y, 15)
        if area.covers(shapely.Point(x, y))
    ]
    chosen = [grid[0]]
    while len(chosen) < min(count, len(grid)):
        apart = [min(np.hypot(x - a, y - b) for a, b in chosen) for x, y in grid]
        chosen.append(grid[int(np.argmax(apart))])
    return chosen
