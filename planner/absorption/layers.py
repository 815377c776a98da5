"""What stands before a rigid wall, layer by layer: surface impedance and absorption.

The impedance is carried from the wall to the front through each layer, for every frequency and angle
of incidence at once; random incidence is its average after Paris.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.absorption.porous import (
    DENSITY,
    IMPEDANCE,
    SPEED,
    VISCOSITY,
    Complex,
    Medium,
    air_medium,
    delany_bazley,
    johnson_champoux_allard,
    miki,
)

Array = NDArray[np.float64]

ANGLES = 48
"""Nodes of the integral over the angle of incidence."""
FIELD_DEG = 78.0
"""Largest angle of field incidence; usual, from memory. [°]"""


class Layer(Protocol):
    """Something that turns the impedance behind it into the impedance before it."""

    def before(self, behind: Complex | None, frequency: Array, angle: Array) -> Complex:
        """Impedance at its front.

        Parameters
        ----------
        behind
            Impedance at its back, shape ``(frequency, angle)``; None for a rigid wall. [Pa s/m]
        frequency, angle
            Shapes ``(frequency,)`` and ``(angle,)``. [Hz], [rad]
        """


@dataclass(frozen=True, slots=True)
class Porous:
    """A porous layer."""

    thickness: float
    """[m]"""
    flow_resistivity: float
    """[Pa s/m²]"""
    model: str = "miki"
    """``miki``, ``delany-bazley`` or ``jca``."""
    porosity: float = 0.97
    tortuosity: float = 1.0
    viscous_length: float = 80e-6
    """[m]"""
    thermal_length: float = 160e-6
    """[m]"""
    local: bool = False
    """Locally reacting: sound runs straight through whatever its angle."""

    def medium(self, frequency: Array) -> Medium:
        """Impedance and wavenumber of the material."""
        if self.model == "delany-bazley":
            return delany_bazley(frequency, self.flow_resistivity)
        if self.model == "miki":
            return miki(frequency, self.flow_resistivity)
        return johnson_champoux_allard(
            frequency,
            self.flow_resistivity,
            porosity=self.porosity,
            tortuosity=self.tortuosity,
            viscous_length=self.viscous_length,
            thermal_length=self.thermal_length,
        )

    def before(self, behind: Complex | None, frequency: Array, angle: Array) -> Complex:
        """See `Layer.before`."""
        return _through(
            self.medium(frequency), self.thickness, self.local, behind, frequency, angle
        )


@dataclass(frozen=True, slots=True)
class AirGap:
    """Air, undivided or divided by battens so that it reacts locally."""

    thickness: float
    """[m]"""
    local: bool = False

    def before(self, behind: Complex | None, frequency: Array, angle: Array) -> Complex:
        """See `Layer.before`."""
        return _through(air_medium(frequency), self.thickness, self.local, behind, frequency, angle)


@dataclass(frozen=True, slots=True)
class Sheet:
    """A thin sheet: a mass that resists, in series with what is behind it."""

    mass: Array | float
    """Moving mass, shape ``(frequency,)`` or a number. [kg/m²]"""
    resistance: Array | float
    """[Pa s/m], shape ``(frequency,)`` or a number"""

    def before(self, behind: Complex | None, frequency: Array, angle: Array) -> Complex:
        """See `Layer.before`; right at a rigid wall a sheet cannot move."""
        own = np.asarray(self.resistance) + 2j * np.pi * frequency * self.mass
        wall = np.full((len(frequency), len(angle)), np.inf + 0j) if behind is None else behind
        before: Complex = wall + own[:, None]
        return before


def perforated(
    thickness: float, hole: float, open_area: float, frequency: ArrayLike = (500.0,)
) -> Sheet:
    """A sheet with round holes as a resisting mass.

    Parameters
    ----------
    thickness, hole
        Of the sheet, and diameter of a hole. [m]
    open_area
        Share of holes. [-]
    frequency
        Where the resistance is worked out, shape ``(frequency,)``. [Hz]

    Notes
    -----
    m = ρ (t + 2 δ a) / ε with δ = 0.8 (1 − 1.47 √ε + 0.47 √ε³) and the viscous resistance
    (ρ/ε) √(8 ν ω) (1 + t/2a); both from memory of Cox and D'Antonio, (7.4)–(7.10).
    """
    radius = hole / 2.0
    end = 0.8 * (1.0 - 1.47 * np.sqrt(open_area) + 0.47 * np.sqrt(open_area**3))
    mass = DENSITY * (thickness + 2.0 * end * radius) / open_area
    return Sheet(float(mass), _viscous(thickness, radius, open_area, frequency))


def slotted(
    thickness: float, slot: float, open_area: float, frequency: ArrayLike = (500.0,)
) -> Sheet:
    """Slats with slots between them as a resisting mass.

    m = ρ (t + 2 w δ) / ε with δ = −(1/π) ln sin(π ε/2), w the slot's width; the resistance is that
    of holes of the same hydraulic diameter. From memory of Cox and D'Antonio. [m], [-], [Hz]
    """
    end = -np.log(np.sin(np.pi * open_area / 2.0)) / np.pi
    mass = DENSITY * (thickness + 2.0 * slot * end) / open_area
    return Sheet(float(mass), _viscous(thickness, slot, open_area, frequency))


def _viscous(thickness: float, radius: float, open_area: float, frequency: ArrayLike) -> Array:
    omega = 2.0 * np.pi * np.asarray(frequency, float)
    friction = np.sqrt(8.0 * VISCOSITY / DENSITY * omega) * (1.0 + thickness / (2.0 * radius))
    resistance: Array = DENSITY / open_area * friction
    return resistance


def microperforated(thickness: float, hole: float, open_area: float, frequency: ArrayLike) -> Sheet:
    """A sheet with holes so fine that they need no wool behind them, after Maa [1]_.

    Parameters
    ----------
    thickness, hole
        Both under a millimetre. [m]
    open_area
        About 0.5 to 5 %. [-]
    frequency
        Shape ``(frequency,)``. [Hz]

    Notes
    -----
    r = 32 η t k_r / (p d²) with k_r = √(1 + x²/32) + (√2/32) x d/t; m = ρ t k_m / p with
    k_m = 1 + 1/√(1 + x²/2) + 0.85 d/t, x = d √(ω ρ/(4 η)). Constants of 1998, from memory (an older
    form of k_m has 9 + x²/2 under the root).

    References
    ----------
    .. [1] D.-Y. Maa, "Potential of microperforated panel absorber", JASA 104 (1998) 2861.
    """
    omega = 2.0 * np.pi * np.asarray(frequency, float)
    x = hole * np.sqrt(omega * DENSITY / (4.0 * VISCOSITY))
    resisting = np.sqrt(1.0 + x**2 / 32.0) + np.sqrt(2.0) / 32.0 * x * hole / thickness
    resistance = 32.0 * VISCOSITY * thickness / (open_area * hole**2) * resisting
    moving = 1.0 + 1.0 / np.sqrt(1.0 + x**2 / 2.0) + 0.85 * hole / thickness
    return Sheet(DENSITY * thickness * moving / open_area, resistance)


def _through(
    medium: Medium,
    thickness: float,
    local: bool,
    behind: Complex | None,
    frequency: Array,
    angle: Array,
) -> Complex:
    """Impedance before a layer of some thickness, shape ``(frequency, angle)``.

    Bies et al., 5th ed., (D.83) and (D.95).
    """
    k, z = medium.wavenumber[:, None], medium.impedance[:, None]
    k0 = 2.0 * np.pi * frequency[:, None] / SPEED
    sine = np.zeros_like(angle) if local else np.sin(angle)
    normal = np.sqrt(k**2 - (k0 * sine) ** 2 + 0j)
    normal = np.where(normal.imag > 0, -normal, normal)
    oblique = z * k / normal
    phase = normal * thickness
    # Air loses nothing, and the tangent of a real number is several times cheaper.
    tangent = np.tan(phase) if phase.imag.any() else np.tan(phase.real)
    if behind is None:
        return -1j * oblique / tangent
    with np.errstate(invalid="ignore"):
        front = oblique * (behind + 1j * oblique * tangent) / (oblique + 1j * behind * tangent)
    return np.where(np.isinf(behind), -1j * oblique / tangent, front)


def surface_impedance(layers: Sequence[Layer], frequency: ArrayLike, angle: ArrayLike) -> Complex:
    """Impedance at the front of layers before a rigid wall, shape ``(frequency, angle)``.

    Parameters
    ----------
    layers
        From the front to the wall.
    frequency, angle
        Shapes ``(frequency,)`` [Hz] and ``(angle,)`` [rad].
    """
    f, theta = np.asarray(frequency, float), np.asarray(angle, float)
    behind: Complex | None = None
    for layer in reversed(layers):
        behind = layer.before(behind, f, theta)
    if behind is None:
        return np.full((len(f), len(theta)), np.inf + 0j)
    return behind


def absorption_at(layers: Sequence[Layer], frequency: ArrayLike, angle: ArrayLike) -> Array:
    """Absorption coefficient at each frequency and angle, shape ``(frequency, angle)``. [-]."""
    z = surface_impedance(layers, frequency, angle) / IMPEDANCE
    cosine = np.cos(np.asarray(angle, float))
    with np.errstate(invalid="ignore"):
        reflected = np.where(np.isinf(z), 1.0, (z * cosine - 1.0) / (z * cosine + 1.0))
    alpha: Array = np.clip(1.0 - np.abs(reflected) ** 2, 0.0, 1.0)
    return alpha


def normal_incidence(layers: Sequence[Layer], frequency: ArrayLike) -> Array:
    """Absorption at normal incidence, shape ``(frequency,)``. [-]."""
    return absorption_at(layers, frequency, [0.0])[:, 0]


def random_incidence(
    layers: Sequence[Layer], frequency: ArrayLike, *, largest_deg: float = 90.0
) -> Array:
    """Absorption in a diffuse field after Paris, shape ``(frequency,)``. [-].

    ∫ α(θ) sin 2θ dθ / sin²θ_max; 90° is random incidence, 78° field incidence.
    """
    limit = np.radians(largest_deg)
    node, weight = _nodes()
    angle = 0.5 * limit * (node + 1.0)
    alpha = absorption_at(layers, frequency, angle)
    total: Array = 0.5 * limit * (alpha * np.sin(2.0 * angle)) @ weight / np.sin(limit) ** 2
    return total


@cache
def _nodes() -> tuple[Array, Array]:
    """Nodes and weights of the Gauss-Legendre rule of `ANGLES` points."""
    node, weight = np.polynomial.legendre.leggauss(ANGLES)
    return node, weight
