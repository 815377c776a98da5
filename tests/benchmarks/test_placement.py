"""Laying panels, against the general method: a set-packing programme on a grid of positions."""

import time
from itertools import product as pairs
from types import SimpleNamespace

import numpy as np
import pytest

from planner.treat.free_field import Box, field_of
from planner.treat.packing import densest

pytestmark = pytest.mark.benchmark

CELL = 0.1  # every size below is a multiple, so that the grid loses nothing


def by_programme(width, height, obstacle, size):
    """Most panels, by HiGHS: at most one panel over each cell."""
    from scipy.optimize import Bounds, LinearConstraint, milp
    from scipy.sparse import csc_array

    columns, rows = round(width / CELL), round(height / CELL)
    blocked = np.zeros((rows, columns), bool)
    left, bottom, w, h = (round(value / CELL) for value in obstacle)
    blocked[bottom : bottom + h, left : left + w] = True
    cells, owners, count = [], [], 0
    for across, up in (size, size[::-1]):
        w, h = round(across / CELL), round(up / CELL)
        for y, x in pairs(range(rows - h + 1), range(columns - w + 1)):
            if blocked[y : y + h, x : x + w].any():
                continue
            under = [(y + j) * columns + x + i for j in range(h) for i in range(w)]
            cells += under
            owners += [count] * len(under)
            count += 1
    over = csc_array((np.ones(len(cells)), (cells, owners)), shape=(rows * columns, count))
    result = milp(
        -np.ones(count),
        constraints=LinearConstraint(over, ub=1.0),
        integrality=np.ones(count),
        bounds=Bounds(0, 1),
        options={"time_limit": 60.0},
    )
    return round(-result.fun)


@pytest.mark.parametrize(
    ("width", "height", "obstacle"),
    [
        (3.9, 2.6, (0.3, 0.0, 0.9, 2.1)),
        (5.2, 2.6, (1.8, 0.9, 1.4, 1.2)),
        (4.0, 3.0, (3.0, 1.0, 0.5, 0.5)),
    ],
)
def test_counting_panels_on_a_wall(width, height, obstacle, capsys):
    """As many panels as the programme proves possible (or one fewer), in a fraction of its time."""
    size = (0.6, 1.2)
    frame = SimpleNamespace(
        width=width,
        height=height,
        outline=np.array([(0, 0), (width, 0), (width, height), (0, height)]),
    )

    def ours():
        return len(densest(field_of(frame, [Box(*obstacle)], 0.0), [size, size[::-1]]))

    began = time.perf_counter()
    proven = by_programme(width, height, obstacle, size)
    theirs = time.perf_counter() - began
    assert proven - 1 <= ours() <= proven
    times = []
    for _ in range(5):
        began = time.perf_counter()
        ours()
        times.append(time.perf_counter() - began)
    with capsys.disabled():
        print(
            f"\n{width} × {height} m: {ours()} of {proven} panels, {theirs / min(times):.0f} × faster"
        )
    assert min(times) < theirs
