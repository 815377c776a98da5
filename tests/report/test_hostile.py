"""Any text at all: it is set as typed or by its code, and never stops the printing."""

import xml.etree.ElementTree as ET

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.report import charts
from planner.report.document import Builder, Document, picture
from planner.report.drawings import Panel, on_screen, sheet
from planner.report.glyphs import covered, printable
from planner.report.html import to_html
from planner.report.typeset import to_pdf
from planner.room.model import Room

ROOM = {
    "name": "Invented room",
    "shape": {"length": 4, "width": 3, "height": 2.5},
    "surfaces": {"floor": "f", "ceiling": "c", "walls": "w"},
}
ANY_TEXT = st.text(st.characters(), max_size=120)
# Letters with accents, scripts and signs of which the fonts have some and lack others.
LIKELY = st.text(
    st.characters(max_codepoint=0x2FFF, categories=("L", "M", "N", "P", "S", "Z", "Cf")),
    max_size=60,
)
# Letters of the fonts with marks of the fonts, as no language has them.
ACCENTED = st.text(
    st.sampled_from([*map(chr, range(0x300, 0x370)), *"aZeα\u05d0\u0627\u0644 \u05b0\u064b\u0483"]),
    max_size=20,
)


def print_everything(text):
    chart = charts.reverberation([charts.Series(text, [0.5] * 8)], title=text)
    room = Room.model_validate(
        ROOM
        | {"keep_out": [{"on": "back", "left": 1, "bottom": 1, "width": 1, "height": 1,
                         "why": text.encode("utf-8", "replace").decode()[:500]}]}
    )  # fmt: skip
    drawn = sheet(room, "back", [Panel(text, "back", 0.2, 0.2, 0.6, 0.6, text)])
    ET.fromstring(drawn.svg)
    ET.fromstring(on_screen(room, "back", [Panel(text, "back", 0.2, 0.2, 0.6, 0.6, text)]))
    builder = Builder([picture(chart)]).words(text).bullets([text], text)
    builder.table((text, "b"), [(text, text)], total=(text, ""), caption=text)
    document = Document(text, text, tuple(builder.section(text)), footer=text, contents=True)
    pdf = to_pdf(document)
    assert b"<pdfuaid:part>1</pdfuaid:part>" in pdf
    assert "<script" not in to_html(document)


@pytest.mark.parametrize(
    "text",
    [
        "",
        " \n\t ",
        "\x00\x01\x1b\x7f\x85",
        "\ud800 lone surrogate",
        "\ufffe\uffff\ufdd0",
        "\u202e\u2066\u200f\u061c turned",
        "\u05e9\u05dc\u05d5\u05dd \u0627\u0644\u0639\u0631\u0628\u064a\u0629",
        "\U0001f600\U0001f468\u200d\U0001f469\u200d\U0001f467 \U0001f1ea\U0001f1fa",
        "\u6c49\u5b57 \ud55c\uae00 \u0939\u093f\u0928\u094d\u0926\u0940 \u0e44\u0e17\u0e22",
        "Z\u0351\u036b\u0343\u036a\u0302\u036b\u033d\u034f\u0334\u0319\u0324\u031e\u0349algo",
        "x" * 500,
        "<script>alert(1)</script>",
        "]]> &amp; &#x0; <!-- -->",
        "#panic() $ \\ ` * _ @ < > [ ] { } //",
    ],
)
def test_known_troublemakers_are_printed(text):
    print_everything(text)


@pytest.mark.slow
@given(ANY_TEXT | LIKELY | ACCENTED)
@settings(max_examples=300, deadline=None)
def test_any_text_is_printed(text):
    print_everything(text)


@given(ANY_TEXT)
@settings(max_examples=200, deadline=None)
def test_printable_text_has_only_characters_with_a_glyph(text):
    known = covered() | {0xA0, 0x200B}
    assert all(ord(c) in known for c in printable(text))


@given(
    st.text(st.sampled_from("abcäöüßαβЖ .,;:#*_$@<>&=+-'\"[]{}()/\\~^`|!?%0123456789"), max_size=60)
)
@settings(max_examples=200, deadline=None)
def test_ordinary_text_is_kept_as_typed(text):
    """Apart from runs of spaces and break points, nothing is changed."""
    shown = printable(text).replace("\u200b", "").replace("\u00a0", " ")
    assert shown == " ".join(text.split())
