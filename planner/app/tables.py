"""Tables that a person edits: nothing typed is lost, and every cell is looked at before it counts."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Mapping, Sequence
from typing import Any

import pandas as pd
import streamlit as st

from planner.errors import CatalogueError
from planner.treat.catalogue_file import COLUMNS, products_from_bytes
from planner.treat.cells import decoded
from planner.treat.option import Option, option_from

HELD = "tables"
"""Under this key the session keeps what each table showed when it was opened."""


def edited(base: pd.DataFrame, *, key: str, **looks: Any) -> pd.DataFrame:
    """A table as a person has edited it.

    What was read back is never shown as the next beginning: the edits would then be applied twice,
    or every second one lost. The first table stays until the page is left.
    """
    held = st.session_state.setdefault(HELD, {})
    if key not in st.session_state or key not in held:
        held[key] = base
    looks = {"num_rows": "dynamic", "width": "stretch", "hide_index": True, **looks}
    table: pd.DataFrame = st.data_editor(held[key], key=key, **looks)
    return table


def cells(table: pd.DataFrame) -> list[dict[str, Any]]:
    """What stands in a table of text: cells that hold something, in rows that do."""
    rows = table.fillna("").astype(str).to_dict("records")
    kept = ({name: cell for name, cell in row.items() if cell} for row in rows)
    return [row for row in kept if row]


def option_rows(option: Option, catalogue: Mapping[str, Any]) -> pd.DataFrame:
    """Items of an option as they are edited."""
    return pd.DataFrame(
        [
            {
                "product": item.product,
                "what": catalogue[item.product].description if item.product in catalogue else "",
                "surface": item.surface,
                "pieces": item.count,
                "area": item.area,
            }
            for item in option.items
        ],
        columns=["product", "what", "surface", "pieces", "area"],
    )


def option_of(rows: Sequence[Mapping[str, Any]], option: Option) -> Option:
    """The option that an edited table says; places of unchanged items are kept.

    Parameters
    ----------
    rows
        With ``product``, ``surface``, ``pieces`` and ``area`` [m²]; rows that name no product yet
        and rows of nothing are left out.
    option
        As it was.

    Raises
    ------
    OptionError
        A count or an area cannot be.
    """
    before: dict[tuple[Any, ...], list[Any]] = {}
    for item in option.items:
        key = (item.product, item.surface, item.count, item.area)
        before.setdefault(key, []).append(item)
    items = []
    for row in rows:
        product, surface = _text(row.get("product")), _text(row.get("surface"))
        count, area = _number(row.get("pieces")), _number(row.get("area"))
        if not product or not surface or not (count or area):
            continue
        known = before.get((product, surface, count, None if count else area))
        if known:
            items.append(known.pop(0).model_dump(by_alias=True, exclude_defaults=True))
            continue
        amount = {"count": int(count) if count.is_integer() else count} if count else {"area": area}
        items.append({"product": product, "surface": surface, **amount})
    return option_from({"name": option.name, "note": option.note, "item": items})


def catalogue_rows(raw: bytes) -> pd.DataFrame:
    """Cells of a catalogue as they stand, under the columns of the guide and any further ones.

    Raises
    ------
    CatalogueError
        It is no text file.
    """
    text = decoded(raw, "catalogue.csv")
    lines = [line for line in text.split("\n") if line.strip() and not line.startswith("#")]
    table = list(csv.reader(io.StringIO("\n".join(lines)), delimiter=separator(raw)))
    names = [name.strip() for name in table[0]] if table else []
    columns = list(dict.fromkeys([*names, *COLUMNS]))
    given = [dict(zip(names, row, strict=False)) for row in table[1:]]
    # Empty columns are text too: a person is to type into them.
    rows = [{name: row.get(name, "") for name in columns} for row in given]
    return pd.DataFrame(rows, columns=columns, dtype=str)


def separator(raw: bytes) -> str:
    """What stands between the cells of a catalogue: comma, semicolon or tab."""
    lines = decoded(raw, "catalogue.csv").split("\n")
    first = next((line for line in lines if line.strip() and not line.startswith("#")), "")
    return max(",;\t", key=first.count)


def catalogue_text(table: pd.DataFrame, between: str = ",") -> str:
    """The edited table as a catalogue file, with the separator that it had.

    Raises
    ------
    CatalogueError
        A row cannot be used; it and the column are named.
    """
    cells = table.fillna("").astype(str)
    cells = cells[(cells != "").any(axis=1)]
    if cells.empty:
        raise CatalogueError("no product is left", cure="Keep at least one row.")
    text: str = cells.loc[:, (cells != "").any(axis=0)].to_csv(
        index=False, lineterminator="\n", sep=between
    )
    products_from_bytes(text.encode(), file="catalogue.csv")
    return text


def _text(value: Any) -> str:
    return value.strip() if isinstance(value, str) else ""


def _number(value: Any) -> float | None:
    """A cell as a number, None where it is empty or nought; what is no number is left for the refusal."""
    if value is None or value == "" or (isinstance(value, float) and math.isnan(value)):
        return None
    return None if float(value) == 0 else float(value)
