"""The usual cautions of a shopping list, in general words; local codes and licensed practice decide."""

from __future__ import annotations

from collections.abc import Sequence

from planner.treat.catalogue import Product

_FIBRE = ("wool", "fibre", "fiber", "mineral", "glass")


def cautions(products: Sequence[Product], *, overhead: bool) -> tuple[str, ...]:
    """What to mind when these products are bought and put up.

    Parameters
    ----------
    products
        Those on the list.
    overhead
        Does anything hang from the ceiling.
    """
    if not products:
        return ()
    said = [_fire(products)]
    if any(product.needs_fixings for product in products):
        said.append(
            "Fixings: use anchors made for what the wall is, rated well above the weight; hollow "
            "boards need framing behind them."
        )
    if overhead:
        said.append(
            "Overhead: fix into the structure, not into boards, and secure every piece a second time "
            "(wire or chain) so that it cannot fall on anyone."
        )
    if any(word in f"{p.id} {p.description}".lower() for p in products for word in _FIBRE):
        said.append(
            "Fibre dust irritates skin, eyes and airways: gloves, glasses and a mask while cutting, "
            "and a closed, breathable cover on the finished piece."
        )
    said += [
        "Keep exits, escape routes, signs, detectors, sprinklers, vents and air openings free; a "
        "tight room needs fresh air.",
        "Electricity: keep clear of lamps, sockets and heaters; know where cables run before drilling.",
        "Old buildings may hold asbestos or damp walls: have them looked at first.",
        "Local codes and licensed professionals (fire, structure, electricity) decide; this list is "
        "an estimate.",
    ]
    return tuple(said)


def _fire(products: Sequence[Product]) -> str:
    unknown = [product.id for product in products if not product.fire_class_declared]
    said = "Fire: classes on this list are declared by the maker and not verified"
    if unknown:
        said += f"; none is declared for {', '.join(unknown)}: do not put it up before you know"
    return said + ". A class holds for the tested build-up with its facing and glue only."
