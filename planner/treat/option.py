"""One treatment of one room: its file ``options/NAME.toml``, and the room with it in place."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Annotated, Any, Self

from pydantic import BaseModel, ConfigDict, Field, ValidationError, model_validator

from planner.errors import InputError, OptionError
from planner.room.surfaces import RoomSurfaces
from planner.storage import write_atomically
from planner.treat.catalogue import FREE, Catalogue, Product

LARGEST_FILE = 2_000_000
"""An option file beyond this is something else. [byte]"""

Number = Annotated[float, Field(allow_inf_nan=False)]
Rectangle = tuple[
    Annotated[Number, Field(ge=0)],
    Annotated[Number, Field(ge=0)],
    Annotated[Number, Field(gt=0)],
    Annotated[Number, Field(gt=0)],
]
"""left, bottom, width, height on the surface, as seen from inside. [m]"""


class _Model(BaseModel):
    model_config = ConfigDict(
        frozen=True, extra="forbid", str_strip_whitespace=True, populate_by_name=True
    )


class OptionItem(_Model):
    """So many of one product on one surface."""

    product: Annotated[str, Field(min_length=1, max_length=80)]
    surface: Annotated[str, Field(min_length=1, max_length=80)]
    """Name of the surface, or ``free`` for things that stand in the room."""
    count: Annotated[int, Field(ge=1, le=100_000)] | None = None
    """Pieces."""
    area: Annotated[Number, Field(gt=0, le=1e6)] | None = None
    """For goods by the square metre. [m²]"""
    placement: tuple[Rectangle, ...] = ()
    """Where each piece goes, once drawn. [m]"""

    @model_validator(mode="after")
    def _count_or_area(self) -> Self:
        if (self.count is None) == (self.area is None):
            raise OptionError(
                "an item has either a count of pieces or an area", cure="Give count or area."
            )
        if self.placement and self.count is not None and len(self.placement) != self.count:
            raise OptionError(
                f"{self.count} pieces but {len(self.placement)} places",
                cure="Give one [left, bottom, width, height] for each piece.",
            )
        return self


class Option(_Model):
    """A named treatment."""

    name: Annotated[str, Field(min_length=1, max_length=200)]
    items: tuple[OptionItem, ...] = Field(default=(), alias="item")
    note: Annotated[str, Field(max_length=2000)] = ""

    def pieces(self, product_id: str) -> float:
        """Pieces (or square metres) of one product on all surfaces together."""
        return sum(
            float(item.count if item.count is not None else item.area or 0.0)
            for item in self.items
            if item.product == product_id
        )

    @property
    def products(self) -> tuple[str, ...]:
        """Distinct product ids in order of first use."""
        return tuple(dict.fromkeys(item.product for item in self.items))


def read_option(path: str | Path) -> Option:
    """Read an option file.

    Raises
    ------
    OptionError
        The file cannot be read, is not TOML, or does not describe a treatment.
    """
    file = Path(path)
    try:
        raw = file.read_bytes()
    except OSError as error:
        raise OptionError(
            f"cannot be read ({error.strerror or error})", file=file, cure="Name an option file."
        ) from error
    if len(raw) > LARGEST_FILE:
        raise OptionError(
            f"is {len(raw) / 1e6:.1f} MB large", file=file, cure="An option file has a few kB."
        )
    try:
        text = raw.decode("utf-8-sig").replace("\r\n", "\n")
        data = tomllib.loads(text)
    except UnicodeDecodeError as error:
        raise OptionError("is not UTF-8 text", file=file, cure="Save it as UTF-8.") from error
    except (tomllib.TOMLDecodeError, RecursionError) as error:
        raise OptionError(
            f"is not TOML: {error}", file=file, cure='Lines look like product = "panel-50".'
        ) from error
    return option_from(data, file=file)


def option_from(data: Mapping[str, Any], *, file: str | Path | None = None) -> Option:
    """Option from nested tables as TOML gives them.

    Raises
    ------
    OptionError
        As `read_option`.
    """
    try:
        return Option.model_validate(dict(data))
    except ValidationError as error:
        entry = error.errors(include_url=False)[0]
        what, cure = _in_words(dict(entry))
        raise OptionError(what, file=file, where=_place(entry["loc"]), cure=cure) from error


def option_to_toml(option: Option) -> str:
    """Text of an option file that reads back as the same option."""
    import tomli_w

    data = option.model_dump(by_alias=True, exclude_defaults=True, mode="json")
    text: str = tomli_w.dumps(data)
    return text


def write_option(path: str | Path, option: Option) -> Path:
    """Write an option file atomically.

    Raises
    ------
    InputError
        The place cannot be written to.
    """
    return write_atomically(path, option_to_toml(option))


def treated(surfaces: RoomSurfaces, option: Option, catalogue: Catalogue) -> RoomSurfaces:
    """The room with every item of an option in place.

    Raises
    ------
    OptionError
        An item names no product of the catalogue, goes where its product must not go, or does not
        fit.
    """
    room = surfaces
    for number, item in enumerate(option.items, 1):
        where = f"[[item]] {number} of {option.name!r}"
        try:
            product = catalogue.find(item.product)
        except InputError as error:
            raise OptionError(error.what, where=where, cure=error.cure) from error
        _check_item(item, product, where)
        if product.unit == "item":
            room = room.with_item(product.id, float(item.count or 0), product.coefficients)
        else:
            room = room.covered(
                item.surface,
                f"{product.id} on {item.surface}",
                product.id,
                item_area(item, product),
                product.coefficients,
            )
    return room


def panel_places(
    surfaces: RoomSurfaces, option: Option, catalogue: Catalogue
) -> dict[int, tuple[Rectangle, ...]]:
    """Where the panels lie that `treated` adds to a room, by the number of their part."""
    mounted = [item for item in option.items if catalogue.find(item.product).unit != "item"]
    first = len(surfaces.parts)
    return {first + n: item.placement for n, item in enumerate(mounted) if item.placement}


def item_area(item: OptionItem, product: Product) -> float:
    """Surface that an item hides. [m²]."""
    if item.area is not None:
        return item.area
    return (item.count or 0) * product.piece_area


def kind_of_surface(name: str) -> str:
    """``floor``, ``ceiling``, ``free`` or ``wall``."""
    return name if name in ("floor", "ceiling", FREE) else "wall"


def _check_item(item: OptionItem, product: Product, where: str) -> None:
    if (item.area is not None) != (product.unit == "m2"):
        wanted = "area = … (m²)" if product.unit == "m2" else "count = …"
        raise OptionError(
            f"{product.id!r} is sold by the {_SOLD_BY[product.unit]}",
            where=where,
            cure=f"Write {wanted}.",
        )
    if kind_of_surface(item.surface) not in product.surfaces:
        raise OptionError(
            f"{product.id!r} does not go on {item.surface!r}",
            where=where,
            cure=f"It may go on: {', '.join(product.surfaces)}.",
        )


_SOLD_BY = {"piece": "piece", "m2": "square metre", "item": "item"}


def _place(location: Sequence[int | str]) -> str | None:
    words = [str(step + 1) if isinstance(step, int) else step for step in location]
    if words and words[0] == "item":
        words[0] = "[[item]]"
        if len(words) > 1:
            words[0:2] = [f"[[item]] {words[1]}"]
    return ", ".join(words) or None


def _in_words(entry: Mapping[str, Any]) -> tuple[str, str | None]:
    cause = (entry.get("ctx") or {}).get("error")
    if isinstance(cause, InputError):
        return cause.what, cause.cure
    kind = entry["type"]
    if kind == "missing":
        return "is missing", "Add it."
    if kind == "extra_forbidden":
        return "is not a key the planner knows", "Known: product, surface, count, area, placement."
    shown = repr(entry.get("input"))
    message = str(entry["msg"])
    return f"{shown[:60]}: {message[0].lower()}{message[1:]}", None
