"""Reverberation time of diffuse and not so diffuse rooms: one function per published formula.

Every function takes plain numbers and arrays with bands on the last axis and knows nothing of rooms
or files. With k = 24 ln(10) / c, S the surface area, α̅ the mean coefficient and m the energy
attenuation of the air, they are all of the form T = k V / (a + 4 m V) and differ in a.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

SPEED_OF_SOUND = 343.0
"""Default, air of about 20 °C. [m/s]"""

LARGEST_ALPHA = 0.99
"""Logarithmic formulas take coefficients up to this; laboratory values reach 1.3. [-]"""

PATH_VARIANCE = 0.4
"""Typical relative variance of the free path in Kuttruff's correction. [-]"""


def decay_constant(speed_of_sound: ArrayLike = SPEED_OF_SOUND) -> Array:
    """Constant k = 24 ln(10) / c: 0.161 s/m at 343 m/s. [s/m]."""
    k: Array = 24.0 * np.log(10.0) / np.asarray(speed_of_sound, float)
    return k


def capped(alpha: ArrayLike) -> Array:
    """Coefficients as logarithmic formulas take them: at least 0, at most 0.99. [-]."""
    limited: Array = np.clip(np.asarray(alpha, float), 0.0, LARGEST_ALPHA)
    return limited


def time_from_area(
    volume: ArrayLike, area: ArrayLike, *, air_attenuation: ArrayLike, speed_of_sound: ArrayLike
) -> Array:
    """T = k V / (a + 4 m V) of an effective absorption area a; inf where nothing absorbs. [s]."""
    v = np.asarray(volume, float)
    total = np.asarray(area, float) + 4.0 * np.asarray(air_attenuation, float) * v
    with np.errstate(divide="ignore"):
        time: Array = decay_constant(speed_of_sound) * v / np.maximum(total, 0.0)
    return time


def decaying_area(
    volume: ArrayLike, time: ArrayLike, *, speed_of_sound: ArrayLike = SPEED_OF_SOUND
) -> Array:
    """K V / T: the effective absorption area, the air's included, behind a reverberation time.

    inf where the time is 0, 0 where it is infinite. [m²]
    """
    with np.errstate(divide="ignore"):
        area: Array = (
            decay_constant(speed_of_sound) * np.asarray(volume, float) / np.asarray(time, float)
        )
    return area


def area_from_time(
    formula: str,
    time: ArrayLike,
    volume: ArrayLike,
    surface_area: ArrayLike,
    *,
    air_attenuation: ArrayLike,
    speed_of_sound: ArrayLike,
) -> Array:
    """Absorption area of the surfaces behind a reverberation time: `sabine` or `eyring` turned round.

    Parameters
    ----------
    formula
        ``sabine`` or ``eyring``; the latter counts coefficients up to 0.99.
    time
        Shape ``(..., band)``. [s]
    volume, surface_area
        Of the room. [m³], [m²]
    air_attenuation, speed_of_sound
        As `sabine`.

    Returns
    -------
    area
        Shape of `time`: k V / T − 4 m V, or S (1 − exp(−(k V / T − 4 m V) / S)). Negative where the
        time is longer than the air alone would allow; not capped; NaN where the time is. [m²]
    """
    v, s = np.asarray(volume, float), np.asarray(surface_area, float)
    needed = decaying_area(v, time, speed_of_sound=speed_of_sound)
    needed = needed - 4.0 * np.asarray(air_attenuation, float) * v
    if formula == "sabine":
        return np.asarray(needed, float)
    with np.errstate(over="ignore"):
        area: Array = -s * np.expm1(-needed / s)
    return area


def sabine(
    volume: ArrayLike,
    absorption_area: ArrayLike,
    *,
    air_attenuation: ArrayLike = 0.0,
    speed_of_sound: ArrayLike = SPEED_OF_SOUND,
) -> Array:
    """Reverberation time of a diffuse room after Sabine [1]_.

    Parameters
    ----------
    volume
        Room volume. [m³]
    absorption_area
        Equivalent absorption area, shape ``(..., band)``; coefficients above 1 are used as they
        are, which is how they were derived. [m²]
    air_attenuation
        Energy attenuation of air, scalar or ``(band,)``. [1/m]
    speed_of_sound
        [m/s]

    Returns
    -------
    reverberation_time
        Shape ``(..., band)``; inf without absorption. [s]

    Notes
    -----
    T = k V / (A + 4 m V). Best for mean coefficients under about 0.2, evenly spread, above the
    Schroeder frequency.

    References
    ----------
    .. [1] W. C. Sabine, *Collected Papers on Acoustics*. Harvard Univ. Press, 1922.

    Examples
    --------
    >>> sabine(60.0, [9.4]).round(2)
    array([1.03])
    """
    return time_from_area(
        volume, absorption_area, air_attenuation=air_attenuation, speed_of_sound=speed_of_sound
    )


def eyring(
    volume: ArrayLike,
    surface_area: ArrayLike,
    mean_alpha: ArrayLike,
    *,
    air_attenuation: ArrayLike = 0.0,
    speed_of_sound: ArrayLike = SPEED_OF_SOUND,
) -> Array:
    """Reverberation time of a diffuse room after Eyring [1]_.

    Parameters
    ----------
    volume, surface_area
        [m³], [m²]
    mean_alpha
        Absorption area over surface area, shape ``(..., band)``; capped at 0.99. [-]
    air_attenuation, speed_of_sound
        As `sabine`.

    Returns
    -------
    reverberation_time
        Never above Sabine's for the same coefficients. [s]

    Notes
    -----
    T = k V / (−S ln(1 − α̅) + 4 m V).

    References
    ----------
    .. [1] C. F. Eyring, "Reverberation time in 'dead' rooms", J. Acoust. Soc. Am. 1 (1930) 217.
    """
    exponent = -np.log1p(-capped(mean_alpha))
    return time_from_area(
        volume,
        np.asarray(surface_area, float) * exponent,
        air_attenuation=air_attenuation,
        speed_of_sound=speed_of_sound,
    )


def millington_sette(
    volume: ArrayLike,
    area: ArrayLike,
    alpha: ArrayLike,
    *,
    further_area: ArrayLike = 0.0,
    air_attenuation: ArrayLike = 0.0,
    speed_of_sound: ArrayLike = SPEED_OF_SOUND,
) -> Array:
    """Reverberation time after Millington and Sette [1]_: each surface weighed by itself.

    Parameters
    ----------
    volume
        [m³]
    area
        Of each part, shape ``(..., part)``. [m²]
    alpha
        Of each part, shape ``(..., part, band)``; capped at 0.99. [-]
    further_area
        Absorption area of what is no surface (furnishings), shape ``(..., band)``. [m²]
    air_attenuation, speed_of_sound
        As `sabine`.

    Returns
    -------
    reverberation_time
        Shape ``(..., band)``. [s]

    Notes
    -----
    T = k V / (−Σ Sᵢ ln(1 − αᵢ) + 4 m V). One surface near α = 1 drives the time towards zero,
    which no room does: read it as a lower bound.

    References
    ----------
    .. [1] G. Millington, J. Acoust. Soc. Am. 4 (1932) 69; W. J. Sette, ibid. 193.
    """
    exponents = -np.log1p(-capped(alpha))
    total: Array = np.einsum("...p,...pb->...b", np.asarray(area, float), exponents)
    return time_from_area(
        volume,
        total + np.asarray(further_area, float),
        air_attenuation=air_attenuation,
        speed_of_sound=speed_of_sound,
    )


def kuttruff(
    volume: ArrayLike,
    surface_area: ArrayLike,
    mean_alpha: ArrayLike,
    *,
    path_variance: ArrayLike = PATH_VARIANCE,
    unevenness: ArrayLike = 0.0,
    air_attenuation: ArrayLike = 0.0,
    speed_of_sound: ArrayLike = SPEED_OF_SOUND,
) -> Array:
    """Eyring's reverberation time with Kuttruff's corrections [1]_.

    Parameters
    ----------
    volume, surface_area, mean_alpha, air_attenuation, speed_of_sound
        As `eyring`.
    path_variance
        Relative variance γ² of the free path; 0.34 for a cube, 0.4 for most rooms. [-]
    unevenness
        `uneven_absorption` of the room, shape ``(..., band)``. [-]

    Returns
    -------
    reverberation_time
        [s]

    Notes
    -----
    a = S · {−ln(1 − α̅) [1 + (γ²/2) ln(1 − α̅)] + unevenness}. Both corrections are from memory of
    the book. The bracket falls under zero for α̅ near 1, far beyond what a series to second order
    can say; it is kept at 0.5 or more.

    References
    ----------
    .. [1] H. Kuttruff, *Room Acoustics*, chapter 5.
    """
    exponent = -np.log1p(-capped(mean_alpha))
    bracket = np.maximum(1.0 - 0.5 * np.asarray(path_variance, float) * exponent, 0.5)
    return time_from_area(
        volume,
        np.asarray(surface_area, float) * (exponent * bracket + np.asarray(unevenness, float)),
        air_attenuation=air_attenuation,
        speed_of_sound=speed_of_sound,
    )


def uneven_absorption(area: ArrayLike, alpha: ArrayLike) -> Array:
    """What an uneven spread of absorption adds to Eyring's exponent, after Kuttruff [1]_.

    Parameters
    ----------
    area
        Of each part, shape ``(..., part)``. [m²]
    alpha
        Of each part, shape ``(..., part, band)``; capped at 0.99. [-]

    Returns
    -------
    unevenness
        ln(1 + Σ ρₙ (ρₙ − ρ̅) Sₙ² / ((ρ̅ S)² − Σ ρₙ² Sₙ²)) with ρ = 1 − α, shape ``(..., band)``;
        0 for uniform coefficients. For parts that are each small against the whole; from memory of
        the book. [-]

    References
    ----------
    .. [1] H. Kuttruff, *Room Acoustics*, chapter 5.
    """
    s = np.asarray(area, float)[..., None]
    rho = 1.0 - capped(alpha)
    total = np.sum(s, axis=-2, keepdims=True)
    mean = np.sum(rho * s, axis=-2, keepdims=True) / total
    numerator = np.sum(rho * (rho - mean) * s**2, axis=-2)
    denominator = np.sum(rho * s, axis=-2) ** 2 - np.sum(rho**2 * s**2, axis=-2)
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.where(denominator > 0, numerator / denominator, 0.0)
    unevenness: Array = np.log1p(np.clip(ratio, -0.5, 1.0))
    return unevenness


def axis_shares(
    area: ArrayLike, normal: ArrayLike, alpha: ArrayLike, *, further_area: ArrayLike = 0.0
) -> tuple[Array, Array]:
    """Surface and mean coefficient seen along each of the three axes.

    Parameters
    ----------
    area
        Of each part, shape ``(..., part)``. [m²]
    normal
        Unit normals, shape ``(part, 3)``.
    alpha
        Shape ``(..., part, band)``; capped at 0.99. [-]
    further_area
        Absorption area of what is no surface, shared out evenly over all surface. [m²]

    Returns
    -------
    axis_area
        Shape ``(..., 3)``; the three add up to the whole surface. [m²]
    axis_alpha
        Shape ``(..., 3, band)``. [-]

    Notes
    -----
    Fitzroy and Arau-Puchades take a rectangular room. For other footprints a part counts for an
    axis with the square of its normal's component along it: squares add up to one, so that no
    surface is counted twice, a wall along an axis counts for that axis alone (the rectangle is
    unchanged), and a wall at 45° counts half for each. This extension is ours.
    """
    weights = np.asarray(normal, float) ** 2
    s = np.asarray(area, float)
    axis_area = s @ weights
    absorbed = np.einsum("...p,pj,...pb->...jb", s, weights, capped(alpha))
    spread = np.asarray(further_area, float) / np.sum(s, axis=-1)[..., None]
    with np.errstate(divide="ignore", invalid="ignore"):
        mean = np.where(axis_area[..., None] > 0, absorbed / axis_area[..., None], 0.0)
    return axis_area, mean + spread[..., None, :]


def _axial_times(
    volume: ArrayLike,
    axis_area: ArrayLike,
    axis_alpha: ArrayLike,
    air_attenuation: ArrayLike,
    speed_of_sound: ArrayLike,
) -> tuple[Array, Array]:
    """Weight of each axis ``(..., 3, 1)`` and the Eyring time it would give ``(..., 3, band)``."""
    areas = np.asarray(axis_area, float)[..., None]
    surface = np.sum(areas, axis=-2, keepdims=True)
    times = eyring(
        volume,
        surface,
        axis_alpha,
        air_attenuation=air_attenuation,
        speed_of_sound=speed_of_sound,
    )
    return areas / surface, times


def fitzroy(
    volume: ArrayLike,
    axis_area: ArrayLike,
    axis_alpha: ArrayLike,
    *,
    air_attenuation: ArrayLike = 0.0,
    speed_of_sound: ArrayLike = SPEED_OF_SOUND,
) -> Array:
    """Reverberation time after Fitzroy [1]_: the area mean of the three axial Eyring times.

    Parameters
    ----------
    volume
        [m³]
    axis_area, axis_alpha
        Area of the pair of walls facing each other along each axis, shape ``(..., 3)``, and their
        mean coefficient, shape ``(..., 3, band)``: see `axis_shares`. [m²], [-]
    air_attenuation, speed_of_sound
        As `sabine`.

    Returns
    -------
    reverberation_time
        Long where one pair of walls is hard. [s]

    References
    ----------
    .. [1] D. Fitzroy, J. Acoust. Soc. Am. 31 (1959) 893.
    """
    weight, times = _axial_times(volume, axis_area, axis_alpha, air_attenuation, speed_of_sound)
    with np.errstate(invalid="ignore"):
        mean: Array = np.sum(np.where(weight > 0, weight * times, 0.0), axis=-2)
    return mean


def arau_puchades(
    volume: ArrayLike,
    axis_area: ArrayLike,
    axis_alpha: ArrayLike,
    *,
    air_attenuation: ArrayLike = 0.0,
    speed_of_sound: ArrayLike = SPEED_OF_SOUND,
) -> Array:
    """Reverberation time after Arau-Puchades [1]_: the geometric mean of the axial Eyring times.

    Parameters and shapes as `fitzroy`, which it never exceeds.

    References
    ----------
    .. [1] H. Arau-Puchades, "An improved reverberation formula", Acustica 65 (1988) 163.
    """
    weight, times = _axial_times(volume, axis_area, axis_alpha, air_attenuation, speed_of_sound)
    with np.errstate(divide="ignore", invalid="ignore"):
        logs = np.where(weight > 0, weight * np.log(times), 0.0)
    mean: Array = np.exp(np.sum(logs, axis=-2))
    return mean


def hard_object_area(volume: ArrayLike) -> Array:
    """Absorption area of a hard irregular object, V^(2/3) (EN 12354-6:2003, formula 4). [m²]."""
    area: Array = np.asarray(volume, float) ** (2.0 / 3.0)
    return area


def schroeder_frequency(reverberation_time: ArrayLike, volume: ArrayLike) -> Array:
    """Frequency above which modes overlap enough for statistics, 2000 sqrt(T / V) [1]_. [Hz].

    References
    ----------
    .. [1] H. Kuttruff, *Room Acoustics*, formula (3.44).
    """
    frequency: Array = 2000.0 * np.sqrt(
        np.asarray(reverberation_time, float) / np.asarray(volume, float)
    )
    return frequency
