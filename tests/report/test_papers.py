"""PDF and HTML: everything is in them, tagged, with embedded fonts, and always the same bytes."""

import functools
import io
import re
import sys
from html.parser import HTMLParser

import ezdxf
import pypdf
import pytest

from planner.errors import InputError, MissingPartError
from planner.report.document import Builder, Document, Picture
from planner.report.glyphs import code_points, covered, printable
from planner.report.html import to_html
from planner.report.list_formats import list_document
from planner.report.palette import FONTS
from planner.report.printing import write_document, write_drawings, write_list
from planner.report.report import report_document
from planner.report.typeset import to_pdf

LAYERS = {
    "wool-100": [{"layer": "porous", "thickness_mm": 100}, {"layer": "air", "thickness_mm": 50}]
}
MARKUP = [
    '#panic("x")', "*bold* _it_ `raw`", "$x^2$", "@label <label>", "// comment /* c */", "\\u{1F600}",
    "</td><script>alert(1)</script>", "&amp;&#60;", "=1+1", "-dash", "~tilde~", "[link](x)", "#{ 1 }",
]  # fmt: skip


def pages_of(pdf):
    return pypdf.PdfReader(io.BytesIO(pdf)).pages


def text_of(pdf):
    """Text of a PDF on one line, without the break points of long words."""
    text = " ".join(page.extract_text() for page in pages_of(pdf))
    return re.sub(r"\s+", " ", text.replace("\u200b", ""))


def fonts_of(pdf):
    found = {}
    for page in pages_of(pdf):
        for font in page["/Resources"].get("/Font", {}).values():
            font = font.get_object()
            child = font["/DescendantFonts"][0].get_object()
            descriptor = child["/FontDescriptor"].get_object()
            found[str(font["/BaseFont"])] = "/FontFile2" in descriptor or "/FontFile3" in descriptor
    return found


@pytest.fixture(scope="module")
def report_pdf(samples):
    """The sample report as PDF, made once per paper."""
    return functools.cache(lambda paper: to_pdf(report_document(samples.report(paper=paper))))


@pytest.mark.parametrize("paper", ["a4", "a3", "us-letter"])
def test_list_pdf_has_every_line_every_total_and_its_page_numbers(paper, sample):
    buying = sample.buying(build_ups=LAYERS)
    pdf = to_pdf(list_document(buying, paper=paper, date="2026-02-03"))
    text = text_of(pdf)
    for line in buying.lines:
        assert line.item in text
        assert f"{line.packs} × " in text
        if line.cost is not None:
            assert f"{line.cost:.2f}" in text
    assert "450.70" in text
    assert "12.12 m²" in text
    for raw in buying.raw:
        assert raw.goods in text
        assert raw.buy in text
    for entry in (*buying.cautions, *buying.notes, *buying.assumptions):
        assert re.sub(r"\s+", " ", entry) in text
    count = len(pages_of(pdf))
    for number, page in enumerate(pages_of(pdf), 1):
        assert f"page {number} of {count}" in page.extract_text()
    width = {"a4": 210.0, "a3": 297.0, "us-letter": 215.9}[paper]
    assert float(pages_of(pdf)[0].mediabox.width) * 25.4 / 72 == pytest.approx(width, abs=0.1)


def test_pdf_is_tagged_says_so_and_has_its_fonts_in_it(report_pdf):
    pdf = report_pdf("a4")
    catalog = pypdf.PdfReader(io.BytesIO(pdf)).trailer["/Root"]
    assert catalog["/MarkInfo"]["/Marked"]
    assert "/StructTreeRoot" in catalog
    assert catalog["/Lang"].startswith("en")
    assert b"<pdfuaid:part>1</pdfuaid:part>" in catalog["/Metadata"].get_object().get_data()
    fonts = fonts_of(pdf)
    assert any("PlannerSans" in name for name in fonts)
    assert all(fonts.values())
    assert all("PlannerSans" in name or "DejaVuSans" in name for name in fonts)


def test_report_has_every_section_and_number(sample, report_pdf):
    data = sample.report()
    document = report_document(data)
    titles = [section.title for section in document.sections]
    wanted = [
        "In short", "The room", "Assumptions", "Prediction", "Room modes", "Measurement",
        "Calibration: what the measurement says about the surfaces", "Options compared",
        "Chosen treatment: Thick walls", "Drawing: plan", "Drawing: reflected ceiling plan",
        "Panels in their places", "Shopping list: Thick walls", "Acceptance",
        "Sources of every coefficient and target", "How to make this report again",
    ]  # fmt: skip
    assert [title for title in titles if title in wanted] == wanted
    text = text_of(report_pdf("a4"))
    for words in (
        "does not keep sound in or out", "0.63 s (measured", "0.28 s is predicted", "450.70 EUR",
        "0.14 ± 0.03", "Proven: this is the cheapest list", "engineering: 6 positions",
        "Invented table, row 3", "0123456789abcdef" * 4, "planner 0.1.0", "Invented handbook",
        "P11", "350 mm", "not met at 63 Hz", "Scale 1:25",
    ):  # fmt: skip
        assert words in text, words


def test_client_page_is_one_page(report_pdf):
    for paper in ("a4", "us-letter"):
        pages = pages_of(report_pdf(paper))
        assert "What it will not do" in pages[0].extract_text()
        assert pages[1].extract_text().lstrip().startswith("The room")


def test_report_needs_nothing_but_a_room(sample):
    data = type(sample.report())(room=sample.room())
    document = report_document(data)
    assert text_of(to_pdf(document))
    assert "<h2>The room</h2>" in to_html(document)


@pytest.mark.parametrize("paper", ["a4", "a3", "us-letter"])
def test_drawings_in_the_report_are_true_to_scale(paper, report_pdf):
    """A drawing's unit is a millimetre; the page must show it as 72/25.4 points, to 0.5 %.

    Read from the transformations in the PDF's own page contents.
    """
    pdf = report_pdf(paper)
    checked = 0
    for page in pages_of(pdf):
        if "Scale 1:" not in page.extract_text():
            continue
        contents = page.get_contents().get_data().decode("latin-1")
        factors = {
            float(a)
            for a, d in re.findall(r"([\d.]+) 0 0 -([\d.]+) [\d.]+ [\d.]+ cm", contents)
            if abs(float(a) - float(d)) < 1e-3 and float(a) != 1
        }
        assert factors
        for factor in factors:
            assert factor == pytest.approx(72 / 25.4, rel=0.005)
        checked += 1
    assert checked == 4


@pytest.mark.parametrize("text", MARKUP)
def test_markup_is_printed_as_typed(text):
    section = Builder().words(text).bullets([text]).table((text,), [(text,)], caption=text)
    document = Document(text, text, tuple(section.section(text)), footer=text)
    assert text_of(to_pdf(document)).count(re.sub(r"\s+", " ", text)) >= 8
    page = to_html(document)
    parser = Collector()
    parser.feed(page)
    assert parser.text.count(text) >= 7
    assert parser.tags <= {
        "html", "head", "meta", "title", "style", "body", "header", "h1", "h2", "p", "main",
        "section", "ul", "li", "div", "table", "caption", "thead", "tbody", "tr", "th", "td", "footer",
    }  # fmt: skip


class Collector(HTMLParser):
    def __init__(self):
        super().__init__(convert_charrefs=True)
        self.text, self.tags, self._style = "", set(), False

    def handle_starttag(self, tag, attrs):
        self.tags.add(tag)
        self._style = tag == "style"

    def handle_endtag(self, tag):
        self._style = False

    def handle_data(self, data):
        if not self._style:
            self.text += data


def test_long_emoji_and_right_to_left_texts_are_printed():
    """500 characters break and stay whole; emoji in the fonts print, others as their code."""
    long, emoji, hebrew = "x" * 500, "\U0001f600", "\u05e9\u05dc\u05d5\u05dd"
    texts = [long, emoji, hebrew, "\u202eturned", "\u6c49"]
    section = Builder().table(("a", "b", "c"), [(text, text, "1.00") for text in texts])
    pdf = to_pdf(Document("t", "s", tuple(section.section("h"))))
    text = text_of(pdf).replace(" ", "")
    assert text.count("x") >= 1000
    assert emoji in text
    assert hebrew in text or hebrew[::-1] in text
    assert "⟨U+202E⟩turned" in text
    assert "⟨U+6C49⟩" in text
    for page in pages_of(pdf):
        assert float(page.mediabox.width) > 0


def test_characters_without_a_glyph_are_the_only_ones_replaced():
    """The fonts' own character maps, read by another library where it is there."""
    ttlib = pytest.importorskip("fontTools.ttLib")
    for file in FONTS.glob("*.ttf"):
        assert code_points(file) == set(ttlib.TTFont(file).getBestCmap())
    assert ord("α") in covered()
    assert printable("a\nb\tc") == "a b c"
    assert printable("α ≤ −3 dB") == "α ≤ −3\u00a0dB"


def test_identical_reports_are_identical_files(sample, report_pdf):
    document = report_document(sample.report())
    assert to_pdf(document) == report_pdf("a4")
    assert to_html(document) == to_html(report_document(sample.report()))


def test_html_asks_for_nothing_from_outside(sample):
    page = to_html(report_document(sample.report()))
    assert not re.search(r"(?:src|href)\s*=\s*[\"'](?!#)", page)
    assert "<script" not in page
    assert "default-src 'none'" in page
    assert page.count("<svg") >= 8
    assert page.count('role="img"') >= 8


def test_missing_typst_gives_html_and_says_so(sample, tmp_path, monkeypatch):
    monkeypatch.setitem(sys.modules, "typst", None)
    with pytest.raises(MissingPartError, match="pip install typst"):
        to_pdf(Document("t", "s", ()))
    written = write_list(tmp_path / "list.pdf", sample.buying())
    assert written.path.name == "list.html"
    assert "typst" in written.note
    assert "list.html" in written.note
    assert "450.70" in written.path.read_text()
    assert not (tmp_path / "list.pdf").exists()


def test_wrong_endings_and_papers_are_refused(sample, tmp_path):
    with pytest.raises(InputError, match=r"\.docx is no kind of file"):
        write_list(tmp_path / "a.docx", sample.buying())
    with pytest.raises(InputError, match="no paper known here"):
        write_list(tmp_path / "a.pdf", sample.buying(), paper="napkin")
    (tmp_path / "file").write_text("")
    with pytest.raises(InputError, match="cannot be written"):
        write_document(tmp_path / "file" / "a.html", Document("t", "s", ()))


def test_drawings_alone_are_written_for_the_fitter_and_the_joiner(sample, tmp_path):
    data = sample.report()
    for ending in ("dxf", "pdf", "html"):
        written = write_drawings(tmp_path / f"drawings.{ending}", data.room, data.panels)
        assert written.path.stat().st_size > 1000
    pdf = (tmp_path / "drawings.pdf").read_bytes()
    text = text_of(pdf)
    assert all(f"Drawing: {name}" in text for name in ("plan", "left wall", "reflected ceiling"))
    assert sum("Drawing: " in page.extract_text() for page in pages_of(pdf)) == 6
    layouts = ezdxf.readfile(tmp_path / "drawings.dxf").modelspace()
    assert len(layouts.query('LWPOLYLINE[layer=="PANELS"]')) == len(data.panels)
    with pytest.raises(InputError, match=r"\.dwg is no kind of file"):
        write_drawings(tmp_path / "drawings.dwg", data.room, data.panels)


def test_picture_has_its_words_in_the_pdf(sample):
    """The alternative text of each picture stands in the tag tree of the PDF."""
    svg = '<svg xmlns="http://www.w3.org/2000/svg" width="10" height="10"/>'
    section = Builder([Picture(svg, "An invented picture of nothing")]).section("h")
    reader = pypdf.PdfReader(io.BytesIO(to_pdf(Document("t", "s", tuple(section)))))
    alternatives = [
        str(obj["/Alt"])
        for n in range(1, len(reader.xref[0]) + 200)
        if isinstance(obj := reader.get_object(n), dict) and "/Alt" in obj
    ]
    assert alternatives == ["An invented picture of nothing"]
