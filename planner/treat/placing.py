"""The work behind a placement: surface by surface, product by product, pair by pair."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from itertools import islice, permutations

from planner.errors import OptionError
from planner.room.model import Room
from planner.treat.catalogue import Catalogue, Product
from planner.treat.fitting import fields, over_there, same_size, sheets, sizes_of
from planner.treat.free_field import Box, Field
from planner.treat.laying import Wish, lay, lay_mirrored
from planner.treat.option import OptionItem
from planner.treat.packing import Size, densest

MOST_ORDERS = 6
"""Orders of the products of one surface that are tried."""

Groups = dict[int, list[Box]]
"""Panels by number of their item, with half a gap on every side. [m]"""


@dataclass
class Job:
    """One placement while it is made."""

    room: Room
    free: Mapping[str, Field]
    """Surfaces that may carry something."""
    catalogue: Catalogue
    items: Sequence[OptionItem]
    bass: frozenset[str]
    """Products that follow the modes' pressure."""
    middles: Mapping[str, str]
    """Surfaces to be mirrored about their own middle, and along which axis."""
    wishes: Mapping[str, Wish]
    """What panels should do, by surface."""
    laid: Groups = field(init=False)
    """What hangs, by item, without gaps. [m]"""
    taken: dict[str, list[Box]] = field(init=False)
    """The same by surface, with half a gap on every side. [m]"""
    warnings: list[str] = field(default_factory=list)

    def run(self) -> None:
        """Lay everything: what a person drew, symmetric pairs, the rest, goods by the metre."""
        self.laid = {number: [] for number in range(len(self.items))}
        self.taken = {name: [] for name in self.free}
        for number, item in enumerate(self.items):
            for place in item.placement:
                self._as_drawn(number, Box(*place))
        open_count = {
            number: item.count
            for number, item in enumerate(self.items)
            if item.count is not None and not item.placement
        }
        for one, other in self.room.treatment.symmetric:
            self._pair(one, other, open_count)
        for name in self.free:
            wanted = {n: c for n, c in open_count.items() if self.items[n].surface == name and c}
            if wanted:
                self._alone(name, wanted)
            self._sheets(name)

    def product(self, number: int) -> Product:
        """Of an item."""
        return self.catalogue.find(self.items[number].product)

    def missing(self, number: int) -> float:
        """Pieces, or square metres, of an item that found no place."""
        item, boxes = self.items[number], self.laid[number]
        if item.count is not None:
            return float(item.count - len(boxes))
        return (item.area or 0.0) - sum(box.width * box.height for box in boxes)

    @cached_property
    def _bare(self) -> Mapping[str, Field]:
        """Surfaces without any gap, for what a person drew."""
        return fields(self.room, gap=0.0)

    def _now(self, surface: str) -> Field:
        """What is still free on a surface."""
        taken = self.taken[surface]
        return self.free[surface].without(taken) if taken else self.free[surface]

    def _hang(self, number: int, boxes: Sequence[Box]) -> None:
        surface = self.items[number].surface
        half = 0.5 * self.free[surface].gap
        self.laid[number] += [box.grown(-half) for box in boxes]
        self.taken[surface] += boxes

    def _as_drawn(self, number: int, box: Box) -> None:
        """A place that a person drew: closer than the gap is theirs to decide, overlap is not."""
        surface = self.items[number].surface
        half = 0.5 * self.free[surface].gap
        if not self._bare[surface].without(b.grown(-half) for b in self.taken[surface]).holds(box):
            raise OptionError(
                f"{self.items[number].product!r} at {box.left:g}, {box.bottom:g} m on {surface!r} "
                "lies over an opening, a keep-out or another panel, or leaves the surface",
                where=f"[[item]] {number + 1}, placement",
                cure="Move it, or leave placement out and let the planner lay it.",
            )
        self._hang(number, [box.grown(half)])

    def _pair(self, one: str, other: str, open_count: dict[int, int]) -> None:
        """Lay what both surfaces have in common once, and mirror it; the rest stays open."""
        if one not in self.free or other not in self.free:
            return
        here, seen = self._now(one), over_there(one, self._now(other))
        partner = self._partners(one, other, open_count)
        if not same_size(here, seen):
            if partner:
                self.warnings.append(
                    f"{one} and {other} differ in size: their panels are laid independently."
                )
            return
        both = {n: min(open_count[n], open_count[m]) for n, m in partner.items()}
        for number, match in partner.items():
            open_count[number] -= both[number]
            open_count[match] -= both[number]
        uneven = {
            self.items[n].product
            for n, count in open_count.items()
            if count and self.items[n].surface in (one, other)
        }
        if uneven:
            self.warnings.append(
                f"{one} and {other} have different numbers of {', '.join(sorted(uneven))}: the "
                "rest is not symmetric."
            )
        level = one in ("floor", "ceiling")
        theirs = self.wishes[other] if level else self.wishes[other].mirrored(here.width)
        wish = replace(self.wishes[one].and_also(theirs), beside=tuple(self.taken[one]))
        for number, boxes in self._groups(here.both(seen), both, wish, None).items():
            self._hang(number, boxes)
            copies = boxes if level else [box.mirrored(here.width) for box in boxes]
            self._hang(partner[number], copies)

    def _partners(self, one: str, other: str, open_count: Mapping[int, int]) -> dict[int, int]:
        """Item on the other surface for each item on this one that has such a counterpart."""
        partner: dict[int, int] = {}
        for number in open_count:
            if self.items[number].surface != one:
                continue
            wanted = (other, self.items[number].product)
            for match in open_count:
                found = (self.items[match].surface, self.items[match].product)
                if found == wanted and match not in partner.values():
                    partner[number] = match
                    break
        return partner

    def _alone(self, name: str, wanted: Mapping[int, int]) -> None:
        """Lay panels on one surface, about its middle where that is wished and possible."""
        wish = replace(self.wishes[name], beside=tuple(self.taken[name]))
        axis, here = self.middles.get(name), self._now(name)
        found = self._groups(here, wanted, wish, axis)
        if axis and _count(found) < sum(wanted.values()):
            anyhow = self._groups(here, wanted, wish, None)
            if _count(anyhow) > _count(found):
                found = anyhow
                self.warnings.append(
                    f"{name}: the panels do not fit symmetrically about its middle."
                )
        for number, boxes in found.items():
            self._hang(number, boxes)

    def _groups(
        self, here: Field, wanted: Mapping[int, int], wish: Wish, axis: str | None
    ) -> Groups:
        """Panels of several products on one surface: the first order that holds them all.

        Tidy arrangements are tried in every order first, then the densest ones.
        """
        best, most = Groups(), 0.0
        for tight in (False,) if axis else (False, True):
            for order in self._orders(wanted, wish):
                found = self._in_order(here, wanted, order, wish, axis, tight)
                if _count(found) == sum(wanted.values()):
                    return found
                area = sum(len(b) * self.product(n).piece_area for n, b in found.items())
                if area > most + 1e-9:
                    best, most = found, area
        return best

    def _orders(self, wanted: Mapping[int, int], wish: Wish) -> list[tuple[int, ...]]:
        """What is to cover reflections first, then by size; other orders after that."""

        def rank(number: int) -> tuple[bool, float, int]:
            product = self.product(number)
            return product.id in self.bass and bool(wish.cover), -product.piece_area, number

        return list(islice(permutations(sorted(wanted, key=rank)), MOST_ORDERS))

    def _in_order(
        self,
        here: Field,
        wanted: Mapping[int, int],
        order: Sequence[int],
        wish: Wish,
        axis: str | None,
        tight: bool,
    ) -> Groups:
        found: Groups = {}
        hung = list(wish.beside)
        for number in order:
            product = self.product(number)
            low = product.id in self.bass
            own = Wish(
                cover=() if low else wish.cover,
                pressure=wish.pressure if low else None,
                middle=wish.middle,
                beside=tuple(hung),
            )
            boxes = _laid(here, sizes_of(here, product), wanted[number], own, axis, tight)
            if boxes:
                found[number] = boxes
                here = here.without(boxes)
                hung += boxes
        return found

    def _sheets(self, name: str) -> None:
        """Goods by the square metre, in what the panels leave: whole sheets, the last one cut."""
        for number, item in enumerate(self.items):
            if item.surface != name or item.placement or item.area is None:
                continue
            wanted = item.area
            for sheet in sheets(self._now(name)):
                if wanted <= 1e-6:
                    break
                width = min(sheet.width, wanted / sheet.height)
                box = Box(sheet.left, sheet.bottom, width, sheet.height)
                self._hang(number, [box.grown(0.5 * self.free[name].gap)])
                wanted -= width * sheet.height


def _laid(
    here: Field, sizes: Sequence[Size], count: int, wish: Wish, axis: str | None, tight: bool
) -> list[Box]:
    if tight:
        return densest(here, sizes)[:count]
    if axis == "u":
        return lay_mirrored(here, sizes, count, wish)
    if axis == "v":
        turned = [(height, width) for width, height in sizes]
        return [b.turned() for b in lay_mirrored(here.turned(), turned, count, wish.turned())]
    return lay(here, sizes, count, wish)


def _count(groups: Groups) -> int:
    return sum(len(boxes) for boxes in groups.values())
