r"""Compiled loops of :mod:`sitescreen.terrain.horizon`: sweeps along skewed lines.

For an azimuth within 45° of north or south the lines run down the rows, one row a step, and shift sideways by a
constant fraction of a column; otherwise they run along the columns. Below, ``step`` counts rows (or columns) along the
lines and ``side`` columns (or rows) across them.

::

      side →            line j sits at side = first + j + whole[step] + part[step]
    s  z . z . z        ground on a line: mixed from the cells to its left and right, weights 1 − part and part
    t   \   \            swept from the far end towards the viewer
    e  z \ z \ z        answer of a cell: mixed from the lines to its left and right, weights part and 1 − part
    p     l   l

One strip of neighbouring lines is worked on at a time, small enough to stay in the processor's cache.
"""

import math
from typing import Any

import numpy as np
from numba import njit

_NAN = np.float32(math.nan)
_LOWEST = np.float32(-math.inf)


@njit(nogil=True, cache=True, error_model="numpy")
def _steps_inside(whole: Any, sides: Any, first: Any, lines: Any) -> Any:
    """The first step, and the one behind the last, at which any line of the strip has ground under it."""
    begin, end = whole.shape[0], 0
    for step in range(whole.shape[0]):
        left = first + whole[step]
        if left + lines + 1 >= 0 and left < sides:
            begin = min(begin, step)
            end = step + 1
    return begin, end


@njit(nogil=True, cache=True, error_model="numpy")
def _mixed(here: Any, next_: Any, part: Any) -> Any:
    """Value between two neighbours, the other's where one is unknown."""
    mixed = here + part * (next_ - here)
    alone = here if here == here else next_
    mixed = mixed if mixed == mixed else alone
    return here if part == 0 else mixed


@njit(nogil=True, cache=True, error_model="numpy")
def _gather(
    elevation_m: Any, by_row: Any, whole: Any, part: Any, first: Any, begin: Any, end: Any, ground: Any
) -> None:
    """Fill ``ground[step, line]`` with the heights under the strip's lines; NaN beside the grid and unknown cells."""
    lines = ground.shape[1]
    sides = elevation_m.shape[1] if by_row else elevation_m.shape[0]
    for step in range(begin, end):
        left = first + whole[step]
        share = part[step]
        # a line that runs through cell centres needs no second cell
        apart = 1 if share > 0 else 0
        low = max(0, -left)
        high = min(lines, sides - apart - left)
        target = ground[step]
        if low > 0 or high < lines:
            target[:] = _NAN
        if by_row:
            source = elevation_m[step]
            for line in range(low, high):
                here = source[left + line]
                target[line] = here + share * (source[left + line + apart] - here)
        else:
            for line in range(low, high):
                here = elevation_m[left + line, step]
                target[line] = here + share * (elevation_m[left + line + apart, step] - here)


@njit(nogil=True, cache=True, error_model="numpy")
def _raise(answer: Any, elevation_m: Any, by_row: Any, share: Any, left: Any, step: Any, out: Any) -> None:
    """Blend one step's answers of the lines back to the cells between them, where they are higher."""
    cells = answer.shape[0] - 1
    sides = out.shape[1] if by_row else out.shape[0]
    low = max(0, -(left + 1))
    high = min(cells, sides - left - 1)
    for k in range(low, high):
        mixed = _mixed(answer[k + 1], answer[k], share)
        row, col = (step, left + 1 + k) if by_row else (left + 1 + k, step)
        best = out[row, col]
        best = mixed if mixed > best else best
        out[row, col] = best if best > _LOWEST and elevation_m[row, col] == elevation_m[row, col] else _NAN


@njit(nogil=True, cache=True, error_model="numpy")
def _hull_sweep(
    ground: Any,
    line: Any,
    begin: Any,
    end: Any,
    ascending: Any,
    spacing_m: Any,
    bend_per_m: Any,
    near: Any,
    hull_at: Any,
    hull_z: Any,
    tangent: Any,
) -> None:
    """Horizon of every point of one line over the ground more than ``near`` steps ahead.

    A stack holds the upper hull of what was passed. A point under the chord of its neighbours on the stack can hide
    nothing from any later viewer and is dropped for good, so the cost of a point does not grow with the distance
    searched. The drop of the Earth's surface with distance, bend·d², is laid under the line as a parabola: hulls and
    tangents keep their order under it.
    """
    bend = bend_per_m * spacing_m * spacing_m
    per_m = 1.0 / spacing_m
    top = -1
    for k in range(end - begin):
        added = k - near - 1
        if added >= 0:
            z_added = ground[begin + added if ascending else end - 1 - added, line]
            if z_added == z_added:
                z = np.float64(z_added) - bend * added * added
                while top >= 1 and (hull_z[top] - z) * (added - hull_at[top - 1]) <= (hull_z[top - 1] - z) * (
                    added - hull_at[top]
                ):
                    top -= 1
                top += 1
                hull_at[top] = added
                hull_z[top] = z
        step = begin + k if ascending else end - 1 - k
        z_seen = ground[step, line]
        if top < 0 or z_seen != z_seen:
            tangent[step, line] = _NAN
            continue
        z = np.float64(z_seen) - bend * k * k
        touch = top
        over, along = hull_z[touch] - z, k - hull_at[touch]
        while touch > 0:
            next_over, next_along = hull_z[touch - 1] - z, k - hull_at[touch - 1]
            if next_over * along < over * next_along:
                break
            over, along = next_over, next_along
            touch -= 1
        tangent[step, line] = (over / along - 2.0 * bend * k) * per_m


@njit(nogil=True, cache=True, error_model="numpy")
def raise_to_horizon(
    elevation_m: Any,
    by_row: Any,
    ascending: Any,
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

    Works on the strips start … stop of ``lines`` cells each. Unknown ground is passed over: it hides nothing. NaN where
    the cell is unknown or no ground is known in that direction.
    """
    steps = whole.shape[0]
    sides = elevation_m.shape[1] if by_row else elevation_m.shape[0]
    ground = np.empty((steps, lines + 1), dtype=np.float32)
    tangent = np.empty((steps, lines + 1), dtype=np.float32)
    hull_at = np.empty(steps, dtype=np.int64)
    hull_z = np.empty(steps, dtype=np.float64)
    for strip in range(start, stop):
        first = first_line + strip * lines
        begin, end = _steps_inside(whole, sides, first, lines)
        _gather(elevation_m, by_row, whole, part, first, begin, end, ground)
        for line in range(lines + 1):
            _hull_sweep(ground, line, begin, end, ascending, spacing_m, bend_per_m, near, hull_at, hull_z, tangent)
        for step in range(begin, end):
            _raise(tangent[step], elevation_m, by_row, part[step], first + whole[step], step, out)
