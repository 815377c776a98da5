"""``room.toml`` ⇄ `Room`. Every refusal names the file, the key and what would be right."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterable, Mapping
from difflib import get_close_matches
from pathlib import Path
from typing import Any

from pydantic import BaseModel, ValidationError

from planner.bands import OCTAVES
from planner.errors import InputError, RoomError
from planner.room.model import Room
from planner.storage import write_atomically

LARGEST_FILE = 1_000_000
"""A room file beyond this is something else. [byte]"""

# An array without arrays or tables in it, over several lines; strings never hold a line break here.
_ARRAY = re.compile(r"\[\n([^\[\]{}]*)\n\s*\]")
_SPACE = re.compile(r"\s*\n\s*")

_TABLES = {
    "openings": "opening",
    "patches": "patch",
    "keep_outs": "keep_out",
    "furnishings": "furnishing",
    "materials": "material",
}


def read_room(path: str | Path) -> Room:
    """Read a room file.

    Parameters
    ----------
    path
        A ``room.toml``, or a project folder that holds one.

    Returns
    -------
    room
        In SI units.

    Raises
    ------
    RoomError
        The file cannot be read, is not TOML, or describes a room that cannot be.
    """
    file = Path(path)
    if file.is_dir():
        file = file / "room.toml"
    try:
        raw = file.read_bytes()
    except OSError as error:
        raise RoomError(
            f"cannot be read ({error.strerror or error})",
            file=file,
            cure="Name a room.toml, or the folder it lies in.",
        ) from error
    if len(raw) > LARGEST_FILE:
        raise RoomError(
            f"is {len(raw) / 1e6:.1f} MB large", file=file, cure="A room file has a few kB."
        )
    try:
        text = raw.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError as error:
        line = raw[: error.start].count(b"\n") + 1
        raise RoomError(
            "is not UTF-8 text", file=file, where=f"line {line}", cure="Save it as UTF-8."
        ) from error
    return parse_room(text, file=file)


def parse_room(text: str, *, file: str | Path = "room.toml") -> Room:
    """Room from the text of a room file; `file` is the name that refusals print.

    Raises
    ------
    RoomError
        As `read_room`.
    """
    try:
        data = tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError) as error:
        raise RoomError(
            f"is not TOML: {error}",
            file=file,
            cure='Keys look like length = 5.2, text stands in "quotes".',
        ) from error
    return room_from(data, file=file)


def room_from(
    data: Mapping[str, Any], *, file: str | Path | None = None, lengths_in: str | None = None
) -> Room:
    """Room from nested tables as TOML gives them.

    Bare lengths are in the table's own `units`, or in `lengths_in` (``m`` or ``ft``) where that is
    given: `Room.model_dump` gives metres whatever the room's unit.

    Raises
    ------
    RoomError
        As `read_room`.
    """
    units = lengths_in or data.get("units", "m")
    context = {"units": units if units in ("m", "ft") else "m"}
    try:
        return Room.model_validate(dict(data), context=context)
    except ValidationError as error:
        raise _in_words(error, file) from error


def room_to_toml(room: Room) -> str:
    """Text of a room file that reads back as the same room, lengths in the room's own units."""
    import tomli_w

    data = room.model_dump(
        by_alias=True, exclude_defaults=True, context={"units": room.units}, mode="python"
    )
    text: str = tomli_w.dumps(_plain(data))
    return _ARRAY.sub(lambda match: f"[{_SPACE.sub(' ', match[1].strip().rstrip(','))}]", text)


def write_room(path: str | Path, room: Room) -> Path:
    """Write a room file atomically; comments of an older file there are not kept.

    Raises
    ------
    InputError
        The place cannot be written to.
    """
    return write_atomically(path, room_to_toml(room))


def _plain(value: Any) -> Any:
    """What TOML can hold: text keys, lists, nothing empty."""
    if isinstance(value, Mapping):
        return {str(key): _plain(entry) for key, entry in value.items() if entry is not None}
    if isinstance(value, list | tuple):
        return [_plain(entry) for entry in value]
    return value


def _in_words(error: ValidationError, file: str | Path | None) -> RoomError:
    """One message for everything that is wrong, the first problem in full."""
    problems = [_problem(dict(entry)) for entry in error.errors(include_url=False)]
    # A value that fits none of several types is reported once for each; say it once.
    problems = [p for n, p in enumerate(problems) if p[1] not in {q[1] for q in problems[:n]}]
    what, where, cure = problems[0]
    others = [f"{place}: {text}" for text, place, _ in problems[1:6]]
    if others:
        cure = f"{cure or ''} Also wrong: {'; '.join(others)}.".strip()
    return RoomError(what, file=file, where=where or None, cure=cure)


def _problem(entry: dict[str, Any]) -> tuple[str, str, str | None]:
    """What, where and cure of one pydantic error."""
    where = place(entry["loc"])
    cause = (entry.get("ctx") or {}).get("error")
    if isinstance(cause, InputError):
        return cause.what, cause.where or where, cause.cure
    kind, value = entry["type"], entry.get("input")
    if kind == "missing":
        return "is missing", where, "Add it; the guide to the room file shows an example."
    if kind == "extra_forbidden":
        return "is not a key the planner knows", where, _near_key(entry["loc"])
    if kind == "literal_error":
        return f"{value!r} is none of its choices", where, f"Use {entry['ctx']['expected']}."
    if kind in ("string_type", "float_type", "int_type", "dict_type", "tuple_type", "model_type"):
        return f"{_shown(value)} is of the wrong kind", where, _wanted(kind)
    if kind == "finite_number":
        return f"{value} is not a number to build with", where, "Write a finite number."
    return f"{_shown(value)}: {entry['msg'][0].lower()}{entry['msg'][1:]}", where, None


def _shown(value: Any) -> str:
    text = repr(value)
    return text if len(text) <= 60 else f"{text[:57]}…"


def _wanted(kind: str) -> str:
    return {
        "string_type": 'Write text in "quotes".',
        "float_type": "Write a number.",
        "int_type": "Write a whole number.",
        "dict_type": "Write a table: [name] with keys below it, or { key = value }.",
        "model_type": "Write a table: [name] with keys below it, or { key = value }.",
        "tuple_type": "Write a list: [ … ], or [[name]] for a table that may repeat.",
    }[kind]


def place(location: Iterable[int | str]) -> str:
    """Where a key stands, as a reader of the file would say it: ``[[opening]] 2, width``."""
    names: list[str] = []
    for step in location:
        if isinstance(step, int):
            if step in OCTAVES and names[-1] in ("low", "high", "alpha", "u"):
                names.append(str(step))  # a band, not a place in a list
            elif len(names) == 1:
                names[0] = f"[[{names[0].strip('[]')}]] {step + 1}"
            else:
                names.append(str(step + 1))
        elif step.startswith(("function-", "constrained-", "dict[", "tuple[", "str", "float")):
            continue  # which branch of a union was tried: of no use to the reader
        else:
            names.append(step if names else f"[{step}]")
    if not names:
        return ""
    if len(names) == 1:
        return names[0] if names[0].startswith("[[") else names[0].strip("[]")
    if names[0].startswith("[["):
        return ", ".join(names)
    return f"{names[0]} {', '.join(names[1:])}"


def _near_key(location: tuple[int | str, ...]) -> str | None:
    """The keys that stand at that place, the nearest first."""
    model: type[BaseModel] | None = Room
    for step in location[:-1]:
        if isinstance(step, int) or model is None:
            continue
        field = next(
            (f for n, f in model.model_fields.items() if step in (n, f.alias)),
            None,
        )
        model = _model_of(field.annotation) if field else None
    if model is None:
        return None
    keys = [field.alias or name for name, field in model.model_fields.items()]
    wanted = str(location[-1])
    near = get_close_matches(_TABLES.get(wanted, wanted), keys, n=1, cutoff=0.5)
    hint = f"Did you mean {near[0]!r}? " if near else ""
    return f"{hint}Known here: {', '.join(keys)}."


def _model_of(annotation: Any) -> type[BaseModel] | None:
    """The model behind ``X``, ``X | None`` or ``tuple[X, ...]``."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    for argument in getattr(annotation, "__args__", ()):
        found = _model_of(argument)
        if found is not None:
            return found
    return None
