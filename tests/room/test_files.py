"""Room files: what is read, what is refused and in which words, and what is written back."""

import contextlib
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.errors import InputError, RoomError
from planner.room.checks import room_warnings
from planner.room.files import parse_room, read_room, room_to_toml, write_room
from planner.room.geometry import geometry
from planner.room.surfaces import room_surfaces

GOOD = (Path(__file__).parent / "good.toml").read_text(encoding="utf-8")


def test_a_room_file_is_read_with_everything_in_it():
    room = parse_room(GOOD)
    assert room.dimensions == pytest.approx((5.2, 3.9, 2.6))
    assert room.surface_materials["left"] == "plasterboard-on-studs"
    assert room.openings[0].area == pytest.approx(0.9 * 2.05)
    assert room.described_state == "occupied"
    assert room.air_state().temperature_c == 21
    assert geometry(room).volume == pytest.approx(5.2 * 3.9 * 2.6)


def test_reading_what_was_written_gives_the_same_room(tmp_path):
    room = parse_room(GOOD)
    assert read_room(write_room(tmp_path / "room.toml", room)) == room
    assert read_room(tmp_path) == room  # a folder stands for the room file in it


def test_feet_are_converted_and_written_back_as_feet():
    text = GOOD.replace('units = "m"', 'units = "ft"').replace("length = 5.20", 'length = "17\' 1"')
    text = text.replace("width = 3.90", "width = 12.75").replace("height = 2.60", "height = 8.5")
    text = text.replace("height = 2.05", "height = 6.5").replace("area = 6.0", "area = 64.0")
    text = text.replace("seat = [3.2, 1.95, 1.2]", "seat = [10.5, 6.4, 4]")
    room = parse_room(text)
    assert room.shape.length == pytest.approx((17 + 1 / 12) * 0.3048)
    assert room.patches[0].covered == pytest.approx(64 * 0.3048**2)
    again = parse_room(room_to_toml(room))
    assert again.units == "ft"
    assert again.shape.length == pytest.approx(room.shape.length)
    assert again.patches[0].covered == pytest.approx(room.patches[0].covered)


@given(
    st.tuples(st.floats(1, 20), st.floats(1, 20), st.floats(2, 6)),
    st.text(st.characters(exclude_categories=["Cs", "Cc"]), min_size=1, max_size=40),
    st.sampled_from(["m", "ft"]),
)
def test_round_trip_keeps_meaning(size, name, units):
    length, width, height = size
    factor = 0.3048 if units == "ft" else 1.0
    text = GOOD[: GOOD.index("[[opening]]")]
    text = text.replace("5.20", f"{length / factor:.6f}").replace("3.90", f"{width / factor:.6f}")
    text = text.replace("2.60", f"{height / factor:.6f}").replace('"m"', f'"{units}"')
    room = parse_room(text).model_copy(update={"name": name.strip() or "x"})
    again = parse_room(room_to_toml(room))
    assert again.name == room.name
    assert again.dimensions == pytest.approx(room.dimensions, rel=1e-6)


MALFORMED = [
    # (what stands there, what is written instead, what the message must say)
    ("length = 5.20", "length = -5", "positive"),
    ("length = 5.20", "length = 0", "positive"),
    ("length = 5.20", "length = nan", r"\[shape\] length"),
    ("length = 5.20", "length = inf", r"\[shape\] length"),
    ("length = 5.20", "length = 5200", "means mm"),
    ("length = 5.20", "length = true", "not a length"),
    ("length = 5.20", 'length = "five"', "not a length"),
    ("length = 5.20", "lenght = 5.20", "Did you mean 'length'"),
    ("length = 5.20", "", "neither a rectangle nor a footprint"),
    ("length = 5.20", "length = [5.2]", "not a length"),
    ("height = 2.60", "height = 260", "means cm"),
    ("height = 2.60", "height = 0.3", "no height"),
    ("height = 2.60", "", "height: is missing"),
    ('units = "m"', 'units = "ft"', 'units = "m"'),
    ('units = "m"', 'units = "yd"', "none of its choices"),
    ("width = 3.90", "width = 3.90\nfootprint = [[0,0],[1,0],[1,1]]", "neither a rectangle nor"),
    ("length = 5.20\nwidth = 3.90", "footprint = [[0,0],[4,3],[4,0],[0,3]]", "crosses"),
    ("length = 5.20\nwidth = 3.90", "footprint = [[0,0],[4,0]]", "enclose nothing"),
    ("length = 5.20\nwidth = 3.90", "footprint = [[0,0],[4,0],[4,0],[0,3]]", "same point"),
    ("length = 5.20\nwidth = 3.90", "footprint = [[0,0],[4,0],[4,3],[0,3],[0,0]]", "same point"),
    ("length = 5.20\nwidth = 3.90", "footprint = [[0,0],[0,3],[4,3],[4,0]]", "clockwise"),
    ("length = 5.20\nwidth = 3.90", "footprint = [[0,0],[4,0],[8,0]]", "crosses|encloses"),
    ("length = 5.20\nwidth = 3.90", "footprint = [[0,0],[4,0,1],[4,3]]", "footprint"),
    ("length = 5.20\nwidth = 3.90", 'footprint = "square"', "wrong kind"),
    ("left = 0.30", "left = 3.30", "leaves the surface 'back'"),
    ("left = 0.30", "left = -0.30", "leaves the surface"),
    ("height = 2.05", "height = 3.05", "leaves the surface"),
    ("width = 0.90", "width = 0", r"\[\[opening\]\] 1, width"),
    ('wall = "back"', 'wall = "bak"', "Did you mean 'back'"),
    ('wall = "back"', "wall = 3", r"\[\[opening\]\] 1, wall"),
    ('kind = "door"', 'kind = "dor"', "none of its choices"),
    ('material = "door-solid-timber"', 'material = "door-solid-timer"', "door-solid-timber"),
    ('floor = "timber-floor-on-joists"', 'floor = "timber-floor-on-joist"', "timber-floor-on-joists"),
    ('floor = "timber-floor-on-joists"', "", "floor: is missing"),
    ('floor = "timber-floor-on-joists"', 'floor = "person-seated"', "furnishing"),
    ('floor = "timber-floor-on-joists"', 'floor = ""', r"\[surfaces\] floor"),
    ('walls = "plasterboard-on-studs"', 'walls = ["a", "b"]', "2 materials for 4 walls"),
    ('walls = "plasterboard-on-studs"', 'walls = { front = "brick" }', "no material for"),
    ('walls = "plasterboard-on-studs"', 'walls = { north = "brick" }', "no surface 'north'"),
    ('walls = "plasterboard-on-studs"', "walls = 5", "walls"),
    ("area = 6.0", "area = 60.0", "20.28 m² left"),
    ("area = 6.0", "area = -1", r"\[\[patch\]\] 1, area"),
    ("area = 6.0", 'area = "big"', "not an area"),
    ("area = 6.0", "left = 1.0", "either an area or a place"),
    ("area = 6.0", "left = 4.0\nbottom = 0\nwidth = 3\nheight = 1", "leaves the surface 'floor'"),
    ('on = "floor"', 'on = "roof"', "no surface 'roof'"),
    ('material = "carpet-on-underlay"', 'material = "carpet"', "carpet-"),
    ("count = 2", "count = 0", "count"),
    ("count = 2", "count = 2.5", "count"),
    ('item = "person-seated"', 'item = "person-siting"', "person-seated"),
    ('item = "person-seated"', 'item = "brick-painted"', "."),
    ('item = "person-seated"', 'item = "hard-object"', "needs its volume"),
    ("seat = [3.2, 1.95, 1.2]", "seat = [33.2, 1.95, 1.2]", "outside the room"),
    ("seat = [3.2, 1.95, 1.2]", "seat = [3.2, 1.95]", r"\[positions\] seat"),
    ("[1.1, 2.75, 1.2]]", "[1.1, 2.75, 9.2]]", "loudspeakers, 2"),
    ("temperature_c = 21", "temperature_c = 210", "temperature_c"),
    ("humidity_percent = 45", "humidity_percent = -5", "humidity_percent"),
    ("humidity_percent = 45", 'humidity_percent = "dry"', "humidity_percent"),
    ('use = "control-room-bs1116"', "", "says nothing"),
    ('use = "control-room-bs1116"', "low = { 125 = 0.5 }\nhigh = { 125 = 0.2 }", "Exchange"),
    ('use = "control-room-bs1116"', "high = { 126 = 0.2 }", "not an octave band"),
    ('use = "control-room-bs1116"', "high = { 125 = -0.2 }", "no reverberation time"),
    ("budget = 1800", "budget = -1", "budget"),
    ('formula = "eyring"', 'formula = "eiring"', "none of its choices"),
    ("ceiling = 0.6", "ceiling = 60", "write 0.6"),
    ("ceiling = 0.6", "celing = 0.6", "Did you mean 'ceiling'"),
    ('keep_clear = ["floor"]', 'keep_clear = "floor"', "keep_clear"),
    ('[["left", "right"]]', '[["left", "left"]]', "paired with itself"),
    ('[["left", "right"]]', '[["left"]]', "symmetric"),
    ("125 = 0.18", "125 = 18", "125"),
    ("125 = 0.18", "125 = -0.1", "125"),
    ("125 = 0.18", "120 = 0.1", "not an octave band"),
    ("alpha = {", "alfa = {", "Did you mean 'alpha'"),
    ('name = "Control', "name = Control", "not TOML"),
    ("[[opening]]", "[opening]", "may repeat"),
    ("[positions]", "[[positions]]", "Write a table"),
    ("[shape]", "[form]", "not a key the planner knows"),
    ('name = "Control room in the old net loft"', "", "name: is missing"),
]  # fmt: skip


@pytest.mark.parametrize(("there", "instead", "words"), MALFORMED)
def test_a_malformed_room_is_refused_in_words(there, instead, words):
    """One message, with the file, the place and what would be right; never another exception."""
    assert there in GOOD
    with pytest.raises(RoomError, match=words) as refusal:
        room_surfaces(parse_room(GOOD.replace(there, instead, 1)))
    assert "\n" not in str(refusal.value)


def test_overlapping_openings_are_refused():
    window = '[[opening]]\nwall = "back"\nkind = "window"\nmaterial = "glazing-single"\n'
    window += "left = 1.0\nbottom = 1.0\nwidth = 1.0\nheight = 1.0\n"
    with pytest.raises(RoomError, match="the door overlaps the window"):
        parse_room(GOOD.replace("[[opening]]", window + "[[opening]]", 1))


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"\xff\xfe\x00", "not UTF-8"),
        (b"x = " + b"[" * 100_000, "not TOML"),
        (b"a" * 2_000_000, "MB"),
        (b"", "missing"),
        (b"\x00", "not TOML"),
    ],
)
def test_what_is_no_room_file_is_refused(tmp_path, content, words):
    path = tmp_path / "room.toml"
    path.write_bytes(content)
    with pytest.raises(RoomError, match=words) as refusal:
        read_room(path)
    assert "room.toml" in str(refusal.value)


def test_a_file_that_is_not_there(tmp_path):
    with pytest.raises(RoomError, match=r"room\.toml: cannot be read"):
        read_room(tmp_path / "room.toml")


def test_a_place_that_cannot_be_written_keeps_what_is_there(tmp_path):
    blocker = tmp_path / "file"
    blocker.write_text("kept")
    with pytest.raises(InputError, match="cannot be written"):
        write_room(blocker / "room.toml", parse_room(GOOD))
    assert blocker.read_text() == "kept"
    assert list(tmp_path.iterdir()) == [blocker]


def test_doubts_are_warnings():
    assert room_warnings(parse_room(GOOD)) == ()
    tall = room_warnings(parse_room(GOOD.replace("height = 2.60", "height = 8.5")))
    assert "were feet meant" in tall[0]


@settings(max_examples=150, deadline=None)
@given(st.data())
def test_any_mutation_is_a_room_or_one_message(data):
    """Lines dropped, doubled or with a token exchanged never give anything but a refusal."""
    lines = GOOD.splitlines()
    for _ in range(data.draw(st.integers(1, 3))):
        number = data.draw(st.integers(0, len(lines) - 1))
        change = data.draw(st.sampled_from(["drop", "double", "swap", "junk"]))
        if change == "drop":
            del lines[number]
        elif change == "double":
            lines.insert(number, lines[number])
        elif change == "swap":
            other = data.draw(st.integers(0, len(lines) - 1))
            lines[number], lines[other] = lines[other], lines[number]
        else:
            head, _, _ = lines[number].partition("=")
            lines[number] = f"{head}= " + data.draw(
                st.sampled_from(
                    ["[]", "{}", "''", "-1", "1e308", "nan", "[[1]]", "true", "2020-01-01"]
                )
            )
    with contextlib.suppress(InputError):  # any other exception fails the test
        room_surfaces(parse_room("\n".join(lines)))
