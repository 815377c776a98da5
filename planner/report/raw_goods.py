"""What a panel built by hand is made of: wool, battens, cloth and sheets, in what is sold.

All sizes of what is sold are assumptions that stand on the list (`Supplies`); no prices are given
for them, and the list says so. Offcuts of wool are used along a board, not across it.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from planner.report.cutting import CuttingPlan, cut_lengths
from planner.report.quantities import Quantities


@dataclass(frozen=True, slots=True)
class Supplies:
    """Sizes in which raw goods are sold; common practice, no source: put in your dealer's."""

    wool_board: tuple[float, float] = (0.6, 1.2)
    """Width and length. [m]"""
    wool_pack: int = 6
    """Boards in a pack."""
    batten_lengths: tuple[float, ...] = (2.4, 3.0, 3.6, 4.8)
    """[m]"""
    batten_width: float = 0.02
    """Across the panel's edge. [m]"""
    kerf: float = 0.003
    """Width of a saw cut. [m]"""
    cloth_width: float = 1.5
    """Of the roll. [m]"""
    cloth_wrap: float = 0.06
    """Folded behind the frame at each edge. [m]"""
    cloth_step: float = 0.1
    """Cloth is cut from the roll in steps of this. [m]"""
    sheet: tuple[float, float] = (1.22, 2.44)
    """[m]"""
    units: str = "m"
    """``m`` or ``ft``: what the texts are written in."""

    @property
    def show(self) -> Quantities:
        """Writes quantities in these units."""
        return Quantities(self.units)


IMPERIAL = Supplies(
    wool_board=(0.6096, 1.2192),
    batten_lengths=(2.4384, 3.048, 3.6576, 4.8768),
    batten_width=0.01905,
    kerf=0.003175,
    cloth_width=1.524,
    cloth_wrap=0.0635,
    cloth_step=0.2286,
    sheet=(1.2192, 2.4384),
    units="ft",
)
"""Boards of 24 × 48 in, battens of 8 to 16 ft, cloth 60 in wide by the quarter yard, sheets 4 × 8 ft."""


@dataclass(frozen=True, slots=True)
class HandMade:
    """Panels of one size that are built by hand."""

    product: str
    width: float
    """[m]"""
    height: float
    """[m]"""
    count: int
    wool_mm: tuple[float, ...] = ()
    """Thickness of each porous layer. [mm]"""
    gap_mm: float = 0.0
    """Air behind. [mm]"""
    sheets: tuple[str, ...] = ()
    """Sheets in front, in words."""
    cloth: bool = True

    @property
    def depth(self) -> float:
        """Of the frame: all the wool, and behind a sheet the closed air space too. [m]."""
        return (sum(self.wool_mm) + (self.gap_mm if self.sheets else 0.0)) / 1000.0


@dataclass(frozen=True, slots=True)
class RawLine:
    """One raw good to buy."""

    goods: str
    need: str
    """What is needed, in words with units."""
    buy: str
    """What to buy, in words."""
    amount: float
    """Packs, bars, metres or sheets bought."""
    waste: float
    """Share bought that is not built in. [-]"""
    plan: CuttingPlan | None = None
    notes: tuple[str, ...] = field(default=())


def hand_made(
    product: str,
    width: float,
    height: float,
    count: int,
    layers: Sequence[Mapping[str, Any]],
    *,
    units: str = "m",
) -> HandMade:
    """Panels from the layers of a build-up (front to wall), as `planner.absorption.build_up` reads them."""
    show = Quantities(units)
    wool, gap, sheets = [], 0.0, []
    for layer in layers:
        kind = str(layer.get("layer", "")).lower()
        thickness = float(layer.get("thickness_mm") or 0.0)
        if kind == "porous":
            wool.append(thickness)
        elif kind == "air":
            gap += thickness
        elif kind:
            sheets.append(_sheet_name(layer, kind, thickness, show))
    return HandMade(product, width, height, count, tuple(wool), gap, tuple(sheets), not sheets)


def _sheet_name(layer: Mapping[str, Any], kind: str, thickness: float, show: Quantities) -> str:
    """``perforated sheet, 6 mm, holes 5 mm`` with the sizes that the layer gives."""
    words = [f"{kind} sheet"]
    if thickness:
        words.append(show.small(thickness))
    for key, name in (("hole_mm", "holes"), ("slot_mm", "slots"), ("spacing_mm", "spacing")):
        if layer.get(key):
            words.append(f"{name} {float(layer[key]):g} mm")
    if layer.get("open_area"):
        words.append(f"{100 * float(layer['open_area']):g} % open")
    if layer.get("mass_kg_m2"):
        words.append(f"{float(layer['mass_kg_m2']):g} kg/m²")
    return ", ".join(words)


def raw_goods(panels: Iterable[HandMade], supplies: Supplies | None = None) -> list[RawLine]:
    """Everything to buy for panels built by hand.

    Parameters
    ----------
    panels
        What is built.
    supplies
        Sizes in which raw goods are sold.
    """
    sold = supplies or Supplies()
    made = [panel for panel in panels if panel.count > 0]
    spaced = [panel for panel in made if panel.gap_mm > 0 and not panel.sheets]
    gaps = sorted({panel.gap_mm for panel in spaced})
    depths = sorted({panel.depth for panel in made if panel.depth > 0})
    sheets = dict.fromkeys(name for panel in made for name in panel.sheets)
    wrapped = [panel for panel in made if panel.cloth]
    return [
        *(_wool(made, t, sold) for t in sorted({t for panel in made for t in panel.wool_mm})),
        *(
            _frames([panel for panel in made if panel.depth == depth], depth, sold)
            for depth in depths
        ),
        *(_spacers([panel for panel in spaced if panel.gap_mm == gap], gap, sold) for gap in gaps),
        *([_cloth(wrapped, sold)] if wrapped else []),
        *(
            _sheets([panel for panel in made if name in panel.sheets], name, sold)
            for name in sheets
        ),
    ]


def whole_packs(needed: float, pack: float) -> int:
    """Packs that hold at least what is needed: never short, never one too many.

    A ratio within a billionth of a whole number is that number, so that 0.1 + 0.2 of 0.1 are three
    packs and not four.
    """
    if needed <= 0:
        return 0
    ratio = needed / pack
    return round(ratio) if abs(ratio - round(ratio)) < 1e-9 * max(1.0, ratio) else math.ceil(ratio)


def _wool(made: Sequence[HandMade], thickness: float, sold: Supplies) -> RawLine:
    """Boards cut into strips as wide as the panel or the board, offcuts used along the board."""
    width, length = sold.wool_board
    strips: dict[float, dict[float, int]] = {}
    area = 0.0
    for panel in made:
        layers = sum(1 for t in panel.wool_mm if t == thickness)
        if layers:
            across, along = _turned(panel, width, length)
            area += panel.width * panel.height * panel.count * layers
            for strip in _parts(across, width):
                for piece in _parts(along, length):
                    pieces = strips.setdefault(strip, {})
                    pieces[piece] = pieces.get(piece, 0) + panel.count * layers
    boards = sum(_side_by_side(strip, pieces, sold) for strip, pieces in strips.items())
    packs = whole_packs(boards, sold.wool_pack)
    bought = packs * sold.wool_pack * width * length
    return RawLine(
        goods=f"Porous board, {sold.show.small(thickness)}",
        need=f"{sold.show.area(area)}, {boards} boards of {sold.show.size(width, length)}",
        buy=f"{packs} pack{'s' * (packs != 1)} of {sold.wool_pack}",
        amount=packs,
        waste=1.0 - area / bought,
    )


def _turned(panel: HandMade, width: float, length: float) -> tuple[float, float]:
    """Panel sides across and along the board: the way that takes fewer pieces."""
    ways = [(panel.width, panel.height), (panel.height, panel.width)]
    return min(ways, key=lambda way: len(_parts(way[0], width)) * len(_parts(way[1], length)))


def _parts(side: float, largest: float) -> list[float]:
    """A side as full lengths and a rest. [m]."""
    full = int(side / largest + 1e-9)
    rest = round(side - full * largest, 6)
    return [largest] * full + ([rest] if rest > 1e-6 else [])


def _side_by_side(strip: float, pieces: Mapping[float, int], sold: Supplies) -> int:
    """Boards for strips of one width: as many side by side as the board is wide."""
    beside = max(int(sold.wool_board[0] / strip + 1e-9), 1)
    plan = cut_lengths(pieces, [sold.wool_board[1]], kerf=0.0)
    return math.ceil(plan.count / beside)


def _frames(made: Sequence[HandMade], depth: float, sold: Supplies) -> RawLine:
    """Two uprights as high as the panel, two rails between them; a middle rail above 1 m."""
    pieces: dict[float, int] = {}
    for panel in made:
        rail = round(panel.width - 2 * sold.batten_width, 4)
        rails = 3 if panel.height > 1.0 else 2
        pieces[panel.height] = pieces.get(panel.height, 0) + 2 * panel.count
        if rail > 0:
            pieces[rail] = pieces.get(rail, 0) + rails * panel.count
    sides = (sold.batten_width * 1000, depth * 1000)
    section = " × ".join(sold.show.small(side) for side in sides)
    return _battens(f"Frame battens, {section}", pieces, sold)


def _spacers(made: Sequence[HandMade], gap_mm: float, sold: Supplies) -> RawLine:
    """Two rails across the back of each panel hold it off the wall."""
    pieces: dict[float, int] = {}
    for panel in made:
        pieces[panel.width] = pieces.get(panel.width, 0) + 2 * panel.count
    return _battens(f"Spacer battens for the air gap, {sold.show.small(gap_mm)} deep", pieces, sold)


def _battens(goods: str, pieces: Mapping[float, int], sold: Supplies) -> RawLine:
    longest = max(sold.batten_lengths)
    joined: dict[float, int] = {}
    notes: tuple[str, ...] = ()
    for length, count in pieces.items():
        for part in _parts(length, longest):
            joined[part] = joined.get(part, 0) + count
        if length > longest:
            notes = (f"pieces longer than {sold.show.cut(longest)} are joined",)
    plan = cut_lengths(joined, sold.batten_lengths, kerf=sold.kerf)
    bars = ", ".join(f"{count} × {sold.show.cut(stock)}" for stock, count in plan.by_stock.items())
    need = ", ".join(
        f"{count} × {sold.show.cut(length)}" for length, count in sorted(joined.items())
    )
    return RawLine(goods, need, bars, plan.count, plan.waste, plan, notes)


def _cloth(made: Sequence[HandMade], sold: Supplies) -> RawLine:
    """Panels of one kind side by side on the roll, kinds one after the other."""
    length, area, notes = 0.0, 0.0, []
    for panel in made:
        fold = 2 * (panel.depth + sold.cloth_wrap)
        sides = (panel.width + fold, panel.height + fold)
        area += sides[0] * sides[1] * panel.count
        length += min(
            _roll(across, along, panel.count, sold) for across, along in (sides, sides[::-1])
        )
        if min(sides) > sold.cloth_width:
            notes.append(f"{panel.product} is wider than the roll and needs a seam")
    steps = whole_packs(round(length, 6), sold.cloth_step)
    bought = steps * sold.cloth_step
    return RawLine(
        goods=f"Breathable cloth, roll {sold.show.cut(sold.cloth_width)} wide",
        need=f"{sold.show.area(area)} with {sold.show.small(sold.cloth_wrap * 1000)} folded behind each edge",
        buy=f"{sold.show.length(bought)} of the roll",
        amount=round(bought, 3),
        waste=1.0 - area / (bought * sold.cloth_width),
        notes=tuple(notes),
    )


def _roll(across: float, along: float, count: int, sold: Supplies) -> float:
    """Length of roll for pieces laid one way. [m]."""
    if across > sold.cloth_width:
        return count * along * math.ceil(across / sold.cloth_width - 1e-9)
    return math.ceil(count / int(sold.cloth_width / across + 1e-9)) * along


def _sheets(made: Sequence[HandMade], goods: str, sold: Supplies) -> RawLine:
    """Equal panels in rows and columns, the better way round; kinds on sheets of their own."""
    sheets, area = 0, 0.0
    notes: list[str] = []
    for panel in made:
        area += panel.width * panel.height * panel.count
        fit = max(
            _grid(a, b, sold) for a, b in ((panel.width, panel.height), (panel.height, panel.width))
        )
        if fit:
            sheets += math.ceil(panel.count / fit)
        else:
            tiles = math.ceil(panel.width / sold.sheet[0]) * math.ceil(panel.height / sold.sheet[1])
            sheets += panel.count * tiles
            notes.append(f"{panel.product} is larger than a sheet and is joined from {tiles}")
    bought = sheets * sold.sheet[0] * sold.sheet[1]
    return RawLine(
        goods=goods[:1].upper() + goods[1:],
        need=sold.show.area(area),
        buy=f"{sheets} sheet{'s' * (sheets != 1)} of {sold.show.size(*sold.sheet)}",
        amount=sheets,
        waste=1.0 - area / bought if bought else 0.0,
        notes=tuple(notes),
    )


def _grid(width: float, height: float, sold: Supplies) -> int:
    """Pieces per sheet, a saw cut between neighbours."""
    across = int((sold.sheet[0] + sold.kerf) / (width + sold.kerf) + 1e-9)
    along = int((sold.sheet[1] + sold.kerf) / (height + sold.kerf) + 1e-9)
    return across * along
