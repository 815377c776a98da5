"""The project that is open in a browser session, and its folder: nothing here draws.

Every change is written to the folder at once, unless someone else changed a file there meanwhile:
then the page asks. A session without a folder of its own works in a draft folder, so that a
reload loses nothing.
"""

from __future__ import annotations

import hashlib
import os
import re
import tempfile
import tomllib
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import tomli_w

from planner.errors import InputError, OptionError, PlannerError, ProjectError, RoomError
from planner.measure.measured import Measured, measured_to_csv, read_measured
from planner.measure.measurement import Measurement
from planner.predict.prediction import Prediction
from planner.project import Project
from planner.room.files import read_room, room_from, room_to_toml
from planner.room.model import RECTANGLE_WALLS, Room
from planner.storage import write_atomically
from planner.treat.option import Option, option_to_toml, read_option
from planner.treat.suggestion import Suggestion

NEW_ROOM: dict[str, Any] = {
    "name": "New room",
    "shape": {"length": 5.0, "width": 4.0, "height": 2.6},
    "surfaces": {
        "floor": "timber-floor-on-joists",
        "ceiling": "plasterboard-on-joists",
        "walls": "plasterboard-on-studs",
    },
    "target": {"use": "listening-room-ebu3276"},
    "treatment": {"keep_clear": ["floor"], "symmetric": [["left", "right"]]},
}
"""A first sketch, to be changed."""

MOST_OPTIONS = 12

SURVEY = "recordings/survey.csv"

ASKED: dict[str, type] = {"files": list, "impulse": bool, "thirds": bool, "state": str}
"""What is kept of an evaluation of recordings."""

ANSWERED: dict[str, type] = {
    "option": str,
    "of": str,
    "met": bool,
    "proof": str,
    "sure": str,
    "lines": str,
    "doubts": list,
}
"""What is kept of a suggestion beside its option."""

LOOKED_AT = "looked-at.toml"
"""What the pages show of a project, beside it; nothing that a result depends on without saying so."""


@dataclass
class Work:
    """One open project."""

    folder: Path
    room: Room
    options: dict[str, Option] = field(default_factory=dict)
    chosen: str | None = None
    """Name of the option that is looked at."""
    measured: Measured | None = None
    measurement: Measurement | None = None
    """With the decay curves; only in the session that evaluated the recordings."""
    evaluated: dict[str, Any] = field(default_factory=dict)
    """What was asked of the recordings, so that their decays can be shown again after a reload."""
    use_measured: bool = False
    """Calibrate the room by its measurement."""
    suggestion: Suggestion | None = None
    answer: dict[str, Any] = field(default_factory=dict)
    """What the last suggestion was said to prove, in words."""
    problem: PlannerError | None = None
    """Why the last change to the room was not taken."""
    unsaved: dict[str, str] = field(default_factory=dict)
    """Texts that wait for a decision, by the name of a file that changed on the disk meanwhile."""
    serial: int = 0
    """Grows with every project that is opened: widgets of another project are not these."""
    digests: dict[str, str] = field(default_factory=dict)
    remembered: str = ""
    _sketch: tuple[Project, Prediction | None] | None = None
    _unwritten: bool = False

    @property
    def project(self) -> Project:
        """The room with what lies beside it, as it lies there now."""
        return Project(self.room, self.folder, self.folder / "room.toml")

    @property
    def sketch(self) -> Project:
        """The room alone; what follows from it is kept as long as the room is."""
        if self._sketch is None or self._sketch[0].room is not self.room:
            self._sketch = (self.project, None)
        return self._sketch[0]

    @property
    def forecast(self) -> Prediction:
        """Prediction of the room as it is described."""
        sketch = self.sketch
        assert self._sketch is not None
        found = self._sketch[1] or sketch.predict()
        self._sketch = (sketch, found)
        return found

    @property
    def option(self) -> Option | None:
        """The option that is looked at."""
        return self.options.get(self.chosen) if self.chosen else None

    @property
    def calibrating(self) -> Measured | None:
        """The measurement that corrects the room, where that is wanted."""
        return self.measured if self.use_measured else None

    @property
    def basis(self) -> str:
        """Tells apart what a suggestion rests on: room, measurement and products."""
        catalogue = self.folder / "catalogue.csv"
        parts = (
            room_to_toml(self.room),
            measured_to_csv(self.calibrating) if self.calibrating else "",
            _digest(catalogue) if catalogue.is_file() else "",
        )
        return hashlib.sha256("\0".join(parts).encode()).hexdigest()[:16]

    @property
    def conflict(self) -> str | None:
        """Name of a file that someone else changed meanwhile."""
        return next(iter(self.unsaved), None)

    def change_room(self, data: dict[str, Any], *, write: bool = True) -> bool:
        """Take a changed description in metres; a refusal is kept in `problem`.

        Who wants to show the change before it is written calls `write_room` right after.
        """
        names = new_wall_names(self.room, data)
        try:
            room = room_from(renamed(data, names), lengths_in="m")
            project = Project(room, self.folder)
            project.surfaces  # noqa: B018 - refuses unknown materials
        except PlannerError as error:
            self.problem = error
            return False
        self.problem = None
        if room != self.room:
            self.room = room
            self._sketch = (project, None)
            self.suggestion, self.answer = None, {}
            self._unwritten = True
            if write:
                self.write_room()
            if names:
                for option in list(self.options.values()):
                    self.set_option(_moved(option, names), replacing=option.name)
        return True

    def write_room(self) -> None:
        """Write the room where it changed since the last time."""
        if self._unwritten:
            self._unwritten = False
            self.save("room.toml", room_to_toml(self.room))

    def set_option(self, option: Option, *, replacing: str | None = None) -> None:
        """Keep an option under its name, in place of another where that is named."""
        if (
            replacing is None
            and option.name not in self.options
            and len(self.options) >= MOST_OPTIONS
        ):
            raise OptionError(f"{MOST_OPTIONS} options are kept already", cure="Delete one first.")
        for other in self.options:
            if other not in (option.name, replacing) and file_name(other) == file_name(option.name):
                raise OptionError(
                    f"{option.name!r} and {other!r} would be kept in one file",
                    cure="Choose a name that differs in more than signs and capitals.",
                )
        if replacing and replacing != option.name:
            self.remove_option(replacing)
        self.options[option.name] = option
        self.chosen = option.name
        self.save(f"options/{file_name(option.name)}.toml", option_to_toml(option))

    def remove_option(self, name: str) -> None:
        """Forget an option and delete its file.

        Raises
        ------
        OptionError
            Someone else changed it meanwhile.
        """
        file = f"options/{file_name(name)}.toml"
        path = self.folder / file
        if path.is_file() and self.digests.get(file) not in (None, _digest(path)):
            raise OptionError(
                f"{name!r} was changed by someone else meanwhile and is not deleted",
                cure="Open the project again to see it.",
            )
        path.unlink(missing_ok=True)
        self.options.pop(name, None)
        self.digests.pop(file, None)
        self.unsaved.pop(file, None)
        if self.chosen == name:
            self.chosen = next(iter(self.options), None)

    def set_measured(self, measurement: Measurement) -> None:
        """Keep what the recordings gave."""
        self.measurement, self.measured = measurement, measurement.measured
        self.save("measured.csv", measured_to_csv(measurement.measured))

    def remember(self) -> None:
        """Keep what is looked at, so that a reload shows the same."""
        text = tomli_w.dumps(
            {
                "use_measured": self.use_measured,
                "chosen": self.chosen or "",
                "evaluated": self.evaluated,
                "answer": self.answer,
            }
        )
        if text != self.remembered:
            self.remembered = text
            write_atomically(self.folder / LOOKED_AT, text)

    def save(self, name: str, text: str, *, force: bool = False) -> None:
        """Write a file of the project, unless it changed on the disk since it was read."""
        path = self.folder / name
        if not force and path.is_file() and _digest(path) != self.digests.get(name):
            self.unsaved[name] = text
            return
        write_atomically(path, text)
        self.digests[name] = _digest(path)
        self.unsaved.pop(name, None)

    def is_mine(self, name: str) -> bool:
        """Does a file still hold what was last read or written here."""
        path = self.folder / name
        return path.is_file() and _digest(path) == self.digests.get(name)

    def overwrite(self) -> None:
        """Settle every conflict with what is in the browser."""
        for name, text in list(self.unsaved.items()):
            self.save(name, text, force=True)


def new_wall_names(room: Room, data: dict[str, Any]) -> dict[str, str]:
    """Old and new names of the walls where a rectangle becomes corners or the other way round."""
    corners = data["shape"].get("footprint")
    if room.is_rectangle is (corners is None):
        return {}
    numbered = tuple(f"wall-{n + 1}" for n in range(len(RECTANGLE_WALLS)))
    old, new = (RECTANGLE_WALLS, numbered) if room.is_rectangle else (numbered, RECTANGLE_WALLS)
    return dict(zip(old, new, strict=True))


def renamed(data: dict[str, Any], names: dict[str, str]) -> dict[str, Any]:
    """A description in which walls have other names, wherever they are named."""
    if not names:
        return data

    def of(name: str) -> str:
        return names.get(name, name)

    data = {**data, "treatment": dict(data["treatment"])}
    for part, key in (("opening", "wall"), ("patch", "on"), ("keep_out", "on")):
        data[part] = [{**entry, key: of(entry[key])} for entry in data[part]]
    limits = data["treatment"]
    limits["keep_clear"] = [of(name) for name in limits["keep_clear"]]
    limits["symmetric"] = [tuple(of(name) for name in pair) for pair in limits["symmetric"]]
    for table in ("max_cover", "max_weight_kg"):
        limits[table] = {of(name): value for name, value in limits[table].items()}
    return data


def _moved(option: Option, names: dict[str, str]) -> Option:
    items = [
        item.model_copy(update={"surface": names.get(item.surface, item.surface)})
        for item in option.items
    ]
    return option.model_copy(update={"items": tuple(items)})


def open_work(folder: Path, serial: int = 0) -> tuple[Work, list[str]]:
    """Open a project folder; what cannot be read beside the room becomes a note.

    Raises
    ------
    PlannerError
        The room itself cannot be used.
    """
    room = read_room(folder)
    work = Work(folder=folder, room=room, serial=serial)
    notes: list[str] = []
    try:
        work.project.surfaces  # noqa: B018 - refuses unknown materials here, not on a page
    except RoomError as error:
        raise RoomError(
            error.what, file=folder / "room.toml", where=error.where, cure=error.cure
        ) from error
    for name in ("room.toml", "catalogue.csv", SURVEY):
        if (folder / name).is_file():
            work.digests[name] = _digest(folder / name)
    for path in sorted((folder / "options").glob("*.toml"))[:MOST_OPTIONS]:
        try:
            option = read_option(path)
            work.options[option.name] = option
            work.digests[f"options/{path.name}"] = _digest(path)
        except InputError as error:
            notes.append(str(error))
    work.chosen = next(iter(work.options), None)
    if (folder / "measured.csv").is_file():
        try:
            work.measured = read_measured(folder / "measured.csv")
            work.digests["measured.csv"] = _digest(folder / "measured.csv")
        except InputError as error:
            notes.append(str(error))
    _recall(work)
    return work, notes


def _recall(work: Work) -> None:
    """What was looked at when the project was last open; a damaged note is no harm."""
    try:
        known = tomllib.loads((work.folder / LOOKED_AT).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return
    work.use_measured = bool(known.get("use_measured")) and work.measured is not None
    if known.get("chosen") in work.options:
        work.chosen = str(known["chosen"])
    if _kinds(known.get("evaluated")) == ASKED:
        asked = known["evaluated"]
        work.evaluated = {**asked, "files": [str(name) for name in asked["files"]]}
    if _kinds(known.get("answer")) == ANSWERED:
        answer = known["answer"]
        work.answer = {**answer, "doubts": [str(doubt) for doubt in answer["doubts"]]}


def _kinds(table: Any) -> dict[str, type]:
    return {n: type(value) for n, value in table.items()} if isinstance(table, dict) else {}


def new_work(folder: Path, serial: int = 0) -> Work:
    """A first sketch in a folder that holds no room yet.

    Raises
    ------
    ProjectError
        The folder holds a room already.
    """
    if (folder / "room.toml").exists():
        raise ProjectError("holds a room already", file=folder, cure="Open it instead.")
    room = room_from(NEW_ROOM)
    work = Work(folder=folder, room=room, serial=serial)
    work.save("room.toml", room_to_toml(room))
    return work


def drafts() -> Path:
    """Where sketches without a folder of their own are kept, for this user only."""
    user = str(os.getuid()) if hasattr(os, "getuid") else os.environ.get("USERNAME", "user")
    folder = Path(tempfile.gettempdir()) / f"room-treatment-planner-{user}"
    folder.mkdir(mode=0o700, parents=True, exist_ok=True)
    return folder


def new_draft() -> Path:
    """A new empty folder among the drafts."""
    return Path(tempfile.mkdtemp(prefix="sketch-", dir=drafts()))


def file_name(name: str) -> str:
    """A name as a harmless file name."""
    plain = re.sub(r"[^\w\- ]+", "", name, flags=re.UNICODE).strip().replace(" ", "-").lower()
    return plain[:60] or hashlib.sha256(name.encode()).hexdigest()[:12]


def _digest(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()
