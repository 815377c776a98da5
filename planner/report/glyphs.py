"""Text made safe for typesetting: characters no shipped font has are written as their code."""

from __future__ import annotations

import functools
import re
import struct
import unicodedata
from pathlib import Path

from planner.report.palette import FONTS

INVISIBLE = {0x200B, 0x200C, 0x200D, 0x00AD, 0x2060, 0xFEFF}
_UNIT = re.compile(r"(?<=\d) (?=(?:%|Hz|kHz|dB|s|m|mm|m²|m³|kg|°C)(?![\w²³]))")
_LONG_WORD = re.compile(r"[^\s\u200b]{24,}")


def printable(text: str, *, breakable: bool = True, picture: bool = False) -> str:
    """The text as it can be set on paper.

    Line ends become spaces, the space before a unit does not break; controls, marks that turn the direction of writing and characters that
    no shipped font has become their code, ``⟨U+202E⟩``; very long words may be broken.

    Parameters
    ----------
    text
        Any text.
    breakable
        Put invisible break points into words of 24 characters and more.
    picture
        For text inside SVG: accents are joined with their letters, those that cannot be become
        their code, because a tagged PDF cannot tell what such a pair of glyphs means.
    """
    line = re.sub(r"\s+", " ", text).strip()
    if picture:
        line = unicodedata.normalize("NFC", line)
    known = covered_in_pictures() if picture else covered()
    if not all(ord(c) in known for c in line):
        line = "".join(c if ord(c) in known else f"⟨U+{ord(c):04X}⟩" for c in line)
    line = _UNIT.sub("\u00a0", line)
    if breakable:
        line = _LONG_WORD.sub(lambda word: _broken(word[0]), line)
    return line


@functools.cache
def covered_in_pictures() -> frozenset[int]:
    """`covered`, less combining marks."""
    marks = {point for point in covered() if unicodedata.category(chr(point)).startswith("M")}
    return covered() - marks


@functools.cache
def covered() -> frozenset[int]:
    """Code points for which the shipped fonts have a glyph, less all controls."""
    points: set[int] = set()
    for file in sorted(FONTS.glob("*.ttf")):
        points |= code_points(file)
    controls = {*range(0x20), *range(0x7F, 0xA0), *range(0x202A, 0x202F), *range(0x2066, 0x206A)}
    controls |= {
        0x2028,
        0x2029,
        0x200E,
        0x200F,
        0x061C,
        *range(0xFE00, 0xFE10),
        *range(0xE000, 0xF900),
    }
    return frozenset((points | {0x20}) - controls - INVISIBLE)


def code_points(font: Path) -> set[int]:
    """Code points in the character map of a TrueType font (formats 4 and 12)."""
    data = font.read_bytes()
    (tables,) = struct.unpack_from(">H", data, 4)
    for number in range(tables):
        tag, _, offset, _ = struct.unpack_from(">4sIII", data, 12 + 16 * number)
        if tag == b"cmap":
            return _character_map(data, offset)
    return set()


def _character_map(data: bytes, start: int) -> set[int]:
    (count,) = struct.unpack_from(">H", data, start + 2)
    points: set[int] = set()
    for number in range(count):
        platform, _, offset = struct.unpack_from(">HHI", data, start + 4 + 8 * number)
        at = start + offset
        (kind,) = struct.unpack_from(">H", data, at)
        if kind == 12:
            (groups,) = struct.unpack_from(">I", data, at + 12)
            for group in range(groups):
                first, last, _ = struct.unpack_from(">III", data, at + 16 + 12 * group)
                points |= set(range(first, last + 1))
        elif kind == 4 and platform in (0, 3):
            points |= _segments(data, at)
    return points


def _segments(data: bytes, at: int) -> set[int]:
    (twice,) = struct.unpack_from(">H", data, at + 6)
    size = twice // 2
    ends = struct.unpack_from(f">{size}H", data, at + 14)
    starts = struct.unpack_from(f">{size}H", data, at + 16 + twice)
    deltas = struct.unpack_from(f">{size}h", data, at + 16 + 2 * twice)
    ranges_at = at + 16 + 3 * twice
    ranges = struct.unpack_from(f">{size}H", data, ranges_at)
    points: set[int] = set()
    for n, (first, last) in enumerate(zip(starts, ends, strict=True)):
        for code in range(first, min(last, 0xFFFE) + 1):
            if ranges[n] == 0:
                glyph = (code + deltas[n]) & 0xFFFF
            else:
                place = ranges_at + 2 * n + ranges[n] + 2 * (code - first)
                (glyph,) = struct.unpack_from(">H", data, place)
            if glyph:
                points.add(code)
    return points


def _broken(word: str) -> str:
    return "\u200b".join(word[n : n + 8] for n in range(0, len(word), 8))
