"""Where panels of one product look right on one surface: rows at a common height, evenly spaced.

Arrangements that a fitter would draw are tried one by one (how many rows, at which height, spread
evenly, side by side, at both ends, or over given points) and judged by what they cover, by where
the modes press, and by how tidy they are. When none holds all panels, the densest packing does.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import islice

from planner.treat.free_field import TOUCH, Box, Field
from planner.treat.packing import Size, densest, fitting

MOST_STACKS = 4
"""Places of one stack on the middle line that are tried."""

MOST_ROWS = 5
"""Rows of one product that are tried as a block."""


@dataclass(frozen=True)
class Wish:
    """What an arrangement should do besides fitting, in the coordinates of its field."""

    cover: tuple[tuple[Box, float], ...] = ()
    """Rectangles to be covered and their weights, such as first reflections."""
    pressure: Callable[[Box], float] | None = None
    """How much a panel does against the modes at a place."""
    middle: float | None = None
    """Height at which rows are centred where nothing else decides. [m]"""
    beside: tuple[Box, ...] = ()
    """Panels that hang there already."""

    def mirrored(self, width: float) -> Wish:
        """For the mirrored surface."""
        pressure = self.pressure
        return Wish(
            tuple((box.mirrored(width), weight) for box, weight in self.cover),
            None if pressure is None else lambda box: pressure(box.mirrored(width)),
            self.middle,
            tuple(box.mirrored(width) for box in self.beside),
        )

    def turned(self) -> Wish:
        """For the surface with exchanged axes."""
        pressure = self.pressure
        return Wish(
            tuple((box.turned(), weight) for box, weight in self.cover),
            None if pressure is None else lambda box: pressure(box.turned()),
            None,
            tuple(box.turned() for box in self.beside),
        )

    def and_also(self, other: Wish) -> Wish:
        """Both wishes together."""
        one, two = self.pressure, other.pressure
        both = one or two
        if one and two:
            both = lambda box: one(box) + two(box)  # noqa: E731
        return Wish(self.cover + other.cover, both, self.middle, self.beside + other.beside)


def lay(field: Field, sizes: Sequence[Size], count: int, wish: Wish) -> list[Box]:
    """Panels of one product on one surface.

    Parameters
    ----------
    field
        Where they may lie; what hangs there already is taken out of it.
    sizes
        Sizes a panel may have, the preferred first, with half a gap on every side. [m]
    count
        How many are wanted.
    wish
        What they should do there.

    Returns
    -------
    boxes
        With half a gap on every side; fewer than `count` when they do not fit.
    """
    found = max(
        (arrangement for arrangement in _arrangements(field, sizes, count, wish)),
        key=lambda arrangement: arrangement[0],
        default=None,
    )
    if found is not None:
        return found[1]
    return _thinned(densest(field, sizes), count, wish)


def lay_mirrored(field: Field, sizes: Sequence[Size], count: int, wish: Wish) -> list[Box]:
    """As `lay`, but mirrored about the upright middle line of the surface.

    An odd panel goes astride the middle line; so may more, one above the other.
    """
    width = field.width
    both = field.both(field.mirrored())
    wanted = wish.and_also(wish.mirrored(width))
    right_half = Box(0.5 * width, -1.0, width, field.height + 2.0)
    best: tuple[tuple[float, ...], list[Box]] | None = None
    for astride in _astride(both, sizes, count, wanted):
        half = both.without([right_half, *astride])
        own = replace(wanted, beside=(*wanted.beside, *astride))
        side = lay(half, sizes, (count - len(astride)) // 2, own)
        boxes = [*astride, *side, *(box.mirrored(width) for box in side)]
        score = (float(len(boxes)), *judged(boxes, wanted), -_lines(boxes, wanted.beside))
        if best is None or score > best[0]:
            best = (score, boxes)
    return best[1] if best else []


def _astride(field: Field, sizes: Sequence[Size], count: int, wish: Wish) -> Iterator[list[Box]]:
    """Stacks of panels on the middle line that leave an even number for the sides."""
    if count % 2 == 0:
        yield []
    middle = _middle_of(field, wish)
    for width, height in sizes:
        for number in range(2 - count % 2, min(count, MOST_ROWS) + 1, 2):
            stacks = (
                [
                    Box(0.5 * (field.width - width), bottom + n * height, width, height)
                    for n in range(number)
                ]
                for bottom in _bottoms(field, number * height, wish, middle)
            )
            holding = (stack for stack in stacks if all(field.holds(box) for box in stack))
            yield from islice(holding, MOST_STACKS)


def _lines(boxes: Sequence[Box], beside: Sequence[Box]) -> float:
    """How many different heights and sizes of rows the eye sees, those of neighbours not counted."""
    known = {(round(box.bottom, 4), round(box.height, 4)) for box in beside}
    return float(len({(round(box.bottom, 4), round(box.height, 4)) for box in boxes} - known))


def judged(boxes: Sequence[Box], wish: Wish) -> tuple[float, float]:
    """What an arrangement covers and how much it does against the modes, coarsely rounded."""
    covered = 0.0
    for target, weight in wish.cover:
        shared = sum(box.shared(target) for box in (*boxes, *wish.beside))
        covered += weight * min(shared / (target.width * target.height), 1.0)
    pressed = sum(wish.pressure(box) for box in boxes) if wish.pressure and boxes else 0.0
    return round(covered, 2), round(pressed / max(len(boxes), 1), 3)


def _arrangements(
    field: Field, sizes: Sequence[Size], count: int, wish: Wish
) -> Iterator[tuple[tuple[float, ...], list[Box]]]:
    """Tidy arrangements that hold all panels, each with its score."""
    middle = _middle_of(field, wish)
    for preference, size in enumerate(sizes):
        for rows in range(1, min(count, MOST_ROWS) + 1):
            columns = -(-count // rows)
            if rows > 1 and -(-count // (rows - 1)) == columns:
                continue
            height = rows * size[1]
            for bottom in _bottoms(field, height, wish, middle):
                stretches = field.free(bottom, height)
                if sum(fitting(right - left, size[0]) for left, right in stretches) < columns:
                    continue
                off_line = abs(bottom + 0.5 * height - middle)
                for tidy, places in _ways(stretches, size[0], columns, wish, bottom, height):
                    boxes = _stacked(places, size, bottom, rows, count)
                    score = (
                        *judged(boxes, wish),
                        -float(preference),
                        -float(rows),
                        _in_line(bottom, height, wish.beside),
                        -round(off_line, 3),
                        tidy,
                    )
                    yield score, boxes


def _middle_of(field: Field, wish: Wish) -> float:
    return 0.5 * (field.low + field.high) if wish.middle is None else wish.middle


def _in_line(bottom: float, height: float, beside: Sequence[Box]) -> float:
    """Does a row share its lower edge, its upper edge or its middle with what hangs there."""
    lines = (bottom, bottom + height, bottom + 0.5 * height)
    return float(
        any(
            abs(line - other) < 1e-4
            for box in beside
            for line, other in zip(
                lines, (box.bottom, box.top, box.bottom + 0.5 * box.height), strict=True
            )
        )
    )


def _bottoms(field: Field, height: float, wish: Wish, middle: float) -> list[float]:
    """Heights of the lower edge that are worth trying, the likeliest first."""
    lowest, highest = field.low, field.high - height
    if highest < lowest - TOUCH:
        return []
    tried = [middle - 0.5 * height]
    for target, _ in wish.cover:
        tried += [target.bottom + 0.5 * target.height - 0.5 * height, target.bottom]
        tried.append(target.top - height)
    for box in wish.beside:
        tried += [box.bottom, box.bottom + 0.5 * (box.height - height), box.top - height]
        tried += [box.top, box.bottom - height]
    tried += field.starts
    tried += [end - height for end in field.ends]
    inside = [min(max(bottom, lowest), max(highest, lowest)) for bottom in tried]
    return list(dict.fromkeys(round(bottom, 6) for bottom in inside))


def _stacked(
    places: Sequence[float], size: Size, bottom: float, rows: int, count: int
) -> list[Box]:
    """Columns of panels; what is too many is left out of the top row, evenly."""
    columns = len(places)
    last = count - (rows - 1) * columns
    if last == columns:
        kept = list(range(columns))
    else:
        # Evenly over the row, and symmetric where the columns are.
        kept = sorted({int((n + 0.5) * columns / last) for n in range(last)})
    boxes = []
    for row in range(rows):
        chosen = kept if row == rows - 1 else range(columns)
        boxes += [Box(places[n], bottom + row * size[1], *size) for n in chosen]
    return boxes


Stretches = Sequence[tuple[float, float]]


def _ways(
    stretches: Stretches, width: float, columns: int, wish: Wish, bottom: float, height: float
) -> Iterator[tuple[float, list[float]]]:
    """Left edges of the columns in several ways, with how tidy each is."""
    spread = _spread(stretches, width, columns)
    yield 1.0, spread
    if wish.cover:
        targets = [
            target
            for target, _ in sorted(wish.cover, key=lambda entry: -entry[1])
            if min(bottom + height, target.top) - max(bottom, target.bottom) > TOUCH
        ]
        for enough in range(len(targets), 0, -1):
            over = _over(stretches, width, columns, targets[:enough])
            if over is not None:
                yield 0.8, over
                yield 0.9, _evened(over, stretches, width, targets[:enough])
                break
    left, right = stretches[0][0], stretches[-1][1]
    yield 0.6, _beside(stretches, width, columns, 0.5 * (left + right))
    if wish.pressure is not None:
        yield 0.5, _at_ends(stretches, width, columns)
        yield 0.4, _beside(stretches, width, columns, left)
        yield 0.3, _beside(stretches, width, columns, right)


def _spread(stretches: Stretches, width: float, columns: int) -> list[float]:
    """The same space between all panels of a stretch, and before the first and after the last."""
    counts = [0] * len(stretches)
    for _ in range(columns):
        # Where the space would stay largest; of equal ones the one that is nearest the middle.
        rooms = [
            (right - left - (n + 1) * width) / (n + 2)
            for (left, right), n in zip(stretches, counts, strict=True)
        ]
        able = [
            k
            for k, (left, right) in enumerate(stretches)
            if fitting(right - left, width) > counts[k]
        ]
        counts[max(able, key=lambda k: (round(rooms[k], 6), -k))] += 1
    places = []
    for (left, right), n in zip(stretches, counts, strict=True):
        space = max(right - left - n * width, 0.0) / (n + 1)
        places += [left + space * (k + 1) + width * k for k in range(n)]
    return places


def _beside(stretches: Stretches, width: float, columns: int, centre: float) -> list[float]:
    """Side by side around a point, going on in the nearest stretches."""

    def distance(stretch: tuple[float, float]) -> float:
        return max(stretch[0] - centre, centre - stretch[1], 0.0)

    places: list[float] = []
    for left, right in sorted(stretches, key=distance):
        n = min(fitting(right - left, width), columns - len(places))
        if n <= 0:
            continue
        start = min(max(centre - 0.5 * n * width, left), max(right - n * width, left))
        places += [start + k * width for k in range(n)]
    return sorted(places)


def _at_ends(stretches: Stretches, width: float, columns: int) -> list[float]:
    """Half of the panels from the left end, half from the right: into the corners."""
    left = [
        start + k * width for start, end in stretches for k in range(fitting(end - start, width))
    ]
    right = [
        end - (k + 1) * width
        for start, end in reversed(stretches)
        for k in range(fitting(end - start, width))
    ]
    first = left[: (columns + 1) // 2]
    others = [place for place in right if all(abs(place - p) > width - TOUCH for p in first)]
    taken = first + others[: columns // 2]
    return sorted(taken) if len(taken) == columns else left[:columns]


def _over(
    stretches: Stretches, width: float, columns: int, targets: Sequence[Box]
) -> list[float] | None:
    """Panels side by side over each target, the rest spread over what is left of the row."""
    free, places = list(stretches), list[float]()
    for target in targets:
        centre = target.left + 0.5 * target.width
        if any(p - TOUCH <= target.left and target.right <= p + width + TOUCH for p in places):
            continue
        holding = [k for k, (left, right) in enumerate(free) if fitting(right - left, width)]
        if not holding or len(places) >= columns:
            return None
        k = min(holding, key=lambda k: max(free[k][0] - centre, centre - free[k][1], 0.0))
        left, right = free.pop(k)
        wanted = max(-(-(target.width - TOUCH) // width), 1.0)
        n = min(int(wanted), fitting(right - left, width), columns - len(places))
        start = min(max(centre - 0.5 * n * width, left), right - n * width)
        places += [start + m * width for m in range(n)]
        free += [(left, start), (start + n * width, right)]
    free = sorted((left, right) for left, right in free if right - left > TOUCH)
    rest = columns - len(places)
    if sum(fitting(right - left, width) for left, right in free) < rest:
        return None
    return sorted(places + (_spread(free, width, rest) if rest else []))


def _evened(
    places: Sequence[float], stretches: Stretches, width: float, targets: Sequence[Box]
) -> list[float]:
    """The same number of panels at one distance, set so that the first target is covered."""
    centre = targets[0].left + 0.5 * targets[0].width
    nearest = min(range(len(places)), key=lambda k: abs(places[k] + 0.5 * width - centre))
    for left, right in stretches:
        inside = left - TOUCH <= min(places) and max(places) + width <= right + TOUCH
        if not inside or len(places) < 2:
            continue
        before, after = nearest, len(places) - 1 - nearest
        start = min(max(centre - 0.5 * width, left), right - width)
        steps = [(start - left) / before] if before else []
        steps += [(right - width - start) / after] if after else []
        step = min(steps)
        if step >= width - TOUCH:
            return [start + (k - nearest) * step for k in range(len(places))]
    return list(places)


def _thinned(boxes: list[Box], count: int, wish: Wish) -> list[Box]:
    """The `count` panels of a dense packing that do most, whole rows first."""
    if len(boxes) <= count:
        return boxes

    def worth(box: Box) -> tuple[float, float, float]:
        covered, pressed = judged([box], Wish(wish.cover, wish.pressure))
        return -covered, -pressed, box.bottom

    ranked = sorted(range(len(boxes)), key=lambda n: (*worth(boxes[n]), n))
    return [boxes[n] for n in sorted(ranked[:count])]
