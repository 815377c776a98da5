"""Room: describe it, see it to scale, and see at once what it will sound like."""

from __future__ import annotations

import contextlib
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import streamlit as st

from planner.absorption.library import builtin
from planner.app import show
from planner.app.main import current
from planner.bands import OCTAVES
from planner.errors import PlannerError
from planner.predict.targets import USES
from planner.report import charts
from planner.report.drawings import on_screen
from planner.report.quantities import Quantities
from planner.room.lengths import METRES_PER, parse_length
from planner.room.model import RECTANGLE_WALLS

if TYPE_CHECKING:
    from streamlit.delta_generator import DeltaGenerator

work = current()
units = work.room.units
box = work.room.is_rectangle
data = work.room.model_dump(by_alias=True)


def key(name: str) -> str:
    """Key of a field of this project."""
    return f"room-{work.serial}-{units}-{'box' if box else 'corners'}-{name}"


def materials(per_item: bool = False) -> dict[str, str]:
    """Ids of what may be chosen, with their descriptions."""
    library = {**builtin(), **{own.id: None for own in work.room.materials}}
    return {
        name: material.description if material else "own material of this room"
        for name, material in library.items()
        if material is None or material.per_item is per_item
    }


def choose(label: str, value: str, options: dict[str, str], name: str) -> str:
    """A choice among materials, by their plain words."""
    ids = list(options) if value in options else [value, *options]
    chosen = st.selectbox(
        label,
        ids,
        index=ids.index(value),
        format_func=lambda one: f"{options.get(one, one)}  ({one})",
        key=key(name),
    )
    return str(chosen)


def heading(data: dict[str, Any]) -> None:
    """Name, unit and kind of plan: what the fields below depend on."""
    one, two, three = st.columns([2, 1, 1])
    data["name"] = (
        one.text_input("Name", value=work.room.name, key=key("name")).strip() or work.room.name
    )
    data["units"] = two.radio(
        "Lengths in", ["m", "ft"], index=["m", "ft"].index(units), horizontal=True, key=key("units"),
        format_func={"m": "metres", "ft": "feet"}.get,
    )  # fmt: skip
    kind = three.radio(
        "Plan", ["rectangle", "corners"], index=0 if box else 1, horizontal=True, key=key("plan"),
        format_func={"rectangle": "rectangle", "corners": "any corners"}.get,
    )  # fmt: skip
    length, width, _ = work.room.dimensions
    sides: dict[str, Any] = {"length": length, "width": width, "footprint": None}
    if kind == "corners":
        places = [(float(x), float(y)) for x, y in work.room.footprint]
        sides = {"length": None, "width": None, "footprint": places}
    data["shape"] = {**data["shape"], **sides}


def sizes(data: dict[str, Any]) -> None:
    """Dimensions or corners."""
    length, width, height = work.room.dimensions
    if data["shape"]["footprint"] is None:
        one, two, three = st.columns(3)
        with one:
            length = show.length("Length", length, units, key=key("length")) or length
        with two:
            width = show.length("Width", width, units, key=key("width")) or width
        with three:
            height = show.length("Height", height, units, key=key("height")) or height
        data["shape"] = {**data["shape"], "length": length, "width": width}
    else:
        height = show.length("Height", height, units, key=key("height")) or height
        data["shape"] = {**data["shape"], "footprint": corners()}
    data["shape"]["height"] = height


def corners() -> list[tuple[float, float]]:
    """Corners in plan, as a table of x and y."""
    import pandas as pd

    from planner.app.tables import edited

    base = pd.DataFrame(work.room.footprint / METRES_PER[units], columns=["x", "y"]).round(4)
    st.caption("Corners in plan, anticlockwise; x from front to back, y from left to right.")
    table = edited(
        base, key=key("corners"),
        column_config={c: st.column_config.NumberColumn(f"{c} ({units})", format="%.3f") for c in "xy"},
    )  # fmt: skip
    rows = table.dropna().to_numpy(dtype=float, copy=True) * METRES_PER[units]
    return [(float(x), float(y)) for x, y in rows]


def surfaces(data: dict[str, Any]) -> None:
    """Material of floor, ceiling and walls."""
    options = materials()
    chosen = work.room.surface_materials
    found: dict[str, Any] = {
        name: choose(name.capitalize(), chosen[name], options, f"m-{name}")
        for name in ("floor", "ceiling")
    }
    walls = work.room.wall_names
    same = len({chosen[name] for name in walls}) == 1
    if st.checkbox("All walls alike", value=same, key=key("alike")):
        found["walls"] = choose("Walls", chosen[walls[0]], options, "m-walls")
    else:
        each = [choose(f"Wall {name}", chosen[name], options, f"m-{name}") for name in walls]
        found["walls"] = dict(zip(walls, each, strict=True)) if work.room.is_rectangle else each
    data["surfaces"] = found
    table = st.expander("Their coefficients", key=key("coefficients"), on_change="rerun")
    if table.open:
        table.dataframe(_coefficients(work.sketch.surfaces), hide_index=True, width="stretch")
        table.caption(
            "From tables; an asterisk marks what no source gives and the planner assumes."
        )


def fit_walls(data: dict[str, Any]) -> None:
    """Materials of single walls, for as many walls as the plan now has."""
    walls = data["surfaces"]["walls"]
    if isinstance(walls, str):
        return
    each = [walls[name] for name in RECTANGLE_WALLS] if isinstance(walls, dict) else list(walls)
    footprint = data["shape"]["footprint"]
    count = len(RECTANGLE_WALLS) if footprint is None else len(footprint)
    # A new corner makes a new wall: it begins as the one before it.
    each = [*each, *each[-1:] * (count - len(each))][:count]
    data["surfaces"]["walls"] = (
        dict(zip(RECTANGLE_WALLS, each, strict=True)) if footprint is None else each
    )


def _coefficients(rows: Any) -> Any:
    import pandas as pd

    from planner.bands import OCTAVES, band_label

    return pd.DataFrame(
        [
            {"part": part.name, "material": part.material, "area (m²)": round(float(area), 2)}
            | {
                band_label(hz): f"{a:.2f}{'*' if flag else ''}"
                for hz, a, flag in zip(OCTAVES, alpha, assumed, strict=True)
            }
            for part, area, alpha, assumed in zip(
                rows.parts, rows.area, rows.alpha, rows.assumed, strict=True
            )
        ]
    )


def things(data: dict[str, Any], name: str, title: str, blank: dict[str, Any]) -> None:
    """A list of openings, patches, keep-outs or furnishings, each with its fields."""
    entries = [dict(entry) for entry in data[name]]
    for number, entry in enumerate(entries):
        st.markdown(f"**{title} {number + 1}**")
        fields(entry, f"{name}-{number}")
        if st.button(f"Remove {title.lower()} {number + 1}", key=key(f"{name}-{number}-remove")):
            entries.pop(number)
            data[name] = entries
            work.change_room(data)
            work.serial += 1000
            st.rerun()
    if st.button(f"Add {title.lower()}", key=key(f"{name}-add-{len(entries)}")):
        data[name] = [*entries, blank]
        work.change_room(data)
        st.rerun()
    data[name] = entries


LENGTHS = {"left": "From left", "bottom": "From floor", "width": "Width", "height": "Height"}


def fields(entry: dict[str, Any], prefix: str) -> None:
    """Fields of one entry of a list, by what it holds."""
    names = list(work.room.surface_names)
    columns = st.columns(2)
    slot = 0
    for field, value in list(entry.items()):
        with columns[slot % 2]:
            if field in ("wall", "on"):
                entry[field] = st.selectbox(
                    "On", names, index=names.index(value), key=key(f"{prefix}-{field}")
                )
            elif field == "kind":
                kinds = ["door", "window", "hatch", "vent", "opening"]
                entry[field] = st.selectbox(
                    "Kind", kinds, index=kinds.index(value), key=key(f"{prefix}-kind")
                )
            elif field == "material":
                entry[field] = choose("Material", value, materials(), f"{prefix}-material")
            elif field == "item":
                entry[field] = choose("What", value, materials(per_item=True), f"{prefix}-item")
            elif field == "count":
                entry[field] = int(
                    st.number_input("How many", 1, 10_000, int(value), key=key(f"{prefix}-count"))
                )
            elif field in LENGTHS and value is not None:
                entry[field] = show.length(
                    LENGTHS[field], value, units, key=key(f"{prefix}-{field}")
                )
            elif field == "area" and value is not None:
                entry[field] = float(
                    st.number_input(
                        "Area (m²)", 0.01, 1000.0, float(value), key=key(f"{prefix}-area")
                    )
                )
            elif field == "why":
                entry[field] = st.text_input("Why", value=value, key=key(f"{prefix}-why"))
            else:
                continue
        slot += 1


def places(data: dict[str, Any]) -> None:
    """Seat and loudspeakers."""
    length, width, _ = work.room.dimensions
    positions = data["positions"]
    use = st.checkbox(
        "A seat and loudspeakers", value=positions["seat"] is not None, key=key("places")
    )
    if not use:
        positions["seat"], positions["loudspeakers"] = None, []
        return
    positions["seat"] = point("Seat", positions["seat"] or (0.6 * length, width / 2, 1.2), "seat")
    speakers = list(positions["loudspeakers"]) or [
        (0.2 * length, 0.3 * width, 1.2), (0.2 * length, 0.7 * width, 1.2),
    ]  # fmt: skip
    positions["loudspeakers"] = [
        point(f"Loudspeaker {n + 1}", place, f"speaker-{n}") for n, place in enumerate(speakers)
    ]


def point(label: str, value: tuple[float, float, float], name: str) -> tuple[float, float, float]:
    """Three coordinates."""
    st.markdown(f"**{label}**")
    words = ("from the front", "from the left", "above the floor")
    columns = st.columns(3)
    found = []
    for axis, (column, word) in enumerate(zip(columns, words, strict=True)):
        with column:
            got = show.length(f"{label} {word}", value[axis], units, key=key(f"{name}-{axis}"))
            found.append(value[axis] if got is None else got)
    return found[0], found[1], found[2]


def target_and_air(data: dict[str, Any]) -> None:
    """What the room is to reach, and its air."""
    uses = {use.id: f"{use.description} – {use.source}" for use in USES}
    now = work.room.target.use if work.room.target else None
    ids = ["", *uses]
    if work.room.target and now is None:
        st.caption("The room file gives limits of its own; choose a use to replace them.")
    chosen = st.selectbox(
        "Target", ids, index=ids.index(now) if now in ids else 0, key=key("target"),
        format_func=lambda one: uses.get(one, "none, or limits of one's own"),
    )  # fmt: skip
    if chosen:
        keep = data["target"] if data["target"] and data["target"]["use"] == chosen else {}
        data["target"] = {**keep, "use": chosen}
    elif now is not None:
        data["target"] = None
    left, right = st.columns(2)
    air = dict(data["air"])
    air["temperature_c"] = float(
        left.number_input(
            "Temperature (°C)",
            -20.0,
            50.0,
            float(air["temperature_c"]),
            0.5,
            key=key("temperature"),
        )
    )
    air["humidity_percent"] = float(
        right.number_input(
            "Relative humidity (%)",
            0.0,
            100.0,
            float(air["humidity_percent"]),
            1.0,
            key=key("humidity"),
        )
    )
    data["air"] = air


# Where the fields stand that a part of the room file belongs to.
SECTIONS = {
    "shape": "sizes", "name": "sizes", "units": "sizes", "surfaces": "surfaces", "opening": "opening",
    "patch": "patch", "furnishing": "furnishing", "keep_out": "keep_out", "positions": "places",
    "target": "target", "air": "target",
}  # fmt: skip


def section(name: str, title: str, fill: Callable[[], None], *, expanded: bool = False) -> None:
    """A group of fields; open, with the reason on top, where its last change was refused.

    Fields of a closed group are not drawn: what is not looked at would slow down every change.
    """
    refused = work.problem is not None and place_of(work.problem) == name
    if refused:
        st.session_state[key(f"section-{name}")] = True
    box = st.expander(title, expanded=expanded, key=key(f"section-{name}"), on_change="rerun")
    if box.open:
        with box:
            if refused:
                refusal()
            fill()


def place_of(problem: PlannerError) -> str:
    """Group of fields that a refusal is about."""
    words = (getattr(problem, "where", None) or "").replace("[", " ").replace("]", " ").split()
    return SECTIONS.get(words[0], "sizes") if words else "surfaces"


def refusal() -> None:
    """Why the last change was not taken."""
    if work.problem is not None:
        show.refusal(work.problem)
        st.caption("The last description that holds is used until this is put right.")


def details() -> None:
    """Everything but the sizes, group by group."""
    door = {
        "wall": work.room.wall_names[0], "kind": "door", "material": "door-solid-timber",
        "left": 0.2, "bottom": 0.0, "width": 0.8, "height": 2.0,
    }  # fmt: skip
    carpet = {"on": "floor", "material": "carpet-on-underlay", "area": 2.0}
    person = {"item": "person-seated", "count": 1}
    free = {
        "on": work.room.wall_names[0], "left": 0.1, "bottom": 0.1, "width": 0.4, "height": 0.4, "why": "",
    }  # fmt: skip

    def listed(name: str, title: str, single: str, blank: dict[str, Any]) -> None:
        section(name, f"{title} ({len(data[name])})", lambda: things(data, name, single, blank))

    left, right = st.columns(2, gap="large")
    with left:
        section("surfaces", "Surfaces", lambda: surfaces(data), expanded=True)
        listed("opening", "Doors and windows", "Opening", door)
        listed("patch", "What covers part of a surface", "Patch", carpet)
    with right:
        section("target", "Target and air", lambda: target_and_air(data), expanded=True)
        listed("furnishing", "Furniture and people", "Item", person)
        listed("keep_out", "Where nothing may be mounted", "Keep-out", free)
        section("places", "Seat and loudspeakers", lambda: places(data))


@st.fragment
def sketch() -> None:
    """Sizes with what they do beside them; a changed size draws this part alone again."""
    left, right = st.columns([5, 6], gap="large")
    before = standing()
    sides = data["shape"]["footprint"] is None
    if sides:
        # What was typed is known before its field is drawn: its effect need not wait for the fields.
        typed(data)
        take(right)
    with left, st.container(border=True):
        if work.problem is not None and place_of(work.problem) == "sizes":
            refusal()
        sizes(data)
    if not sides:
        take(right)
    with left:
        drawings()
    if standing() != before:
        st.rerun()  # the rest of the page is to show it too


def take(place: DeltaGenerator) -> None:
    """Take the description as it stands and show its effect."""
    fit_walls(data)
    work.change_room(data, write=False)
    try:
        with place:
            effect()
    finally:
        work.write_room()


def standing() -> tuple[object, ...]:
    """What the rest of the page shows of the room beside its sizes."""
    room = work.room
    return str(work.problem), work.conflict, room.name, room.units, room.is_rectangle


def typed(data: dict[str, Any]) -> None:
    """Take the sizes as the fields hold them; what is no length is refused beside its field."""
    for side, metres in zip(("length", "width", "height"), work.room.dimensions, strict=True):
        text = st.session_state.get(key(side))
        if text is not None and text != show.shown(metres, units):
            with contextlib.suppress(PlannerError):
                data["shape"] = {**data["shape"], side: parse_length(text, units)}


def effect() -> None:
    """What the room sounds like: the numbers first, as a picture takes longer to appear."""
    if work.problem is not None:
        st.warning("The last change is not taken: see the refusal beside its field.")
    prediction, geometry = work.forecast, work.sketch.geometry
    shown = Quantities(work.room.units)
    middle = OCTAVES.index(500)
    low, high = prediction.interval_s[:, middle]
    st.caption(
        f"**{prediction.time[middle]:.2f} s at 500 Hz** (95 % interval {low:.2f} to {high:.2f} s) · "
        f"Volume {shown.volume(geometry.volume)} · surface {shown.area(geometry.surface_area)} · "
        f"Schroeder frequency {prediction.schroeder_hz:.0f} Hz"
    )
    series = [show.prediction_series(prediction, "Predicted", "untreated")]
    show.chart(
        charts.reverberation(
            series,
            prediction.target,
            title="Predicted reverberation time",
            highest=axis(charts.axis_top(series, prediction.target)),
        ),
        key="room-prediction",
    )
    show.notes([*work.sketch.warnings, *prediction.warnings])


AXES = (0.2, 0.4, 0.6, 0.8, 1.0, 1.5, 2.0, 3.0, 4.0, 6.0, 8.0, 10.0)
"""Upper ends of the chart's axis, far enough apart that few changes reach the next. [s]."""


def axis(top: float) -> float:
    """Upper end of the chart's axis: it stays while sizes change, so that the change is seen."""
    kept = float(st.session_state.get(key("axis"), 0.0))
    if not top <= kept <= 2.5 * top:
        kept = st.session_state[key("axis")] = next((end for end in AXES if end >= top), top)
    return kept


def drawings() -> None:
    """Plan, ceiling or a wall, to scale."""
    names = ["plan", "ceiling", *work.room.wall_names]
    which = st.segmented_control("View", names, default="plan", key=key("view")) or "plan"
    show.drawing(
        on_screen(work.room, which, (), units=work.room.units, theme=show.theme()),
        f"{which.capitalize()} of {work.room.name}, to scale",
    )


st.title("Room")
heading(data)
above = st.container()
details()
with above:
    sketch()
