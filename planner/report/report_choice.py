"""Sections on the treatment: options compared, the chosen one with its proof, drawings, list."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from planner.bands import OCTAVES
from planner.report import charts
from planner.report.acceptance import acceptance_sections, limits_text
from planner.report.document import Builder, Row, Section, drawing_page, picture
from planner.report.drawings import Panel, sheets, surface_title
from planner.report.list_formats import list_sections
from planner.report.quantities import NONE, Quantities, money, seconds
from planner.report.report_client import after_times, now_assumed, now_times
from planner.report.report_data import ReportData, band_heads
from planner.room.lengths import METRES_PER

if TYPE_CHECKING:
    from planner.treat.suggestion import Suggestion


def option_sections(data: ReportData) -> list[Section]:
    """Options side by side."""
    if not data.options:
        return []
    show = Quantities(data.units)
    currency = data.buying.currency if data.buying else data.room.treatment.currency
    rows = [
        (
            f"{option.name}{' (chosen)' if option.chosen else ''}{f'; {option.note}' if option.note else ''}",
            ", ".join(f"{hz} Hz" for hz in option.outside_hz) or "none",
            NONE if option.probability is None else f"{100 * option.probability:.0f} %",
            money(option.cost),
            show.small(option.depth_mm),
            show.area(option.area_m2),
            money(_each(option.cost_per_m2_125, show)),
            money(_each(option.cost_per_m2_1000, show)),
        )
        for option in data.options
    ]
    heads = ("option", "outside at", "inside", f"cost ({currency})", "deepest", "covers",
             "125 Hz", "1 kHz")  # fmt: skip
    unit = show.area_unit
    caption = (
        "Outside at: bands outside the target; inside: probability of lying inside it; deepest: thickness "
        f"and gap; 125 Hz and 1 kHz: cost of one {unit} of absorption area added there"
    )
    builder = Builder().table(
        heads, rows, right=(2, 3, 4, 5, 6, 7), wide=0, small=True, caption=caption
    )
    times = [
        (option.name, *(seconds(float(v)) for v in option.predicted)) for option in data.options
    ]
    if data.target is not None:
        times.append(
            (
                "target",
                *(
                    limits_text(float(a), float(b))
                    for a, b in zip(data.target.low, data.target.high, strict=True)
                ),
            )
        )
    builder.table(("T (s)", *band_heads()), times, right=tuple(range(1, 9)), wide=0, small=True)
    now = now_times(data)
    untreated = (
        None
        if now is None
        else charts.Series("Now", now, "untreated", assumed_hz=now_assumed(data))
    )
    series = [charts.Series(option.name, option.predicted, "option-a") for option in data.options]
    small = [picture(c) for c in charts.side_by_side(series, data.target, untreated=untreated)]
    builder.blocks += [Row(tuple(small[n : n + 2])) for n in range(0, len(small), 2)]
    return builder.section("Options compared")


def _each(cost_per_m2: float | None, show: Quantities) -> float | None:
    """Cost of one unit of absorption area in the paper's units."""
    if cost_per_m2 is None or not show.imperial:
        return cost_per_m2
    return cost_per_m2 * METRES_PER["ft"] ** 2


def treatment_sections(data: ReportData) -> list[Section]:
    """The chosen treatment, what it does and how that is known."""
    builder = Builder()
    now, after = now_times(data), after_times(data)
    if data.suggestion is not None:
        builder.words(*_proof_words(data.suggestion))
        show = Quantities(data.units)
        rows: list[tuple[str, ...]] = [
            (
                item.description or item.product,
                item.surface,
                NONE if item.count is None else str(item.count),
                show.area(item.area_m2),
            )
            for item in data.suggestion.items
        ]
        builder.table(("product", "on", "pieces", "area"), rows, right=(2, 3), wide=0)
    if after is not None:
        series = [charts.Series("After treatment", after, "option-a")]
        if data.after is not None:
            low, high = np.asarray(data.after.interval_s, float)
            series = [
                charts.Series(
                    "After treatment",
                    after,
                    "option-a",
                    low,
                    high,
                    "95 % interval of the prediction",
                    data.after.assumed_hz,
                )
            ]
        if now is not None:
            series.insert(0, charts.Series("Now", now, "untreated", assumed_hz=now_assumed(data)))
        builder.chart(charts.reverberation(series, data.target, title="Before and after"))
    if data.suggestion is not None:
        chosen = data.suggestion
        short = [
            (
                f"{band.band_hz} Hz",
                band.side,
                seconds(band.reached_s),
                seconds(band.limit_s),
                Quantities(data.units).area(band.short_by_m2),
                Quantities(data.units).area(band.largest_possible_m2),
            )
            for band in chosen.short_bands
        ]
        builder.table(
            (
                "band",
                "side",
                "reached (s)",
                "limit (s)",
                "still short by",
                "most possible",
            ),
            short,
            right=(2, 3, 4, 5),
            wide=1,
            small=True,
        )
        builder.bullets(
            [show.sentence(limit) for limit in chosen.binding], "Limits that this list uses up"
        )
        builder.bullets([show.sentence(one.says) for one in chosen.relaxations], "What would help")
        builder.bullets(chosen.warnings, "Doubts")
        second = chosen.second_opinion
        if second is not None:
            builder.words(f"Second opinion: {second.says}")
            rows = [
                (o.method, *(seconds(float(v)) for v in o.reverberation_time))
                for o in second.opinions
            ]
            builder.table(
                ("T (s) by", *band_heads()), rows, right=tuple(range(1, 9)), wide=0, small=True
            )
    title = (
        f"Chosen treatment: {data.treatment_name}" if data.treatment_name else "Chosen treatment"
    )
    return builder.section(title)


def _proof_words(chosen: Suggestion) -> list[str]:
    said = []
    if chosen.status == "optimal":
        least = "least area" if chosen.currency == "m2" else "cheapest list"
        gap = "" if chosen.gap <= 1e-9 else f" to within {100 * chosen.gap:.2g} %"
        said.append(
            f"Proven: this is the {least}{gap} that keeps to all limits and "
            + (
                "meets the target."
                if chosen.meets_target
                else "comes as near to the target as they allow."
            )
        )
    elif chosen.status == "infeasible":
        said.append("Proven: no list within these limits meets the target; this one comes nearest.")
    else:
        said.append(
            f"The search was stopped: this is the best list found, at most {100 * chosen.gap:.1f} % dearer than the cheapest."
        )
    bands = ", ".join(f"{hz} Hz" for hz in chosen.judged_hz)
    said.append(
        f"Judged at {bands or 'no band'}; probability that all of them lie inside the target: {100 * chosen.probability:.0f} %."
    )
    rows = [
        f"{hz} Hz {100 * p:.0f} %"
        for hz, p in zip(OCTAVES, chosen.band_probability, strict=True)
        if hz in chosen.judged_hz
    ]
    if rows:
        said.append(f"By band: {', '.join(rows)}.")
    return said


def drawing_sections(data: ReportData) -> list[Section]:
    """Every view with panels, to scale, then a table of all the panels' places."""
    if not data.panels:
        return []
    drawn = sheets(data.room, data.panels, paper=data.paper, units=data.units, only_used=True)
    pages = [drawing_page(sheet) for sheet in drawn]
    return [*pages, *panel_schedule(data.panels, data.units, tuple(data.room.wall_names))]


def panel_schedule(panels: Sequence[Panel], units: str, walls: tuple[str, ...]) -> list[Section]:
    """Where each panel goes, in numbers."""
    show = Quantities(units)

    def place(metres: float) -> str:
        return show.length(metres) if units == "ft" else f"{metres * 1000:.0f} mm"

    rows = [
        (
            panel.number,
            surface_title(panel.surface).lower() if panel.surface in walls else panel.surface,
            panel.label,
            show.size(panel.width, panel.height),
            show.small(panel.thickness_mm),
            show.small(panel.gap_mm),
            place(panel.left),
            place(panel.bottom),
        )
        for panel in panels
    ]
    heads = (
        "panel",
        "on",
        "what",
        "width × height",
        "thick",
        "air gap",
        "from left or x",
        "from floor or y",
    )
    builder = Builder().table(heads, rows, right=(3, 4, 5, 6, 7), wide=2, small=True)
    builder.words(
        "On walls: from the left corner as seen from inside, and from the finished floor. On the floor "
        "and the ceiling: x and y as on the plan. The place is that of the panel's lower left corner."
    )
    return builder.section("Panels in their places", new_page=True)


def buying_sections(data: ReportData) -> list[Section]:
    """The shopping list inside the report."""
    if data.buying is None:
        return []
    head = Section(f"Shopping list: {data.buying.name}", (), new_page=True)
    return [head, *list_sections(data.buying, level=2)]


def proof_sections(data: ReportData) -> list[Section]:
    """Measured again: did it work."""
    sections = []
    if data.proof is not None:
        sections += Builder().bullets(data.proof.words).section("What the treatment did")
    if data.acceptance is not None:
        before = None if data.proof is None else data.proof.before.measured
        sections += acceptance_sections(data.acceptance, data.target, before=before)
    return sections
