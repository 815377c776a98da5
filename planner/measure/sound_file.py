"""Sound files in blocks, whatever a recorder left: odd headers repaired, unreadable ones explained."""

from __future__ import annotations

import io
import os
import struct
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from types import TracebackType
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray

from planner.errors import RecordingError

LOWEST_RATE = 16_000
"""Recordings below this hold no octave of interest above 4 kHz. [Hz]"""

MOST_CHANNELS = 64

LOSSY = ("OGG", "MP3")
_PHONE = (".m4a", ".mp4", ".aac", ".3gp", ".amr", ".wma", ".caf", ".mov")

_MUTING = threading.Lock()

Frames = NDArray[np.float32]


@contextmanager
def _muted() -> Iterator[None]:
    """A damaged MP3 makes the library complain past Python, straight to standard error."""
    with _MUTING:
        try:
            kept = os.dup(2)
        except OSError:  # there is no standard error
            yield
            return
        sink = os.open(os.devnull, os.O_WRONLY)
        try:
            os.dup2(sink, 2)
            yield
        finally:
            os.dup2(kept, 2)
            os.close(kept)
            os.close(sink)


class SoundFile:
    """An open recording, read in pieces.

    Raises
    ------
    RecordingError
        It cannot be read, or nothing can be measured with it; the message says what to change.
    """

    def __init__(self, path: str | Path) -> None:
        import soundfile

        self.path = Path(path)
        self.notes: list[str] = []
        try:
            size = self.path.stat().st_size
            self._stream: Any = self.path.open("rb")
        except OSError as error:
            raise RecordingError(
                f"cannot be read ({error.strerror or error})",
                file=self.path,
                cure="Name a WAV, FLAC or AIFF file.",
            ) from error
        try:
            self._file = self._opened(soundfile, size)
            self._check()
        except BaseException:
            self._stream.close()
            raise

    def _opened(self, soundfile: Any, size: int) -> Any:
        if size == 0:
            raise RecordingError(
                "is empty", file=self.path, cure="Copy it from the recorder again."
            )
        try:
            # By name: through a Python file object every kilobyte would cost a call.
            with _muted():
                file = soundfile.SoundFile(str(self.path))
            block = file.channels * _bytes_per_sample(file.subtype)
        except (soundfile.SoundFileError, RuntimeError, TypeError, ValueError) as error:
            raise self._unreadable() from error
        if file.format in ("WAV", "WAVEX") and block:
            return self._repaired(soundfile, file, size, block)
        return file

    def _unreadable(self) -> RecordingError:
        suffix = self.path.suffix.lower()
        if suffix in _PHONE:
            return RecordingError(
                f"{suffix} is not a format that can be measured with",
                file=self.path,
                cure="Set the recorder to WAV or FLAC and record again; a converted lossy file "
                "keeps its damage.",
            )
        return RecordingError(
            "is no sound file that can be read (its header is damaged, or it is something else)",
            file=self.path,
            cure="Record as WAV or FLAC, and copy the file again.",
        )

    def _repaired(self, soundfile: Any, file: Any, size: int, block: int) -> Any:
        """A WAV whose header does not agree with what lies in the file."""
        place = _data_chunk(self._stream)
        if place is None:
            return file
        offset, promised = place
        there = size - offset
        if promised in (0, 0xFFFFFFFF) or file.frames * block + 1024 < min(promised, there):
            layout = {"subtype": file.subtype, "channels": file.channels}
            rate = file.samplerate
            file.close()
            raw = soundfile.SoundFile(
                _Window(self._stream, offset, size),
                format="RAW",
                endian="LITTLE",
                samplerate=rate,
                **layout,
            )
            self.notes.append(
                "The header does not say how long the recording is (the recorder died or is still "
                "writing): everything behind it was read."
            )
            return raw
        if promised > there + 1:
            self.notes.append(
                f"The file is truncated: its header promises {promised / block / file.samplerate:.1f} s, "
                f"{there / block / file.samplerate:.1f} s are there. Copy it from the recorder again."
            )
        return file

    def _check(self) -> None:
        if self._file.frames <= 0:
            raise RecordingError("holds no sound", file=self.path, cure="Record it again.")
        if self.rate < LOWEST_RATE:
            raise RecordingError(
                f"is sampled at {self.rate} Hz, {LOWEST_RATE} Hz is the least",
                file=self.path,
                cure="Set the recorder to 44.1 or 48 kHz.",
            )
        if self.rate > 768_000 or self.channels > MOST_CHANNELS:
            raise RecordingError(
                f"claims {self.channels} channels at {self.rate} Hz",
                file=self.path,
                cure="Its header is damaged; copy it from the recorder again.",
            )
        if self._file.format in LOSSY:
            self.notes.append(
                f"{self._file.format} is a lossy format: quiet decays may be cut away. Record WAV "
                "or FLAC."
            )

    @property
    def rate(self) -> int:
        """[Hz]."""
        return int(self._file.samplerate)

    @property
    def channels(self) -> int:
        """Number of channels."""
        return int(self._file.channels)

    @property
    def frames(self) -> int:
        """Length in samples of one channel."""
        return int(self._file.frames)

    @property
    def duration_s(self) -> float:
        """[s]."""
        return self.frames / self.rate

    def read(self, first: int, last: int) -> Frames:
        """Samples [first, last) of all channels, shape ``(sample, channel)``; fewer at the end.

        Raises
        ------
        RecordingError
            The file breaks off or holds what is no sound.
        """
        first = max(first, 0)
        try:
            self._file.seek(min(first, self.frames))
            data: Frames = self._file.read(max(last - first, 0), dtype="float32", always_2d=True)
        except RuntimeError as error:
            raise self._breaks_off(first) from error
        self._check_finite(data, first)
        return data

    def blocks(self, size: int = 2**17) -> Iterator[Frames]:
        """The whole file in blocks of `size` samples, shape ``(sample, channel)`` each.

        A block is valid until the next one is asked for.

        Raises
        ------
        RecordingError
            As `read`.
        """
        position = 0
        memory = np.empty((size, self.channels), np.float32)
        self.read(0, 0)
        while True:
            try:
                block: Frames = self._file.read(size, dtype="float32", always_2d=True, out=memory)
            except RuntimeError as error:
                raise self._breaks_off(position) from error
            if not len(block):
                break  # also where the header promised more than there is
            self._check_finite(block, position)
            yield block
            position += len(block)

    def _breaks_off(self, position: int) -> RecordingError:
        return RecordingError(
            f"cannot be read beyond {position / self.rate:.1f} s",
            file=self.path,
            cure="Copy it from the recorder again.",
        )

    def _check_finite(self, data: Frames, first: int) -> None:
        # The extremes of a block are not finite as soon as one sample is not.
        if len(data) and not (np.isfinite(data.max()) and np.isfinite(data.min())):
            raise RecordingError(
                "holds values that are no numbers (NaN or infinity)",
                file=self.path,
                where=f"{first / self.rate:.1f} s to {(first + len(data)) / self.rate:.1f} s",
                cure="Export it again as 24-bit PCM.",
            )

    def close(self) -> None:
        """Close the file."""
        self._file.close()
        self._stream.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.close()


def _bytes_per_sample(subtype: str) -> int:
    return {
        "PCM_U8": 1, "PCM_S8": 1, "PCM_16": 2, "PCM_24": 3, "PCM_32": 4, "FLOAT": 4, "DOUBLE": 8,
        "ULAW": 1, "ALAW": 1,
    }.get(subtype, 0)  # fmt: skip


def _data_chunk(stream: Any) -> tuple[int, int] | None:
    """Offset and promised size of the samples in a RIFF file. [byte]."""
    stream.seek(0)
    if stream.read(12)[:4] not in (b"RIFF", b"RIFX"):
        return None
    for _ in range(100):
        head = stream.read(8)
        if len(head) < 8:
            return None
        name, size = struct.unpack("<4sI", head)
        if name == b"data":
            return stream.tell(), size
        stream.seek(size + size % 2, io.SEEK_CUR)
    return None


class _Window(io.RawIOBase):
    """Part of a file, as a file of its own."""

    def __init__(self, stream: Any, start: int, stop: int) -> None:
        super().__init__()
        self._stream, self._start, self._stop, self._at = stream, start, stop, 0

    def readable(self) -> bool:
        return True

    def seekable(self) -> bool:
        return True

    def tell(self) -> int:
        return self._at

    def seek(self, offset: int, whence: int = io.SEEK_SET) -> int:
        base = {io.SEEK_SET: 0, io.SEEK_CUR: self._at, io.SEEK_END: self._stop - self._start}[
            whence
        ]
        self._at = max(base + offset, 0)
        return self._at

    def readinto(self, buffer: Any) -> int:
        left = max(self._stop - self._start - self._at, 0)
        self._stream.seek(self._start + self._at)
        data = self._stream.read(min(len(buffer), left))
        buffer[: len(data)] = data
        self._at += len(data)
        return len(data)
