"""Compiled loops of :mod:`sitescreen.climate.cold_layer`: one night of cold air in motion over known ground."""

import math
from typing import Any

import numpy as np
from numba import njit

_UNKNOWN = -1.5
"""Supply codes: −1 a sink, −2 unknown ground, which is no part of the ledger."""

# The row loops are short and write one row each: the compiler then proves that rows do not overlap and uses the
# processor's wide registers. It gives up on one loop over all the arrays, at several times the cost.


@njit(nogil=True, cache=True, error_model="numpy")
def _flux(
    flux: Any,
    depth_a: Any,
    bed_a: Any,
    depth_b: Any,
    bed_b: Any,
    sill: Any,
    push: Any,
    drag: Any,
    bound: Any,
    most: Any,
) -> None:
    """New flux of each face from cell a to cell b: pressure, friction taken implicitly, never above critical flow."""
    for i in range(flux.shape[0]):
        top_a = bed_a[i] + depth_a[i]
        top_b = bed_b[i] + depth_b[i]
        deep = (top_a if top_a > top_b else top_b) - sill[i]
        deep = deep if deep > 0.0 else 0.0
        deep = deep if deep < bound else bound
        square = deep * deep
        # 1e-12 m² only keeps a dry face from 0/0
        new = (flux[i] + push * deep * (top_a - top_b)) * square / (square + drag * abs(flux[i]) + 1e-12)
        limit = most * deep * math.sqrt(deep)
        new = new if new < limit else limit
        flux[i] = new if new > -limit else -limit


@njit(nogil=True, cache=True, error_model="numpy")
def _add_out(out: Any, before: Any, width_before: Any, behind: Any, width_behind: Any, ratio: Any) -> None:
    """Add what wants to leave each cell over its two sides of one direction. [m of depth]"""
    for i in range(out.shape[0]):
        back = -before[i] * width_before[i]
        on = behind[i] * width_behind[i]
        out[i] += ratio * ((back if back > 0.0 else 0.0) + (on if on > 0.0 else 0.0))


@njit(nogil=True, cache=True, error_model="numpy")
def _asks_too_much(depth: Any, out: Any, supply_m: Any) -> Any:
    """1 if any cell of known ground is to give more than it holds, else 0."""
    found = 0
    for i in range(depth.shape[0]):
        found |= 1 if (out[i] > depth[i]) & (supply_m[i] > _UNKNOWN) else 0
    return found


@njit(nogil=True, cache=True, error_model="numpy")
def _share(share: Any, depth: Any, out: Any, supply_m: Any) -> None:
    """The share of it that each cell can give; what comes from unknown ground comes whole."""
    for i in range(share.shape[0]):
        share[i] = depth[i] / out[i] if (out[i] > depth[i]) & (supply_m[i] > _UNKNOWN) else 1.0


@njit(nogil=True, cache=True, error_model="numpy")
def _scale(flux: Any, share_a: Any, share_b: Any) -> None:
    """Cut each face's flux to what the cell that it comes from can give."""
    for i in range(flux.shape[0]):
        flux[i] *= share_a[i] if flux[i] > 0.0 else share_b[i]


@njit(nogil=True, cache=True, error_model="numpy")
def _gain(gain: Any, depth: Any, supply_m: Any, fill_m: Any) -> None:
    """Air that cools in this step, the less the deeper the layer is already; none in sinks (supply below 0)."""
    for i in range(gain.shape[0]):
        left = 1.0 - depth[i] / fill_m
        left = left if left > 0.0 else 0.0
        gain[i] = left * (supply_m[i] if supply_m[i] > 0.0 else 0.0)


@njit(nogil=True, cache=True, error_model="numpy")
def _add_in(gain: Any, before: Any, width_before: Any, behind: Any, width_behind: Any, ratio: Any) -> None:
    """Add what comes in less what goes out over the two sides of one direction."""
    for i in range(gain.shape[0]):
        gain[i] += ratio * (before[i] * width_before[i] - behind[i] * width_behind[i])


@njit(nogil=True, cache=True, error_model="numpy")
def _add(total: Any, part: Any) -> None:
    for i in range(total.shape[0]):
        total[i] += part[i]


@njit(nogil=True, cache=True, error_model="numpy")
def _update(depth: Any, gain: Any, supply_m: Any, sunk: Any) -> None:
    for i in range(depth.shape[0]):
        new = depth[i] + gain[i]
        # a cell that gave all it had ends a rounding error off zero
        depth[i] = new if new > 0.0 else 0.0
    for i in range(depth.shape[0]):
        sunk[i] += depth[i] if (supply_m[i] < 0.0) & (supply_m[i] > _UNKNOWN) else 0.0
    for i in range(depth.shape[0]):
        depth[i] = 0.0 if supply_m[i] < 0.0 else depth[i]


@njit(nogil=True, cache=True, error_model="numpy")
def _carry_on(
    flux_x: Any, flux_y: Any, width_x: Any, width_y: Any, row: Any, cols: Any, sides: Any, first: Any, stop: Any
) -> None:
    """Depth and flow go on beyond an open edge: what crosses it is what crosses the cell's other side."""
    for e in range(first, stop):
        col, side = cols[e], sides[e]
        if side == 0:
            flux_x[row, col] = flux_x[row, col + 1] * width_x[row, col + 1]
        elif side == 1:
            flux_x[row, col + 1] = flux_x[row, col] * width_x[row, col]
        elif side == 2:
            flux_y[row, col] = flux_y[row + 1, col] * width_y[row + 1, col]
        else:
            flux_y[row + 1, col] = flux_y[row, col] * width_y[row, col]


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
    positive; both per metre of the face's open width, which ``width_x`` and ``width_y`` give as a share of the cell's
    side. ``supply_m`` is per step, −1 in sinks, −2 on unknown ground. The open edges of row r are entries
    ``edge_first[r]`` to ``edge_first[r + 1]``: the column, and the side (0 west, 1 east, 2 north, 3 south).

    ``at_once`` steps go down the rows together, each two rows behind the one before, so that rows stay in the
    processor's cache: the same operations on the same numbers in another order, hence the same bits.
    """
    rows, cols = depth.shape
    ratio = step_s / cell_m
    push = gravity * ratio
    drag = step_s * friction
    most = critical * math.sqrt(gravity)
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
                            push,
                            drag,
                            bound_m,
                            most,
                        )
                    _carry_on(
                        flux_x,
                        flux_y,
                        width_x,
                        width_y,
                        row,
                        edge_col,
                        edge_side,
                        edge_first[row],
                        edge_first[row + 1],
                    )
                    work[:] = 0.0
                    _add_out(work, x[:cols], width_x[row, :cols], x[1:], width_x[row, 1:], ratio)
                    _add_out(work, flux_y[row], width_y[row], flux_y[row + 1], width_y[row + 1], ratio)
                    before, short[k, row & 1] = short[k, row & 1], _asks_too_much(h, work, supply_m[row])
                    # nearly always no cell does, and shares of 1 need neither be computed nor applied
                    if before | short[k, row & 1]:
                        _share(below[1 : cols + 1], h, work, supply_m[row])
                if short[k, 0] | short[k, 1]:
                    _scale(flux_y[row], above[1 : cols + 1], below[1 : cols + 1])
                if row == 0:
                    continue
                last = row - 1
                x = flux_x[last]
                if short[k, 1 - (row & 1)]:
                    _scale(x, above[: cols + 1], above[1:])
                _gain(work, depth[last], supply_m[last], fill_m)
                _add(supplied, work)
                _add_in(work, x[:cols], width_x[last, :cols], x[1:], width_x[last, 1:], ratio)
                _add_in(work, flux_y[last], width_y[last], flux_y[row], width_y[row], ratio)
                _update(depth[last], work, supply_m[last], sunk)
                came_in += ratio * _came_in(
                    flux_x, flux_y, last, edge_col, edge_side, edge_first[last], edge_first[last + 1]
                )
        done += together
    return came_in
