"""What to buy for one option: whole packs, pieces, area, weight, cost, and the usual cautions."""

from __future__ import annotations

import csv
import io
import math
from dataclasses import dataclass
from typing import Any

from planner.errors import OptionError
from planner.treat.catalogue import Catalogue, Product
from planner.treat.cautions import cautions
from planner.treat.option import Option, item_area


@dataclass(frozen=True, slots=True)
class ShoppingLine:
    """One product of the list."""

    product: str
    item: str
    """Its description."""
    unit: str
    """``piece``, ``m2`` or ``item``."""
    surfaces: tuple[str, ...]
    """Where it goes, with how many: ``ceiling: 6``."""
    packs: int
    pieces: int | None
    """Needed; None for goods by the square metre."""
    area_m2: float
    """Covered; 0 for free-standing things. [m²]"""
    weight_kg: float | None
    """Of what is mounted; None where the catalogue gives none. [kg]"""
    cost: float | None
    """Of the packs; None where the catalogue gives no price."""
    price_per_pack: float | None
    pack: float
    """Pieces (or square metres) in a pack."""
    spare: float
    """Pieces (or square metres) left over from the last pack."""
    price_is_invented: bool
    fire_class_declared: str

    @property
    def spare_percent(self) -> float:
        """Left over, of what is bought. [%]."""
        return 100.0 * self.spare / (self.packs * self.pack) if self.packs else 0.0


@dataclass(frozen=True, slots=True)
class ShoppingList:
    """Everything to buy for one option."""

    name: str
    lines: tuple[ShoppingLine, ...]
    currency: str
    cautions: tuple[str, ...]
    warnings: tuple[str, ...]

    @property
    def total(self) -> float | None:
        """Cost of the lines with a price; None where none has one."""
        costs = [line.cost for line in self.lines if line.cost is not None]
        return math.fsum(costs) if costs or not self.lines else None

    @property
    def is_complete(self) -> bool:
        """Has every line a price."""
        return all(line.cost is not None for line in self.lines)

    @property
    def weight_kg(self) -> float | None:
        """Of everything mounted; None where a weight is not known. [kg]."""
        weights = [line.weight_kg for line in self.lines]
        known = [weight for weight in weights if weight is not None]
        return math.fsum(known) if len(known) == len(weights) else None

    @property
    def area_m2(self) -> float:
        """Covered surface. [m²]."""
        return math.fsum(line.area_m2 for line in self.lines)

    def to_json(self) -> dict[str, Any]:
        """As promised for ``planner buy --json``."""
        return {
            "name": self.name,
            "lines": [
                {
                    "item": line.item,
                    "product": line.product,
                    "unit": line.unit,
                    "surfaces": list(line.surfaces),
                    "packs": line.packs,
                    "pieces": line.pieces,
                    "area_m2": round(line.area_m2, 4),
                    "weight_kg": None if line.weight_kg is None else round(line.weight_kg, 3),
                    "cost": None if line.cost is None else round(line.cost, 2),
                    "spare": round(line.spare, 4),
                    "spare_percent": round(line.spare_percent, 1),
                    "price_is_invented": line.price_is_invented,
                    "fire_class_declared": line.fire_class_declared or None,
                }
                for line in self.lines
            ],
            "total": None if self.total is None else round(self.total, 2),
            "currency": self.currency,
            "is_complete": self.is_complete,
            "area_m2": round(self.area_m2, 4),
            "weight_kg": None if self.weight_kg is None else round(self.weight_kg, 3),
            "cautions": list(self.cautions),
            "warnings": list(self.warnings),
        }


def shopping_list(
    option: Option, catalogue: Catalogue, *, currency: str = "EUR", reserve: float = 0.0
) -> ShoppingList:
    """What to buy for an option.

    Parameters
    ----------
    option
        The treatment.
    catalogue
        Where its products stand.
    currency
        Of the room; used where the catalogue names none.
    reserve
        Share bought on top of goods by the square metre, for offcuts, 0 to 1. [-]

    Raises
    ------
    OptionError
        The option names a product that the catalogue does not have, mixes currencies, or `reserve`
        is no share.
    """
    if not 0.0 <= reserve <= 1.0:
        raise OptionError(f"a reserve of {reserve:g} is no share", cure="Write 0.1 for 10 %.")
    products = {name: _product(option, catalogue, name) for name in option.products}
    used = {p.currency for p in products.values() if p.price_per_pack is not None and p.currency}
    if len(used | ({currency.upper()} if used else set())) > 1:
        raise OptionError(
            f"{option.name!r} has prices in {', '.join(sorted(used))}, the room in {currency}",
            cure="Write all prices in one currency and set currency under [treatment].",
        )
    lines = tuple(_line(option, product, reserve) for product in products.values())
    overhead = any(item.surface == "ceiling" for item in option.items)
    return ShoppingList(
        name=option.name,
        lines=lines,
        currency=currency.upper(),
        cautions=cautions(tuple(products.values()), overhead=overhead),
        warnings=_warnings(lines),
    )


def _product(option: Option, catalogue: Catalogue, name: str) -> Product:
    from planner.errors import InputError

    try:
        return catalogue.find(name)
    except InputError as error:
        raise OptionError(error.what, where=f"option {option.name!r}", cure=error.cure) from error


def _line(option: Option, product: Product, reserve: float) -> ShoppingLine:
    mine = [item for item in option.items if item.product == product.id]
    amount = option.pieces(product.id)
    wanted = amount * (1.0 + reserve) if product.unit == "m2" else amount
    packs = math.ceil(wanted / product.pack - 1e-6)
    price = product.price_per_pack
    by_surface: dict[str, float] = {}
    for item in mine:
        number = float(item.count if item.count is not None else item.area or 0.0)
        by_surface[item.surface] = by_surface.get(item.surface, 0.0) + number
    sign = " m²" if product.unit == "m2" else ""
    return ShoppingLine(
        product=product.id,
        item=product.description,
        unit=product.unit,
        surfaces=tuple(f"{on}: {_plain(number)}{sign}" for on, number in by_surface.items()),
        packs=packs,
        pieces=None if product.unit == "m2" else round(amount),
        area_m2=math.fsum(item_area(item, product) for item in mine),
        weight_kg=None if product.weight_kg is None else amount * product.weight_kg,
        cost=None if price is None else packs * price,
        price_per_pack=price,
        pack=product.pack,
        spare=max(0.0, packs * product.pack - amount),
        price_is_invented=price is not None and product.price_is_invented,
        fire_class_declared=product.fire_class_declared,
    )


def _warnings(lines: tuple[ShoppingLine, ...]) -> tuple[str, ...]:
    said = []
    unpriced = [line.product for line in lines if line.cost is None]
    if unpriced:
        said.append(f"no price is known for {', '.join(unpriced)}: the total leaves them out")
    invented = [line.product for line in lines if line.price_is_invented]
    if invented:
        said.append(f"the price is invented for {', '.join(invented)}: ask for a real one")
    unweighed = [line.product for line in lines if line.weight_kg is None]
    if unweighed:
        said.append(f"no weight is known for {', '.join(unweighed)}: weigh one before fixing it")
    return tuple(said)


def to_text(bought: ShoppingList) -> str:
    """The list as plain text for a terminal or a printer."""
    heads = ("item", "packs", "pieces", "area m²", "weight kg", f"cost {bought.currency}", "where")
    rows = [
        (
            line.item,
            str(line.packs),
            "–" if line.pieces is None else str(line.pieces),
            f"{line.area_m2:.2f}",
            _number(line.weight_kg, 1),
            _number(line.cost, 2),
            ", ".join(line.surfaces),
        )
        for line in bought.lines
    ]
    total = _number(bought.total, 2) + ("" if bought.is_complete else " (incomplete)")
    rows.append(("total", "", "", f"{bought.area_m2:.2f}", _number(bought.weight_kg, 1), total, ""))
    widths = [max(len(row[n]) for row in (heads, *rows)) for n in range(len(heads))]
    lines = [f"Shopping list: {bought.name}", ""]
    lines += [_aligned(heads, widths), _aligned(tuple("-" * width for width in widths), widths)]
    lines += [_aligned(row, widths) for row in rows]
    spare = [
        f"{line.item}: {_plain(line.spare)}{' m²' if line.unit == 'm2' else ''} "
        f"({line.spare_percent:.0f} %)"
        for line in bought.lines
        if line.spare > 1e-6
    ]
    if spare:
        lines += ["", "Left over from whole packs: " + "; ".join(spare)]
    for title, entries in (("Note", bought.warnings), ("Take care", bought.cautions)):
        if entries:
            lines += ["", f"{title}:", *(f"- {entry}" for entry in entries)]
    return "\n".join(lines) + "\n"


def to_csv(bought: ShoppingList) -> str:
    """The list as CSV with units in the headings; no cell can run as a formula."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(
        [
            "product", "item", "where", "packs", "pieces", "area_m2", "weight_kg",
            f"cost_{harmless(bought.currency)}", "spare_percent", "fire_class_declared",
            "price_basis",
        ]
    )  # fmt: skip
    for line in bought.lines:
        basis = (
            "none" if line.cost is None else "invented" if line.price_is_invented else "catalogue"
        )
        writer.writerow(
            [
                harmless(line.product),
                harmless(line.item),
                harmless("; ".join(line.surfaces)),
                line.packs,
                "" if line.pieces is None else line.pieces,
                f"{line.area_m2:.3f}",
                "" if line.weight_kg is None else f"{line.weight_kg:.2f}",
                "" if line.cost is None else f"{line.cost:.2f}",
                f"{line.spare_percent:.1f}",
                harmless(line.fire_class_declared),
                basis,
            ]
        )
    total = "" if bought.total is None else f"{bought.total:.2f}"
    note = "total" if bought.is_complete else "total, incomplete"
    weight = "" if bought.weight_kg is None else f"{bought.weight_kg:.2f}"
    writer.writerow([note, "", "", "", "", f"{bought.area_m2:.3f}", weight, total, "", "", ""])
    for title, entries in (("note", bought.warnings), ("take care", bought.cautions)):
        for entry in entries:
            writer.writerow([title, harmless(entry), *[""] * 9])
    return stream.getvalue()


def harmless(text: str) -> str:
    """Text for a spreadsheet cell: what would run as a formula gets an apostrophe before it."""
    plain = text.replace("\r", " ").replace("\n", " ").replace("\t", " ")
    return f"'{plain}" if plain.lstrip()[:1] in tuple("=+-@＝＋－＠") and plain.strip() else plain


def _aligned(cells: tuple[str, ...], widths: list[int]) -> str:
    words = [
        cell.ljust(width) if n in (0, len(widths) - 1) else cell.rjust(width)
        for n, (cell, width) in enumerate(zip(cells, widths, strict=True))
    ]
    return "  ".join(words).rstrip()


def _number(value: float | None, digits: int) -> str:
    return "?" if value is None else f"{value:.{digits}f}"


def _plain(value: float) -> str:
    return f"{value:.0f}" if value == round(value) else f"{value:.2f}"
