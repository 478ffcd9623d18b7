"""Compiled loops of :mod:`sitescreen.climate.wind` and :mod:`sitescreen.climate.sector_winds`.

The wind of one sector at one cell, in one place, so that plots and fields cannot come to differ.
"""

import math
from typing import Any

import numpy as np
from numba import njit

FLOW, POWER, TIME = 0, 1, 2
"""What a sum over the sectors adds: the speed ratio, its cube, or the share of the wind that is held off."""


@njit(nogil=True, cache=True, error_model="numpy")
def smoothstep(x: Any) -> Any:
    """0 below 0, 1 above 1, 3x² − 2x³ between."""
    t = min(max(x, 0.0), 1.0)
    return t * t * (3.0 - 2.0 * t)


@njit(nogil=True, cache=True, error_model="numpy")
def shelter(tangent: Any, from_tangent: Any, span_tangent: Any, most: Any) -> Any:
    """Speed left behind upwind ground; NaN where the angle is."""
    return math.nan if math.isnan(tangent) else 1.0 - most * smoothstep((tangent - from_tangent) / span_tangent)


@njit(nogil=True, cache=True, error_model="numpy")
def capped(speed_up: Any, least: Any, most: Any) -> Any:
    """Speed-up bent towards its caps."""
    cap = most if speed_up > 0.0 else -least
    return cap * math.tanh(speed_up / cap)


@njit(nogil=True, cache=True, error_model="numpy")
def speed_ratio(up: Any, left: Any, rough: Any) -> Any:
    """F from the capped speed-up, the speed left by shelter and the factor of the ground's roughness."""
    slowed = left if math.isnan(left) else min(1.0 + min(up, 0.0), left)
    return slowed * (1.0 + max(up, 0.0)) * rough


@njit(nogil=True, cache=True, error_model="numpy")
def _speed_up(east: Any, north: Any, east_east: Any, east_north: Any, north_north: Any) -> Any:
    return east * east * east_east + 2.0 * east * north * east_north + north * north * north_north


@njit(nogil=True, cache=True, error_model="numpy")
def cover_upwind(
    row: Any,
    col: Any,
    east: Any,
    north: Any,
    cell_size_m: Any,
    ground_m: Any,
    canopy_m: Any,
    ln_roughness: Any,
    how: Any,
) -> Any:
    """Speed left in the lee of upwind canopies, and the factor of the roughness upwind.

    ``how``: canopies' displacement share, windbreaks' most, full and span in heights, their reach [m], the fetch of
    the roughness [m], the logarithm of the reference roughness, the height above ground [m].
    """
    displaced, most, full, span, reach_m, fetch_m, ln_reference, height_m = how
    rows, cols = canopy_m.shape
    base = displaced * canopy_m[row, col]
    here = ground_m[row, col]
    held, ln_sum, seen = 0.0, np.float64(ln_roughness[row, col]), 1
    for step in range(1, int(max(reach_m, fetch_m) / cell_size_m) + 1):
        r, c = int(np.rint(row - step * north)), int(np.rint(col + step * east))
        if r < 0 or c < 0 or r >= rows or c >= cols:
            break
        away = step * cell_size_m
        if away <= fetch_m:
            ln_sum += ln_roughness[r, c]
            seen += 1
        # trees on lower ground shelter less, those on a rise no more than their own height: the rise has its own angle
        tall = canopy_m[r, c] - base + min(np.float64(ground_m[r, c]) - here, 0.0)
        if tall > 0.0 and away <= reach_m:
            held = max(held, most * (1.0 - smoothstep((away / tall - full) / span)))
    ln_upwind = ln_sum / seen
    # EN 1991-1-4:2005, eq. 4.4 and 4.5: 0.19·(z0/z0,II)^0.07·ln(z/z0)
    profile = math.exp(0.07 * (ln_upwind - ln_reference)) * (math.log(height_m) - ln_upwind)
    return 1.0 - held, profile / (math.log(height_m) - ln_reference)


@njit(nogil=True, cache=True, error_model="numpy")
def cover_sector(
    ground_m: Any,
    canopy_m: Any,
    ln_roughness: Any,
    cell_size_m: Any,
    east: Any,
    north: Any,
    how: Any,
    left: Any,
    rough: Any,
    first: int,
    stop: int,
) -> None:
    """:func:`cover_upwind` of every cell of rows first … stop."""
    for row in range(first, stop):
        for col in range(canopy_m.shape[1]):
            left[row, col], rough[row, col] = cover_upwind(
                row, col, east, north, cell_size_m, ground_m, canopy_m, ln_roughness, how
            )


@njit(nogil=True, cache=True, error_model="numpy")
def add_sector(
    tangent: Any,
    east_east: Any,
    east_north: Any,
    north_north: Any,
    left_by_cover: Any,
    rough: Any,
    east: float,
    north: float,
    closure: Any,
    kinds: Any,
    weights: Any,
    place: Any,
    blend: Any,
    sums: Any,
    first: int,
    stop: int,
) -> None:
    """Add one sector to the sums, for rows first … stop.

    ``closure``: shelter's start, span and most, speed-up's least and most. ``weights``: (places, sums) of this sector;
    a cell without wind from it skips it, so that unknown ground there does not spread. ``place``: which place serves
    each cell, unless ``blend`` holds the places' (row, col, least squared distance in cells): then each counts by the
    inverse square of its distance. ``left_by_cover`` and ``rough`` have no cells where no cover is given.
    """
    from_tangent, span_tangent, most_shelter, least, most = closure
    places, count = weights.shape
    with_cover = rough.shape[0] > 0
    share = np.empty(count)
    for row in range(first, stop):
        for col in range(tangent.shape[1]):
            if blend.shape[0] > 0:
                share[:] = 0.0
                for k in range(places):
                    near = 1.0 / max((row - blend[k, 0]) ** 2 + (col - blend[k, 1]) ** 2, blend[k, 2])
                    for m in range(count):
                        share[m] += near * weights[k, m]
            else:
                share[:] = weights[place[row, col]]
            if not share.any():
                continue
            left = shelter(tangent[row, col], from_tangent, span_tangent, most_shelter)
            roughness = 1.0
            if with_cover:
                left = left if math.isnan(left) else min(left, left_by_cover[row, col])
                roughness = rough[row, col]
            up = capped(
                _speed_up(east, north, east_east[row, col], east_north[row, col], north_north[row, col]), least, most
            )
            ratio = speed_ratio(up, left, roughness)
            for m in range(count):
                if share[m] > 0.0:
                    if kinds[m] == FLOW:
                        what = ratio
                    elif kinds[m] == POWER:
                        what = ratio * ratio * ratio
                    else:
                        what = 1.0 - left
                    sums[m, row, col] += np.float32(share[m] * what)


@njit(nogil=True, cache=True, error_model="numpy")
def divide_blended(blend: Any, totals: Any, sums: Any, first: int, stop: int) -> None:
    """Divide blended sums by what their weights, blended alike, come to; ``totals``: (places, sums)."""
    for row in range(first, stop):
        for col in range(sums.shape[2]):
            for m in range(sums.shape[0]):
                total = 0.0
                for k in range(totals.shape[0]):
                    near = 1.0 / max((row - blend[k, 0]) ** 2 + (col - blend[k, 1]) ** 2, blend[k, 2])
                    total += near * totals[k, m]
                sums[m, row, col] /= np.float32(total)


@njit(nogil=True, cache=True, error_model="numpy")
def upwind_tangent_at(
    elevation_m: Any, row: Any, col: Any, east: Any, north: Any, cell_size_m: Any, reach_m: Any, height_m: Any
) -> Any:
    """Largest tangent to the ground upwind of one cell, as :func:`sitescreen.terrain.horizon.upwind_tangent` has it."""
    rows, cols = elevation_m.shape
    by_row = abs(north) >= abs(east) * (1.0 - 1e-12)
    main, aside = (-north, east) if by_row else (east, -north)
    ahead = 1 if main > 0.0 else -1
    slant = aside / abs(main)
    spacing = cell_size_m * math.hypot(1.0, slant)
    here = np.float64(elevation_m[row, col]) + height_m
    best = -math.inf
    for step in range(1, math.floor(reach_m / spacing + 1e-9) + 1):
        shift = slant * step
        whole = math.floor(shift + 1e-9)
        part = shift - whole
        if part < 2e-9:
            part = 0.0
        r, c = (row + ahead * step, col + whole) if by_row else (row + whole, col + ahead * step)
        r1, c1 = (r, c + 1) if by_row else (r + 1, c)
        if part == 0.0:
            r1, c1 = r, c
        if r < 0 or c < 0 or r1 >= rows or c1 >= cols:
            return math.nan
        z = np.float64(elevation_m[r, c])
        z += part * (np.float64(elevation_m[r1, c1]) - z)
        if math.isnan(z):
            return math.nan
        best = max(best, (z - here) / (step * spacing))
    return math.nan if math.isnan(here) else best


@njit(nogil=True, cache=True, error_model="numpy")
def plot_sectors(
    elevation_m: Any,
    known: Any,
    east_east: Any,
    east_north: Any,
    north_north: Any,
    cover_ground_m: Any,
    canopy_m: Any,
    ln_roughness: Any,
    cell_size_m: Any,
    begins: Any,
    cells: Any,
    shares: Any,
    azimuth_rad: Any,
    reach_m: Any,
    height_m: Any,
    closure: Any,
    how: Any,
    least_known: Any,
    ratio_out: Any,
    left_out: Any,
    up_out: Any,
    first: int,
    stop: int,
) -> None:
    """Means of F, W and ΔS over the cells of plots first … stop, sector by sector; ``azimuth_rad``: (plots, sectors).

    NaN where less than ``least_known`` of the plot's cells have a known wind from there.
    """
    from_tangent, span_tangent, most_shelter, least, most = closure
    cols = elevation_m.shape[1]
    with_cover = canopy_m.shape[0] > 0
    for plot in range(first, stop):
        whole = 0.0
        for k in range(begins[plot], begins[plot + 1]):
            whole += shares[k]
        for sector in range(azimuth_rad.shape[1]):
            east, north = math.sin(azimuth_rad[plot, sector]), math.cos(azimuth_rad[plot, sector])
            ratio_sum, left_sum, up_sum, weight = 0.0, 0.0, 0.0, 0.0
            for k in range(begins[plot], begins[plot + 1]):
                row, col = cells[k] // cols, cells[k] % cols
                if not known[row, col]:
                    continue
                tangent = upwind_tangent_at(elevation_m, row, col, east, north, cell_size_m, reach_m, height_m)
                left = shelter(tangent, from_tangent, span_tangent, most_shelter)
                if math.isnan(left):
                    continue
                rough = 1.0
                if with_cover:
                    by_cover, rough = cover_upwind(
                        row, col, east, north, cell_size_m, cover_ground_m, canopy_m, ln_roughness, how
                    )
                    left = min(left, by_cover)
                up = capped(
                    _speed_up(east, north, east_east[row, col], east_north[row, col], north_north[row, col]),
                    least,
                    most,
                )
                ratio_sum += shares[k] * speed_ratio(up, left, rough)
                left_sum += shares[k] * left
                up_sum += shares[k] * up
                weight += shares[k]
            is_known = weight > 0.0 and weight >= least_known * whole
            ratio_out[plot, sector] = ratio_sum / weight if is_known else math.nan
            left_out[plot, sector] = left_sum / weight if is_known else math.nan
            up_out[plot, sector] = up_sum / weight if is_known else math.nan
