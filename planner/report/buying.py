"""The shopping list as it leaves the house: products, raw goods, fixings, what is not known.

Enters what `planner.treat.shopping` worked out, with the option, the catalogue and the room; leaves
one `BuyingList` that every format is written from, with the numbers that the drawings carry.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from planner.report.drawings import Panel
from planner.report.fixings import SAFETY_FACTOR, FixingLine, fixing_line
from planner.report.quantities import Quantities
from planner.report.raw_goods import IMPERIAL, HandMade, RawLine, Supplies, hand_made, raw_goods

if TYPE_CHECKING:
    from planner.room.model import Room
    from planner.treat.catalogue import Catalogue, Product
    from planner.treat.option import Option
    from planner.treat.shopping import ShoppingList


@dataclass(frozen=True, slots=True)
class BuyingLine:
    """One product on the list."""

    number: int
    """Of the line."""
    panels: str
    """Numbers of its panels on the drawings, ``P1–P6, P9``; empty for what is not drawn."""
    item: str
    where: str
    pieces: int | None
    packs: int
    pack: float
    """Pieces (or square metres) in a pack."""
    unit: str
    """``piece``, ``m2`` or ``item``."""
    area_m2: float
    """[m²]"""
    thickness_mm: float | None
    """[mm]"""
    weight_kg: float | None
    """[kg]"""
    cost: float | None
    spare_percent: float
    """Of what is bought. [%]"""
    price_basis: str
    """``catalogue``, ``invented`` or ``missing``."""
    fire_class: str


@dataclass(frozen=True, slots=True)
class BuyingList:
    """Everything to buy."""

    name: str
    room: str
    currency: str
    lines: tuple[BuyingLine, ...]
    raw: tuple[RawLine, ...] = ()
    fixings: tuple[FixingLine, ...] = ()
    total: float | None = None
    is_complete: bool = True
    """Has every line a price."""
    area_m2: float = 0.0
    """[m²]"""
    weight_kg: float | None = None
    """[kg]"""
    notes: tuple[str, ...] = ()
    """What is not known: prices, weights."""
    cautions: tuple[str, ...] = ()
    assumptions: tuple[str, ...] = field(default=())
    """What raw goods and fixings were worked out with."""
    units: str = "m"
    """``m`` or ``ft`` throughout."""


def buying_list(
    bought: ShoppingList,
    option: Option,
    catalogue: Catalogue,
    room: Room,
    *,
    units: str = "m",
    supplies: Supplies | None = None,
    build_ups: Mapping[str, Sequence[Mapping[str, Any]]] | None = None,
) -> BuyingList:
    """The list with raw goods, fixings and panel numbers.

    Parameters
    ----------
    bought
        Packs, weights and costs of the option.
    option
        The treatment.
    catalogue
        Where its products stand.
    room
        For the wall type, and whether anything may be screwed on.
    units
        ``m`` or ``ft`` throughout the list.
    supplies
        Sizes in which raw goods are sold; usual ones of that system of units by default.
    build_ups
        Layers of products that are built by hand, by product id; those that the catalogue gives
        as a build-up are taken by themselves.
    """
    numbers: dict[str, list[int]] = {}
    for panel in placed_panels(option, catalogue, room):
        numbers.setdefault(panel.product, []).append(int(panel.number[1:]))
    sold = supplies or (IMPERIAL if units == "ft" else Supplies())
    lines = []
    for number, line in enumerate(bought.lines, 1):
        product = catalogue[line.product]
        basis = (
            "missing"
            if line.cost is None
            else "invented"
            if line.price_is_invented
            else "catalogue"
        )
        lines.append(
            BuyingLine(
                number=number,
                panels=number_ranges(numbers.get(line.product, ())),
                item=line.item or line.product,
                where=_where(option, line.product, Quantities(units)),
                pieces=line.pieces,
                packs=line.packs,
                pack=line.pack,
                unit=line.unit,
                area_m2=line.area_m2,
                thickness_mm=product.thickness_mm,
                weight_kg=line.weight_kg,
                cost=line.cost,
                spare_percent=line.spare_percent,
                price_basis=basis,
                fire_class=line.fire_class_declared,
            )
        )
    raw = tuple(raw_goods(_made_by_hand(option, catalogue, build_ups or {}, units), sold))
    fixings = tuple(_fixings(option, catalogue, room, Quantities(units)))
    return BuyingList(
        name=bought.name,
        room=room.name,
        currency=bought.currency,
        lines=tuple(lines),
        raw=raw,
        fixings=fixings,
        total=bought.total,
        is_complete=bought.is_complete,
        area_m2=bought.area_m2,
        weight_kg=bought.weight_kg,
        notes=tuple(bought.warnings) + _raw_note(raw),
        cautions=tuple(bought.cautions),
        assumptions=_assumptions(raw, fixings, room, sold),
        units=units,
    )


def placed_panels(option: Option, catalogue: Catalogue, room: Room) -> list[Panel]:
    """Every panel of an option that has a place, numbered P1, P2, … as on the list.

    Numbers run surface by surface, left to right, bottom to top, as `planner.treat.placement`
    gives them.
    """
    order = {name: n for n, name in enumerate(room.surface_names)}
    places = sorted(
        (order.get(item.surface, len(order)), round(place[0], 4), round(place[1], 4), n, place)
        for n, item in enumerate(option.items)
        for place in item.placement
    )
    panels = []
    for number, (_, _, _, n, (left, bottom, width, height)) in enumerate(places, 1):
        item = option.items[n]
        product = catalogue.get(item.product)
        panels.append(
            Panel(
                number=f"P{number}",
                surface=item.surface,
                left=left,
                bottom=bottom,
                width=width,
                height=height,
                label=(product.description or product.id) if product else item.product,
                thickness_mm=product.thickness_mm if product else None,
                gap_mm=product.gap_mm if product else None,
                product=item.product,
            )
        )
    return panels


def number_ranges(numbers: Sequence[int]) -> str:
    """``P1–P5, P8`` for 1 to 5 and 8."""
    runs: list[list[int]] = []
    for number in sorted(numbers):
        if runs and number == runs[-1][-1] + 1:
            runs[-1].append(number)
        else:
            runs.append([number])
    return ", ".join(f"P{run[0]}" + (f"–P{run[-1]}" if len(run) > 1 else "") for run in runs)


def _where(option: Option, product: str, show: Quantities) -> str:
    """Surfaces with how many pieces, or how much area, goes on each."""
    amounts: dict[str, float] = {}
    whole = True
    for item in option.items:
        if item.product == product:
            whole = item.count is not None
            amount = float(item.count if item.count is not None else item.area or 0.0)
            amounts[item.surface] = amounts.get(item.surface, 0.0) + amount
    return ", ".join(f"{on}: {f'{n:.0f}' if whole else show.area(n)}" for on, n in amounts.items())


def _made_by_hand(
    option: Option,
    catalogue: Catalogue,
    build_ups: Mapping[str, Sequence[Mapping[str, Any]]],
    units: str,
) -> Iterable[HandMade]:
    for name in option.products:
        product = catalogue[name]
        layers = build_ups.get(name) or getattr(product, "build_up", None)
        if layers and product.width and product.height:
            count = int(option.pieces(name))
            yield hand_made(
                product.description or name,
                product.width,
                product.height,
                count,
                layers,
                units=units,
            )


def _fixings(
    option: Option, catalogue: Catalogue, room: Room, show: Quantities
) -> Iterable[FixingLine]:
    counts: dict[tuple[str, bool], int] = {}
    for item in option.items:
        product = catalogue[item.product]
        if item.count and _is_fixed(product, item.surface):
            key = (item.product, item.surface == "ceiling")
            counts[key] = counts.get(key, 0) + item.count
    if room.treatment.rented:
        return
    for (name, overhead), count in counts.items():
        product = catalogue[name]
        yield fixing_line(
            product.description or name,
            count,
            product.weight_kg,
            room.treatment.wall_type,
            overhead=overhead,
            show=show,
        )


def _is_fixed(product: Product, surface: str) -> bool:
    return product.needs_fixings and product.unit == "piece" and surface not in ("floor", "free")


def _raw_note(raw: Sequence[RawLine]) -> tuple[str, ...]:
    if not raw:
        return ()
    return ("raw goods have no prices here: ask your dealer, the total leaves them out",)


def _assumptions(
    raw: Sequence[RawLine], fixings: Sequence[FixingLine], room: Room, sold: Supplies
) -> tuple[str, ...]:
    said = []
    if raw:
        stock = ", ".join(sold.show.cut(length) for length in sold.batten_lengths)
        said.append(
            f"Raw goods are assumed to be sold as: boards {sold.show.size(*sold.wool_board)} in packs of "
            f"{sold.wool_pack}, battens of {stock} cut with a saw {sold.show.small(sold.kerf * 1000)} thick, cloth "
            f"{sold.show.cut(sold.cloth_width)} wide, sheets {sold.show.size(*sold.sheet)}. A frame has two "
            f"uprights and two rails, a third rail above {sold.show.cut(1.0)} of height; two spacers hold it off the wall."
        )
    if fixings:
        wall = room.treatment.wall_type
        walls = "the wall type is not given" if wall == "unknown" else f"walls and ceiling: {wall}"
        said.append(
            f"Fixings: {walls}; weight times {SAFETY_FACTOR:g} over the assumed rated load, at least "
            "two, overhead at least four and a second retention for each panel. The rating on the "
            "fixing's own package decides."
        )
    if room.treatment.rented:
        said.append("Rented room: nothing is screwed on, so no fixings are listed.")
    return tuple(said)
