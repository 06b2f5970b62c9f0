"""Paths of drawings made short: what no eye can tell apart is left out.

A line of two hundred points that bends little is drawn by a dozen, and a hatch of dots by points with round caps.
"""

from __future__ import annotations

import re

_NUMBER = re.compile(r"-?\d*\.?\d+(?:e-?\d+)?")
_DECIMAL = re.compile(r"-?\d*\.\d+(?:e-?\d+)?")  # a colour such as #009e73 holds none
_SPACE = re.compile(r"\s*([A-Za-z])\s*|\s+")
_POLYLINE = re.compile(r"\s*(?:[ML]\s*-?[\d.]+\s+-?[\d.]+\s*)+[zZ]?\s*")
_POINT = re.compile(r"([ML])\s*(-?[\d.]+)\s+(-?[\d.]+)")
_TOLERANCE = 0.04  # of a point at print size: below the thickness of any line
_FEWEST = 12
_SAME = 0.05

Point = tuple[float, float]


def rounded(value: str) -> str:
    """Numbers to two decimals, which is finer than any screen or printer here."""
    return _DECIMAL.sub(lambda found: _short(float(found[0])), value)


def _short(value: float) -> str:
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def short_path(path: str) -> str:
    """The data of a path with as few figures as show the same."""
    if _POLYLINE.fullmatch(path) and len(path) > 200:
        return _short_polyline(path)
    return _SPACE.sub(lambda found: found[1] or " ", rounded(path)).strip()


def _short_polyline(path: str) -> str:
    lines: list[list[Point]] = []
    for letter, x, y in _POINT.findall(path):
        if letter == "M":
            lines.append([])
        lines[-1].append((float(x), float(y)))
    closed = "z" if path.rstrip().endswith(("z", "Z")) else ""
    return "".join(_written(simplified(line) if len(line) > _FEWEST else line) for line in lines) + closed


def _written(line: list[Point]) -> str:
    # the first pair of figures moves, those that follow draw lines
    return "M" + " ".join(f"{_short(x)} {_short(y)}" for x, y in line)


def simplified(line: list[Point], tolerance: float = _TOLERANCE) -> list[Point]:
    """The points of a line without those that lie within the tolerance of it (Ramer, Douglas and Peucker).

    >>> simplified([(0, 0), (1, 0.01), (2, 0), (2, 5)])
    [(0, 0), (2, 0), (2, 5)]
    """
    kept = {0, len(line) - 1}
    stack = [(0, len(line) - 1)]
    while stack:
        first, last = stack.pop()
        (x0, y0), (x1, y1) = line[first], line[last]
        dx, dy = x1 - x0, y1 - y0
        square = dx * dx + dy * dy
        far, place = tolerance, None
        for one in range(first + 1, last):
            x, y = line[one][0] - x0, line[one][1] - y0
            # from the nearest point of the chord
            at = min(max((x * dx + y * dy) / square, 0.0), 1.0) if square else 0.0
            off = ((x - at * dx) ** 2 + (y - at * dy) ** 2) ** 0.5
            if off > far:
                far, place = off, one
        if place is not None:
            kept.add(place)
            stack += [(first, place), (place, last)]
    return [line[one] for one in sorted(kept)]


def dots(path: str) -> tuple[str, float] | None:
    """A path of many equal discs as points, with the width their round caps must have; None for any other path."""
    discs = [part for part in path.split("M") if part.strip()]
    if len(discs) < _FEWEST or any("C" not in part for part in discs):
        return None
    centres, sizes = [], []
    for part in discs:
        figures = [float(one) for one in _NUMBER.findall(part)]
        xs, ys = figures[::2], figures[1::2]
        sizes += [max(xs) - min(xs), max(ys) - min(ys)]
        centres.append(((max(xs) + min(xs)) / 2.0, (max(ys) + min(ys)) / 2.0))
    if max(sizes) - min(sizes) > _SAME:
        return None
    return "".join(f"M{_short(x)} {_short(y)}h0" for x, y in centres), sizes[0]
