"""Compiled loops of :mod:`sitescreen.climate.cold_flow`: one night of cold air in motion over known ground."""

import math
from typing import Any

import numpy as np
from numba import njit

_UNKNOWN = -1.5
"""Supply codes: −1 a sink, −2 unknown ground, which is no part of the ledger."""

# The row loops are short and write one or two rows each: the compiler then proves that rows do not overlap and uses the
# processor's wide registers. It gives up on one loop over all the arrays, at several times the cost.


@njit(nogil=True, cache=True, error_model="numpy")
def _flux(
    flux: Any,
    depth_a: Any,
    bed_a: Any,
    depth_b: Any,
    bed_b: Any,
    sill: Any,
    width: Any,
    push: Any,
    drag: Any,
    bound: Any,
    most: Any,
) -> None:
    """New flux of each side from cell a to cell b: pressure, friction taken implicitly, never above critical flow."""
    for i in range(flux.shape[0]):
        top_a = bed_a[i] + depth_a[i]
        top_b = bed_b[i] + depth_b[i]
        deep = (top_a if top_a > top_b else top_b) - sill[i]
        deep = deep if deep > 0.0 else 0.0
        deep = deep if deep < bound else bound
        section = deep * width[i]
        square = deep * section
        # 1e-12 m² only keeps a dry side from 0/0
        new = (flux[i] + push * section * (top_a - top_b)) * square / (square + drag * abs(flux[i]) + 1e-12)
        limit = most * section * math.sqrt(deep)
        new = new if new < limit else limit
        flux[i] = new if new > -limit else -limit


@njit(nogil=True, cache=True, error_model="numpy")
def _out(out: Any, depth: Any, supply_m: Any, west: Any, east: Any, north: Any, south: Any) -> Any:
    """What wants to leave each cell; returns 1 if any cell of known ground is to give more than it holds, else 0."""
    found = 0
    for i in range(out.shape[0]):
        wants = (east[i] if east[i] > 0.0 else 0.0) - (west[i] if west[i] < 0.0 else 0.0)
        wants += (south[i] if south[i] > 0.0 else 0.0) - (north[i] if north[i] < 0.0 else 0.0)
        out[i] = wants
        found |= 1 if (wants > depth[i]) & (supply_m[i] > _UNKNOWN) else 0
    return found


@njit(nogil=True, cache=True, error_model="numpy")
def _share(share: Any, depth: Any, out: Any, supply_m: Any) -> None:
    """The share of it that each cell can give; what comes from unknown ground comes whole."""
    for i in range(share.shape[0]):
        share[i] = depth[i] / out[i] if (out[i] > depth[i]) & (supply_m[i] > _UNKNOWN) else 1.0


@njit(nogil=True, cache=True, error_model="numpy")
def _scale(flux: Any, share_a: Any, share_b: Any) -> None:
    """Cut each side's flux to what the cell that it comes from can give."""
    for i in range(flux.shape[0]):
        flux[i] *= share_a[i] if flux[i] > 0.0 else share_b[i]


@njit(nogil=True, cache=True, error_model="numpy")
def _gain(gain: Any, supplied: Any, depth: Any, supply_m: Any, per_fill: Any) -> None:
    """Air that cools in this step, the less the deeper the layer is already; none where the supply is a code."""
    for i in range(gain.shape[0]):
        left = 1.0 - depth[i] * per_fill
        one = (left if left > 0.0 else 0.0) * (supply_m[i] if supply_m[i] > 0.0 else 0.0)
        gain[i] = one
        supplied[i] += one


@njit(nogil=True, cache=True, error_model="numpy")
def _update(depth: Any, gain: Any, west: Any, east: Any, north: Any, south: Any) -> None:
    for i in range(depth.shape[0]):
        new = depth[i] + (gain[i] + ((west[i] - east[i]) + (north[i] - south[i])))
        # a cell that gave all it had ends a rounding error off zero
        depth[i] = new if new > 0.0 else 0.0


@njit(nogil=True, cache=True, error_model="numpy")
def _sink(depth: Any, supply_m: Any, sunk: Any) -> None:
    for i in range(depth.shape[0]):
        if supply_m[i] < 0.0:
            if supply_m[i] > _UNKNOWN:
                sunk[i] += depth[i]
            depth[i] = 0.0


@njit(nogil=True, cache=True, error_model="numpy")
def _carry_on(flux_x: Any, flux_y: Any, row: Any, cols: Any, sides: Any, first: Any, stop: Any) -> None:
    """Depth and flow go on beyond an open edge: what crosses it is what crosses the cell's other side."""
    for e in range(first, stop):
        col, side = cols[e], sides[e]
        if side == 0:
            flux_x[row, col] = flux_x[row, col + 1]
        elif side == 1:
            flux_x[row, col + 1] = flux_x[row, col]
        elif side == 2:
            flux_y[row, col] = flux_y[row + 1, col]
        else:
            flux_y[row + 1, col] = flux_y[row, col]


@njit(nogil=True, cache=True, error_model="numpy")
def _came_in(flux_x: Any, flux_y: Any, row: Any, cols: Any, sides: Any, first: Any, stop: Any) -> Any:
    """Net flux into the cells of a row over their open edges."""
    total = 0.0
    for e in range(first, stop):
        col, side = cols[e], sides[e]
        if side == 0:
            total += flux_x[row, col]
        elif side == 1:
            total -= flux_x[row, col + 1]
        elif side == 2:
            total += flux_y[row, col]
        else:
            total -= flux_y[row + 1, col]
    return total


@njit(nogil=True, cache=True, error_model="numpy")
def night(
    depth: Any,
    flux_x: Any,
    flux_y: Any,
    bed: Any,
    sill_x: Any,
    sill_y: Any,
    width_x: Any,
    width_y: Any,
    supply_m: Any,
    edge_first: Any,
    edge_col: Any,
    edge_side: Any,
    steps: Any,
    step_s: Any,
    cell_m: Any,
    gravity: Any,
    friction: Any,
    bound_m: Any,
    critical: Any,
    fill_m: Any,
    at_once: Any,
    supplied: Any,
    sunk: Any,
) -> Any:
    """Run ``steps`` steps in place; returns what came in over open edges, in metres of depth × cells.

    ``flux_x[r, c]`` crosses the west side of cell (r, c), eastward positive; ``flux_y[r, c]`` its north side, southward
    positive; both in metres of a cell's depth in a step, so that they add up without a factor. ``width_x`` and
    ``width_y`` are the open shares of the sides. ``supply_m`` is per step, −1 in sinks, −2 on unknown ground. The open
    edges of row r are entries ``edge_first[r]`` to ``edge_first[r + 1]``: the column, and the side (0 west, 1 east,
    2 north, 3 south).

    ``at_once`` steps go down the rows together, each two rows behind the one before, so that rows stay in the
    processor's cache: the same operations on the same numbers in another order, hence the same bits.
    """
    rows, cols = depth.shape
    ratio = step_s / cell_m
    push = gravity * ratio * ratio
    # step · friction · |q|, with q in m²/s
    drag = friction * cell_m
    most = critical * math.sqrt(gravity) * ratio
    per_fill = 1.0 / fill_m
    coded = np.zeros(rows, dtype=np.bool_)
    for row in range(rows):
        for col in range(cols):
            coded[row] |= supply_m[row, col] < 0.0
    # row r's shares lie in [k, r & 1]; the outermost columns stand for what lies beyond, which gives all it is asked
    share = np.ones((at_once, 2, cols + 2))
    short = np.zeros((at_once, 2), dtype=np.int64)
    work = np.empty(cols)
    came_in = 0.0
    done = 0
    while done < steps:
        together = min(at_once, steps - done)
        for front in range(rows + 1 + 2 * (together - 1)):
            for k in range(together):
                row = front - 2 * k
                if row < 0 or row > rows:
                    continue
                below, above = share[k, row & 1], share[k, 1 - (row & 1)]
                if row == 0:
                    above[:] = 1.0
                    short[k, 1] = 0
                if row == rows:
                    below[:] = 1.0
                    short[k, row & 1] = 0
                else:
                    x, h, z = flux_x[row], depth[row], bed[row]
                    _flux(
                        x[1:cols],
                        h[: cols - 1],
                        z[: cols - 1],
                        h[1:],
                        z[1:],
                        sill_x[row, 1:cols],
                        width_x[row, 1:cols],
                        push,
                        drag,
                        bound_m,
                        most,
                    )
                    if row + 1 < rows:
                        _flux(
                            flux_y[row + 1],
                            h,
                            z,
                            depth[row + 1],
                            bed[row + 1],
                            sill_y[row + 1],
                            width_y[row + 1],
                            push,
                            drag,
                            bound_m,
                            most,
                        )
                    _carry_on(flux_x, flux_y, row, edge_col, edge_side, edge_first[row], edge_first[row + 1])
                    before = short[k, row & 1]
                    asked = _out(work, h, supply_m[row], x[:cols], x[1:], flux_y[row], flux_y[row + 1])
                    short[k, row & 1] = asked
                    # nearly always no cell is asked too much, and shares of 1 need neither be computed nor applied
                    if before | asked:
                        _share(below[1 : cols + 1], h, work, supply_m[row])
                if short[k, 0] | short[k, 1]:
                    _scale(flux_y[row], above[1 : cols + 1], below[1 : cols + 1])
                if row == 0:
                    continue
                # shares of the rows on both sides are known now
                last = row - 1
                x, h = flux_x[last], depth[last]
                if short[k, 1 - (row & 1)]:
                    _scale(x, above[: cols + 1], above[1:])
                _gain(work, supplied, h, supply_m[last], per_fill)
                _update(h, work, x[:cols], x[1:], flux_y[last], flux_y[row])
                if coded[last]:
                    _sink(h, supply_m[last], sunk)
                came_in += _came_in(flux_x, flux_y, last, edge_col, edge_side, edge_first[last], edge_first[last + 1])
        done += together
    return came_in
