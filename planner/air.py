"""The air in the room: speed of sound and attenuation (ISO 9613-1)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

REFERENCE_PRESSURE_KPA = 101.325
"""p_r of ISO 9613-1. [kPa]"""

REFERENCE_TEMPERATURE = 293.15
"""T_0 of ISO 9613-1. [K]"""


@dataclass(frozen=True, slots=True)
class Air:
    """State of the air in a room."""

    temperature_c: float = 20.0
    """[°C]"""
    humidity_percent: float = 50.0
    """Relative humidity. [%]"""
    pressure_kpa: float = REFERENCE_PRESSURE_KPA
    """[kPa]"""


def speed_of_sound(temperature_c: ArrayLike) -> NDArray[np.float64]:
    """Speed of sound in air.

    Parameters
    ----------
    temperature_c
        Air temperature, any shape; valid from −20 to 50 °C. [°C]

    Returns
    -------
    speed
        343.2 · sqrt(T / 293.15 K), same shape. [m/s]

    References
    ----------
    .. [1] ISO 9613-1:1993, formula (A.5).
    """
    kelvin = np.asarray(temperature_c, float) + 273.15
    speed: NDArray[np.float64] = 343.2 * np.sqrt(kelvin / REFERENCE_TEMPERATURE)
    return speed


def attenuation_db_per_m(
    frequency: ArrayLike,
    temperature_c: ArrayLike = 20.0,
    humidity_percent: ArrayLike = 50.0,
    pressure_kpa: ArrayLike = REFERENCE_PRESSURE_KPA,
) -> NDArray[np.float64]:
    """Pure-tone attenuation of sound by the atmosphere.

    Parameters
    ----------
    frequency
        Exact frequencies, shape ``(band,)``: use `planner.bands.exact_midband` for bands. [Hz]
    temperature_c, humidity_percent, pressure_kpa
        State of the air; arrays broadcast against `frequency`, so give them a trailing axis of
        length one. [°C], [%], [kPa]

    Returns
    -------
    attenuation
        Shape of the broadcast inputs. Stated accuracy ±10 % for 0.05–5 % molar water vapour,
        −20 to 50 °C, under 200 kPa. [dB/m]

    References
    ----------
    .. [1] ISO 9613-1:1993, formulas (3) to (5) and annex B.
    """
    f = np.asarray(frequency, float)
    kelvin = np.asarray(temperature_c, float) + 273.15
    theta = kelvin / REFERENCE_TEMPERATURE
    pressure = np.asarray(pressure_kpa, float) / REFERENCE_PRESSURE_KPA
    saturation = 10.0 ** (-6.8346 * (273.16 / kelvin) ** 1.261 + 4.6151)
    h = np.asarray(humidity_percent, float) * saturation / pressure  # molar concentration, %
    oxygen = pressure * (24.0 + 4.04e4 * h * (0.02 + h) / (0.391 + h))
    nitrogen = (
        pressure * theta**-0.5 * (9.0 + 280.0 * h * np.exp(-4.170 * (theta ** (-1.0 / 3.0) - 1.0)))
    )
    classical = 1.84e-11 / pressure * np.sqrt(theta)
    relaxation = theta**-2.5 * (
        0.01275 * np.exp(-2239.1 / kelvin) / (oxygen + f**2 / oxygen)
        + 0.1068 * np.exp(-3352.0 / kelvin) / (nitrogen + f**2 / nitrogen)
    )
    attenuation: NDArray[np.float64] = 8.686 * f**2 * (classical + relaxation)
    return attenuation


def energy_attenuation(
    frequency: ArrayLike,
    temperature_c: ArrayLike = 20.0,
    humidity_percent: ArrayLike = 50.0,
    pressure_kpa: ArrayLike = REFERENCE_PRESSURE_KPA,
) -> NDArray[np.float64]:
    """Energy attenuation coefficient m of the ``4 m V`` term, attenuation / (10 lg e). [1/m].

    Arguments and shape as `attenuation_db_per_m`; relation from ISO 354:2003, 8.1.2.1.
    """
    db = attenuation_db_per_m(frequency, temperature_c, humidity_percent, pressure_kpa)
    m: NDArray[np.float64] = db / (10.0 * np.log10(np.e))
    return m
