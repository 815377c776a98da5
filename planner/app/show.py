"""What every page shows alike: charts with their numbers, drawings, refusals, lengths to type."""

from __future__ import annotations

import base64
from collections.abc import Callable, Sequence
from html import escape
from typing import TYPE_CHECKING, Any

import streamlit as st

from planner.errors import PlannerError
from planner.report.palette import DARK, LIGHT, Theme
from planner.room.lengths import METRES_PER, parse_length

if TYPE_CHECKING:
    from planner.predict.prediction import Prediction
    from planner.report.band_series import Series
    from planner.report.chart import Chart


def theme() -> Theme:
    """Light or dark, as the page is."""
    try:
        kind = st.context.theme.type
    except AttributeError:
        kind = "light"
    return DARK if kind == "dark" else LIGHT


def plain(text: str) -> str:
    """Text that a person typed, without meaning for Markdown."""
    for sign in "\\`*_{}[]<>#$|~:":
        text = text.replace(sign, f"\\{sign}")
    return text


def chart(picture: Chart, *, key: str, table: bool = True, to_scale: bool = False) -> None:
    """A chart over the whole width, its message in words, and the same numbers as a table.

    One that is drawn to scale keeps its own size instead.
    """
    sized = picture if to_scale else picture.sized("container", picture.spec.get("height", 260))
    spec = apart(dict(sized.vega_lite(theme())))
    spec["description"] = f"{picture.title}; in words and numbers below"
    if not to_scale:
        spec["autosize"] = {"type": "fit-x", "contains": "padding"}
    signs = " ".join(spec["title"].get("subtitle", ()))
    # As text of the page it wraps on a narrow screen instead of being cut.
    spec["title"] = {**spec["title"], "subtitle": ()}
    # A screen reader gets the sentence and the table; nameless dots of a plot would only be in its way.
    spec["config"] = {**spec["config"], "mark": {"aria": False}}
    st.vega_lite_chart(spec, width="content" if to_scale else "stretch", theme=None, key=key)
    words = (
        f"{signs[0].upper()}{signs[1:]}. {picture.description}" if signs else picture.description
    )
    st.caption(plain(words))
    if table:
        # Filled once it is opened: a table costs the browser more than the chart.
        numbers = st.expander(
            f"Numbers: {plain(picture.title)}", key=f"{key}-numbers", on_change="rerun"
        )
        if numbers.open:
            numbers.dataframe(picture.table(), hide_index=True, width="stretch", key=f"{key}-table")


def apart(spec: dict[str, Any]) -> dict[str, Any]:
    """The same chart with its data beside it, under names that do not change.

    A chart of which only data changed is refilled by the browser; one that changed itself is built
    anew, which takes several times as long.
    """
    import pyarrow as pa

    tables: dict[str, pa.Table] = {}

    def named(node: Any) -> Any:
        if isinstance(node, list):
            return [named(each) for each in node]
        if not isinstance(node, dict):
            return node
        rows = node["data"].get("values") if isinstance(node.get("data"), dict) else None
        if rows and all(isinstance(row, dict) for row in rows):
            columns = dict.fromkeys(column for row in rows for column in row)
            table = pa.table({name: [row.get(name) for row in rows] for name in columns})
            # Whole numbers would reach the browser as a kind that its arithmetic does not take.
            kinds = [
                pa.field(one.name, pa.float64()) if pa.types.is_integer(one.type) else one
                for one in table.schema
            ]
            name = f"table-{len(tables)}"
            tables[name] = table.cast(pa.schema(kinds))
            node = {**node, "data": {"name": name}}
        return {key: named(value) for key, value in node.items()}

    found: dict[str, Any] = named(spec)
    return {**found, "datasets": {**found.get("datasets", {}), **tables}} if tables else found


def drawing(svg: str, words: str) -> None:
    """A drawing to scale, with words for those who do not see it.

    As an image it can neither run anything nor fetch anything, whatever names it holds.
    """
    source = base64.b64encode(svg.encode("utf-8")).decode("ascii")
    st.html(
        f'<img alt="{escape(words, quote=True)}" style="width: 100%; max-height: 80vh" '
        f'src="data:image/svg+xml;base64,{source}">'
    )
    st.caption(plain(words))


def refusal(error: PlannerError) -> None:
    """A refusal in words."""
    st.error(plain(str(error)))


def notes(texts: Sequence[str], title: str = "Doubts and their cures") -> None:
    """Doubts, out of the way but not hidden."""
    if not texts:
        return
    with st.expander(f"{title} ({len(texts)})"):
        st.markdown("\n".join(f"- {plain(text)}" for text in texts))


def shown(metres: float | None, units: str) -> str:
    """A length as one edits it: a number in the room's unit."""
    return "" if metres is None else f"{metres / METRES_PER[units]:.4g}"


def length(
    label: str,
    metres: float | None,
    units: str,
    *,
    key: str,
    optional: bool = False,
    help_: str = "",
) -> float | None:
    """A field for a length; text that is none is refused below it and the old value stays. [m]."""
    text = st.text_input(
        f"{label} ({units})", value=shown(metres, units), key=key, help=help_ or _LENGTH_HELP
    )
    if optional and not text.strip():
        return None
    try:
        found = parse_length(text, units)
    except PlannerError as error:
        refusal(error)
        return metres
    # Typed as shown: keep the exact value instead of the four digits of the field.
    return metres if metres is not None and text == shown(metres, units) else found


_LENGTH_HELP = "For example 5.20, 520 cm, 17' 1 or 17 ft 1."


def prediction_series(prediction: Prediction, name: str, look: str) -> Series:
    """A prediction as a line of a chart: its interval pale, assumed bands hollow."""
    from planner.report.charts import Series

    low, high = prediction.interval_s
    return Series(
        name=name,
        values=prediction.time,
        look=look,
        low=low,
        high=high,
        assumed_hz=prediction.assumed_hz,
    )


def guarded(action: Callable[[], Any]) -> Any:
    """The result of an action, or None after showing why it was refused."""
    try:
        return action()
    except PlannerError as error:
        refusal(error)
        return None
