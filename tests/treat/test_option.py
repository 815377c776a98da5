"""Options: what a file may say, and what the room becomes with one in place."""

from __future__ import annotations

import numpy as np
import pytest
from treat_rooms import box, panel

from planner.errors import OptionError
from planner.treat.catalogue import Catalogue
from planner.treat.option import Option, OptionItem, read_option, treated, write_option

CATALOGUE = Catalogue(
    [
        panel("wide", 0.8, width=1.2, height=0.5),
        panel("carpet", 0.4, unit="m2", surfaces=("floor",)),
        panel("stand", 1.5, unit="item", surfaces=("free",)),
    ]
)


def read(tmp_path, text: str | bytes):
    file = tmp_path / "option.toml"
    file.write_bytes(text.encode() if isinstance(text, str) else text)
    return read_option(file)


def test_written_and_read_again_it_is_the_same(tmp_path):
    option = Option(
        name='Fancy "name" with ümlaut',
        items=(
            OptionItem(
                product="wide", surface="left", count=2,
                placement=((0.1, 0.9, 1.2, 0.5), (1.4, 0.9, 1.2, 0.5)),
            ),
            OptionItem(product="carpet", surface="floor", area=3.25),
        ),
        note="by hand",
    )  # fmt: skip
    path = write_option(tmp_path / "options" / "a.toml", option)
    assert read_option(path) == option
    assert [p.name for p in path.parent.iterdir()] == ["a.toml"]


def test_the_file_looks_as_it_is_documented(tmp_path):
    """name, [[item]] with product, surface, count or area."""
    option = read(
        tmp_path,
        'name = "few"\n[[item]]\nproduct = "wide"\nsurface = "ceiling"\ncount = 3\n'
        '[[item]]\nproduct = "carpet"\nsurface = "floor"\narea = 2.5\n',
    )
    assert option.products == ("wide", "carpet")
    assert (option.pieces("wide"), option.pieces("carpet")) == (3, 2.5)


def test_panels_hide_what_is_behind_them():
    """Three panels of 0.6 m² on 20 m² of ceiling: 18.2 m² stay bare; a stand hides nothing."""
    option = Option(
        name="x",
        items=(
            OptionItem(product="wide", surface="ceiling", count=3),
            OptionItem(product="carpet", surface="floor", area=5.0),
            OptionItem(product="stand", surface="free", count=2),
        ),
    )
    room = treated(box(alpha=0.1), option, CATALOGUE)
    area = {(part.on, part.kind): a for part, a in zip(room.parts, room.area, strict=True)}
    assert area["ceiling", "base"] == pytest.approx(18.2)
    assert area["ceiling", "panel"] == pytest.approx(1.8)
    assert room.area.sum() == pytest.approx(box().surface_area)
    bare = 85.0 * 0.1  # 2·20 + 2·10 + 2·12.5 m² at 0.1
    added = 1.8 * (0.8 - 0.1) + 5.0 * (0.4 - 0.1) + 2 * 1.5
    assert room.absorption_area == pytest.approx(np.full(8, bare + added))


MALFORMED = [
    ("not toml", "name = = 1", "not TOML"),
    ("binary", b"\xff\xfe\x00\x01", "not UTF-8"),
    ("deep", "x = " + "[" * 3000, "not TOML"),
    ("huge", "#" * 2_100_000, "MB large"),
    ("no name", '[[item]]\nproduct = "wide"\nsurface = "left"\ncount = 1\n', "name.*missing"),
    ("unknown key", 'name = "x"\ncolour = "red"\n', "colour.*not a key"),
    ("no count", 'name = "x"\n[[item]]\nproduct = "wide"\nsurface = "left"\n', "count.*or.*area"),
    (
        "both",
        'name = "x"\n[[item]]\nproduct = "wide"\nsurface = "left"\ncount = 1\narea = 1.0\n',
        "either",
    ),
    (
        "half a panel",
        'name = "x"\n[[item]]\nproduct = "wide"\nsurface = "left"\ncount = 1.5\n',
        r"\[\[item\]\] 1",
    ),
    (
        "none",
        'name = "x"\n[[item]]\nproduct = "wide"\nsurface = "left"\ncount = 0\n',
        r"\[\[item\]\] 1, count",
    ),
    (
        "area not finite",
        'name = "x"\n[[item]]\nproduct = "carpet"\nsurface = "floor"\narea = inf\n',
        "area",
    ),
    (
        "places do not match",
        'name = "x"\n[[item]]\nproduct = "wide"\nsurface = "left"\ncount = 2\n'
        "placement = [[0, 0, 1, 1]]\n",
        "2 pieces but 1 place",
    ),
    ("items no list", 'name = "x"\nitem = 3\n', "item"),
]


@pytest.mark.parametrize(
    ("text", "match"), [case[1:] for case in MALFORMED], ids=[case[0] for case in MALFORMED]
)
def test_what_is_wrong_is_refused_with_its_place(tmp_path, text, match):
    with pytest.raises(OptionError, match=f"(?s)option.toml.*({match})"):
        read(tmp_path, text)


def test_a_missing_file_is_refused(tmp_path):
    with pytest.raises(OptionError, match="cannot be read"):
        read_option(tmp_path / "none.toml")


@pytest.mark.parametrize(
    ("item", "match"),
    [
        ({"product": "wild", "surface": "left", "count": 1}, "no product 'wild'.*wide"),
        ({"product": "wide", "surface": "floor", "count": 1}, "does not go on 'floor'"),
        ({"product": "wide", "surface": "left", "area": 1.0}, "sold by the piece"),
        ({"product": "carpet", "surface": "floor", "count": 1}, "sold by the square metre"),
        ({"product": "wide", "surface": "wall-9", "count": 1}, "no surface 'wall-9'"),
        ({"product": "wide", "surface": "left", "count": 99}, "do not fit"),
    ],
)
def test_an_option_that_does_not_fit_its_room_is_refused(item, match):
    option = Option(name="x", items=(OptionItem(**item),))
    with pytest.raises(OptionError, match=match):
        treated(box(), option, CATALOGUE)
