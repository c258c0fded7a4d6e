"""Short texts that options and sheets share: grids, intervals, assignments and bounds."""

from __future__ import annotations

import math
import re
from decimal import Decimal
from typing import Final

from ..errors import InputError
from .wording import quoted

__all__ = [
    "HIGHEST_TEMPERATURE",
    "MAX_GRID_POINTS",
    "interval_text",
    "line_interval_text",
    "ordered_interval",
    "parse_assignment",
    "parse_bounds",
    "parse_grid",
    "parse_interval",
    "parse_line_interval",
]

MAX_GRID_POINTS: Final = 100_000
HIGHEST_TEMPERATURE: Final = 1e6
_NUMBER: Final = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,4})?", re.ASCII)


def parse_grid(text: str) -> tuple[float, ...]:
    """Read a temperature grid.

    Parameters
    ----------
    text : str
        Temperatures in K and ranges ``low:high:step`` (both ends included where the step meets them), separated by
        commas: ``"0.5:5:0.5, 10:300:10, 298.15"``.

    Returns
    -------
    tuple of float
        Ascending, without repeats. Ranges are stepped in decimal, so 0.1 stays 0.1.

    Raises
    ------
    InputError
        If a part cannot be read, a temperature is not above 0 K, or there are too many points.
    """
    points: set[float] = set()
    for part in text.split(","):
        if not part.strip():
            raise InputError(f"grid {quoted(text)} has an empty part: write it as in '0.5:5:0.5, 10:300:10, 298.15'")
        points.update(_range(part.strip(), text))
        if len(points) > MAX_GRID_POINTS:
            raise InputError(f"grid {quoted(text)} has more than {MAX_GRID_POINTS} points")
    return tuple(sorted(points))


def _range(part: str, text: str) -> list[float]:
    pieces = [_number(piece) for piece in part.split(":")]
    if None in pieces or len(pieces) not in (1, 3):
        raise InputError(
            f"grid {quoted(text)}: {quoted(part)} is neither a temperature nor low:high:step; write it as in "
            "'0.5:5:0.5, 10:300:10, 298.15'"
        )
    low, high, step = pieces if len(pieces) == 3 else (pieces[0], pieces[0], 1.0)
    if not all(0 < value <= HIGHEST_TEMPERATURE for value in (low, high, step) if value is not None):
        raise InputError(f"grid {quoted(text)}: temperatures and step in {quoted(part)} must be above 0 K and finite")
    if len(pieces) == 1:
        return [float(part)]
    start, stop, stride = (Decimal(piece.strip()) for piece in part.split(":"))
    if stop < start:
        raise InputError(f"grid {quoted(text)}: {quoted(part)} ends below its start; write low:high:step")
    count = int((stop - start) / stride) + 1
    if count > MAX_GRID_POINTS:
        raise InputError(f"grid {quoted(text)}: {quoted(part)} has more than {MAX_GRID_POINTS} points")
    return [float(start + index * stride) for index in range(count)]


def _number(text: str) -> float | None:
    return float(text) if _NUMBER.fullmatch(text := text.strip()) else None


def parse_interval(text: str) -> tuple[float, float]:
    """Read a closed temperature interval in K: ``"2:300"``, or open on one side, ``"2:"`` and ``":300"``.

    Returns
    -------
    tuple of float
        Low and high; an open side is 0 or infinite.

    Raises
    ------
    InputError
        If it cannot be read, or its ends are not 0 <= low <= high.
    """
    low, high = _sides(text, 0.0, f"interval {quoted(text)} must be low:high in K, as in '2:300', '2:' or ':300'")
    return ordered_interval(low, high, text)


def ordered_interval(low: float, high: float, text: str) -> tuple[float, float]:
    """Return the ends of an interval in K, written as `text`.

    Raises
    ------
    InputError
        If they are not 0 <= low <= high.
    """
    if math.isnan(low) or math.isnan(high) or math.isinf(low):
        raise InputError(f"interval {quoted(text)} must be low:high in K, as in '2:300', '2:' or ':300'")
    if low < 0:
        raise InputError(f"interval {quoted(text)} starts below 0 K")
    if low > high:
        raise InputError(f"interval {quoted(text)} ends below its start; write it low:high")
    return low, high


def _sides(text: str, lowest: float, message: str) -> tuple[float, float]:
    parts = [part.strip() for part in text.split(":")]
    if len(parts) != 2 or not any(parts):
        raise InputError(message)
    values = [_number(part) if part else blank for part, blank in zip(parts, (lowest, math.inf), strict=True)]
    low, high = values
    if low is None or high is None or any(part and not math.isfinite(float(part)) for part in parts):
        raise InputError(message)
    return low, high


def interval_text(interval: tuple[float, float]) -> str:
    """Return an interval as `parse_interval` reads it; the inverse to the last bit."""
    low, high = interval
    return f"{_shortest(low) if low > 0 or not math.isfinite(high) else ''}:{_shortest(high)}"


def parse_line_interval(text: str) -> tuple[int, int]:
    """Read a closed interval of 1-based lines of a file: ``"40:45"``, or one line, ``"12"``.

    Raises
    ------
    InputError
        If it cannot be read, or its ends are not 1 <= first <= last.
    """
    match = re.fullmatch(r"\s*(\d{1,9})\s*(?::\s*(\d{1,9})\s*)?", text, re.ASCII)
    if match is None:
        raise InputError(f"lines {quoted(text)} must be a line number or FIRST:LAST, as in '12' or '40:45'")
    first, last = int(match[1]), int(match[2] or match[1])
    if not 1 <= first <= last:
        raise InputError(f"lines {quoted(text)} must be FIRST:LAST, counted from 1")
    return first, last


def line_interval_text(lines: tuple[int, int]) -> str:
    """Return an interval of lines as `parse_line_interval` reads it."""
    first, last = lines
    return str(first) if first == last else f"{first}:{last}"


def _shortest(value: float) -> str:
    return repr(value).removesuffix(".0") if math.isfinite(value) else ""


def parse_assignment(text: str) -> tuple[str, float]:
    """Read ``NAME=VALUE``, as in ``"debye_theta=300"``.

    Raises
    ------
    InputError
        If it cannot be read.
    """
    name, equals, value = (part.strip() for part in text.partition("="))
    number = _number(value)
    if not (name and equals) or number is None or not math.isfinite(number):
        raise InputError(
            f"{quoted(text)} must be NAME=VALUE, as in 'debye_theta=300', the value a plain number in SI units"
        )
    return name, number


def parse_bounds(text: str) -> tuple[str, tuple[float, float]]:
    """Read ``NAME=LOW:HIGH``, as in ``"debye_theta=100:500"``; a side left out is infinite.

    Raises
    ------
    InputError
        If it cannot be read, or low is not below high.
    """
    name, equals, sides = (part.strip() for part in text.partition("="))
    message = f"{quoted(text)} must be NAME=LOW:HIGH, as in 'debye_theta=100:500'"
    if not (name and equals):
        raise InputError(message)
    low, high = _sides(sides, -math.inf, message)
    if low >= high:
        raise InputError(f"{quoted(text)}: the lower bound must be below the upper one")
    return name, (low, high)
