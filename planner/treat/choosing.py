"""What may be chosen for a room: its catalogue and the limits of its ``[treatment]``."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from itertools import chain

import numpy as np

from planner.errors import CatalogueError, OptionError
from planner.room.model import TreatmentLimits
from planner.room.surfaces import RoomSurfaces
from planner.treat.catalogue import FREE, Catalogue, Product
from planner.treat.covers import Cover, merged
from planner.treat.option import kind_of_surface
from planner.treat.problem import Cap, Choice, Problem, base_part, footprint

FREE_SHARE = 0.10
"""Free-standing things take at most this share of the floor (a judgement, no source). [-]"""


def problem(
    surfaces: RoomSurfaces,
    catalogue: Catalogue,
    limits: TreatmentLimits,
    *,
    area_limits: Mapping[str, float] | None = None,
    piece_limits: Mapping[tuple[str, str], float] | None = None,
    covers: Sequence[Cover] = (),
) -> Problem:
    """Everything that may be chosen for a room.

    Parameters
    ----------
    surfaces
        The room as it is. Panels go on bare surface; openings and patches stay uncovered.
    catalogue
        Products to choose from.
    limits
        The room file's ``[treatment]``.
    area_limits
        Most that can be mounted on a surface, by name, from the placement. [m²]
    piece_limits
        Most pieces of a product on a surface, by ``(surface, product)``, from the placement.
    covers
        Rectangles that must be covered.

    Raises
    ------
    CatalogueError
        Prices in several currencies, or none in the room's.
    OptionError
        A limit names a surface that the room does not have, or a rectangle to be covered lies
        where nothing may go.
    """
    warnings: list[str] = []
    priced = catalogue.is_priced
    _check_currency(catalogue, limits.currency)
    usable = _usable(catalogue, limits, priced, warnings)
    if limits.cover_first_reflections and not covers:
        warnings.append(
            "first reflections are to be covered, but none are known: give seat and loudspeakers"
        )
    for cover in covers:
        base_part(surfaces, cover.surface)
    most, possible = _areas(surfaces, limits, area_limits or {})
    groups = _groups(surfaces, limits)
    choices = tuple(
        choice
        for product in usable
        for choice in _choices(product, groups, most, possible, limits, piece_limits or {})
    )
    caps = tuple(_caps(choices, most, possible, limits, surfaces))
    choices = _bounded(choices, caps)
    products = tuple({choice.product.id: choice.product for choice in choices}.values())
    order = {product.id: index for index, product in enumerate(products)}
    return Problem(
        surfaces=surfaces,
        limits=limits,
        choices=choices,
        products=products,
        product_of=np.array([order[choice.product.id] for choice in choices], dtype=np.intp),
        copies=np.array([float(len(choice.on)) for choice in choices]),
        caps=caps,
        covers=tuple(merged(covers)),
        is_priced=priced,
        currency=limits.currency,
        warnings=tuple(warnings),
    )


def _check_currency(catalogue: Catalogue, currency: str) -> None:
    for product in catalogue.values():
        if product.price_per_pack is None or product.currency in ("", currency.upper()):
            continue
        raise CatalogueError(
            f"{product.id!r} is priced in {product.currency}, the room in {currency}",
            file=catalogue.file,
            cure="Write all prices in one currency and set currency under [treatment].",
        )


def _usable(
    catalogue: Catalogue, limits: TreatmentLimits, priced: bool, warnings: list[str]
) -> list[Product]:
    """Products that the limits allow; what is left out for want of data is said."""
    usable, unpriced, unsized = [], [], []
    for product in catalogue.values():
        if limits.rented and product.needs_fixings:
            continue
        if priced and product.price_per_pack is None:
            unpriced.append(product.id)
        elif not _depth_allowed(product, limits):
            if product.depth_mm is None:
                unsized.append(product.id)
        else:
            usable.append(product)
    if unpriced:
        warnings.append(f"left out because they have no price: {', '.join(unpriced)}")
    if unsized:
        warnings.append(f"left out because their thickness is not given: {', '.join(unsized)}")
    if not priced and limits.budget is not None:
        warnings.append("the budget was not applied: no product has a price")
    if not usable:
        warnings.append("no product is left that the limits allow")
    return usable


def _depth_allowed(product: Product, limits: TreatmentLimits) -> bool:
    """Thickness and gap within the limits; what lies on the floor or stands free is not asked."""
    least, most = limits.min_thickness_mm, limits.max_depth_mm
    if (least is None and most is None) or not {"wall", "ceiling"} & set(product.surfaces):
        return True
    depth = product.depth_mm
    if depth is None:
        return False
    return (least is None or depth >= least) and (most is None or depth <= most)


def _areas(
    surfaces: RoomSurfaces, limits: TreatmentLimits, given: Mapping[str, float]
) -> tuple[dict[str, float], dict[str, float]]:
    """Most that may be mounted on each surface, and most that could be if the cover was not limited.

    A surface offers its bare part, and no more than the placement found room for.
    """
    names = dict.fromkeys(part.on for part in surfaces.parts)
    mentioned = (
        given,
        limits.max_cover,
        limits.max_weight_kg,
        limits.keep_clear,
        *limits.symmetric,
    )
    for name in chain.from_iterable(mentioned):
        if name not in names and name != FREE:
            raise OptionError(
                f"there is no surface {name!r}", cure=f"This room has {', '.join(names)}."
            )
    most, possible = {}, {}
    for name in names:
        bare = surfaces.area_on(name, "base")
        possible[name] = max(0.0, min(bare, given.get(name, np.inf)))
        most[name] = min(possible[name], bare * limits.max_cover.get(name, 1.0))
    return most, possible


def _groups(surfaces: RoomSurfaces, limits: TreatmentLimits) -> list[tuple[str, ...]]:
    """Surfaces that get the same panels, the rest alone."""
    groups: list[tuple[str, ...]] = [tuple(pair) for pair in limits.symmetric]
    taken = set(chain.from_iterable(groups))
    alone = [(name,) for name in dict.fromkeys(part.on for part in surfaces.parts)]
    return groups + [name for name in alone if name[0] not in taken]


def _choices(
    product: Product,
    groups: Sequence[tuple[str, ...]],
    most: Mapping[str, float],
    possible: Mapping[str, float],
    limits: TreatmentLimits,
    pieces: Mapping[tuple[str, str], float],
) -> list[Choice]:
    if product.unit == "item":
        if FREE in limits.keep_clear or "floor" in limits.keep_clear:
            return []
        return [Choice(product, (FREE,), pieces.get((FREE, product.id), np.inf))]
    found = []
    for group in groups:
        if not all(kind_of_surface(on) in product.surfaces for on in group):
            continue
        if any(on in limits.keep_clear for on in group):
            continue
        if product.weight_kg is None and any(on in limits.max_weight_kg for on in group):
            continue
        upper, fits = (
            min(
                min(areas[on] / product.piece_area, pieces.get((on, product.id), np.inf))
                for on in group
            )
            for areas in (most, possible)
        )
        if product.unit != "m2":
            upper, fits = float(np.floor(upper + 1e-9)), float(np.floor(fits + 1e-9))
        if fits > 0:
            found.append(Choice(product, group, upper, fits))
    return found


def _caps(
    choices: Sequence[Choice],
    most: Mapping[str, float],
    possible: Mapping[str, float],
    limits: TreatmentLimits,
    surfaces: RoomSurfaces,
) -> list[Cap]:
    caps = []
    for name, area in most.items():
        here = np.array([float(name in choice.on) for choice in choices])
        if not here.any():
            continue
        faces = np.array([choice.product.piece_area for choice in choices])
        caps.append(Cap("area", name, here * faces, area, possible[name]))
        if name in limits.max_weight_kg:
            heavy = np.array([choice.product.weight_kg or 0.0 for choice in choices])
            caps.append(Cap("weight", name, here * heavy, limits.max_weight_kg[name]))
    standing = np.array(
        [footprint(c.product) if c.product.unit == "item" else 0.0 for c in choices]
    )
    if standing.any():
        floor = surfaces.area_on("floor", "base", "patch")
        caps.append(Cap("floor space", FREE, standing, FREE_SHARE * floor))
    return caps


def _bounded(choices: Sequence[Choice], caps: Sequence[Cap]) -> tuple[Choice, ...]:
    """The choices with the largest amount that the caps leave each of them."""
    bounded = []
    for number, choice in enumerate(choices):
        most = [cap.most / cap.weights[number] for cap in caps if cap.weights[number] > 0]
        upper = min(choice.upper, *most) if most else choice.upper
        whole = upper if choice.is_continuous else float(np.floor(upper + 1e-9))
        bounded.append(replace(choice, upper=whole))
    return tuple(bounded)
