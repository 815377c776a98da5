"""From recordings to the reverberation time of a room."""

from __future__ import annotations

import datetime
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.air import Air
from planner.errors import RecordingError
from planner.measure.decay import evaluate_decays
from planner.measure.figures import Decays
from planner.measure.filterbank import OCTAVE_BANDS, THIRD_BANDS, BandEnergies, Bands
from planner.measure.impulse import evaluate_impulse
from planner.measure.measured import Measured, RecordingNote
from planner.measure.recording import Recording, choose_channel, read_recording, scan
from planner.measure.sound_file import SoundFile
from planner.measure.survey import (
    Place,
    average,
    grade,
    more_decays,
    place_by_name,
    read_survey,
)

SOUND = (".wav", ".flac", ".aif", ".aiff", ".w64", ".rf64", ".caf", ".ogg", ".mp3", ".au", ".snd")
"""Endings looked for in a folder."""

MANY_S = 600.0
"""Recordings longer than this in all are shared out over the cores. [s]"""


@dataclass(frozen=True, slots=True)
class Measurement:
    """A measured room with the decays it rests on."""

    measured: Measured
    positions: dict[tuple[str, str], Decays]
    """By source and microphone position; with the curves for charts."""
    places: tuple[Place, ...]


@dataclass(frozen=True, slots=True)
class _Result:
    """What one file gave."""

    place: Place
    recording: Recording | None
    impulse: Decays | None
    warnings: tuple[str, ...]
    fatal: bool = False


def measure(
    files: Sequence[str | Path],
    *,
    impulse: bool = False,
    survey: str | Path | None = None,
    thirds: bool = False,
    forward: bool = False,
    air: Air | None = None,
    state: str = "",
    date: str | None = None,
    progress: Callable[[int, int], None] | None = None,
    jobs: int | None = None,
) -> Measurement:
    """Reverberation time of a room from recordings made in it.

    Parameters
    ----------
    files
        Sound files, or folders of them.
    impulse
        They hold a clap, a burst balloon or an impulse response; otherwise interrupted noise.
    survey
        ``survey.csv``; looked for beside the files where not given. Without one the file names say
        which positions they are (``A2.wav``: source A, microphone 2).
    thirds
        One-third octaves instead of octaves.
    forward
        Filters that run forwards, as a check; the default is truer for short decays.
    air, state, date
        Circumstances to be noted down. State overrides the survey's.
    progress
        Called with the number of files done and of all.
    jobs
        Processes; by default all cores once there is much to do. A surrounding
        ``joblib.parallel_config(backend=…)`` decides where they run.

    Raises
    ------
    RecordingError
        A file cannot be read, or nothing in any of them can be used.
    """
    paths = sound_files(files)
    places = _places(paths, survey)
    kinds = {path: impulse or places[path.name].kind == "impulse" for path in paths}
    bands = THIRD_BANDS if thirds else OCTAVE_BANDS
    results = _all(paths, places, kinds, bands, not forward, progress, jobs)
    positions = _positions(results)
    notes = tuple(
        RecordingNote(
            result.place.file,
            result.recording.stops_s if result.recording else (),
            result.warnings,
        )
        for result in results
    )
    if not positions:
        reasons = "; ".join(f"{note.file}: {' '.join(note.warnings)}" for note in notes[:4])
        raise RecordingError(f"no decay can be used. {reasons}")
    states = {result.place.state for result in results if result.place.state}
    return Measurement(
        measured=_measured(
            positions,
            notes,
            state=state or (states.pop() if len(states) == 1 else ""),
            mixed=len(states) > 1 and not state,
            spoilt=_spoilt(results),
            air=air,
            date=datetime.date.today().isoformat() if date is None else date,
        ),
        positions=positions,
        places=tuple(result.place for result in results),
    )


def sound_files(files: Sequence[str | Path]) -> list[Path]:
    """Sound files among these paths, folders searched.

    Raises
    ------
    RecordingError
        There are none, or a path does not exist.
    """
    found: list[Path] = []
    for entry in files:
        path = Path(entry)
        if path.is_dir():
            found += sorted(p for p in path.iterdir() if p.suffix.lower() in SOUND)
        elif path.exists():
            found.append(path)
        else:
            raise RecordingError("does not exist", file=path, cure="Check the name and the folder.")
    if not found:
        raise RecordingError(
            "no sound files are there", cure=f"Name files or a folder ({', '.join(SOUND[:4])} …)."
        )
    names = [path.name for path in found]
    twice = {name for name in names if names.count(name) > 1}
    if twice:
        raise RecordingError(f"{sorted(twice)[0]!r} is named twice", cure="Name each file once.")
    return found


def _places(paths: Sequence[Path], survey: str | Path | None) -> dict[str, Place]:
    table: dict[str, Place] = {}
    if survey is not None:
        table = read_survey(survey)
    else:
        for folder in dict.fromkeys(path.parent for path in paths):
            if (folder / "survey.csv").is_file():
                table |= read_survey(folder / "survey.csv")
    return {path.name: table.get(path.name) or place_by_name(path.name) for path in paths}


def _all(
    paths: Sequence[Path],
    places: Mapping[str, Place],
    kinds: Mapping[Path, bool],
    bands: Bands,
    reverse: bool,
    progress: Callable[[int, int], None] | None,
    jobs: int | None,
) -> list[_Result]:
    tasks = [(path, places[path.name], kinds[path], bands, reverse) for path in paths]
    if jobs is None:
        jobs = -1 if len(paths) > 1 and _duration(paths) > MANY_S else 1
    if jobs == 1:
        results = []
        for number, task in enumerate(tasks, 1):
            results.append(_one(*task))
            if progress:
                progress(number, len(tasks))
        return results
    from joblib import Parallel, delayed

    return list(Parallel(n_jobs=jobs)(delayed(_one)(*task) for task in tasks))


def _duration(paths: Sequence[Path]) -> float:
    """Rough length of all recordings, from their sizes. [s]."""
    return sum(path.stat().st_size for path in paths) / (48_000 * 3)


def _one(path: Path, place: Place, is_impulse: bool, bands: Bands, reverse: bool) -> _Result:
    if is_impulse:
        return _impulse(path, place, bands, reverse)
    recording = read_recording(path, bands=bands, reverse=reverse)
    fatal = any(finding.fatal and not finding.bands_hz for finding in recording.findings)
    return _Result(place, recording, None, recording.warnings, fatal)


def _impulse(path: Path, place: Place, bands: Bands, reverse: bool) -> _Result:
    with SoundFile(path) as file:
        found = scan(file)
        channel, notes = choose_channel(file, found)

        def read(first: int, last: int) -> NDArray[np.float32]:
            return np.ascontiguousarray(file.read(first, last)[:, channel])

        start, stop = _impulse_section(file, channel)
        offered = bands.offered(file.rate)
        decays = evaluate_impulse(read, file.rate, start, stop, offered, reverse=reverse)
        warnings = [*file.notes, *notes]
        if found.clipped[channel]:
            warnings.append(
                f"{found.clipped[channel]} peaks are clipped: turn the level down and repeat."
            )
        if stop < file.frames:
            warnings.append(
                f"Only the loudest impulse, {start / file.rate:.1f} to {stop / file.rate:.1f} s, is "
                "used: put each into a file of its own."
            )
    return _Result(place, None, decays, tuple(warnings))


def _impulse_section(file: SoundFile, channel: int) -> tuple[int, int]:
    """From a little before the loudest impulse to the next one, or the end. [sample]."""
    step = max(round(0.01 * file.rate), 1)
    peaks = np.concatenate(
        [
            np.abs(block[: len(block) // step * step, channel]).reshape(-1, step).max(axis=1)
            for block in file.blocks(step * 8192)
            if len(block) >= step
        ]
        or [np.zeros(1, np.float32)]
    )
    loudest = int(np.argmax(peaks))
    start = max((loudest - 50) * step, 0)
    quiet = np.flatnonzero(peaks[loudest:] < 0.05 * peaks[loudest])
    if not len(quiet):
        return start, file.frames
    later = peaks[loudest + quiet[0] :]
    again = np.flatnonzero(later > 0.3 * peaks[loudest])
    if not len(again):
        return start, file.frames
    return start, (loudest + int(quiet[0]) + int(again[0]) - 5) * step


def _positions(results: Sequence[_Result]) -> dict[tuple[str, str], Decays]:
    """Decays of each pair of positions: its bursts averaged, whichever file they are in."""
    bursts: dict[tuple[str, str], list[BandEnergies]] = {}
    decays: dict[tuple[str, str], Decays] = {}
    for result in results:
        if result.impulse is not None:
            key = result.place.pair
            while key in decays:  # several impulses at one position: each is a sample of the room
                key = (key[0], f"{key[1]}'")
            decays[key] = result.impulse
        elif result.recording is not None and result.recording.bursts and not result.fatal:
            bursts.setdefault(result.place.pair, []).extend(_levelled(result.recording.bursts))
    for pair, each in bursts.items():
        decays[pair] = evaluate_decays(_same_bands(each))
    return decays


def _spoilt(results: Sequence[_Result]) -> dict[float, tuple[str, ...]]:
    """Flags of the bands that a finding spoils, each once."""
    found: dict[float, dict[str, None]] = {}
    for result in results:
        for finding in result.recording.findings if result.recording else ():
            for hz in finding.bands_hz:
                found.setdefault(hz, {})[finding.flag or finding.what] = None
    return {hz: tuple(flags) for hz, flags in found.items()}


def _levelled(bursts: Sequence[BandEnergies]) -> list[BandEnergies]:
    """Bursts of one file with the steady level of the file set to one, so that files can be joined.

    One number for all bands and bursts: the ratio between them stays as recorded.
    """
    steady = np.mean([burst.energy[burst.times < 0].sum(axis=1).mean() for burst in bursts])
    return [
        BandEnergies(b.energy / steady, b.frame_s, b.begin_s, b.bands, b.reverse) for b in bursts
    ]


def _same_bands(bursts: Sequence[BandEnergies]) -> list[BandEnergies]:
    """Bursts on the bands that all of them have."""
    common = set.intersection(*(set(burst.bands.nominal) for burst in bursts))
    kept = []
    for burst in bursts:
        columns = [n for n, hz in enumerate(burst.bands.nominal) if hz in common]
        bands = Bands(tuple(burst.bands.nominal[n] for n in columns), burst.bands.fraction)
        kept.append(
            BandEnergies(
                burst.energy[:, columns], burst.frame_s, burst.begin_s, bands, burst.reverse
            )
        )
    return kept


def _measured(
    positions: Mapping[tuple[str, str], Decays],
    notes: tuple[RecordingNote, ...],
    *,
    state: str,
    mixed: bool,
    spoilt: Mapping[float, tuple[str, ...]],
    air: Air | None,
    date: str,
) -> Measured:
    widest = max((one.bands for one in positions.values()), key=len)
    same = {pair: one for pair, one in positions.items() if one.bands == widest}
    room = average(same)
    name, missing = grade(list(positions), min(one.count for one in positions.values()))
    warnings = [text for text in (missing, more_decays(room)) if text]
    if len(same) < len(positions):
        warnings.append("Positions recorded at a lower rate are left out of the average.")
    if mixed:
        warnings.append(
            "The recordings were made in different states of the room: measure one state."
        )
    return Measured(
        bands_hz=widest.nominal,
        t_s=room.t_s,
        u_s=room.u_s,
        evaluation=room.evaluation,
        t20_s=room.t20_s,
        t30_s=room.t30_s,
        edt_s=room.edt_s,
        range_db=room.range_db,
        positions=room.positions,
        decays=room.decays,
        flags=tuple(
            (*flags, *spoilt.get(hz, ()))
            for hz, flags in zip(widest.nominal, room.flags, strict=True)
        ),
        state=state,
        air=air,
        date=date,
        recordings=notes,
        warnings=tuple(warnings),
        grade=name,
    )
