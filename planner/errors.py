"""Everything the planner refuses, in one tree.

::

    PlannerError
    ├── InputError (ValueError)      a file, option or value that a person can put right
    │   ├── RoomError                room.toml
    │   ├── MaterialError            materials and coefficients
    │   ├── CatalogueError           catalogue.csv
    │   ├── OptionError              options/*.toml
    │   ├── RecordingError           sound files and survey.csv
    │   ├── MeasuredError            measured.csv
    │   └── ProjectError             the project folder or its zip
    └── MissingPartError (ImportError)  an optional library is not installed

A message names the file, the place in it, what is wrong and what would be right. The front ends
(``cli``, ``app``) each have one place that turns a `PlannerError` into words; nothing else catches
it.
"""

from __future__ import annotations

from pathlib import Path


class PlannerError(Exception):
    """Anything the planner refuses to do, with the reason in words."""


class InputError(PlannerError, ValueError):
    """Input that a person can put right.

    Parameters
    ----------
    what
        What is wrong, with the value and the limit.
    file
        The file it stands in; only its name is printed.
    where
        The place in that file: a key, a line, a row, a second.
    cure
        What would be right.
    """

    def __init__(
        self,
        what: str,
        *,
        file: str | Path | None = None,
        where: str | None = None,
        cure: str | None = None,
    ) -> None:
        self.what = what
        self.file = Path(file).name if file is not None else None
        self.where = where
        self.cure = cure
        place = ", ".join(part for part in (self.file, where) if part)
        message = f"{place}: {what}" if place else what
        if not message.endswith((".", "?", "!")):
            message += "."
        super().__init__(f"{message} {cure}" if cure else message)


class RoomError(InputError):
    """A room file that cannot be used as it stands."""


class MaterialError(InputError):
    """A material, or a coefficient, that cannot be used."""


class CatalogueError(InputError):
    """A product catalogue that cannot be used as it stands."""


class OptionError(InputError):
    """A treatment option that does not fit its room or its catalogue."""


class RecordingError(InputError):
    """A sound file, or the table that describes it, that cannot be evaluated."""


class MeasuredError(InputError):
    """A table of measured reverberation times that cannot be used."""


class ProjectError(InputError):
    """A project folder or archive that cannot be opened or written."""


class MissingPartError(PlannerError, ImportError):
    """An optional library that this job needs is not installed."""
