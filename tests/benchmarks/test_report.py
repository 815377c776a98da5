"""How long paper takes, against its charts alone; ratios of one run on one machine.

Run with ``pytest tests/benchmarks/test_report.py -m benchmark --benchmark-enable -s``.
"""

import gc
import importlib.util
import io
import time
from dataclasses import replace
from pathlib import Path

import pypdf
import pytest

from planner.report.chart import to_svg
from planner.report.charts import Series, reverberation
from planner.report.document import picture
from planner.report.report import report_document
from planner.report.typeset import to_pdf

pytestmark = pytest.mark.benchmark

WHERE = Path(__file__).parents[1] / "report" / "conftest.py"
PAGES, CHARTS = 40, 26


@pytest.fixture(scope="module")
def samples():
    spec = importlib.util.spec_from_file_location("report_samples", WHERE)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def seconds(job, rounds=3):
    """Fastest of a few runs. [s]."""
    best = float("inf")
    for _ in range(rounds):
        gc.collect()
        start = time.perf_counter()
        job()
        best = min(best, time.perf_counter() - start)
    return best


def long_chart(n):
    values = [0.9 - 0.01 * n - 0.05 * band for band in range(8)]
    return reverberation([Series(f"Room {n}", values)], title=f"Recording {n}")


def test_forty_pages_build_in_under_three_times_their_charts(samples):
    """One report, filled up with charts to forty pages, against making its charts' SVG alone."""
    data = samples.make_report()
    every = []

    def build():
        every.clear()
        document = report_document(data)
        section = document.sections[0]
        fill = [
            replace(
                section, title=f"Recording {n}", new_page=True, blocks=(picture(long_chart(n)),)
            )
            for n in range(CHARTS)
        ]
        every.append(to_pdf(replace(document, sections=(*document.sections, *fill))))

    own = report_charts(data)

    def charts_alone():
        for chart in [*own, *(long_chart(n) for n in range(CHARTS))]:
            to_svg(chart)

    build()
    pages = len(pypdf.PdfReader(io.BytesIO(every[0])).pages)
    assert pages >= PAGES
    whole, alone = seconds(build), seconds(charts_alone)
    print(f"\n{pages} pages: {whole / alone:.2f} × the time of their charts alone")
    assert whole < 3 * alone


def report_charts(data):
    """The charts of the sample report, caught as they are drawn."""
    from planner.report import document

    caught = []
    original = document.to_svg
    document.to_svg = lambda chart: caught.append(chart) or original(chart)
    try:
        report_document(data)
    finally:
        document.to_svg = original
    return caught


def by_altair(n):
    """Only the line and the points of the same chart, built the usual way."""
    import altair
    import pandas

    values = [0.9 - 0.01 * n - 0.05 * band for band in range(8)]
    table = pandas.DataFrame({"band": [63 * 2**band for band in range(8)], "value": values})
    base = altair.Chart(table).encode(
        x=altair.X("band:Q", scale=altair.Scale(type="log", base=2)), y=altair.Y("value:Q")
    )
    return altair.layer(base.mark_line(), base.mark_point()).to_dict()


def test_ready_charts_are_faster_than_building_them_by_altair():
    """Our whole chart as a dictionary, against a much simpler one through Altair's objects."""
    ours = rows_of(long_chart(1).vega_lite()["layer"])
    theirs = [row["value"] for rows in by_altair(1)["datasets"].values() for row in rows]
    assert ours == pytest.approx(theirs)
    ready = seconds(lambda: [long_chart(n).vega_lite() for n in range(20)])
    built = seconds(lambda: [by_altair(n) for n in range(20)])
    print(f"\nready dictionaries: {built / ready:.0f} × faster than through Altair's objects")
    assert ready < built


def rows_of(layers):
    return [row["value"] for layer in layers for row in layer["data"]["values"] if "value" in row]
