"""The ray tracer against Eyring with Kuttruff's free-path correction, and its own reproducibility."""

import numpy as np
import pytest

from planner.predict.simulation import BIN_S, decay_time, simulate_room
from planner.room.files import parse_room
from planner.room.surfaces import room_surfaces

BANDS = (63, 125, 250, 500, 1000, 2000, 4000, 8000)
RECTANGLE = "length = 5.2\nwidth = 3.9"
L_SHAPE = "footprint = [[0,0],[6,0],[6,2.5],[4,2.5],[4,4],[0,4]]"


def uniform(alpha, shape=RECTANGLE):
    values = ", ".join(f"{hz} = {alpha}" for hz in BANDS)
    return parse_room(
        f'name = "x"\n[shape]\n{shape}\nheight = 2.6\n[surfaces]\nfloor = "u"\nceiling = "u"\n'
        f'walls = "u"\n[[material]]\nid = "u"\nalpha = {{ {values} }}\n'
    )


def corrected_eyring(volume, surface, alpha, m):
    """Kuttruff, Room Acoustics, ch. 5 (from memory), γ² = 0.4, written out here."""
    exponent = -np.log(1 - alpha)
    exponent *= 1 - 0.2 * exponent
    return 24 * np.log(10) / 343.2 * volume / (surface * exponent + 4 * m * volume)


@pytest.mark.parametrize(
    ("shape", "volume", "surface"),
    [(RECTANGLE, 5.2 * 3.9 * 2.6, 87.88), (L_SHAPE, 21 * 2.6, 2 * 21 + 20 * 2.6)],
)
@pytest.mark.parametrize("alpha", [0.05, 0.15, 0.3])
def test_uniform_rooms_follow_the_corrected_formula(alpha, shape, volume, surface):
    """Within 4 % with high scattering; air of 20 °C and 50 %: ISO 9613-1 energy attenuation per band."""
    m = np.array([2.9e-5, 1.10e-4, 3.15e-4, 6.28e-4, 1.074e-3, 2.27e-3, 6.76e-3, 2.393e-2])
    room = uniform(alpha, shape)
    result = simulate_room(room, room_surfaces(room), room.air_state(), scattering=0.9, rays=3000)
    expected = corrected_eyring(volume, surface, alpha, m)
    assert result.reverberation_time == pytest.approx(expected, rel=0.04)


def test_the_same_seed_gives_the_same_bits_and_settings_are_put_back():
    import pyroomacoustics as pra

    before = pra.constants.get("octave_bands_base_freq"), pra.constants.get("num_threads")
    room = uniform(0.2)
    surfaces = room_surfaces(room)
    one = simulate_room(room, surfaces, room.air_state(), rays=300)
    other = simulate_room(room, surfaces, room.air_state(), rays=300)
    assert np.array_equal(one.reverberation_time, other.reverberation_time)
    different = simulate_room(room, surfaces, room.air_state(), rays=300, seed=2)
    assert not np.array_equal(one.reverberation_time, different.reverberation_time)
    assert before == (pra.constants.get("octave_bands_base_freq"), pra.constants.get("num_threads"))


@pytest.mark.parametrize("time", [0.2, 0.7, 2.0])
def test_the_decay_of_an_exponential(time):
    """By definition: energy falls by 60 dB in T."""
    t = np.arange(0, 3 * time, BIN_S)
    assert decay_time(10 ** (-6 * t / time)) == pytest.approx(time, rel=0.01)


def test_no_decay_gives_no_number():
    assert np.isnan(decay_time(np.zeros(100)))
    assert np.isnan(decay_time(np.array([1.0, 1e-9])))
