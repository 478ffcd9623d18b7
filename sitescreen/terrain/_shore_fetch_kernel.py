"""Compiled loop of :func:`sitescreen.terrain.shore_fetch.open_segments`."""

import math
from typing import Any

import numpy as np
from numba import njit


@njit(nogil=True, cache=True, error_model="numpy")
def open_water(
    eye_m: Any,
    own: Any,
    along_m: Any,
    left_wet: Any,
    right_wet: Any,
    start_m: Any,
    end_m: Any,
    by_bucket: Any,
    bucket_from: Any,
    bucket_m: Any,
    origin_m: Any,
    fetch_m: Any,
    rays: Any,
    window: Any,
    least: Any,
    is_open: Any,
    first: Any,
    last: Any,
) -> None:
    """Whether some window of neighbouring rays, from each eye on the shore out over its water, is clear of shores.

    Segments lie sorted by square buckets: those of bucket (row, col) are by_bucket[bucket_from[row, col] :
    bucket_from[row, col + 1]]. Ray k points k/rays of a turn clockwise from north.
    """
    step = 2.0 * math.pi / rays
    clear = np.empty(rays, dtype=np.bool_)
    for eye in range(first, last):
        x, y = eye_m[eye, 0], eye_m[eye, 1]
        for k in range(rays):
            # positive: the ray leaves to the left of the shoreline
            side = along_m[eye, 0] * math.cos(k * step) - along_m[eye, 1] * math.sin(k * step)
            clear[k] = left_wet[eye] if side > 0.0 else (right_wet[eye] if side < 0.0 else False)
        row = int((y - origin_m[1]) // bucket_m)
        col = int((x - origin_m[0]) // bucket_m)
        for r in range(max(row - 1, 0), min(row + 2, bucket_from.shape[0])):
            for at in range(bucket_from[r, max(col - 1, 0)], bucket_from[r, min(col + 2, bucket_from.shape[1] - 1)]):
                segment = by_bucket[at]
                if segment == own[eye]:
                    continue
                ax, ay = start_m[segment, 0] - x, start_m[segment, 1] - y
                bx, by = end_m[segment, 0] - x, end_m[segment, 1] - y
                half = 0.5 * math.hypot(bx - ax, by - ay)
                if math.hypot(0.5 * (ax + bx), 0.5 * (ay + by)) - half > fetch_m:
                    continue
                turn_a = math.atan2(ax, ay)
                span = math.atan2(bx, by) - turn_a
                if span > math.pi:
                    span -= 2.0 * math.pi
                elif span < -math.pi:
                    span += 2.0 * math.pi
                low, high = min(turn_a, turn_a + span), max(turn_a, turn_a + span)
                area = ax * by - ay * bx
                for k in range(math.ceil(low / step), math.floor(high / step) + 1):
                    # crossing of the ray with the segment's line: t·d = a + s·(b − a)
                    down = math.sin(k * step) * (by - ay) - math.cos(k * step) * (bx - ax)
                    if down != 0.0 and 0.0 < area / down <= fetch_m:
                        clear[k % rays] = False
        count = 0
        for k in range(window):
            count += clear[k]
        best = count
        for k in range(rays - 1):
            count += int(clear[(k + window) % rays]) - int(clear[k])
            best = max(best, count)
        is_open[eye] = best >= least
