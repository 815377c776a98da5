"""The open project: autosave, conflicts, options, and how the server is started."""

import shutil

import pytest

from planner.app.launch import flags, launch
from planner.app.work import file_name, new_work, open_work
from planner.errors import OptionError, ProjectError, RoomError


@pytest.fixture
def work(demo_project, tmp_path):
    shutil.copytree(demo_project, tmp_path / "net-loft")
    found, notes = open_work(tmp_path / "net-loft")
    assert notes == []
    return found


def test_a_project_is_opened_with_everything(work):
    assert work.room.name == "Control room in the old net loft"
    assert work.measured is not None
    assert list(work.options) == ["first"]


def test_a_change_is_saved_at_once_and_a_refusal_keeps_the_room(work):
    data = work.room.model_dump(by_alias=True)
    data["shape"]["height"] = 2.8
    assert work.change_room(data)
    assert "height = 2.8" in (work.folder / "room.toml").read_text(encoding="utf-8")
    data["shape"]["height"] = -1
    assert not work.change_room(data)
    assert isinstance(work.problem, RoomError)
    assert work.room.height == 2.8


def test_feet_are_shown_and_kept_as_feet(work):
    data = work.room.model_dump(by_alias=True)
    data["units"] = "ft"
    assert work.change_room(data)
    assert work.room.height == pytest.approx(2.6)
    again, _ = open_work(work.folder)
    assert again.room.units == "ft"
    assert again.room.height == pytest.approx(2.6)


def test_two_tabs_on_one_project(work):
    """The second to save is asked; nothing is lost either way."""
    other, _ = open_work(work.folder)
    first = other.room.model_dump(by_alias=True)
    first["name"] = "Theirs"
    assert other.change_room(first)
    mine = work.room.model_dump(by_alias=True)
    mine["name"] = "Mine"
    work.change_room(mine)
    assert work.conflict == "room.toml"
    assert open_work(work.folder)[0].room.name == "Theirs"
    work.overwrite()
    assert work.conflict is None
    assert open_work(work.folder)[0].room.name == "Mine"


def test_options_are_kept_renamed_and_deleted(work):
    option = work.options["first"]
    work.set_option(option.model_copy(update={"name": "Zweite Wahl / ../x"}))
    files = {path.name for path in (work.folder / "options").iterdir()}
    assert files == {"first.toml", "zweite-wahl--x.toml"}
    work.set_option(option.model_copy(update={"name": "third"}), replacing="first")
    assert "first" not in work.options
    work.remove_option("third")
    assert work.chosen == "Zweite Wahl / ../x"
    for n in range(11):
        work.set_option(option.model_copy(update={"name": f"n{n}"}))
    with pytest.raises(OptionError, match="kept already"):
        work.set_option(option.model_copy(update={"name": "one too many"}))


def test_a_broken_option_is_a_note_and_a_broken_room_a_refusal(work):
    (work.folder / "options" / "bad.toml").write_text("= nonsense")
    _, notes = open_work(work.folder)
    assert "bad.toml" in notes[0]
    (work.folder / "room.toml").write_text("name = 3")
    with pytest.raises(RoomError, match=r"room\.toml"):
        open_work(work.folder)


def test_a_new_sketch_does_not_replace_a_room(tmp_path):
    made = new_work(tmp_path)
    assert made.room.name == "New room"
    with pytest.raises(ProjectError, match="holds a room already"):
        new_work(tmp_path)


@pytest.mark.parametrize("name", ["a b", "Ünïcode", "///", "x" * 300, "..", "=cmd()"])
def test_names_become_harmless_file_names(name):
    plain = file_name(name)
    assert plain
    assert len(plain) <= 60
    assert not set(plain) & set("/\\.:*?")


def test_the_server_listens_to_this_computer_only_and_tells_nobody():
    settings = flags(8501, browser=False, lan=False)
    assert settings["server.address"] == "127.0.0.1"
    assert settings["browser.gatherUsageStats"] == "false"
    assert settings["browser.serverAddress"] == "localhost"
    assert settings["server.headless"] == "true"
    assert flags(8501, browser=False, lan=True)["server.address"] == "0.0.0.0"


def test_a_folder_that_is_none_is_refused(tmp_path):
    with pytest.raises(ProjectError, match="is no folder"):
        launch(tmp_path / "nowhere")


def test_the_network_is_an_explicit_choice_with_a_warning(monkeypatch, capsys):
    commands = []
    monkeypatch.setattr("subprocess.call", lambda command, env: commands.append(command) or 0)
    assert launch(None, lan=True, browser=False) == 0
    assert "no password" in " ".join(capsys.readouterr().err.split())
    assert "0.0.0.0" in commands[0]
    assert launch(None, browser=False) == 0
    assert "127.0.0.1" in commands[1]


def test_a_rectangle_becomes_corners_with_everything_on_its_walls(work):
    """Edges anticlockwise from the origin: left (y = 0), back, right, front; names by hand."""
    data = work.room.model_dump(by_alias=True)
    before = {(one.kind, one.wall) for one in work.room.openings}
    length, width, _ = work.room.dimensions
    corners = [(0.0, 0.0), (length, 0.0), (length, width), (0.0, width)]
    data["shape"] = {**data["shape"], "length": None, "width": None, "footprint": corners}
    assert work.change_room(data), work.problem
    names = {"left": "wall-1", "back": "wall-2", "right": "wall-3", "front": "wall-4"}
    assert {(one.kind, one.wall) for one in work.room.openings} == {
        (kind, names[wall]) for kind, wall in before
    }
    surfaces = {item.surface for item in work.options["first"].items}
    assert surfaces <= {"ceiling", "floor", "free", *names.values()}
    back = work.room.model_dump(by_alias=True)
    back["shape"] = {**back["shape"], "length": length, "width": width, "footprint": None}
    assert work.change_room(back), work.problem
    assert {(one.kind, one.wall) for one in work.room.openings} == before


def test_two_tabs_on_one_option_and_one_catalogue(work):
    """Neither a catalogue nor an option that someone else changed is overwritten or deleted unasked."""
    other, _ = open_work(work.folder)
    option = work.options["first"]
    other.set_option(option.model_copy(update={"note": "theirs"}))
    other.save("catalogue.csv", "theirs")
    with pytest.raises(OptionError, match="someone else"):
        work.remove_option("first")
    work.set_option(option.model_copy(update={"note": "mine"}))
    work.save("catalogue.csv", "mine")
    assert work.conflict == "options/first.toml"
    assert "theirs" in (work.folder / "options" / "first.toml").read_text(encoding="utf-8")
    work.overwrite()
    assert work.conflict is None
    assert "mine" in (work.folder / "options" / "first.toml").read_text(encoding="utf-8")
    assert (work.folder / "catalogue.csv").read_text(encoding="utf-8") == "mine"


def test_a_file_that_appeared_meanwhile_is_not_overwritten(work):
    other, _ = open_work(work.folder)
    option = work.options["first"]
    other.set_option(option.model_copy(update={"name": "Suggestion 1", "note": "theirs"}))
    work.set_option(option.model_copy(update={"name": "Suggestion 1", "note": "mine"}))
    assert work.conflict == "options/suggestion-1.toml"


@pytest.mark.parametrize(
    "note",
    [
        "no toml [",
        "evaluated = 3",
        'evaluated = {files = "A1.flac", impulse = false, thirds = false, state = ""}',
        'evaluated = {files = ["A1.flac"], impulse = 1, thirds = false, state = ""}',
    ],
)
def test_a_damaged_note_of_what_was_looked_at_is_no_harm(work, note):
    (work.folder / "looked-at.toml").write_text(note, encoding="utf-8")
    again, notes = open_work(work.folder)
    assert (again.evaluated, notes) == ({}, [])


def test_what_was_asked_of_the_recordings_is_remembered(work):
    work.evaluated = {"files": ["A1.flac"], "impulse": False, "thirds": True, "state": "empty"}
    work.remember()
    assert open_work(work.folder)[0].evaluated == work.evaluated


def test_a_change_can_be_looked_at_before_it_is_written(work):
    data = work.room.model_dump(by_alias=True)
    data["shape"]["height"] = 2.8
    assert work.change_room(data, write=False)
    assert work.sketch.geometry.volume == pytest.approx(5.2 * 3.9 * 2.8)
    assert "height = 2.6" in (work.folder / "room.toml").read_text(encoding="utf-8")
    work.write_room()
    assert "height = 2.8" in (work.folder / "room.toml").read_text(encoding="utf-8")


def test_no_option_takes_the_file_of_another(work):
    """Names that differ in capitals or signs only would end up in one file."""
    first = work.options["first"]
    text = (work.folder / "options" / "first.toml").read_text(encoding="utf-8")
    with pytest.raises(OptionError, match="one file"):
        work.set_option(first.model_copy(update={"name": "First!"}))
    assert (work.folder / "options" / "first.toml").read_text(encoding="utf-8") == text
    work.set_option(first.model_copy(update={"name": "First"}), replacing="first")
    assert list(work.options) == ["First"]


def test_what_a_suggestion_rests_on_changes_with_the_measurement(work):
    before = work.basis
    work.use_measured = True
    assert work.basis != before
