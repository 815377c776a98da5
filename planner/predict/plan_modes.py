"""Modes of rooms whose plan is no rectangle: finite elements in plan times cosines in height."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.bands import OCTAVES
from planner.errors import RoomError
from planner.predict.modes import Modes, at_frequency

Array = NDArray[np.float64]

ELEMENT_SIZE = 0.65
"""Longest edge of a cubic element at 300 Hz; inversely proportional to the frequency. [m]"""

CORNER_REFINEMENTS = 4
"""How often elements at an inner corner are halved: pressure is not smooth there."""

MOST_PLAN_MODES = 1500

POINTS_AT_ONCE = 500


@dataclass(frozen=True, slots=True)
class PlanModes:
    """Modes of a footprint with rigid walls, the constant one first."""

    wavenumber: Array
    """Shape ``(mode,)``. [1/m]"""
    wall_pressure: Array
    """Mean square pressure on each wall against that of the plan, shape ``(mode, wall)``. [-]"""
    mean_square: Array
    """Of each mode's pressure over the plan, shape ``(mode,)``. [-]"""
    basis: Any
    """Of the finite elements."""
    vectors: Array
    """Pressure of each mode at the basis's nodes, largest magnitude 1, shape ``(node, mode)``. [-]"""

    def pressure(self, points: ArrayLike) -> Array:
        """Pressure of every mode at points inside the footprint, shape ``(mode, point)``. [-].

        Parameters
        ----------
        points
            Shape ``(point, 2)``; those outside the footprint by rounding are read at its edge. [m]
        """
        return np.concatenate(
            [self._at(some) for some in _in_lots(np.asarray(points, float), POINTS_AT_ONCE)], axis=1
        )

    def _at(self, points: Array) -> Array:
        basis, mapping = self.basis, self.basis.mapping
        # Every triangle is asked, and the one that holds a point best is taken: a point on an edge
        # or, by rounding, outside is found as surely as any other.
        local = mapping.invF(points.T[:, None, :].repeat(basis.mesh.t.shape[1], axis=1))
        cells = np.minimum(local.min(axis=0), 1.0 - local.sum(axis=0)).argmax(axis=0)
        own = mapping.invF(points.T[:, :, None], tind=cells)
        found = np.zeros((self.vectors.shape[1], len(points)))
        for number, nodes in enumerate(basis.element_dofs):
            weight = np.asarray(basis.elem.gbasis(mapping, own, number, tind=cells)[0])[:, 0]
            found += weight * self.vectors[nodes[cells]].T
        return found


def _in_lots(points: Array, count: int) -> list[Array]:
    return np.array_split(points, max(1, -(-len(points) // count)))


def plan_modes(footprint: ArrayLike, highest_wavenumber: float) -> PlanModes:
    """Modes of any simple polygon with rigid walls.

    Parameters
    ----------
    footprint
        Corners, anticlockwise, shape ``(corner, 2)``. [m]
    highest_wavenumber
        2π f / c of the highest frequency wanted. [1/m]

    Returns
    -------
    modes
        Every mode up to there.

    Raises
    ------
    RoomError
        The footprint is so large that there are too many.

    Notes
    -----
    Cubic triangles of 0.65 m at 300 Hz, halved four times towards inner corners; eigenvalues about
    a shift below zero, where the shifted matrix is definite and needs no pivoting.
    """
    from scipy.sparse.linalg import LinearOperator, eigsh, splu
    from skfem import Basis, BilinearForm, ElementTriP3
    from skfem.helpers import dot, grad

    corners = np.asarray(footprint, float)
    mesh = _mesh(corners, highest_wavenumber)
    basis = Basis(mesh, ElementTriP3())
    stiffness = BilinearForm(lambda u, v, _: dot(grad(u), grad(v))).assemble(basis).tocsc()
    mass = BilinearForm(lambda u, v, _: u * v).assemble(basis).tocsc()
    wanted = _expected(corners, highest_wavenumber)
    shift = -0.5 * max(highest_wavenumber, 1.0) ** 2 / 10.0
    factor = splu(
        stiffness - shift * mass,
        permc_spec="MMD_AT_PLUS_A",
        diag_pivot_thresh=0.0,
        options={"SymmetricMode": True},
    )
    inverse = LinearOperator(stiffness.shape, factor.solve, dtype=float)
    size = stiffness.shape[0]
    while True:
        if wanted > MOST_PLAN_MODES:
            raise RoomError(
                f"the footprint has more than {MOST_PLAN_MODES} modes up to that frequency",
                cure="Ask for modes up to a lower frequency.",
            )
        start = np.sin(np.arange(1, size + 1))  # fixed, so that a room gives the same twice
        values, vectors = eigsh(
            stiffness, min(wanted, size - 2), mass, sigma=shift, OPinv=inverse, v0=start, tol=1e-7
        )
        if values.max() > highest_wavenumber**2 or wanted >= size - 2:
            break
        wanted *= 2
    order = np.argsort(values)
    values, vectors = np.maximum(values[order], 0.0), vectors[:, order]
    kept = values <= highest_wavenumber**2
    values, vectors = values[kept], vectors[:, kept]
    values[0] = 0.0
    vectors = vectors / np.abs(vectors).max(axis=0)
    area = float(np.asarray(mass.sum()))
    return PlanModes(
        wavenumber=np.sqrt(values),
        wall_pressure=_wall_pressure(mesh, basis, mass, vectors, corners),
        mean_square=np.einsum("im,im->m", vectors, mass @ vectors) / area,
        basis=basis,
        vectors=vectors,
    )


def extruded_modes(
    footprint: ArrayLike,
    height: float,
    highest_hz: float,
    wall_alpha: Mapping[str, Array],
    wall_names: Sequence[str],
    *,
    speed_of_sound: float = 343.0,
    further_area: ArrayLike = 0.0,
    plan: PlanModes | None = None,
) -> Modes:
    """Modes of a room of any footprint and one height, with their decay.

    Parameters
    ----------
    footprint, height
        Corners ``(corner, 2)``, anticlockwise [m]; [m].
    highest_hz, speed_of_sound
        [Hz], [m/s]
    wall_alpha
        Mean coefficient of ``floor``, ``ceiling`` and every wall over the octaves. [-]
    wall_names
        In the order of the footprint's edges.
    further_area
        Absorption area of furnishings, shape ``(band,)``. [m²]
    plan
        Of `plan_modes` up to the same frequency, where it is known already.

    Returns
    -------
    modes
        Kinds are ``level`` (plan alone), ``upright`` (height alone) and ``mixed``. The decay
        weighs each wall by the mode's pressure on it, as `planner.predict.modes.mode_decay`.
    """
    corners = np.asarray(footprint, float)
    if plan is None:
        plan = plan_modes(corners, 2.0 * np.pi * highest_hz / speed_of_sound)
    area = 0.5 * float(
        np.sum(
            corners[:, 0] * np.roll(corners[:, 1], -1) - np.roll(corners[:, 0], -1) * corners[:, 1]
        )
    )
    lengths = np.hypot(*(np.roll(corners, -1, axis=0) - corners).T)
    volume = area * height
    upright = np.arange(int(2.0 * highest_hz * height / speed_of_sound) + 1)
    wave = np.hypot(plan.wavenumber[:, None], np.pi * upright / height)
    hz = speed_of_sound * wave / (2.0 * np.pi)
    number, level = np.nonzero((hz > 1e-6) & (hz <= highest_hz))
    f = hz[number, level]
    order = np.argsort(f, kind="stable")
    f, number, level = f[order], number[order], level[order]
    rate = np.zeros(len(f))
    for wall, name in enumerate(wall_names):
        beta = at_frequency(wall_alpha[name], f) / 8.0
        surface = lengths[wall] * height
        rate += speed_of_sound * beta * surface * plan.wall_pressure[number, wall] / volume
    pressing = np.where(level > 0, 2.0, 1.0)
    for name in ("floor", "ceiling"):
        beta = at_frequency(wall_alpha[name], f) / 8.0
        rate += speed_of_sound * beta * area * pressing / volume
    spread = np.broadcast_to(np.asarray(further_area, float), (len(OCTAVES),))
    rate += speed_of_sound * at_frequency(spread, f) / (4.0 * volume)
    with np.errstate(divide="ignore"):
        time = 6.0 * np.log(10.0) / rate
    kinds = tuple(
        "level" if z == 0 else "upright" if n == 0 else "mixed"
        for n, z in zip(number, level, strict=True)
    )
    orders = np.stack([number, np.zeros_like(number), level], axis=1)
    return Modes(f, orders, kinds, time)


def _expected(corners: Array, wavenumber: float) -> int:
    """Number of plan modes by Weyl's two terms, with a margin."""
    x, y = corners.T
    area = 0.5 * abs(float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y)))
    perimeter = float(np.hypot(*(np.roll(corners, -1, axis=0) - corners).T).sum())
    count = area * wavenumber**2 / (4 * np.pi) + perimeter * wavenumber / (4 * np.pi)
    return int(1.15 * count) + 8


def _mesh(corners: Array, wavenumber: float) -> Any:
    """Triangles over the footprint, fine enough everywhere and finer at inner corners."""
    import shapely
    from skfem import MeshTri

    parts = shapely.constrained_delaunay_triangles(shapely.Polygon(corners))
    rings = np.array([np.asarray(t.exterior.coords)[:3] for t in parts.geoms])
    points, index = np.unique(rings.reshape(-1, 2).round(9), axis=0, return_inverse=True)
    mesh = MeshTri(points.T.copy(), index.reshape(-1, 3).T.copy(), validate=False)
    longest = ELEMENT_SIZE * (2.0 * np.pi * 300.0 / 343.0) / max(wavenumber, 0.5)
    longest = min(longest, 0.4 * float(np.ptp(corners, axis=0).max()))
    for _ in range(14):
        edges = mesh.p[:, mesh.t[[0, 1, 2]]] - mesh.p[:, mesh.t[[1, 2, 0]]]
        large = np.flatnonzero(np.hypot(*edges).max(axis=0) > longest)
        if not len(large):
            break
        mesh = mesh.refined(large)
    for corner in _inner_corners(corners):
        for _ in range(CORNER_REFINEMENTS):
            touching = np.hypot(*(mesh.p - corner[:, None])) < 1e-7
            mesh = mesh.refined(np.flatnonzero(touching[mesh.t].any(axis=0)))
    return mesh


def _inner_corners(corners: Array) -> Array:
    """Corners where the wall turns back into the room."""
    before = corners - np.roll(corners, 1, axis=0)
    after = np.roll(corners, -1, axis=0) - corners
    turn = before[:, 0] * after[:, 1] - before[:, 1] * after[:, 0]
    return corners[turn < -1e-9]


def _wall_pressure(mesh: Any, basis: Any, mass: Any, vectors: Array, corners: Array) -> Array:
    from skfem import BilinearForm, FacetBasis

    area = float(np.asarray(mass.sum()))
    square = np.einsum("im,im->m", vectors, mass @ vectors) / area
    middles = mesh.p[:, mesh.facets].mean(axis=1).T
    boundary = mesh.boundary_facets()
    found = np.empty((vectors.shape[1], len(corners)))
    for wall, (start, end) in enumerate(zip(corners, np.roll(corners, -1, axis=0), strict=True)):
        along = (end - start) / np.hypot(*(end - start))
        offset = middles[boundary] - start
        distance = np.abs(offset[:, 0] * along[1] - offset[:, 1] * along[0])
        reach = offset @ along
        mine = (distance < 1e-6) & (reach > 0) & (reach < np.hypot(*(end - start)))
        facets = FacetBasis(mesh, basis.elem, facets=boundary[mine])
        wall_mass = BilinearForm(lambda u, v, _: u * v).assemble(facets)
        length = float(np.hypot(*(end - start)))
        found[:, wall] = np.einsum("im,im->m", vectors, wall_mass @ vectors) / length / square
    return found
