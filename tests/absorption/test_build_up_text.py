"""Layers in one cell of a table."""

import contextlib

import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.absorption import layers_from_text, material_from_build_up, text_of_layers
from planner.errors import MaterialError

WOOL = {"layer": "porous", "thickness_mm": 50, "flow_resistivity": 10000}


@pytest.mark.parametrize(
    ("text", "layers"),
    [
        ("porous 50 flow_resistivity=10000", [WOOL]),
        ("  Porous 50 mm flow_resistivity=1e4 ", [WOOL]),
        ("porous thickness_mm=50 flow_resistivity=10000", [WOOL]),
        ("panel mass_kg_m2=4 + air 80 local=true", [{"layer": "panel", "mass_kg_m2": 4}, {"layer": "air", "thickness_mm": 80, "local": True}]),
        ("porous thickness model=jca + air gap", [{"layer": "porous", "thickness_mm": "thickness", "model": "jca"}, {"layer": "air", "thickness_mm": "gap"}]),
        ('[{layer="porous", thickness_mm=50, flow_resistivity=10000}]', [WOOL]),
    ],
)  # fmt: skip
def test_a_cell_may_hold_the_short_line_or_the_list(text, layers):
    assert layers_from_text(text) == layers


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "no layers"),
        ("porous 50 + ", "layer 2: has no name"),
        ("porous 50 60", "no key=value"),
        ("porous 50 thickness_mm=60", "twice"),
        ("porous 50 =3", "no key=value"),
        ("[{layer=", "cannot be read"),
        ("[1, 2]", "no list of layers"),
        ("5", "no list of layers"),
        ("[" * 5000, "cannot be read"),
    ],
)
def test_other_cells_are_refused(text, words):
    with pytest.raises(MaterialError, match=words):
        layers_from_text(text)


@given(
    st.floats(5, 300),
    st.integers(3000, 60_000),
    st.floats(1, 400),
    st.booleans(),
    st.sampled_from(["miki", "jca"]),
)
def test_layers_survive_being_written_as_a_line(thickness, resistivity, gap, local, model):
    layers = [
        {"layer": "perforated", "thickness_mm": 6, "hole_mm": 5.5, "open_area": 0.08},
        {
            "layer": "porous",
            "thickness_mm": thickness,
            "flow_resistivity": resistivity,
            "model": model,
        },
        {"layer": "air", "thickness_mm": gap, "local": local},
    ]
    assert layers_from_text(text_of_layers(layers)) == layers


@given(st.text(max_size=60))
def test_any_text_is_read_or_refused_in_words(text):
    with contextlib.suppress(MaterialError):  # anything else fails the test
        material_from_build_up("x", "", layers_from_text(text))
