"""Drawings: what is drawn lies where it was placed, the scale is true, texts stay readable."""

import io
import itertools
import re
import xml.etree.ElementTree as ET

import ezdxf
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.absorption.library import Coefficients
from planner.report.buying import placed_panels
from planner.report.drawing_dimensions import PITCH, spread
from planner.report.drawing_marks import Label, Outline, label_corners
from planner.report.drawings import (
    PAPERS,
    Panel,
    corner_name,
    on_screen,
    sheets,
    to_svg,
    view,
)
from planner.report.dxf import to_dxf
from planner.report.palette import DARK
from planner.room.model import Room
from planner.treat.catalogue import Catalogue, Product
from planner.treat.option import Option
from planner.treat.placement import place

SVG = "{http://www.w3.org/2000/svg}"


def make_room(**more):
    return Room.model_validate(
        {
            "name": "Invented room",
            "shape": {"length": 5.2, "width": 3.9, "height": 2.6},
            "surfaces": {"floor": "f", "ceiling": "c", "walls": "w"},
            "opening": [
                {"wall": "back", "kind": "door", "material": "d", "left": 0.3, "width": 0.9,
                 "height": 2.05},
            ],
            "keep_out": [
                {"on": "back", "left": 2.9, "bottom": 0.3, "width": 0.5, "height": 0.3,
                 "why": "sockets"},
            ],
            "positions": {
                "seat": (3.2, 1.95, 1.2), "loudspeakers": [(1.1, 1.15, 1.2), (1.1, 2.75, 1.2)],
            },
        }
        | more
    )  # fmt: skip


PANELS = [
    Panel("1", "front", 0.35, 0.5, 0.6, 1.2, "Wool", 100, 50),
    Panel("2", "front", 0.97, 0.5, 0.6, 1.2, "Wool", 100, 50),
    Panel("3", "back", 1.65, 0.7, 0.6, 1.2, "Wool", 100, 50),
    Panel("4", "ceiling", 1.2, 0.9, 1.2, 0.6, "Cloud", 50, 100),
    Panel("5", "right", 0.2, 0.0, 0.3, 2.5, "Corner", 300, 0),
]
L_SHAPE = {"footprint": [(0, 0), (6, 0), (6, 3), (3.5, 3), (3.5, 5), (0, 5)], "height": 2.5}


def rectangles(svg, layer):
    """Name → (left, top, right, bottom) in millimetres of paper, from the SVG text."""
    found = {}
    for shape in ET.fromstring(svg).iter(f"{SVG}polygon"):
        if shape.get("class") == layer:
            points = np.array([p.split(",") for p in shape.get("points").split()], float)
            found[shape.get("data-name")] = (*points.min(axis=0), *points.max(axis=0))
    return found


@pytest.mark.parametrize("paper", PAPERS)
@pytest.mark.parametrize("units", ["m", "ft"])
def test_every_panel_is_drawn_where_it_was_placed(paper, units):
    """Read back from the SVG: distances on paper times the scale are those of the placement."""
    room = make_room()
    drawn = {}
    for sheet in sheets(room, PANELS, paper=paper, units=units):
        svg = sheet.svg
        outline = next(iter(rectangles(svg, "room").values()))
        for name, box in rectangles(svg, "panel").items():
            drawn[name] = [
                length * sheet.drawing.scale / 1000.0
                for length in (
                    box[0] - outline[0], outline[3] - box[3], box[2] - box[0], box[3] - box[1],
                )
            ]  # fmt: skip
    assert set(drawn) == {panel.number for panel in PANELS}
    for panel in PANELS:
        placed = (panel.left, panel.bottom, panel.width, panel.height)
        assert drawn[panel.number] == pytest.approx(placed, abs=2e-4)  # 1/1000 mm of paper, twice


@pytest.mark.parametrize("paper", PAPERS)
def test_every_view_fits_its_sheet_at_a_usual_scale(paper):
    for sheet in sheets(make_room(), PANELS, paper=paper):
        short, long = PAPERS[paper]
        across, up = (long, short) if sheet.landscape else (short, long)
        width, height = sheet.size
        assert width < across - 30
        assert height < up - 40
        assert sheet.drawing.scale in (20, 25, 50)
        assert f"Scale 1:{sheet.drawing.scale}" in sheet.svg


@pytest.mark.parametrize(("units", "metre"), [("m", 1.0), ("ft", 0.3048)])
def test_scale_bar_is_true(units, metre):
    """Its length on paper against its printed length, 0.5 %; the sheet's width in mm is true."""
    for sheet in sheets(make_room(), PANELS, units=units):
        svg = sheet.svg
        ((text, box),) = rectangles(svg, "scale-bar").items()
        printed = float(text.split()[0]) * metre
        assert (box[2] - box[0]) * sheet.drawing.scale / 1000 == pytest.approx(printed, rel=0.005)
        root = ET.fromstring(svg)
        assert root.get("width") == f"{float(root.get('viewBox').split()[2]):.3f}mm"


@pytest.mark.parametrize("shape", [{"length": 5.2, "width": 3.9, "height": 2.6}, L_SHAPE])
@pytest.mark.parametrize("units", ["m", "ft"])
def test_dimension_texts_do_not_run_into_each_other(shape, units):
    more = {"shape": shape, "opening": [], "keep_out": []}
    room = make_room(**more)
    wall = room.wall_names[-1]
    many = [Panel(str(n), wall, 0.02 + 0.31 * n, 0.1 + 0.013 * n, 0.3, 0.4) for n in range(10)]
    for name in ("plan", "ceiling", wall):
        drawing = view(room, name, many, units=units)
        boxes = [
            label_corners(mark, drawing.scale)
            for mark in drawing.marks
            if isinstance(mark, Label) and mark.layer in ("dimension", "heading")
        ]
        for ((a, b), (c, d)), ((e, f), (g, h)) in itertools.combinations(boxes, 2):
            assert a >= g - 1e-9 or e >= c - 1e-9 or b >= h - 1e-9 or f >= d - 1e-9


@given(st.lists(st.floats(0, 100), min_size=1, max_size=30))
@settings(max_examples=60, deadline=None)
def test_spread_places_keep_their_distance_and_order(places):
    """No two nearer than the pitch, and places that were far enough apart do not move."""
    ordered = sorted(places)
    moved = spread(ordered, PITCH)
    assert all(b - a >= PITCH - 1e-9 for a, b in itertools.pairwise(moved))
    if all(b - a >= PITCH for a, b in itertools.pairwise(ordered)):
        assert moved == pytest.approx(ordered)


def test_spread_moves_two_close_places_evenly():
    """Least squares by hand: 10 and 11 at a pitch of 3 become 9 and 12."""
    assert spread([10.0, 11.0], 3.0) == pytest.approx([9.0, 12.0])


def test_elevation_says_from_which_corner_it_is_measured():
    """Corners run anticlockwise from A at (0, 0); facing the back wall its left end is C."""
    svg = to_svg(view(make_room(), "back", PANELS))
    assert "measured from corner C (left) and from the finished floor" in svg
    assert [corner_name(n) for n in (0, 25, 26)] == ["A", "Z", "A2"]


def test_keep_outs_are_hatched_and_named():
    drawing = view(make_room(), "back", PANELS)
    (box,) = [m for m in drawing.marks if isinstance(m, Outline) and m.layer == "keep-out"]
    (left, bottom), (right, top) = box.points[0], box.points[2]
    lines = [m for m in drawing.marks if m.layer == "hatching"]
    assert len(lines) >= 4
    for line in lines:
        for x, y in (line.start, line.end):
            assert left - 1e-9 <= x <= right + 1e-9
            assert bottom - 1e-9 <= y <= top + 1e-9
        run, rise = line.end[0] - line.start[0], line.end[1] - line.start[1]
        assert run == pytest.approx(-rise)
    assert ">sockets<" in to_svg(drawing)


def test_every_wall_of_any_footprint_has_its_elevation():
    room = make_room(shape=L_SHAPE, opening=[], keep_out=[])
    drawn = sheets(room, [], paper="a3")
    assert [sheet.drawing.surface for sheet in drawn] == ["plan", "ceiling", *room.wall_names]


HOSTILE = [
    "</text><script>alert(1)</script>",
    "&amp; \" ' ]]>",
    "#let x = 1 *bold*",
    "=HYPERLINK(1)",
    "\u202eright to left \u05e9\u05dc\u05d5\u05dd",
    "x" * 500,
    "\U0001f600",
    "line\nbreak\x00\x1b",
]


@pytest.mark.parametrize("text", HOSTILE)
def test_hostile_text_stays_text(text):
    room = make_room(
        name=text.replace("\x00", "")[:200],
        keep_out=[{"on": "back", "left": 2, "bottom": 0.5, "width": 1, "height": 1, "why": text}],
    )
    panels = [Panel(text, "back", 1.3, 0.7, 0.6, 1.2, text)]
    for dimensions in (True, False):
        root = ET.fromstring(on_screen(room, "back", panels, dimensions=dimensions, theme=DARK))
        assert {e.tag.removeprefix(SVG) for e in root.iter()} <= {
            "svg", "title", "rect", "line", "polygon", "circle", "text",
        }  # fmt: skip
    document = ezdxf.read(io.StringIO(to_dxf([view(room, "back", panels)]).decode()))
    assert not document.audit().errors


def test_dxf_has_every_panel_in_true_size_on_its_layer():
    """Read back with the library: millimetres for metric, inches for imperial drawings."""
    for units, per_metre, code in (("m", 1000.0, 4), ("ft", 1 / 0.0254, 1)):
        drawing = view(make_room(), "front", PANELS, units=units)
        document = ezdxf.read(io.StringIO(to_dxf([drawing]).decode()))
        assert document.header["$INSUNITS"] == code
        space = document.modelspace()
        (wall,) = space.query('LWPOLYLINE[layer=="ROOM"]')
        corner = np.array(wall.get_points("xy")).min(axis=0)
        boxes = []
        for shape in space.query('LWPOLYLINE[layer=="PANELS"]'):
            points = (np.array(shape.get_points("xy")) - corner) / per_metre
            boxes.append([*points.min(axis=0), *np.ptp(points, axis=0)])
        expected = [[p.left, p.bottom, p.width, p.height] for p in PANELS if p.surface == "front"]
        assert np.allclose(sorted(boxes), sorted(expected), atol=1e-6)
        numbers = {text.dxf.text for text in space.query('TEXT[layer=="PANEL_NUMBERS"]')}
        assert numbers == {"1", "2"}


def test_identical_input_gives_identical_files():
    drawings = [view(make_room(), name, PANELS) for name in ("plan", "front", "ceiling")]
    assert to_dxf(drawings) == to_dxf(drawings)
    assert [to_svg(d) for d in drawings] == [to_svg(d) for d in drawings]


def test_imperial_drawings_are_in_feet_and_inches():
    """2.6 m = 8 ft 6.36 in, to the eighth 8' 6 3/8"."""
    svg = to_svg(view(make_room(), "front", PANELS, units="ft"))
    assert "8&#x27; 6 3/8&quot;" in svg
    assert not re.search(r">2600<", svg)


def test_panels_that_were_placed_overlap_nothing_on_the_drawing():
    """Laid out by the placement around a door and a keep-out, then read back from the SVG."""
    products = Catalogue(
        [
            Product(
                id="a", description="a", unit="piece", width=0.6, height=1.2, thickness_mm=50.0,
                gap_mm=0.0, mounting="direct", surfaces=("wall",), pack=1.0, price_per_pack=1.0,
                currency="EUR", weight_kg=5.0, fire_class_declared="",
                coefficients=Coefficients(np.full(8, 0.8), np.full(8, 0.1), np.zeros(8, bool)),
            )
        ]
    )  # fmt: skip
    wanted = {"name": "x", "item": [{"product": "a", "surface": "back", "count": 3}]}
    room = make_room()
    option = place(room, Option.model_validate(wanted), products).in_option(
        Option.model_validate(wanted)
    )
    panels = placed_panels(option, products, room)
    assert len(panels) == 3
    svg = to_svg(view(room, "back", panels))
    boxes = [
        box for layer in ("panel", "opening", "keep-out") for box in rectangles(svg, layer).values()
    ]
    assert len(boxes) == 5
    for (a, b, c, d), (e, f, g, h) in itertools.combinations(boxes, 2):
        assert a >= g - 1e-3 or e >= c - 1e-3 or b >= h - 1e-3 or f >= d - 1e-3


def test_unknown_paper_is_refused():
    with pytest.raises(ValueError, match="no paper known here"):
        sheets(make_room(), [], paper="napkin")
