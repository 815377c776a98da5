"""Porous layers: characteristic impedance and propagation constant by three published models.

Convention exp(+jωt): a wave that decays has k with a negative imaginary part.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

Complex = NDArray[np.complex128]

DENSITY = 1.205
"""Of air, as the models were published with. [kg/m³]"""
SPEED = 343.0
"""Of sound, likewise. [m/s]"""
VISCOSITY = 1.84e-5
"""Of air. [Pa s]"""
PRANDTL = 0.71
GAMMA = 1.4
"""Ratio of specific heats of air. [-]"""
PRESSURE = 101_325.0
"""[Pa]"""
IMPEDANCE = DENSITY * SPEED
"""Of air, ρ c. [Pa s/m]"""


@dataclass(frozen=True, slots=True)
class Medium:
    """A material that sound travels in, at some frequencies."""

    impedance: Complex
    """Characteristic impedance, shape ``(frequency,)``. [Pa s/m]"""
    wavenumber: Complex
    """Shape ``(frequency,)``. [1/m]"""


def air_medium(frequency: ArrayLike) -> Medium:
    """Air without losses."""
    f = np.asarray(frequency, float)
    return Medium(
        np.full(f.shape, IMPEDANCE, complex), np.asarray(2.0 * np.pi * f / SPEED, complex)
    )


def delany_bazley(frequency: ArrayLike, flow_resistivity: float) -> Medium:
    """Fibrous material of porosity near 1 after Delany and Bazley [1]_.

    Parameters
    ----------
    frequency
        Shape ``(frequency,)``. [Hz]
    flow_resistivity
        σ. [Pa s/m²]

    Notes
    -----
    Fitted for 0.01 < X < 1, X = ρ f / σ; outside it may even turn active: see `fitted_range`.

    References
    ----------
    .. [1] M. E. Delany and E. N. Bazley, Applied Acoustics 3 (1970) 105; coefficients as in Bies
       et al., 5th ed., table D.1.
    """
    f = np.asarray(frequency, float)
    x = DENSITY * f / flow_resistivity
    z = IMPEDANCE * (1.0 + 0.0571 * x**-0.754 - 0.087j * x**-0.732)
    k = 2.0 * np.pi * f / SPEED * (1.0 + 0.0978 * x**-0.700 - 0.189j * x**-0.595)
    return Medium(np.asarray(z, complex), np.asarray(k, complex))


def miki(frequency: ArrayLike, flow_resistivity: float) -> Medium:
    """Fibrous material after Miki [1]_: the same data, refitted so that it stays passive below.

    Parameters as `delany_bazley`; fitted for 0.01 < f/σ < 1 (SI).

    References
    ----------
    .. [1] Y. Miki, J. Acoust. Soc. Jpn. (E) 11 (1990) 19.
    """
    f = np.asarray(frequency, float)
    y = f / flow_resistivity
    z = IMPEDANCE * (1.0 + 0.070 * y**-0.632 - 0.107j * y**-0.632)
    k = 2.0 * np.pi * f / SPEED * (1.0 + 0.109 * y**-0.618 - 0.160j * y**-0.618)
    return Medium(np.asarray(z, complex), np.asarray(k, complex))


def johnson_champoux_allard(
    frequency: ArrayLike,
    flow_resistivity: float,
    *,
    porosity: float,
    tortuosity: float,
    viscous_length: float,
    thermal_length: float,
) -> Medium:
    """Rigid-framed porous material by five parameters [1]_.

    Parameters
    ----------
    frequency, flow_resistivity
        [Hz], [Pa s/m²]
    porosity, tortuosity
        φ and T. [-]
    viscous_length, thermal_length
        Λ and Λ'. [m]

    References
    ----------
    .. [1] T. J. Cox and P. D'Antonio, *Acoustic Absorbers and Diffusers*, (6.19) and (6.20).
    """
    omega = 2.0 * np.pi * np.asarray(frequency, float)
    drag = flow_resistivity * porosity / (1j * omega * DENSITY * tortuosity)
    shape = 4j * tortuosity**2 * VISCOSITY * DENSITY * omega
    root = np.sqrt(1.0 + shape / (flow_resistivity * viscous_length * porosity) ** 2)
    density = tortuosity * DENSITY / porosity * (1.0 + drag * root)
    heat = 8.0 * VISCOSITY / (1j * thermal_length**2 * PRANDTL * omega * DENSITY)
    thermal = np.sqrt(1.0 + 1j * omega * DENSITY * PRANDTL * thermal_length**2 / (16.0 * VISCOSITY))
    modulus = GAMMA * PRESSURE / porosity / (GAMMA - (GAMMA - 1.0) / (1.0 + heat * thermal))
    z: Complex = np.asarray(np.sqrt(density * modulus), complex)
    k: Complex = np.asarray(omega * np.sqrt(density / modulus), complex)
    return Medium(np.asarray(z, complex), np.asarray(k, complex))


def fitted_range(model: str, flow_resistivity: float) -> tuple[float, float]:
    """Frequencies between which the fit behind a model holds. [Hz].

    0.01 < ρ f/σ < 1 for Delany and Bazley, 0.01 < f/σ < 1 (SI) for Miki, whose curve stays passive and
    smooth below; no limit for five parameters.
    """
    if model == "jca":
        return 0.0, float("inf")
    unit = flow_resistivity / (DENSITY if model == "delany-bazley" else 1.0)
    return 0.01 * unit, unit
