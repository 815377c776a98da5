"""An invented project, put together from plain values: no formula runs to make it."""

from __future__ import annotations

import numpy as np
import pytest

from planner.absorption.library import Coefficients, Material
from planner.predict.prediction import Prediction
from planner.predict.targets import TargetLimits
from planner.report.acceptance import judge
from planner.report.buying import buying_list, placed_panels
from planner.report.report_data import (
    Alternative,
    InputFile,
    Measurement,
    ModeList,
    ReportData,
)
from planner.room.model import Room
from planner.room.surfaces import Part, RoomSurfaces
from planner.treat.catalogue import Catalogue, Product
from planner.treat.option import Option
from planner.treat.shopping import shopping_list
from planner.treat.suggestion import SuggestedItem, Suggestion

OCTAVES = (63, 125, 250, 500, 1000, 2000, 4000, 8000)
NOW = np.array([0.92, 0.84, 0.71, 0.62, 0.6, 0.55, 0.5, 0.4])
AFTER = np.array([0.61, 0.42, 0.31, 0.28, 0.27, 0.27, 0.25, 0.2])


def coefficients(value: float = 0.8) -> Coefficients:
    return Coefficients(
        alpha=np.full(8, value), u=np.full(8, 0.05), assumed=np.array([True] + [False] * 7)
    )


def make_room(**more):
    return Room.model_validate(
        {
            "name": "Invented control room",
            "air": {"temperature_c": 21, "humidity_percent": 45},
            "shape": {"length": 5.2, "width": 3.9, "height": 2.6},
            "surfaces": {"floor": "boards", "ceiling": "plaster", "walls": "plaster"},
            "opening": [
                {"wall": "back", "kind": "door", "material": "door", "left": 0.3, "width": 0.9,
                 "height": 2.05},
            ],
            "keep_out": [
                {"on": "back", "left": 3.3, "bottom": 0.3, "width": 0.4, "height": 0.3,
                 "why": "sockets"},
            ],
            "positions": {
                "seat": (3.2, 1.95, 1.2), "loudspeakers": [(1.1, 1.15, 1.2), (1.1, 2.75, 1.2)],
            },
            "treatment": {"wall_type": "masonry", "budget": 1800},
        }
        | more
    )  # fmt: skip


def make_product(id_: str, **more) -> Product:
    values = {
        "description": f"Invented {id_}", "unit": "piece", "width": 0.6, "height": 1.2,
        "thickness_mm": 100.0, "gap_mm": 50.0, "mounting": "gap", "surfaces": ("wall", "ceiling"),
        "pack": 4.0, "price_per_pack": 120.0, "currency": "EUR", "weight_kg": 6.5,
        "fire_class_declared": "B-s1,d0", "coefficients": coefficients(), "source": "invented",
    }  # fmt: skip
    return Product(id=id_, **(values | more))


def make_catalogue(**more) -> Catalogue:
    return Catalogue(
        [
            make_product("wool-100", **more),
            make_product("cloud-50", width=1.2, height=0.6, thickness_mm=50.0, gap_mm=100.0,
                         surfaces=("ceiling",), price_per_pack=75.5, pack=3.0, weight_kg=9.0),
            make_product("curtain", unit="m2", width=None, height=None, thickness_mm=5.0,
                         gap_mm=100.0, mounting="hung", pack=1.5, price_per_pack=19.9,
                         weight_kg=0.5, fire_class_declared=""),
            make_product("stand", unit="item", width=None, height=None, mounting="free-standing",
                         surfaces=("free",), pack=1.0, price_per_pack=None, weight_kg=None),
        ]
    )  # fmt: skip


def make_option(name: str = "Thick walls") -> Option:
    front = [[0.35 + 0.62 * n, 0.6, 0.6, 1.2] for n in range(5)]
    back = [[1.4 + 0.62 * n, 0.8, 0.6, 1.2] for n in range(2)]
    cloud = [[1.2 + 1.3 * a, 0.9 + 1.2 * b, 1.2, 0.6] for a in range(2) for b in range(2)]
    return Option.model_validate(
        {
            "name": name,
            "item": [
                {"product": "wool-100", "surface": "front", "count": 5, "placement": front},
                {"product": "cloud-50", "surface": "ceiling", "count": 4, "placement": cloud},
                {"product": "wool-100", "surface": "back", "count": 2, "placement": back},
                {"product": "curtain", "surface": "left", "area": 4.2},
                {"product": "stand", "surface": "free", "count": 1},
            ],
        }
    )


def make_buying(name: str = "Thick walls", room=None, catalogue=None, **more):
    option, products = make_option(name), catalogue or make_catalogue()
    bought = shopping_list(option, products, currency="EUR")
    return buying_list(bought, option, products, room or make_room(), **more)


def make_target() -> TargetLimits:
    return TargetLimits(
        name="own limits",
        description="Invented limits",
        low=np.array([np.nan, 0.2, 0.2, 0.2, 0.2, 0.2, 0.2, 0.15]),
        aim=np.full(8, np.nan),
        high=np.array([0.6, 0.45, 0.35, 0.3, 0.3, 0.3, 0.3, 0.3]),
        source="Invented handbook",
        edition="first",
        condition="furnished",
        basis="own numbers",
    )


def make_prediction(times=NOW, **more) -> Prediction:
    values = {
        "methods": {"sabine": times * 1.06, "eyring": times, "fitzroy": times * 1.2},
        "formula": "eyring",
        "u_s": 0.08 * times,
        "interval_s": np.array([times * 0.85, times * 1.17]),
        "absorption_area_m2": 8.5 / times,
        "speed_of_sound": 343.8,
        "air_m_per_m": np.full(8, 1e-4),
        "volume_m3": 52.7,
        "surface_m2": 87.9,
        "schroeder_hz": 214.0,
        "assumed_hz": (63,),
        "capped": 3,
        "contributions": {"plaster": np.full(8, 0.7), "boards": np.full(8, 0.3)},
        "target": make_target(),
        "probability": 0.87,
    }
    return Prediction(**(values | more))


def make_suggestion() -> Suggestion:
    return Suggestion(
        status="optimal",
        option=make_option(),
        items=(SuggestedItem("wool-100", "Invented wool-100", "front", 5, 3.6),),
        cost=391.0,
        currency="EUR",
        predicted=AFTER,
        methods={"eyring": AFTER},
        untreated=NOW,
        target_low=make_target().low,
        target_high=make_target().high,
        judged_hz=(125, 250, 500, 1000, 2000, 4000, 8000),
        assumed_hz=(63,),
        probability=0.87,
        band_probability=np.full(8, 0.97),
        confidence=0.8,
        gap=0.0,
        deviation_s=0.0,
        binding=("ceiling: all of the free area is used",),
    )


def make_surfaces() -> RoomSurfaces:
    names = ("floor", "ceiling", "front", "right", "back", "left")
    areas = np.array([20.28, 20.28, 10.14, 13.52, 10.14, 13.52])
    return RoomSurfaces(
        volume=52.728,
        surface_area=87.88,
        parts=tuple(
            Part(n, n, "boards" if n == "floor" else "plaster", "base", (0, 0, 1)) for n in names
        ),
        area=areas,
        alpha=np.full((6, 8), 0.1),
        u=np.full((6, 8), 0.02),
        assumed=np.tile([True] + [False] * 7, (6, 1)),
    )


def make_material(id_: str) -> Material:
    return Material(
        id=id_, description=f"Invented {id_}", category="walls", mounting="", thickness_mm=None,
        gap_mm=None, alpha=(None, *[0.1] * 7), u=(None,) * 8, source="Invented table",
        place_in_source="row 3", note="",
    )  # fmt: skip


def make_report(**more) -> ReportData:
    room = more.pop("room", make_room())
    option, catalogue = make_option(), make_catalogue()
    hz = np.array([33.0, 44.0, 55.0, 66.0, 66.2, 79.0, 88.1, 95.0, 99.0, 110.0])
    kinds = ["axial", "axial", "tangential", "axial", "axial", "tangential", "oblique"] + [
        "axial"
    ] * 3
    values = {
        "surfaces": make_surfaces(),
        "materials": {name: make_material(name) for name in ("boards", "plaster", "door")},
        "target": make_target(),
        "prediction": make_prediction(),
        "modes": ModeList(
            hz, tuple(kinds), tuple(f"{n} 0 0" for n in range(10)), np.full(10, 0.8), 214.0,
            (31.5, 40, 50, 63, 80, 100), (1, 1, 1, 2, 2, 3),
        ),
        "measurement": Measurement(
            OCTAVES, NOW * 1.04, 0.03 * NOW, ("t20",) * 8, np.full(8, 46.0),
            (("few decays",), *[()] * 7), "empty", "2026-01-15", "engineering: 6 positions, 2 decays",
            "2 source × 3 microphone positions, 2 decays each", ("one recording was hot",),
        ),
        "calibrated": (("plaster", "125 Hz", "0.29", "0.14 ± 0.03"),),
        "calibration_words": ("plaster at 125 Hz: 0.29 assumed, 0.14 ± 0.03 fits",),
        "options": tuple(
            Alternative(f"Option {letter}", AFTER * (1 + 0.07 * n), 391.0 + 100 * n, 0.87, (63,), 150.0,
                        11.0, 120.0, 40.0, chosen=n == 0)
            for n, letter in enumerate("ABC")
        ),
        "suggestion": make_suggestion(),
        "after": make_prediction(AFTER),
        "treatment_name": "Thick walls",
        "buying": make_buying(room=room),
        "panels": tuple(placed_panels(option, catalogue, room)),
        "acceptance": judge(AFTER * 1.02, 0.01 * AFTER, make_target().low, make_target().high),
        "product_sources": (("wool-100", "– .8 .8 .8 .8 .8 .8 .8", "invented"),),
        "bibliography": ("Invented handbook, first edition.",),
        "warnings": ("The height is unusual.",),
        "inputs": (InputFile("room.toml", "0123456789abcdef" * 4),),
        "version": "0.1.0",
        "date": "2026-02-03",
        "timestamp": 1_770_000_000,
    }  # fmt: skip
    return ReportData(room=room, **(values | more))


@pytest.fixture
def sample(samples):
    """The makers above, for tests in this folder."""
    return samples


@pytest.fixture(scope="session")
def samples():
    """The makers above, for fixtures of a wider scope."""
    import types

    return types.SimpleNamespace(
        room=make_room, product=make_product, catalogue=make_catalogue, option=make_option,
        buying=make_buying, report=make_report, target=make_target, now=NOW, after=AFTER,
    )  # fmt: skip
