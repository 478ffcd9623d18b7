"""Compiled loops of :func:`sitescreen.climate.plot_sun.monthly_sun`."""

import math
from typing import Any

from numba import njit


@njit(nogil=True, cache=True, error_model="numpy")
def positive_share(from_: Any, to: Any) -> Any:
    """Part of a straight line from one value to another that lies above 0."""
    if from_ > 0.0 and to > 0.0:
        return 1.0
    if from_ <= 0.0 and to <= 0.0:
        return 0.0
    return max(from_, to) / abs(from_ - to)


@njit(nogil=True, cache=True, error_model="numpy")
def month_sums(
    clearance_deg: Any,
    weights: Any,
    towards: Any,
    beam: Any,
    normal: Any,
    hour: Any,
    step_h: Any,
    sums: Any,
    edges: Any,
    start: Any,
    stop: Any,
) -> None:
    """Weighted sums of a plot's sunny steps, and the hours at which its sun comes and goes, month by month.

    ``sums`` (n, 12, k + 1): the k weights, then the beam on the plot's plane. ``edges`` (n, 12, 2): NaN without sun.
    """
    months, steps = clearance_deg.shape[1], clearance_deg.shape[2]
    kinds = weights.shape[2]
    for plot in range(start, stop):
        for month in range(months):
            for kind in range(kinds + 1):
                sums[plot, month, kind] = 0.0
            first, last = -1, -1
            for step in range(steps):
                now = clearance_deg[plot, month, step]
                before = clearance_deg[plot, month, step - 1] if step > 0 else now
                after = clearance_deg[plot, month, step + 1] if step < steps - 1 else now
                if now > 0.0:
                    last = step
                    if first < 0:
                        first = step
                elif before <= 0.0 and after <= 0.0:
                    continue
                share = 0.5 * positive_share(0.5 * (before + now), now)
                share += 0.5 * positive_share(now, 0.5 * (now + after))
                for kind in range(kinds):
                    sums[plot, month, kind] += share * weights[month, step, kind]
                cosine = (
                    towards[month, step, 0] * normal[plot, 0]
                    + towards[month, step, 1] * normal[plot, 1]
                    + towards[month, step, 2] * normal[plot, 2]
                )
                if cosine > 0.0:
                    sums[plot, month, kinds] += share * beam[month, step] * cosine
                elif cosine != cosine:
                    sums[plot, month, kinds] = math.nan
            edges[plot, month, 0] = math.nan
            edges[plot, month, 1] = math.nan
            if first >= 0:
                edges[plot, month, 0] = hour[first]
                edges[plot, month, 1] = hour[last]
                if first > 0:
                    now, before = clearance_deg[plot, month, first], clearance_deg[plot, month, first - 1]
                    edges[plot, month, 0] -= step_h * now / (now - before)
                if last < steps - 1:
                    now, after = clearance_deg[plot, month, last], clearance_deg[plot, month, last + 1]
                    edges[plot, month, 1] += step_h * now / (now - after)
