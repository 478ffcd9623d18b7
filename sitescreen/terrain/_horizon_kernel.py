r"""Compiled loops of :mod:`sitescreen.terrain.horizon`: sweeps along skewed lines.

Lines run along the columns, one column a step, and shift sideways by a constant part of a row, at most one. Azimuths
near north and south are swept over the transposed ground, where they run along the columns too. ``side`` counts rows.

::

      steps →
    s  l . . . z . . .     line j lies at side = first + gap·j + whole[step] + part[step]
    i  z \ . . z . . .     ground on a line: mixed from the cells above and below it
    d  z . \ . l . . .     swept from the far end towards the viewer
    e  l . . \ z \ . .     answer of a cell: mixed from the lines above and below it

One strip of neighbouring lines is worked on at a time, small enough to stay in the processor's cache.
"""

import math
from typing import Any

import numpy as np
from numba import njit

_NAN = np.float32(math.nan)
_LOWEST = np.float32(-math.inf)
_ONE = np.float32(1.0)


@njit(nogil=True, cache=True, error_model="numpy")
def transpose(source: Any, target: Any, start: Any, stop: Any) -> None:
    """Copy rows start … stop of ``target`` from the columns of ``source``, in squares that fit the cache."""
    square = 32
    for row0 in range(start, stop, square):
        row1 = min(row0 + square, stop)
        for col0 in range(0, target.shape[1], square):
            col1 = min(col0 + square, target.shape[1])
            for row in range(row0, row1):
                for col in range(col0, col1):
                    target[row, col] = source[col, row]


@njit(nogil=True, cache=True, error_model="numpy")
def _steps_inside(whole: Any, rows: Any, first: Any, reach: Any) -> Any:
    """The first step, and the one behind the last, at which any line or cell of the strip is on the ground."""
    begin, end = whole.shape[0], 0
    for step in range(whole.shape[0]):
        side = first + whole[step]
        if side + reach >= 0 and side < rows:
            begin = min(begin, step)
            end = step + 1
    return begin, end


@njit(nogil=True, cache=True, error_model="numpy")
def _gather(elevation_m: Any, gap: Any, whole: Any, part: Any, first: Any, begin: Any, end: Any, ground: Any) -> None:
    """Fill ``ground[step, line]`` with the heights under the strip's lines; NaN beside the grid and unknown cells."""
    rows = elevation_m.shape[0]
    lines = ground.shape[1]
    for step in range(begin, end):
        side = first + whole[step]
        share = part[step]
        # a line that runs through cell centres needs no second cell
        apart = 1 if share > 0 else 0
        low = max(0, -(side // gap))
        high = max(low, min(lines, (rows - apart - side + gap - 1) // gap))
        target = ground[step]
        if low > 0 or high < lines:
            target[:] = _NAN
        for line in range(low, high):
            row = side + gap * line
            here = elevation_m[row, step]
            target[line] = here + share * (elevation_m[row + apart, step] - here)


@njit(nogil=True, cache=True, error_model="numpy")
def _raise(answer: Any, gap: Any, share: Any, side: Any, step: Any, out: Any) -> None:
    """Blend one step's answers of the lines back to the cells between them, where they are higher.

    Cells that are NaN so far are unknown and stay so; those still at −∞ have no known ground ahead and become NaN.
    """
    per_gap = _ONE / np.float32(gap)
    rows = out.shape[0]
    for line in range(answer.shape[0] - 1):
        above, below = answer[line], answer[line + 1]
        alone = below if below == below else above
        between = (below - above) * per_gap
        row = side + gap * line
        for k in range(max(1, -row), min(gap + 1, rows - row)):
            mixed = above + (np.float32(k) - share) * between
            mixed = mixed if mixed == mixed else alone
            best = out[row + k, step]
            best = mixed if mixed > best else best
            out[row + k, step] = best if best > _LOWEST else _NAN


@njit(nogil=True, cache=True, error_model="numpy")
def _hull_sweep(heights: Any, near: Any, bend: Any, hull_at: Any, hull_z: Any, tangent: Any) -> None:
    """Horizon of every point of one line over the ground more than ``near`` steps ahead, in heights per step.

    A stack holds the upper hull of what was passed. A point under the chord of its neighbours on the stack can hide
    nothing from any later viewer and is dropped for good, so the cost of a point does not grow with the distance
    searched. From a viewer in front of it the hull's slopes rise to the horizon and fall behind it, so the last
    viewer's horizon is a good place to start looking for the next one's. The drop of the Earth's surface with
    distance, bend·d², is laid under the line as a parabola: hulls and tangents keep their order under it.
    """
    top = -1
    touch = 0
    for k in range(heights.shape[0]):
        if k > near:
            z = heights[k - near - 1]
            if z == z:
                at = np.float64(k - near - 1)
                while top >= 1 and (hull_z[top] - z) * (at - hull_at[top - 1]) <= (hull_z[top - 1] - z) * (
                    at - hull_at[top]
                ):
                    top -= 1
                top += 1
                hull_at[top] = at
                hull_z[top] = z
        z = heights[k]
        if top < 0 or z != z:
            tangent[k] = _NAN
            continue
        at = np.float64(k)
        touch = min(touch, top)
        over, along = hull_z[touch] - z, at - hull_at[touch]
        moved = False
        while touch > 0:
            next_over, next_along = hull_z[touch - 1] - z, at - hull_at[touch - 1]
            if next_over * along <= over * next_along:
                break
            over, along = next_over, next_along
            touch -= 1
            moved = True
        if not moved:
            while touch < top:
                next_over, next_along = hull_z[touch + 1] - z, at - hull_at[touch + 1]
                if next_over * along < over * next_along:
                    break
                over, along = next_over, next_along
                touch += 1
        tangent[k] = over / along - 2.0 * bend * at


@njit(nogil=True, cache=True, error_model="numpy")
def raise_to_horizon(
    elevation_m: Any,
    ascending: Any,
    gap: Any,
    whole: Any,
    part: Any,
    spacing_m: Any,
    bend_per_m: Any,
    near: Any,
    first_line: Any,
    lines: Any,
    out: Any,
    start: Any,
    stop: Any,
) -> None:
    """Raise the tangents in ``out``, of the ground up to ``near`` steps ahead, to those of the ground further on.

    Works on the strips start … stop of ``gap·lines`` rows of cells each. Unknown ground is passed over: it hides
    nothing. NaN where the cell is unknown or no ground is known in that direction.
    """
    steps = whole.shape[0]
    rows = elevation_m.shape[0]
    bend = bend_per_m * spacing_m * spacing_m
    per_m = np.float32(1.0 / spacing_m)
    ground = np.empty((steps, lines + 1), dtype=np.float32)
    heights = np.empty(steps, dtype=np.float64)
    tangent = np.empty(steps, dtype=np.float32)
    hull_at = np.empty(steps, dtype=np.float64)
    hull_z = np.empty(steps, dtype=np.float64)
    for strip in range(start, stop):
        first = first_line + gap * strip * lines
        begin, end = _steps_inside(whole, rows, first, gap * lines)
        count = end - begin
        _gather(elevation_m, gap, whole, part, first, begin, end, ground)
        origin, way = (begin, 1) if ascending else (end - 1, -1)
        for line in range(lines + 1):
            for k in range(count):
                heights[k] = np.float64(ground[origin + way * k, line]) - bend * k * k
            _hull_sweep(heights[:count], near, bend, hull_at, hull_z, tangent)
            for k in range(count):
                ground[origin + way * k, line] = tangent[k] * per_m
        for step in range(begin, end):
            _raise(ground[step], gap, part[step], first + whole[step], step, out)
