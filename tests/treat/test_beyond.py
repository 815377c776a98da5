"""Checked beyond the formula: other predictors asked, and the list corrected until they agree."""

from __future__ import annotations

import math

import numpy as np
import pytest
from treat_enumeration import air_attenuation, time_by
from treat_rooms import box, panel, target

from planner.air import Air
from planner.room.model import TreatmentLimits
from planner.treat.catalogue import Catalogue
from planner.treat.optimise import suggest
from planner.treat.option import treated

AIR = Air()
AIM = target(0.25, 0.45)
HIGH, LOW = 0.45, 0.25
GOODS = Catalogue(
    [
        panel("cheap-on-ceiling", 0.95, price=20.0, surfaces=("ceiling",)),
        panel("dear-on-wall", 0.95, price=35.0, surfaces=("wall",)),
    ]
)


def ask(**more):
    return suggest(box(), AIR, AIM, GOODS, TreatmentLimits(), explain=False, **more)


def arau(room) -> np.ndarray:
    """Arau-Puchades 1988 as printed: Π [k V / (−S ln(1 − a_j) + 4 m V)]^(S_j / S)."""
    pairs = (("floor", "ceiling"), ("front", "back"), ("left", "right"))
    surface, product = room.area.sum(), np.ones(8)
    k = 24 * math.log(10) / (343.2 * math.sqrt((AIR.temperature_c + 273.15) / 293.15))
    for pair in pairs:
        rows = [n for n, part in enumerate(room.parts) if part.on in pair]
        size = room.area[rows].sum()
        mean = room.area[rows] @ np.minimum(room.alpha[rows], 0.99) / size
        decay = -surface * np.log(1 - mean) + 4 * air_attenuation(AIR) * room.volume
        product *= (k * room.volume / decay) ** (size / surface)
    return product


def test_a_list_on_the_ceiling_alone_is_not_believed():
    """The cheapest list crowds one axis; the directional formula objects and a dearer list agrees."""
    suggestion = ask()
    second = suggestion.second_opinion
    assert suggestion.status == "optimal"
    assert not second.agrees
    assert "Arau-Puchades sees" in second.says
    assert second.corrected is not None
    assert second.corrected.cost > suggestion.cost
    first = arau(treated(box(), suggestion.option, GOODS))
    mended = treated(box(), second.corrected.option, GOODS)
    assert np.any(first > HIGH * 1.02)
    assert np.all(arau(mended) <= HIGH * 1.02 + 1e-9)
    assert np.all(arau(mended) >= LOW * 0.98 - 1e-9)
    own = time_by("eyring", mended.area @ np.minimum(mended.alpha, 0.99), 50.0, 85.0, AIR)
    assert np.all((own <= HIGH * (1 + 1e-5)) & (own >= LOW * (1 - 1e-5)))


def test_the_opinion_shown_is_the_formula():
    suggestion = ask()
    shown = {o.method: o.reverberation_time for o in suggestion.second_opinion.opinions}
    room = treated(box(), suggestion.option, GOODS)
    assert shown["arau_puchades"] == pytest.approx(arau(room), rel=1e-9)
    assert np.all(shown["fitzroy"] >= shown["arau_puchades"] - 1e-12)


def test_agreement_that_costs_nothing_is_taken():
    """One price on all surfaces: of equally cheap lists the one that all believe is suggested."""
    goods = Catalogue([panel("everywhere", 0.95, price=20.0)])
    plain = suggest(box(), AIR, AIM, goods, TreatmentLimits(), second_opinion=False, explain=False)
    asked = suggest(box(), AIR, AIM, goods, TreatmentLimits(), explain=False)
    assert asked.cost == plain.cost
    assert np.any(arau(treated(box(), plain.option, goods)) > HIGH * 1.02)
    assert asked.second_opinion.agrees
    assert np.all(arau(treated(box(), asked.option, goods)) <= HIGH * 1.02 + 1e-9)
    assert asked.option.name == "suggested"


def longer(factor):
    """A simulation that hears every room longer than Eyring by a factor."""

    def simulate(room):
        area = room.area @ np.minimum(room.alpha, 0.99)
        return factor * time_by("eyring", area, room.volume, room.area.sum(), AIR)

    return simulate


def test_a_simulation_is_obeyed():
    """One that hears 20 % more wants a list with which it, too, stays under the limit."""
    suggestion = ask(second_opinion=False, simulation=longer(1.2))
    second = suggestion.second_opinion
    assert not second.agrees
    mended = treated(box(), second.corrected.option, GOODS)
    assert np.all(longer(1.2)(mended) <= HIGH * 1.02 + 1e-9)


def test_a_simulation_that_agrees_changes_nothing():
    second = ask(second_opinion=False, simulation=longer(1.0)).second_opinion
    assert second.agrees
    assert second.corrected is None


def test_what_can_never_agree_is_said():
    """A simulation that hears three times as long leaves no list that pleases both."""
    second = ask(second_opinion=False, simulation=longer(3.0)).second_opinion
    assert not second.agrees
    assert second.corrected is None
    assert "no list was found" in second.says
