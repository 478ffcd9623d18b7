r"""Compiled loops of :mod:`sitescreen.terrain.horizon`: sweeps along skewed lines.

For an azimuth within 45° of north or south the lines run down the rows, one row a step, and shift sideways by a
constant fraction of a column; otherwise they run along the columns. Below, ``step`` counts rows (or columns) along the lines and
``side`` columns (or rows) across them.

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
def _mixed(here: Any, next_: Any, part: Any, hard: Any) -> Any:
    """Ground between two cells. Where one is unknown: unknown if ``hard``, else the other's."""
    mixed = here + part * (next_ - here)
    if hard:
        return here if part == 0 else mixed
    alone = here if here == here else next_
    mixed = mixed if mixed == mixed else alone
    return here if part == 0 else mixed


@njit(nogil=True, cache=True, error_model="numpy")
def _gather(
    elevation_m: Any, by_row: Any, whole: Any, part: Any, first: Any, begin: Any, end: Any, hard: Any, ground: Any
) -> None:
    """Fill ``ground[step, line]`` with the heights under the strip's lines; NaN beside the grid."""
    lines = ground.shape[1]
    sides = elevation_m.shape[1] if by_row else elevation_m.shape[0]
    for step in range(begin, end):
        left = first + whole[step]
        share = part[step]
        low = max(0, -left)
        high = min(lines, sides - left)
        if low > 0 or high < lines:
            ground[step, :] = _NAN
        full = min(high, sides - left - 1)
        if by_row:
            source = elevation_m[step]
            for line in range(low, full):
                ground[step, line] = _mixed(source[left + line], source[left + line + 1], share, hard)
            if full < high:
                ground[step, full] = _mixed(source[left + full], _NAN, share, hard)
            if low > 0 and low <= lines and left + low == 0:
                ground[step, low - 1] = _mixed(_NAN, source[0], share, hard)
        else:
            for line in range(low, full):
                ground[step, line] = _mixed(
                    elevation_m[left + line, step], elevation_m[left + line + 1, step], share, hard
                )
            if full < high:
                ground[step, full] = _mixed(elevation_m[left + full, step], _NAN, share, hard)
            if low > 0 and low <= lines and left + low == 0:
                ground[step, low - 1] = _mixed(_NAN, elevation_m[0, step], share, hard)


@njit(nogil=True, cache=True, error_model="numpy")
def _scatter(answer: Any, elevation_m: Any, by_row: Any, share: Any, left: Any, step: Any, hard: Any, out: Any) -> None:
    """Blend one step's answers of the lines back to the cells between them; unknown cells stay unknown."""
    cells = answer.shape[0] - 1
    sides = out.shape[1] if by_row else out.shape[0]
    low = max(0, -(left + 1))
    high = min(cells, sides - left - 1)
    if by_row:
        target, source = out[step], elevation_m[step]
        for k in range(low, high):
            mixed = _mixed(answer[k + 1], answer[k], share, hard)
            target[left + 1 + k] = mixed if source[left + 1 + k] == source[left + 1 + k] else _NAN
    else:
        for k in range(low, high):
            mixed = _mixed(answer[k + 1], answer[k], share, hard)
            z = elevation_m[left + 1 + k, step]
            out[left + 1 + k, step] = mixed if z == z else _NAN


@njit(nogil=True, cache=True, error_model="numpy")
def _hull_sweep(
    ground: Any,
    line: Any,
    begin: Any,
    end: Any,
    ascending: Any,
    spacing_m: Any,
    bend_per_m: Any,
    hull_at: Any,
    hull_z: Any,
    tangent: Any,
) -> None:
    """Horizon of every point of one line towards its far end; a stack holds the upper hull of what was passed.

    A point that lies under the chord of its neighbours on the stack can hide nothing from any later viewer and is
    dropped for good, so the cost of a point does not grow with the distance searched. The drop of the Earth's surface
    with distance, bend·d², is laid under the line as a parabola: hulls and tangents keep their order under it.
    """
    bend = bend_per_m * spacing_m * spacing_m
    top = -1
    for k in range(end - begin):
        step = begin + k if ascending else end - 1 - k
        z_seen = ground[step, line]
        if z_seen != z_seen:
            tangent[step, line] = _NAN
            continue
        z = np.float64(z_seen) - bend * k * k
        while top >= 1:
            near = k - hull_at[top]
            far = k - hull_at[top - 1]
            if (hull_z[top] - z) * far <= (hull_z[top - 1] - z) * near:
                top -= 1
            else:
                break
        if top >= 0:
            slope = (hull_z[top] - z) / (k - hull_at[top]) - 2.0 * bend * k
            tangent[step, line] = slope / spacing_m
        else:
            tangent[step, line] = _NAN
        top += 1
        hull_at[top] = k
        hull_z[top] = z


@njit(nogil=True, cache=True, error_model="numpy")
def horizon_tangents(
    elevation_m: Any,
    by_row: Any,
    ascending: Any,
    whole: Any,
    part: Any,
    spacing_m: Any,
    bend_per_m: Any,
    first_line: Any,
    lines: Any,
    out: Any,
    start: Any,
    stop: Any,
) -> None:
    """Tangent of the horizon's elevation for the strips start … stop of ``lines`` cells each.

    Unknown ground is passed over: it hides nothing. A line's point with no known ground beyond it is NaN.
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
        _gather(elevation_m, by_row, whole, part, first, begin, end, False, ground)
        for line in range(lines + 1):
            _hull_sweep(ground, line, begin, end, ascending, spacing_m, bend_per_m, hull_at, hull_z, tangent)
        for step in range(begin, end):
            _scatter(tangent[step], elevation_m, by_row, part[step], first + whole[step], step, False, out)


@njit(nogil=True, cache=True, error_model="numpy")
def reach_tangents(
    elevation_m: Any,
    by_row: Any,
    ascending: Any,
    whole: Any,
    part: Any,
    spacing_m: Any,
    samples: Any,
    height_m: Any,
    first_line: Any,
    lines: Any,
    out: Any,
    start: Any,
    stop: Any,
) -> None:
    """Largest tangent from ``height_m`` above each cell to the next ``samples`` points of its line.

    NaN where one of them, or the cell itself, is unknown. Every sample is tried: over so short a reach that is faster
    than a hull, since eight lines are worked on by one instruction.
    """
    steps = whole.shape[0]
    sides = elevation_m.shape[1] if by_row else elevation_m.shape[0]
    ground = np.empty((steps, lines + 1), dtype=np.float32)
    known = np.empty(lines + 1, dtype=np.int32)
    best = np.empty(lines + 1, dtype=np.float32)
    base = np.empty(lines + 1, dtype=np.float32)
    per_m = np.empty(samples + 4, dtype=np.float32)
    for lag in range(samples + 4):
        per_m[lag] = 1.0 / (spacing_m * max(lag, 1))
    ahead = -1 if ascending else 1
    for strip in range(start, stop):
        first = first_line + strip * lines
        begin, end = _steps_inside(whole, sides, first, lines)
        _gather(elevation_m, by_row, whole, part, first, begin, end, True, ground)
        known[:] = 0
        for k in range(end - begin):
            step = begin + k if ascending else end - 1 - k
            here = ground[step]
            for line in range(lines + 1):
                known[line] = known[line] + 1 if here[line] == here[line] else 0
                base[line] = here[line] + height_m
                best[line] = -np.inf
            if k >= samples:
                lag = 1
                while lag + 3 <= samples:
                    z1, z2 = ground[step + ahead * lag], ground[step + ahead * (lag + 1)]
                    z3, z4 = ground[step + ahead * (lag + 2)], ground[step + ahead * (lag + 3)]
                    m1, m2, m3, m4 = per_m[lag], per_m[lag + 1], per_m[lag + 2], per_m[lag + 3]
                    for line in range(lines + 1):
                        t1 = (z1[line] - base[line]) * m1
                        t2 = (z2[line] - base[line]) * m2
                        t3 = (z3[line] - base[line]) * m3
                        t4 = (z4[line] - base[line]) * m4
                        t1 = t1 if t1 > t2 else t2
                        t3 = t3 if t3 > t4 else t4
                        t1 = t1 if t1 > t3 else t3
                        best[line] = t1 if t1 > best[line] else best[line]
                    lag += 4
                while lag <= samples:
                    z1 = ground[step + ahead * lag]
                    m1 = per_m[lag]
                    for line in range(lines + 1):
                        t1 = (z1[line] - base[line]) * m1
                        best[line] = t1 if t1 > best[line] else best[line]
                    lag += 1
            for line in range(lines + 1):
                best[line] = best[line] if known[line] > samples else _NAN
            _scatter(best, elevation_m, by_row, part[step], first + whole[step], step, True, out)
