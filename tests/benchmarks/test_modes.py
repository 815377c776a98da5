"""Modes of an L-shaped room against a plain solve. ``pytest tests/benchmarks/test_modes.py -m benchmark -s``."""

import time

import numpy as np
import pytest

from planner.predict.plan_modes import plan_modes

pytestmark = pytest.mark.benchmark

L = [(0, 0), (6, 0), (6, 2.5), (4, 2.5), (4, 4), (0, 4)]
"""21 m² of floor: 60 m³ at 2.86 m of height."""
WAVENUMBER = 2 * np.pi * 300 / 343


def plain(refinements, count, order=2):
    """Elements of one size, general shift-invert: what one would write first."""
    import shapely
    from scipy.sparse.linalg import eigsh
    from skfem import Basis, BilinearForm, ElementTriP1, ElementTriP2, MeshTri
    from skfem.helpers import dot, grad

    parts = shapely.constrained_delaunay_triangles(shapely.Polygon(L))
    rings = np.array([np.asarray(t.exterior.coords)[:3] for t in parts.geoms])
    points, index = np.unique(rings.reshape(-1, 2), axis=0, return_inverse=True)
    mesh = MeshTri(points.T.copy(), index.reshape(-1, 3).T.copy()).refined(refinements)
    basis = Basis(mesh, ElementTriP1() if order == 1 else ElementTriP2())
    stiffness = BilinearForm(lambda u, v, _: dot(grad(u), grad(v))).assemble(basis).tocsc()
    mass = BilinearForm(lambda u, v, _: u * v).assemble(basis).tocsc()
    values = np.sort(eigsh(stiffness, count, mass, sigma=-0.1, return_eigenvectors=True)[0])
    return np.sqrt(np.maximum(values, 0))


def fastest(action):
    spent = []
    for _ in range(3):
        began = time.perf_counter()
        action()
        spent.append(time.perf_counter() - began)
        if spent[-1] > 2.0:
            break
    return min(spent)


def test_an_l_shaped_room_to_300_hz():
    """All modes; each plain mesh is refined until it is as accurate (aim: a fifth of the time)."""
    ours = plan_modes(L, WAVENUMBER).wavenumber
    count = len(ours)
    exact = plain(6, count)[1:]
    error = np.abs(ours[1:] / exact - 1).max()
    assert error < 0.002
    mine = fastest(lambda: plan_modes(L, WAVENUMBER))
    print(f"\nL-shaped room to 300 Hz: {mine:.2f} s, error {100 * error:.3f} %")
    for order, words in ((1, "linear"), (2, "quadratic")):
        for refinements in range(3, 8):
            reached = np.abs(plain(refinements, count, order)[1:] / exact - 1).max()
            if reached <= error:
                break
        theirs = fastest(lambda n=refinements, p=order: plain(n, count, p))
        print(
            f"{words} elements of one size, error {100 * reached:.3f} %: {theirs / mine:.1f} × as long (aim 5)"
        )
