r"""Compiled loops of :mod:`sitescreen.terrain.horizon`: sweeps along skewed lines.

Lines run along the rows' numbers, one row a step, and shift sideways by a constant part of a column, at most one.
Azimuths near east and west are swept over the transposed ground, where they run so too. ``side`` counts columns.

::

      side →
    s  l z z l z z l z z l      line j lies at side = first + GAP·j + whole[step] + part[step]
    t  z l z z l z z l z z      ground on a line: mixed from the cells left and right of it
    e  z z l z z l z z l z      swept from the far end towards the viewer
    p  l z z l z z l z z l      a cell's far horizon: mixed from the lines left and right of it
    ↓

A strip of neighbouring lines is worked on at a time, a block of steps after another, so that all of it stays in the
processor's cache.
"""

import math
from typing import Any

import numpy as np
from numba import njit

_NAN = np.float32(math.nan)
_LOWEST = np.float32(-math.inf)
_ONE = np.float32(1.0)
_HALF = np.float32(0.5)
_ZERO = np.float32(0.0)

GAP = 2
"""Cells from line to line; :func:`_raise` is written out for it."""

SEARCH_EVERY = 2
"""Steps from one viewer on a line to the next; between them tangents are mixed."""

_CHORD = 8
"""Longest half chord under which ground is passed over. [steps]"""

_BLOCK = 64
"""Viewers on a line in a block of steps."""


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
def _copy(source: Any, target: Any) -> None:
    """Copy a row. Array assignment would do, but compiling its message for unequal shapes takes four seconds."""
    for i in range(source.shape[0]):
        target[i] = source[i]


@njit(nogil=True, cache=True, error_model="numpy")
def _inside(samples: Any, row: Any, low: Any, high: Any, rows: Any, cols: Any) -> Any:
    """Whether both cells of each sample lie on the ground, for all viewers low … high of a row."""
    for s in range(samples.shape[0]):
        for k in range(0, 4, 2):
            at, aside = row + samples[s, k], samples[s, k + 1]
            if at < 0 or at >= rows or low + aside < 0 or high + aside > cols:
                return False
    return True


@njit(nogil=True, cache=True, error_model="numpy")
def _near(
    elevation_m: Any, row: Any, low: Any, high: Any, samples: Any, share: Any, per_m: Any, drop: Any, out: Any
) -> None:
    """Largest tangent to the samples of each ray from the cells low … high of a row.

    A sample is mixed from two cells, ``samples[s]``: row and column of the first, then of the second, from the viewer.
    Unknown samples are passed over. −∞ where none of them is known, NaN where the cell itself is unknown.
    """
    rows, cols = elevation_m.shape
    here, best = elevation_m[row, low:high], out[row, low:high]
    for i in range(here.shape[0]):
        best[i] = _LOWEST if here[i] == here[i] else _NAN
    count = samples.shape[0]
    s = 0
    while s < count:
        # four samples at a time: a quarter of the traffic through ``best``
        if s + 4 <= count and _inside(samples[s : s + 4], row, low, high, rows, cols):
            a1 = elevation_m[row + samples[s, 0], low + samples[s, 1] :]
            b1 = elevation_m[row + samples[s, 2], low + samples[s, 3] :]
            a2 = elevation_m[row + samples[s + 1, 0], low + samples[s + 1, 1] :]
            b2 = elevation_m[row + samples[s + 1, 2], low + samples[s + 1, 3] :]
            a3 = elevation_m[row + samples[s + 2, 0], low + samples[s + 2, 1] :]
            b3 = elevation_m[row + samples[s + 2, 2], low + samples[s + 2, 3] :]
            a4 = elevation_m[row + samples[s + 3, 0], low + samples[s + 3, 1] :]
            b4 = elevation_m[row + samples[s + 3, 2], low + samples[s + 3, 3] :]
            p1, p2, p3, p4 = share[s], share[s + 1], share[s + 2], share[s + 3]
            m1, m2, m3, m4 = per_m[s], per_m[s + 1], per_m[s + 2], per_m[s + 3]
            d1, d2, d3, d4 = drop[s], drop[s + 1], drop[s + 2], drop[s + 3]
            for i in range(here.shape[0]):
                z = here[i]
                far = best[i]
                t1 = ((a1[i] + p1 * (b1[i] - a1[i])) - z) * m1 - d1
                t2 = ((a2[i] + p2 * (b2[i] - a2[i])) - z) * m2 - d2
                t3 = ((a3[i] + p3 * (b3[i] - a3[i])) - z) * m3 - d3
                t4 = ((a4[i] + p4 * (b4[i] - a4[i])) - z) * m4 - d4
                far = t1 if t1 > far else far
                far = t2 if t2 > far else far
                far = t3 if t3 > far else far
                best[i] = t4 if t4 > far else far
            s += 4
            continue
        r1, r2, aside1, aside2 = row + samples[s, 0], row + samples[s, 2], samples[s, 1], samples[s, 3]
        left, right = max(low, -min(aside1, aside2)), min(high, cols - max(aside1, aside2))
        if min(r1, r2) >= 0 and max(r1, r2) < rows and left < right:
            a, b = elevation_m[r1, left + aside1 :], elevation_m[r2, left + aside2 :]
            z0, best0 = elevation_m[row, left:right], out[row, left:right]
            p, m, d = share[s], per_m[s], drop[s]
            for i in range(z0.shape[0]):
                t = ((a[i] + p * (b[i] - a[i])) - z0[i]) * m - d
                best0[i] = t if t > best0[i] else best0[i]
        s += 1


@njit(nogil=True, cache=True, error_model="numpy")
def _steps_inside(whole: Any, cols: Any, first: Any, reach: Any) -> Any:
    """The first step, and the one behind the last, at which any line or cell of the strip is on the ground."""
    begin, end = whole.shape[0], 0
    for step in range(whole.shape[0]):
        side = first + whole[step]
        if side + reach >= 0 and side < cols:
            begin = min(begin, step)
            end = step + 1
    return begin, end


@njit(nogil=True, cache=True, error_model="numpy")
def _gather(heights: Any, side: Any, share: Any, ground: Any) -> None:
    """Fill ``ground`` with the heights under one step's lines; NaN beside the grid and over unknown cells."""
    # a line that runs through cell centres needs no second cell
    apart = 1 if share > 0 else 0
    low = min(max(0, -(side // GAP)), ground.shape[0])
    high = max(low, min(ground.shape[0], (heights.shape[0] - apart - side + GAP - 1) // GAP))
    if low > 0 or high < ground.shape[0]:
        ground[:] = _NAN
    if low == high:
        return
    here, target = heights[side + GAP * low :], ground[low:high]
    if apart:
        for line in range(target.shape[0]):
            z = here[GAP * line]
            target[line] = z + share * (here[GAP * line + 1] - z)
    else:
        for line in range(target.shape[0]):
            target[line] = here[GAP * line]


@njit(nogil=True, cache=True, error_model="numpy")
def _may_hide(ground: Any, bend: Any, keep: Any) -> None:
    """Mark in ``keep`` the ground that can hide anything from a distance: not what lies under a chord about it.

    Rows of ``ground`` beyond both ends of ``keep``, _CHORD of them, are its neighbours.
    """
    for k in range(keep.shape[0]):
        here, kept = ground[k + _CHORD], keep[k]
        for line in range(here.shape[0]):
            kept[line] = 1 if here[line] == here[line] else 0
        reach = 1
        while reach <= _CHORD:
            before, after = ground[k + _CHORD - reach], ground[k + _CHORD + reach]
            limit = np.float32(2.0 * bend * reach * reach)
            for line in range(here.shape[0]):
                kept[line] = 0 if (before[line] - here[line]) + (after[line] - here[line]) > limit else kept[line]
            reach *= 2


@njit(nogil=True, cache=True, error_model="numpy")
def _push(at: Any, z: Any, top: Any, hull_at: Any, hull_z: Any) -> Any:
    """Put a point on the hull, and drop what it covers: points under the chord of their neighbours; the new top.

    They can hide nothing from any later viewer.
    """
    while top >= 1 and (hull_z[top] - z) * (at - hull_at[top - 1]) <= (hull_z[top - 1] - z) * (at - hull_at[top]):
        top -= 1
    top += 1
    hull_at[top] = at
    hull_z[top] = z
    return top


@njit(nogil=True, cache=True, error_model="numpy")
def _touched(at: Any, z: Any, top: Any, touch: Any, hull_at: Any, hull_z: Any) -> Any:
    """The point of the hull that a viewer sees highest.

    From a viewer in front of it the hull's slopes rise to the horizon and fall behind it, so the last viewer's horizon
    is a good place to start looking for the next one's.
    """
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
    while not moved and touch < top:
        next_over, next_along = hull_z[touch + 1] - z, at - hull_at[touch + 1]
        if next_over * along < over * next_along:
            break
        over, along = next_over, next_along
        touch += 1
    return touch


@njit(nogil=True, cache=True, error_model="numpy")
def _seen_from_lines(
    step: Any, ground: Any, at: Any, near: Any, found_at: Any, found_m: Any, bend: Any, per_m: Any, tangent: Any
) -> None:
    """Tangents from the viewers on the lines at one step, row ``at`` of ``ground``; NaN over unknown ground.

    To what was found on the hull, and to the ground from ``near`` steps on that is not on it yet.
    """
    here = ground[at]
    for line in range(here.shape[0]):
        along = step - found_at[line]
        tangent[line] = ((found_m[line] - here[line]) / along - bend * along) * per_m
    for ahead in range(near, near + _CHORD):
        other, per, drop = ground[at - ahead], per_m / np.float32(ahead), bend * np.float32(ahead) * per_m
        for line in range(here.shape[0]):
            t = (other[line] - here[line]) * per - drop
            so_far = tangent[line]
            so_far = so_far if so_far == so_far else t
            tangent[line] = t if t > so_far else so_far


@njit(nogil=True, cache=True, error_model="numpy")
def _between_searches(
    step: Any, share: Any, one: Any, two: Any, at: Any, m: Any, bend: Any, per_m: Any, tangent: Any, near: Any
) -> None:
    """Mix the tangents of two searches, ``one`` and ``two``, to a step between them.

    Where both viewers stand over unknown ground: the tangent from the height ``m`` of what was found, at ``at``, and
    ``near``, 1 over its distance, which is 0 elsewhere.
    """
    for line in range(one.shape[0]):
        a, b = one[line], two[line]
        a = a if a == a else b
        b = b if b == b else a
        mixed = a + share * (b - a)
        known = mixed == mixed
        along = step - at[line]
        # NaN where nothing was found
        bare = (m[line] - m[line]) - bend * along * per_m
        tangent[line] = mixed if known else bare
        near[line] = _ZERO if known else per_m / along


@njit(nogil=True, cache=True, error_model="numpy")
def _raise(tangent: Any, near: Any, m: Any, share: Any, height: Any, best: Any) -> None:
    """Mix one step's lines to the cells between them, and raise the cells' tangents where that is higher.

    Cells that are NaN so far are unknown and stay so; those still at −∞ have no known ground ahead and become NaN.
    """
    one, two = (_ONE - share) * _HALF, _ONE - share * _HALF
    for line in range(tangent.shape[0] - 1):
        a, b, n1, n2, m1, m2 = tangent[line], tangent[line + 1], near[line], near[line + 1], m[line], m[line + 1]
        # a line with no known ground ahead, or without a known viewer, leaves it to the other one
        left = a == a and (n1 == _ZERO or n2 > _ZERO or b != b)
        right = b == b and (n2 == _ZERO or n1 > _ZERO or a != a)
        a, n1, m1 = (a, n1, m1) if left else (b, n2, m2)
        b, n2, m2 = (b, n2, m2) if right else (a, n1, m1)
        b, n2, m2 = b - a, n2 - n1, m2 - m1
        # between lines without viewers a cell looks from its own height
        own = n1 + n2 > _ZERO
        t1, t2 = a + one * b, a + two * b
        t1 = t1 + ((m1 + one * m2) - height[GAP * line]) * (n1 + one * n2) if own else t1
        t2 = t2 + ((m1 + two * m2) - height[GAP * line + 1]) * (n1 + two * n2) if own else t2
        best1, best2 = best[GAP * line], best[GAP * line + 1]
        best1 = t1 if t1 > best1 else best1
        best2 = t2 if t2 > best2 else best2
        best[GAP * line] = best1 if best1 > _LOWEST else _NAN
        best[GAP * line + 1] = best2 if best2 > _LOWEST else _NAN


@njit(nogil=True, cache=True, error_model="numpy")
def sweep_strips(
    elevation_m: Any,
    ascending: Any,
    samples: Any,
    sample_share: Any,
    sample_m: Any,
    near: Any,
    whole: Any,
    part: Any,
    spacing_m: Any,
    bend_per_m: Any,
    step0: Any,
    first_line: Any,
    lines: Any,
    out: Any,
    start: Any,
    stop: Any,
) -> None:
    """Tangents of the horizon of all cells in the strips start … stop, of ``GAP·lines`` columns each.

    The ground up to ``near`` steps ahead is read along each cell's own ray, at the samples; the rest along lines. On
    each line a stack holds the upper hull of what was passed, so that the cost of a point does not grow with the
    distance searched. The drop of the Earth's surface with distance, bend·d², is laid under the line as a parabola:
    hulls and tangents keep their order under it. Viewers on the lines look up every SEARCH_EVERY steps only, and cells
    mix what they see, linearly: more ground can then never lower the answer.

    Unknown ground is passed over: it hides nothing. NaN where the cell is unknown or no ground is known ahead.
    """
    steps, cols = elevation_m.shape
    bend = bend_per_m * spacing_m * spacing_m
    bend32, per_spacing = np.float32(bend), np.float32(1.0 / spacing_m)
    per_m, drop = np.empty(sample_m.shape[0], np.float32), np.empty(sample_m.shape[0], np.float32)
    for s in range(sample_m.shape[0]):
        per_m[s] = 1.0 / sample_m[s]
        drop[s] = bend_per_m * sample_m[s]
    width = GAP * lines
    long = _BLOCK * SEARCH_EVERY
    # ground goes on the hull once all chords over it lie at least ``near`` steps ahead
    lag = near + _CHORD
    before = lag + _CHORD
    ground = np.empty((before + long + 1, lines + 1), dtype=np.float32)
    keep = np.empty((long + 1, lines + 1), dtype=np.uint8)
    hides = np.empty(long + 2, dtype=np.int64)
    # side by side: few stacks are ever deep, and memory that is not touched costs nothing
    hull_at = np.empty((steps, lines + 1), dtype=np.float64)
    hull_z = np.empty((steps, lines + 1), dtype=np.float64)
    top, touch = np.empty(lines + 1, dtype=np.int64), np.empty(lines + 1, dtype=np.int64)
    eye_m = np.empty(lines + 1, dtype=np.float32)
    found_at = np.empty((_BLOCK + 2, lines + 1), dtype=np.float32)
    found_m = np.empty((_BLOCK + 2, lines + 1), dtype=np.float32)
    seen = np.empty((_BLOCK + 2, lines + 1), dtype=np.float32)
    tangent, per_distance = np.empty(lines + 1, dtype=np.float32), np.empty(lines + 1, dtype=np.float32)
    height, best = np.empty(width, dtype=np.float32), np.empty(width, dtype=np.float32)
    height[:] = _NAN
    best[:] = _NAN
    for strip in range(start, stop):
        first = first_line + width * strip
        begin, end = _steps_inside(whole, cols, first, width)
        count = end - begin
        if count <= 0:
            continue
        origin, way = (begin, 1) if ascending else (end - 1, -1)
        # searches lie at whole multiples on the lattice, whatever the window
        phase = (-way * (step0 + origin)) % SEARCH_EVERY
        top[:] = -1
        touch[:] = 0
        eye_m[:] = _NAN
        ground[:] = _NAN
        found_at[0], found_m[0], seen[0] = -_ONE, _NAN, _NAN
        k0, base = 0, phase - SEARCH_EVERY
        while k0 < count:
            # steps k0 … k1 − 1; the last one is searched, and so was the one before the first
            k1 = min(base + long + 1, count)
            searches = -(-(k1 - 1 - base) // SEARCH_EVERY)
            for k in range(k0, k1):
                row = origin + way * k
                _gather(elevation_m[row], first + whole[row], part[row], ground[before + k - k0])
            _may_hide(ground, bend, keep[: k1 - k0])
            for line in range(lines + 1):
                at_stack, z_stack = hull_at[:, line], hull_z[:, line]
                line_top, line_touch, eye = top[line], touch[line], eye_m[line]
                hiding = 0
                for k in range(k1 - k0):
                    hides[hiding] = k
                    hiding += keep[k, line]
                n = 0
                for search in range(1, searches + 1):
                    last = min(base + search * SEARCH_EVERY, k1 - 1)
                    while n < hiding and hides[n] <= last - k0:
                        at = np.float64(k0 + hides[n] - lag)
                        z = np.float64(ground[hides[n] + _CHORD, line]) - bend * at * at
                        line_top = _push(at, z, line_top, at_stack, z_stack)
                        n += 1
                    beneath = ground[before + last - k0, line]
                    eye = beneath if beneath == beneath else eye
                    if line_top < 0:
                        found_at[search, line] = -_ONE
                        found_m[search, line] = _NAN
                    else:
                        at = np.float64(last)
                        # a viewer on unknown ground, with none known before: any point will do
                        z = np.float64(eye) - bend * at * at if eye == eye else z_stack[line_top]
                        line_touch = _touched(at, z, line_top, line_touch, at_stack, z_stack)
                        at = at_stack[line_touch]
                        found_at[search, line] = at
                        # the height as it was: the bend's own rounding is far below float32's
                        found_m[search, line] = z_stack[line_touch] + bend * at * at
                top[line], touch[line], eye_m[line] = line_top, line_touch, eye
            for search in range(1, searches + 1):
                last = min(base + search * SEARCH_EVERY, k1 - 1)
                _seen_from_lines(
                    np.float32(last),
                    ground,
                    before + last - k0,
                    near,
                    found_at[search],
                    found_m[search],
                    bend32,
                    per_spacing,
                    seen[search],
                )
            for k in range(k0, k1):
                row = origin + way * k
                side = first + whole[row] + 1
                low, high = max(0, side), min(cols, side + width)
                if high <= low:
                    continue
                _near(elevation_m, row, low, high, samples, sample_share, per_m, drop, out)
                search = -(-(k - base) // SEARCH_EVERY)
                done = base + (search - 1) * SEARCH_EVERY
                between = np.float32(k - done) / np.float32(min(done + SEARCH_EVERY, k1 - 1) - done)
                _between_searches(
                    np.float32(k),
                    between,
                    seen[search - 1],
                    seen[search],
                    found_at[search],
                    found_m[search],
                    bend32,
                    per_spacing,
                    tangent,
                    per_distance,
                )
                _copy(elevation_m[row, low:high], height[low - side :])
                _copy(out[row, low:high], best[low - side :])
                _raise(tangent, per_distance, found_m[search], part[row], height, best)
                _copy(best[low - side : high - side], out[row, low:])
            # what the next block still needs of this one
            for k in range(before):
                _copy(ground[k + k1 - k0], ground[k])
            _copy(found_at[searches], found_at[0])
            _copy(found_m[searches], found_m[0])
            _copy(seen[searches], seen[0])
            k0, base = k1, k1 - 1
