"""The five classes of the map: dark is better, and what each class means in the reading's own unit."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from sitescreen.deliverables.columns import Column

RAMP = ("#f2ecde", "#edc364", "#b07a64", "#6c6386", "#282852")
"""From worst to best. The smallest colour difference between any two stays above 18 for colour-blind readers."""

CLASS_EDGES = (20.0, 40.0, 60.0, 80.0)

Curve = Sequence[tuple[float, float]]


@dataclass(frozen=True)
class ClassRange:
    """What one class holds.

    Parameters
    ----------
    number : int
        0 worst, 4 best.
    words : str
        The readings, such as "3–6°"; "" where no reading falls into the class.
    """

    number: int
    words: str


def class_of(marks: NDArray[np.float32]) -> NDArray[np.float32]:
    """Class 0–4 of each mark; NaN stays NaN."""
    number = np.digitize(marks, CLASS_EDGES).astype(np.float32)
    return np.where(np.isnan(marks), np.float32(np.nan), number)


def marks_by(curve: Curve, values: NDArray[np.float32]) -> NDArray[np.float32]:
    """Marks of readings by a curve, level beyond its ends; NaN stays NaN."""
    x, y = zip(*curve, strict=True)
    marks = np.interp(np.nan_to_num(values), x, y).astype(np.float32)
    return np.where(np.isnan(values), np.float32(np.nan), marks)


def class_ranges(curve: Curve, column: Column) -> tuple[ClassRange, ...]:
    """The readings that each class stands for, best first.

    Parameters
    ----------
    curve : points (reading, mark)
    column : Column
        Of the reading, for its unit.
    """
    pieces = _pieces(curve)
    out = []
    for number in reversed(range(len(RAMP))):
        held: list[tuple[float, float]] = []
        for low, high, which in pieces:
            if which != number:
                continue
            if held and held[-1][1] == low:
                held[-1] = (held[-1][0], high)
            else:
                held.append((low, high))
        out.append(ClassRange(number, " or ".join(_in_words(low, high, column) for low, high in held)))
    return tuple(out)


def _pieces(curve: Curve) -> list[tuple[float, float, int]]:
    """Stretches of readings, each within one class, from −∞ to ∞."""
    cuts = {x for x, _ in curve}
    for (x0, y0), (x1, y1) in pairwise(curve):
        for edge in CLASS_EDGES:
            if min(y0, y1) < edge < max(y0, y1):
                cuts.add(x0 + (edge - y0) / (y1 - y0) * (x1 - x0))
    at = sorted(cuts)
    starts, ends = [-np.inf, *at], [*at, np.inf]
    middles = [at[0] - 1, *[(a + b) / 2 for a, b in pairwise(at)], at[-1] + 1]
    numbers = class_of(marks_by(curve, np.array(middles, dtype=np.float32)))
    return [(lo, hi, int(n)) for lo, hi, n in zip(starts, ends, numbers, strict=True)]


def _in_words(low: float, high: float, column: Column) -> str:
    factor, sign = (100.0, " %") if column.unit == "0–1" else (1.0, "")
    if not sign:
        sign = {"°": "°", "× open ground": " ×"}.get(column.unit, f" {column.unit}" if column.unit else "")
    decimals = column.decimals if factor == 1.0 else max(0, column.decimals - 2)
    numbers = [_short(factor * value, decimals) for value in (low, high)]
    if np.isinf(low):
        return "any" if np.isinf(high) else f"under {numbers[1]}{sign}"
    return f"over {numbers[0]}{sign}" if np.isinf(high) else f"{numbers[0]}–{numbers[1]}{sign}"


def _short(value: float, decimals: int) -> str:
    text = f"{value:.{decimals}f}"
    return text.rstrip("0").rstrip(".") if "." in text else text
