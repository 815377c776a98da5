"""Every page: first start, one change, one refusal."""

import io
import shutil
import tomllib
import zipfile
from pathlib import Path

import pytest
from streamlit.testing.v1 import AppTest

from planner.app.archive import packed

ROOT = Path(__file__).resolve().parents[2]
PAGES = ROOT / "planner" / "app" / "views"

pytestmark = pytest.mark.filterwarnings("ignore::DeprecationWarning", "ignore::ResourceWarning")


@pytest.fixture
def project(demo_project, tmp_path):
    """A copy of the demo that a test may change."""
    place = tmp_path / "net-loft"
    shutil.copytree(demo_project, place)
    return place


@pytest.fixture
def start(monkeypatch, project, tmp_path):
    """The app on that project, at a page."""

    def go(page="room.py"):
        monkeypatch.setenv("PLANNER_FOLDER", str(project))
        monkeypatch.setattr("tempfile.tempdir", str(tmp_path))  # drafts are made there
        app = AppTest.from_file(str(ROOT / "streamlit_app.py"), default_timeout=60).run()
        assert not app.exception
        if page != "room.py":
            app.switch_page(str(PAGES / page)).run()
        assert not app.exception, app.exception
        return app

    return go


@pytest.mark.parametrize("page", sorted(path.name for path in PAGES.glob("*.py")))
def test_every_page_starts(start, page):
    app = start(page)
    assert app.title
    assert not app.error
    documented = [text.value for text in app.markdown if "belongs to" in text.value]
    assert documented == []  # what explains the code is no text for the page


def field(app, label):
    return next(one for one in app.text_input if one.label == label)


def test_a_changed_length_is_saved_and_predicted(start, project):
    app = start()
    field(app, "Length (m)").set_value("6.00").run()
    assert not app.exception
    assert "length = 6.0" in (project / "room.toml").read_text(encoding="utf-8")
    assert any("60.8 m³" in caption.value for caption in app.caption)  # 6.00 · 3.90 · 2.60 by hand


@pytest.mark.parametrize(
    ("text", "words"), [("six", "not a length"), ("-3", "positive"), ("500", "cm")]
)
def test_a_length_that_cannot_be_is_refused_and_the_room_stays(start, project, text, words):
    before = (project / "room.toml").read_text(encoding="utf-8")
    app = start()
    field(app, "Length (m)").set_value(text).run()
    assert not app.exception
    assert any(words in error.value for error in app.error)
    assert (project / "room.toml").read_text(encoding="utf-8") == before


def test_feet_and_inches(start, project):
    app = start()
    field(app, "Height (m)").set_value("8' 6 1/2\"").run()
    assert not app.exception
    assert "height = 2.6035" in (project / "room.toml").read_text(
        encoding="utf-8"
    )  # (8 + 6.5/12) · 0.3048 by hand


def test_a_file_changed_meanwhile_is_not_overwritten(start, project):
    app = start()
    path = project / "room.toml"
    path.write_text(path.read_text(encoding="utf-8").replace("2.60", "2.70"), encoding="utf-8")
    field(app, "Length (m)").set_value("6.00").run()
    app.run()
    assert any("changed by someone else" in error.value for error in app.error)
    assert "2.70" in path.read_text(encoding="utf-8")
    next(b for b in app.button if b.label == "Keep mine").click().run()
    assert "length = 6.0" in path.read_text(encoding="utf-8")


def test_the_measurement_explains_itself_and_can_be_used(start):
    app = start("reality.py")
    assert any("plasterboard" in text.value for text in app.markdown)
    app.toggle[0].set_value(True).run()
    assert not app.exception
    app.switch_page(str(PAGES / "prediction.py")).run()
    assert any("measurement corrects" in info.value for info in app.info)


def test_without_a_measurement_the_page_says_what_to_do(start, project):
    (project / "measured.csv").unlink()
    app = start("reality.py")
    assert "Nothing is measured yet" in app.info[0].value


def test_recordings_are_evaluated(start, project):
    (project / "measured.csv").unlink()
    app = start("recordings.py")
    next(b for b in app.button if b.label == "Evaluate recordings").click().run(timeout=120)
    assert not app.exception
    assert (project / "measured.csv").is_file()
    assert any("engineering method" in caption.value for caption in app.caption)


def test_decays_come_back_after_a_reload(start, project):
    """Evaluated in one session as impulses or not, looked at in the next without asking again."""
    app = start("recordings.py")
    chosen = next(one for one in app.multiselect if one.label == "Evaluate")
    chosen.set_value(["A1.flac", "B2.flac"]).run()
    next(b for b in app.button if b.label == "Evaluate recordings").click().run(timeout=120)
    assert "Decays" in [header.value for header in app.header]
    again = start("recordings.py")
    assert not again.exception
    assert "Decays" in [header.value for header in again.header]
    assert len(next(one for one in again.selectbox if one.label == "Position").options) == 2


def test_other_recordings_do_not_pass_for_those_measured(start, project):
    for path in (project / "recordings").glob("B*.flac"):
        path.unlink()
    app = start("recordings.py")
    assert not app.exception
    assert "Decays" not in [header.value for header in app.header]
    assert any("once more" in caption.value for caption in app.caption)


def test_a_recording_that_is_none_is_refused_in_words(start, project):
    for path in (project / "recordings").glob("*.flac"):
        path.write_bytes(b"no sound at all")
    app = start("recordings.py")
    next(b for b in app.button if b.label == "Evaluate recordings").click().run(timeout=120)
    assert not app.exception
    assert any("no sound file" in error.value for error in app.error)


def test_a_suggestion_becomes_an_option(start, project):
    app = start("treatment.py")
    next(b for b in app.button if b.label == "Suggest the cheapest treatment").click().run(
        timeout=120
    )
    assert not app.exception
    proofs = [one.value for one in app.success]
    assert any("no list within these limits is cheaper" in proof for proof in proofs)
    assert (project / "options" / "suggestion-1.toml").is_file()
    app.switch_page(str(PAGES / "shopping.py")).run()
    assert not app.exception
    assert any("EUR" in metric.value for metric in app.metric)
    again = start("treatment.py")  # a reload
    assert [one.value for one in again.success] == proofs
    room = project / "room.toml"
    room.write_text(room.read_text(encoding="utf-8").replace("height = 2.6", "height = 2.7"))
    other = start("treatment.py")
    assert not other.exception
    assert not other.success  # it was about another room


def test_options_are_copied_renamed_and_deleted(start, project):
    app = start("treatment.py")
    next(b for b in app.button if b.label == "Copy").click().run()
    assert not app.exception
    assert len(list((project / "options").glob("*.toml"))) == 2
    next(b for b in app.button if b.label == "Delete").click().run()
    assert not app.exception
    assert len(list((project / "options").glob("*.toml"))) == 1


def test_shopping_without_an_option_says_where_to_make_one(start, project):
    shutil.rmtree(project / "options")
    assert "page Treatment" in start("shopping.py").info[0].value


def test_a_new_room_and_a_folder_that_is_none(start):
    app = start("projects.py")
    next(b for b in app.button if b.label == "New room").click().run()
    assert not app.exception
    app.switch_page(str(PAGES / "projects.py")).run()
    next(t for t in app.text_input if t.label == "Folder on this computer").set_value(
        "/nowhere"
    ).run()
    next(b for b in app.button if b.label == "Open folder").click().run()
    assert any("holds no room.toml" in error.value for error in app.error)


def test_a_start_without_a_folder_is_a_sketch(monkeypatch, tmp_path):
    monkeypatch.delenv("PLANNER_FOLDER", raising=False)
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    app = AppTest.from_file(str(ROOT / "streamlit_app.py"), default_timeout=60).run()
    assert not app.exception
    assert any("a draft" in caption.value for caption in app.caption)


def edit(app, part, edits):
    """What a person types into a table: AppTest cannot, so that it is put where the browser leaves it."""
    key = [key for key in app.session_state["tables"] if key.startswith(part)][-1]
    nothing = {"edited_rows": {}, "added_rows": [], "deleted_rows": []}
    app.session_state[key] = {**nothing, **edits}
    app.run()
    assert not app.exception, app.exception
    return app


def saved(path):
    return tomllib.loads(path.read_text(encoding="utf-8"))


def test_counts_are_edited_one_after_the_other_and_kept(start, project):
    file = project / "options" / "first.toml"
    before = saved(file)["item"]

    def counts():
        return [item.get("count") for item in saved(file)["item"][:2]]

    app = start("treatment.py")
    assert saved(file)["item"] == before
    edit(app, "edit-", {"edited_rows": {0: {"pieces": 1}}})
    assert counts() == [1, before[1].get("count")]
    edit(app, "edit-", {"edited_rows": {0: {"pieces": 1}, 1: {"pieces": 2}}})
    assert counts() == [1, 2]
    edit(app, "edit-", {"edited_rows": {0: {"pieces": 1}}, "deleted_rows": [1]})
    assert len(saved(file)["item"]) == len(before) - 1


@pytest.mark.parametrize(
    ("cells", "words"),
    [
        ({"pieces": -4}, "greater than or equal to 1"),
        ({"pieces": 90_000}, "fit"),
        ({"product": "no-such-thing"}, "no product"),
        ({"pieces": None, "area": float("inf")}, "finite"),
    ],
)
def test_a_count_that_cannot_be_is_refused_and_the_option_stays(start, project, cells, words):
    file = project / "options" / "first.toml"
    before = file.read_bytes()
    app = start("treatment.py")
    edit(app, "edit-", {"edited_rows": {0: cells}})
    assert any(words in error.value for error in app.error), [e.value for e in app.error]
    assert file.read_bytes() == before


def test_a_cell_of_nothing_takes_its_row_out(start, project):
    file = project / "options" / "first.toml"
    count = len(saved(file)["item"])
    edit(start("treatment.py"), "edit-", {"edited_rows": {0: {"pieces": float("nan")}}})
    assert len(saved(file)["item"]) == count - 1


def test_a_price_in_the_catalogue_is_kept_and_nonsense_is_not(start, project):
    file = project / "catalogue.csv"
    app = start("treatment.py")
    before = file.read_bytes()
    edit(app, "catalogue-edit", {"edited_rows": {0: {"price_per_pack": "NaN"}}})
    assert any("not a number" in error.value for error in app.error)
    assert file.read_bytes() == before
    edit(app, "catalogue-edit", {"edited_rows": {0: {"price_per_pack": "199.50"}}})
    assert b"199.50" in file.read_bytes()


def test_a_catalogue_that_broke_meanwhile_is_said_in_words(start, project):
    (project / "catalogue.csv").write_text("id;what\n1;2;3\n")
    app = start()
    for page in ("treatment.py", "shopping.py", "room.py"):
        app.switch_page(str(PAGES / page)).run()
        assert not app.exception
    app.switch_page(str(PAGES / "treatment.py")).run()
    assert any("catalogue.csv" in error.value for error in app.error)


def test_generic_products_become_the_projects_own(start, project):
    (project / "catalogue.csv").unlink()
    app = start("treatment.py")
    next(b for b in app.button if b.label.startswith("Edit these")).click().run()
    assert not app.exception
    assert (project / "catalogue.csv").is_file()


def upload(app, label, files):
    box = next(one for one in app.get("file_uploader") if label in one.label)
    box.set_value(files).run(timeout=120)
    assert not app.exception, app.exception
    return app


def test_recordings_are_uploaded_and_what_is_no_sound_is_not_kept(start, project, demo_project):
    shutil.rmtree(project / "recordings")
    sound = (demo_project / "recordings" / "A1.flac").read_bytes()
    app = start("recordings.py")
    assert any("drop some above" in info.value for info in app.info)
    upload(app, "Recordings from the site", [
        ("A1.flac", sound, "audio/flac"), ("B2.wav", b"these are words", "audio/wav"),
    ])  # fmt: skip
    assert [path.name for path in (project / "recordings").iterdir()] == ["A1.flac"]
    assert any("B2.wav: not kept" in error.value.replace("\\", "") for error in app.error)


def test_positions_are_named_in_a_table(start, project):
    app = start("recordings.py")
    edit(app, "survey-", {"edited_rows": {0: {"microphone_position": "sofa"}}})
    text = (project / "recordings" / "survey.csv").read_text(encoding="utf-8")
    assert "A1.flac,A,sofa,empty" in text
    edit(app, "survey-", {"edited_rows": {0: {"microphone_position": ""}}})
    assert any("position is empty" in error.value for error in app.error)
    assert (project / "recordings" / "survey.csv").read_text(encoding="utf-8") == text


def test_a_catalogue_of_ones_own_is_uploaded_or_refused(start, project):
    app = start("treatment.py")
    before = (project / "catalogue.csv").read_bytes()
    upload(app, "Own catalogue", ("mine.csv", b"\x89PNG\r\n\x1a\n\0\0", "text/csv"))
    assert app.error
    assert (project / "catalogue.csv").read_bytes() == before
    generic = (ROOT / "materials" / "catalogue.csv").read_bytes()
    upload(app, "Own catalogue", ("mine.csv", generic, "text/csv"))
    assert not any("catalogue" in error.value for error in app.error)
    assert (project / "catalogue.csv").read_bytes() != before


def test_a_zip_that_wants_out_is_refused_and_an_honest_one_opened(start, project):
    app = start("projects.py")
    evil = io.BytesIO()
    with zipfile.ZipFile(evil, "w") as archive:
        archive.writestr("room.toml", "x")
        archive.writestr("../evil.toml", "x")
    upload(app, "zip", ("evil.zip", evil.getvalue(), "application/zip"))
    next(b for b in app.button if b.label == "Open zip").click().run()
    assert any("leaves the project" in error.value for error in app.error)
    upload(app, "zip", ("good.zip", packed(project, recordings=False), "application/zip"))
    next(b for b in app.button if b.label == "Open zip").click().run()
    assert not app.exception
    assert app.session_state["work"].folder != project
    assert app.session_state["work"].room.name == "Control room in the old net loft"


def opened(app, group):
    """A closed group of fields is opened, as by a click."""
    app.session_state[f"room-1-m-box-{group}"] = True
    app.run()
    assert not app.exception


def test_a_length_that_pushes_a_window_out_opens_its_group(start, project):
    app = start()
    field(app, "Length (m)").set_value("2.9").run()
    group = next(box for box in app.expander if box.label.startswith("Doors"))
    assert any("leaves the surface" in error.value for error in group.error)
    assert "length = 5.2" in (project / "room.toml").read_text(encoding="utf-8")


def test_a_door_that_leaves_its_wall_is_refused_beside_its_fields(start, project):
    app = start()
    before = (project / "room.toml").read_text(encoding="utf-8")
    opened(app, "section-opening")
    group = next(box for box in app.expander if box.label.startswith("Doors"))
    group.text_input[0].set_value("40").run()
    group = next(box for box in app.expander if box.label.startswith("Doors"))
    assert any("leaves the surface" in error.value for error in group.error)
    assert any("not taken" in warning.value for warning in app.warning)
    assert (project / "room.toml").read_text(encoding="utf-8") == before


def test_corners_are_added_one_after_the_other(start, project):
    app = start()
    next(one for one in app.radio if one.label == "Plan").set_value("corners").run()
    assert saved(project / "room.toml")["shape"]["footprint"] == [
        [0, 0],
        [5.2, 0],
        [5.2, 3.9],
        [0, 3.9],
    ]
    # An alcove in the left corner at the back, by hand.
    edit(app, "room-", {"edited_rows": {2: {"y": 3.5}}})
    assert saved(project / "room.toml")["shape"]["footprint"][2] == [5.2, 3.5]
    edit(app, "room-", {"edited_rows": {2: {"y": 3.5}, 3: {"x": 3.0, "y": 3.5}},
                        "added_rows": [{"x": 3.0, "y": 3.9}, {"x": 0.0, "y": 3.9}]})  # fmt: skip
    expected = [[0, 0], [5.2, 0], [5.2, 3.5], [3.0, 3.5], [3.0, 3.9], [0, 3.9]]
    assert saved(project / "room.toml")["shape"]["footprint"] == expected
    app.run()
    assert saved(project / "room.toml")["shape"]["footprint"] == expected
    edit(app, "room-", {"edited_rows": {2: {"y": float("nan")}}, "deleted_rows": [1]})
    assert any("corners" in error.value for error in app.error)


def test_walls_of_their_own_materials_stay_so_with_corners(start, project):
    app = start()
    next(box for box in app.checkbox if box.label == "All walls alike").set_value(False).run()
    wall = next(one for one in app.selectbox if one.label == "Wall back")
    wall.set_value("door-solid-timber").run()
    assert saved(project / "room.toml")["surfaces"]["walls"]["back"] == "door-solid-timber"
    next(one for one in app.radio if one.label == "Plan").set_value("corners").run()
    assert not app.error
    walls = saved(project / "room.toml")["surfaces"]["walls"]
    assert [name == "door-solid-timber" for name in walls] == [False, True, False, False]
    edit(app, "room-", {"added_rows": [{"x": 0.0, "y": 2.0}]})
    assert len(saved(project / "room.toml")["surfaces"]["walls"]) == 5


def test_a_mode_is_shown_in_plan(start):
    app = start("prediction.py")
    mode = next(one for one in app.selectbox if one.label == "Mode")
    assert mode.options[0].startswith("33.")  # 343 / (2 · 5.20 m) = 33.0 Hz by hand
    mode.set_value(2).run()
    assert not app.exception
    assert any("largest where the plan is darkest" in one.value for one in app.caption)


def test_the_seat_is_shown_when_it_is_asked_for(start):
    app = start("prediction.py")
    assert not any("dB uneven" in one.value for one in app.markdown)
    app.toggle[0].set_value(True).run(timeout=120)
    assert not app.exception
    assert any("dB uneven" in one.value for one in app.markdown)
