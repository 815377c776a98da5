"""A mixed-integer linear programme, row by row, solved to proven optimality by HiGHS."""

from __future__ import annotations

import contextlib
import ctypes
import os
import threading
from collections.abc import Iterator
from dataclasses import dataclass, field
from enum import StrEnum
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

SLACK = 2e-6
"""How far a later stage may fall behind what an earlier one reached, relative. [-]"""


MOST_SHORT = 100.0
"""Bound on a relative shortfall: a bound on every unknown keeps the solver's presolve safe. [-]"""


@contextlib.contextmanager
def silenced_stdout() -> Iterator[None]:
    """Keep compiled code from writing to standard output while it works.

    HiGHS in scipy 1.17 prints a line of its own now and then, whatever it is told, and a command
    with ``--json`` must print nothing but its object. Where there is no standard output to keep
    clean (a program without a console) nothing is done.
    """
    with _STDOUT:
        try:
            kept = os.dup(1)
            nowhere = os.open(os.devnull, os.O_WRONLY)
        except OSError:
            yield
            return
        try:
            os.dup2(nowhere, 1)
            yield
        finally:
            with contextlib.suppress(OSError, AttributeError, TypeError):
                ctypes.CDLL(None).fflush(None)  # what C still holds back must not come later
            os.dup2(kept, 1)
            os.close(kept)
            os.close(nowhere)


_STDOUT = threading.RLock()


class Status(StrEnum):
    """How a solve ended."""

    OPTIMAL = "optimal"
    INFEASIBLE = "infeasible"
    TIME_LIMIT = "time-limit"


@dataclass(frozen=True, slots=True)
class Outcome:
    """What the solver found."""

    status: Status
    values: Array | None
    """All unknowns; None where nothing was found in time or nothing exists."""
    objective: float
    bound: float
    """Proven: no solution is better than that."""

    @property
    def gap(self) -> float:
        """Proven relative distance from the optimum; inf where nothing was found. [-]."""
        if self.values is None:
            return float("inf")
        if self.status is Status.OPTIMAL and not np.isfinite(self.bound):
            return 0.0  # without whole numbers there is no tree and no bound to report
        distance = max(0.0, self.objective - self.bound) / max(abs(self.objective), 1e-9)
        return distance if distance > 1e-6 else 0.0


@dataclass(slots=True)
class Programme:
    """Unknowns and rows, in the order they were added."""

    low: list[float] = field(default_factory=list)
    high: list[float] = field(default_factory=list)
    whole: list[bool] = field(default_factory=list)
    rows: list[tuple[Array, Array]] = field(default_factory=list)
    row_low: list[float] = field(default_factory=list)
    row_high: list[float] = field(default_factory=list)

    def unknowns(
        self,
        count: int,
        *,
        low: float = 0.0,
        high: Array | float = np.inf,
        whole: bool | NDArray[np.bool_] = False,
    ) -> NDArray[np.intp]:
        """Numbers of `count` new unknowns."""
        first = len(self.low)
        self.low += [low] * count
        self.high += np.broadcast_to(high, (count,)).astype(float).tolist()
        self.whole += np.broadcast_to(whole, (count,)).tolist()
        return np.arange(first, first + count)

    def row(
        self,
        *terms: tuple[NDArray[np.intp] | int, Array | float],
        low: float = -np.inf,
        high: float = np.inf,
    ) -> None:
        """Low ≤ Σ weight · unknown ≤ high."""
        numbers = [np.atleast_1d(np.asarray(number)) for number, _ in terms]
        weights = [
            np.broadcast_to(np.asarray(weight, float), number.shape)
            for number, (_, weight) in zip(numbers, terms, strict=True)
        ]
        self.rows.append((np.concatenate(numbers).astype(float), np.concatenate(weights)))
        self.row_low.append(low)
        self.row_high.append(high)

    def solve(
        self,
        *objective: tuple[NDArray[np.intp] | int, Array | float],
        seconds: float,
        gap: float = 0.0,
        nodes: int | None = None,
    ) -> Outcome:
        """Least value of Σ weight · unknown."""
        from scipy.optimize import Bounds, LinearConstraint, milp
        from scipy.sparse import coo_array

        cost = np.zeros(len(self.low))
        for number, weight in objective:
            cost[number] += weight
        if not self.low:
            return _nothing_to_choose(self)
        lengths = [len(numbers) for numbers, _ in self.rows]
        place = (
            (
                np.repeat(np.arange(len(self.rows)), lengths),
                np.concatenate([numbers for numbers, _ in self.rows]).astype(int),
            )
            if self.rows
            else (np.zeros(0, int), np.zeros(0, int))
        )
        weights = np.concatenate([w for _, w in self.rows]) if self.rows else np.zeros(0)
        matrix = coo_array((weights, place), shape=(len(self.rows), len(self.low)))
        options: dict[str, float | int] = {"time_limit": max(seconds, 0.05), "mip_rel_gap": gap}
        if nodes is not None:
            options["node_limit"] = nodes

        def run() -> Any:
            return milp(
                cost,
                integrality=np.array(self.whole, int),
                bounds=Bounds(np.array(self.low), np.array(self.high)),
                constraints=LinearConstraint(matrix.tocsr(), self.row_low, self.row_high),
                options=options,
            )

        with silenced_stdout():
            result = run()
            if result.status == 2:
                # Its presolve calls some possible programmes infeasible (seen with HiGHS in scipy
                # 1.17 on rows that a solution meets to the last digit): ask again without.
                options["presolve"] = False
                result = run()
        return _outcome(
            result.status, result.x, result.fun, getattr(result, "mip_dual_bound", None)
        )


def _nothing_to_choose(programme: Programme) -> Outcome:
    """Without unknowns every row reads low ≤ 0 ≤ high."""
    possible = all(
        low <= 1e-9 and high >= -1e-9
        for low, high in zip(programme.row_low, programme.row_high, strict=True)
    )
    if possible:
        return Outcome(Status.OPTIMAL, np.zeros(0), 0.0, 0.0)
    return Outcome(Status.INFEASIBLE, None, np.inf, np.inf)


def _outcome(status: int, x: Array | None, value: float | None, bound: float | None) -> Outcome:
    """Scipy's answer: 0 optimal, 1 limit reached (perhaps with a solution), 2 infeasible."""
    known = -np.inf if bound is None else float(bound)
    if status == 0 and x is not None and value is not None:
        return Outcome(Status.OPTIMAL, np.asarray(x), float(value), known)
    if status == 2:
        return Outcome(Status.INFEASIBLE, None, np.inf, np.inf)
    if x is None or value is None:
        return Outcome(Status.TIME_LIMIT, None, np.inf, known)
    return Outcome(Status.TIME_LIMIT, np.asarray(x), float(value), known)
