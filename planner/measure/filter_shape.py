"""The shape of octave and one-third-octave filters (IEC 61260-1:2014, class 1)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.bands import OCTAVES, THIRDS, band_edges, bandwidth, exact_midband
from planner.errors import InputError

NYQUIST_ROOM = 0.95
"""Largest upper band edge that is offered, as a part of the Nyquist frequency. [-]"""

TAPER = (5.4, 7.0)
"""The skirt is faded out between these detunings q: from 44 dB down to nothing (class 1 asks for
40.5 dB at q = 5.3), without the ringing of a hard cut. [-]"""


@dataclass(frozen=True, slots=True)
class Bands:
    """Which bands: nominal midbands and bandwidth designator (1: octaves, 3: one-third octaves)."""

    nominal: tuple[float, ...]
    """Nominal midband frequencies, ascending. [Hz]"""
    fraction: int = 1
    """1 for octaves, 3 for one-third octaves. [-]"""

    def __len__(self) -> int:
        return len(self.nominal)

    @property
    def exact(self) -> NDArray[np.float64]:
        """Exact midband frequencies, shape ``(band,)``. [Hz]."""
        return exact_midband(self.nominal, fraction=self.fraction)

    @property
    def width(self) -> NDArray[np.float64]:
        """Width between the band edges, shape ``(band,)``. [Hz]."""
        return bandwidth(self.nominal, fraction=self.fraction)

    @property
    def statistical_width(self) -> NDArray[np.float64]:
        """Independent complex samples of noise in the band a second, shape ``(band,)``. [1/s].

        (∫|H|²)²/∫|H|⁴ of the third-order Butterworth shape: 0.4 π times the width.
        """
        return 0.4 * np.pi * self.width

    def offered(self, rate: float) -> Bands:
        """The bands whose upper edge lies under 0.95 of the Nyquist frequency of `rate` [Hz]."""
        _, high = band_edges(self.nominal, fraction=self.fraction)
        fits = high <= NYQUIST_ROOM * rate / 2.0
        return Bands(
            tuple(f for f, fit in zip(self.nominal, fits, strict=True) if fit), self.fraction
        )


OCTAVE_BANDS = Bands(tuple(map(float, OCTAVES)), 1)
"""63 Hz to 8 kHz."""
ALL_OCTAVE_BANDS = Bands((31.5, *map(float, OCTAVES), 16000.0), 1)
"""With 31.5 Hz and 16 kHz."""
THIRD_BANDS = Bands(tuple(map(float, THIRDS)), 3)
"""50 Hz to 10 kHz."""


def check_bands(bands: Bands, rate: float) -> None:
    """Refuse bands that a sampling rate [Hz] cannot carry."""
    offered = bands.offered(rate).nominal
    missing = [f for f in bands.nominal if f not in offered]
    if missing:
        raise InputError(
            f"the {missing[0]:g} Hz band reaches above the {rate / 2:g} Hz that a rate of "
            f"{rate:g} Hz can carry",
            cure="Record at a higher sampling rate or leave the band out.",
        )
    if not len(bands):
        raise InputError("no band to evaluate", cure=f"At {rate:g} Hz choose lower bands.")


def detuning(frequency: ArrayLike, nominal: float, *, fraction: int = 1) -> NDArray[np.float64]:
    """Distance from the midband, q = (f/f_m − f_m/f)/((f_2 − f_1)/f_m); ±1 at the edges. [-]."""
    middle = float(exact_midband(nominal, fraction=fraction))
    relative = float(bandwidth(nominal, fraction=fraction)) / middle
    ratio = np.asarray(frequency, float) / middle
    q: NDArray[np.float64] = (ratio - 1.0 / ratio) / relative
    return q


def decay_widening(resolved: float) -> float:
    """How much wider, statistically, a band is for a decay than for steady noise. [-].

    Parameters
    ----------
    resolved
        B·T, bandwidth times reverberation time.

    Notes
    -----
    A decay e^(−2δt) seen through a time-reversed filter H(jω) fluctuates like steady noise through
    H(jω + δ): its poles lie farther from the axis. (∫|H|²)²/∫|H|⁴ of the third-order shape then
    grows by 1 + 0.19 ε + 0.23 ε² with ε = δ/(πB) = 2.2/(B·T), within 0.5 % for B·T > 3.
    """
    epsilon = 1.5 * np.log(100.0) / np.pi / max(resolved, 1.0)
    return float(1.0 + 0.19 * epsilon + 0.23 * epsilon**2)


def support(nominal: float, *, fraction: int = 1) -> tuple[float, float]:
    """Frequencies between which a response is not zero. [Hz]."""
    middle = float(exact_midband(nominal, fraction=fraction))
    half = 0.5 * TAPER[1] * float(bandwidth(nominal, fraction=fraction)) / middle
    upper = half + np.sqrt(half**2 + 1.0)
    return middle / upper, middle * upper


def band_response(
    frequency: ArrayLike,
    nominal: float,
    *,
    fraction: int = 1,
    nyquist: float = np.inf,
    reverse: bool = True,
) -> NDArray[np.complex128]:
    """Complex response of one band filter.

    Parameters
    ----------
    frequency
        Above 0, any shape. [Hz]
    nominal
        Nominal midband frequency. [Hz]
    fraction
        1 for octaves, 3 for one-third octaves.
    nyquist
        Half the sampling rate; the response fades out above the band edge before it. [Hz]
    reverse
        Time-reversed (default) or forward.

    Returns
    -------
    response
        H = 1/((1 + jq)(1 − q² + jq)), faded out where it is 44 dB down. [-]

    References
    ----------
    .. [1] S. Butterworth, "On the theory of filter amplifiers", Experimental Wireless 7 (1930).
    .. [2] IEC 61260-1:2014, 5.10: limits on relative attenuation.
    """
    f = np.asarray(frequency, float)
    q = detuning(f, nominal, fraction=fraction)
    response = np.asarray(1.0 / ((1.0 + 1j * q) * (1.0 - q**2 + 1j * q)), np.complex128)
    response *= _fade(np.abs(q), *TAPER)
    if np.isfinite(nyquist):
        edge = float(band_edges(nominal, fraction=fraction)[1])
        response *= _fade(f, max(edge, 0.9 * nyquist), nyquist)
    return response.conj() if reverse else response


def _fade(x: NDArray[np.float64], start: float, end: float) -> NDArray[np.float64]:
    """1 up to `start`, a quarter of a cosine down to 0 at `end`."""
    part = np.clip((x - start) / (end - start), 0.0, 1.0)
    faded: NDArray[np.float64] = np.cos(0.5 * np.pi * part) * (x < end)
    return faded
