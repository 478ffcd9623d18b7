"""Planted cases in the ground: hollows with a sill, basins behind a narrow gap, islands, a pond's bed."""

from typing import NamedTuple

import numpy as np


class Hollow(NamedTuple):
    """A closed hollow: a bowl with one lowest place in its rim."""

    x: float
    y: float
    radius_km: float
    depth_m: float
    sill_bearing_deg: float


class Basin(NamedTuple):
    """A basin whose floor falls all the way to a narrow gap: it holds cold air, never water."""

    x: float
    y: float
    radius_km: float
    rim_m: float
    gap_bearing_deg: float
    gap_width_m: float


HOLLOWS = {
    "upland hollow": Hollow(17.3, 30.6, 0.62, 28, 100),
    "deep upland hollow": Hollow(13.4, 25.6, 0.80, 40, 60),
    "high hollow": Hollow(7.9, 33.2, 0.50, 22, 120),
    "savannah hollow": Hollow(33.2, 34.4, 0.55, 12, 160),
    "coastal pan": Hollow(47.9, 12.6, 0.30, 6, 90),
    "doubtful hollow": Hollow(17.2, 33.8, 0.20, 1.5, 90),
}
BASINS = {
    "great basin": Basin(22.6, 28.4, 1.75, 135, 95, 100),
}


def _ramp(value, low, high):
    t = np.clip((value - low) / (high - low), 0.0, 1.0)
    return t * t * (3 - 2 * t)


def plant(ground, x, y, crooked):
    """Set the hollows and basins into the ground.

    Parameters
    ----------
    ground, x, y : arrays
        Height [m], kilometres east and north.
    crooked : three arrays of standard deviation 1
        Smooth random fields that bend outlines and roughen rims.

    Returns
    -------
    ground, kept (0–1, how far water must leave a cell as it is), floors of the hollows (bool)
    """
    kept = np.zeros(ground.shape)
    floors = np.zeros(ground.shape, bool)
    for hollow in HOLLOWS.values():
        ground, hold, floor = _hollow(ground, x, y, hollow, crooked)
        kept, floors = np.maximum(kept, hold), floors | floor
    for basin in BASINS.values():
        ground, hold = _basin(ground, x, y, basin, crooked)
        kept = np.maximum(kept, hold)
    return ground, kept, floors


def _along_across(x, y, it, bearing_deg):
    east, north = np.sin(np.radians(bearing_deg)), np.cos(np.radians(bearing_deg))
    return (x - it.x) * east + (y - it.y) * north, (x - it.x) * north - (y - it.y) * east


def _hollow(ground, x, y, it, crooked):
    bent_x, bent_y = x - it.x + 0.16 * it.radius_km * crooked[0], y - it.y + 0.16 * it.radius_km * crooked[1]
    r = np.hypot(bent_x, bent_y) / it.radius_km
    bearing = np.degrees(np.arctan2(bent_x, bent_y))
    sill = float(np.percentile(ground[r < 1.2], 45))
    off_sill = np.abs((bearing - it.sill_bearing_deg + 180) % 360 - 180)
    rim = sill + (3 + 0.2 * it.depth_m) * _ramp(off_sill, 6, 50) * (1 + 0.25 * crooked[2])
    top = np.maximum(ground, rim)
    floor = sill - it.depth_m + 0.2 * it.depth_m * r
    shaped = np.where(r < 1.0, floor + (top - floor) * _ramp(r, 0.28, 1.0), top)
    blend = 1 - _ramp(r, 1.1, 1.9)
    ground = ground * (1 - blend) + shaped * blend
    # From the sill a shallow run leads off, so that the rim's lowest place is where it was meant.
    along, across = _along_across(x, y, it, it.sill_bearing_deg)
    run = sill - 22 * np.maximum(along - it.radius_km, 0) + 300 * np.maximum(np.abs(across) - 0.05, 0)
    ground = np.where(
        (along > 0.6 * it.radius_km) & (along < it.radius_km + 1.0) & (r > 0.6), np.minimum(ground, run), ground
    )
    return ground, 1 - _ramp(r, 1.1, 1.5), r < 0.12


def _basin(ground, x, y, it, crooked):
    bent_x, bent_y = x - it.x + 0.17 * it.radius_km * crooked[0], y - it.y + 0.17 * it.radius_km * crooked[1]
    r = np.hypot(bent_x, bent_y) / it.radius_km
    along, across = _along_across(x, y, it, it.gap_bearing_deg)
    across = np.abs(across + 0.05 * np.sin(2.2 * along))
    to_gap = np.hypot(along - it.radius_km, across)
    level = float(np.percentile(ground[r < 1.0], 20)) - 25
    floor = level + 9.0 * to_gap + 1.5 * to_gap**2  # 1–1.5 % toward the gap
    rim = level + it.rim_m * (1 + 0.16 * crooked[2])
    top = np.maximum(ground, rim)
    inside = floor + (top - floor) * _ramp(r, 0.55, 1.05)
    outside = ground + (top - ground) * (1 - _ramp(r, 1.05, 1.9))
    ground = np.where(r < 1.05, inside, outside)
    # The gap: a flat bed with steep walls that goes on falling outside, so that no water stands in it.
    bed = level - 45 * np.maximum(along - it.radius_km, 0) + 9.0 * np.maximum(it.radius_km - along, 0)
    walls = 800 * np.maximum(across - it.gap_width_m / 2000, 0)
    corridor = (along > 0.35 * it.radius_km) & (along < it.radius_km + 3.5)
    ground = np.where(corridor, np.minimum(ground, bed + walls), ground)
    hold = np.maximum(1 - _ramp(r, 0.45, 0.75), 0.6 * (1 - _ramp(r, 0.9, 1.25)))
    return ground, np.maximum(hold, corridor * (1 - _ramp(across, it.gap_width_m / 2000, 0.15)))


def islands(ground, x, y, shore_km):
    """The sea island and the lake island as low whalebacks."""
    for cx, cy, reach, above, rise in ((56.6, 16.6, 1.6, 0.0, 70.0), (23.6, 13.2, 0.8, 1130.0, 60.0)):
        near = np.hypot(x - cx, y - cy) < reach
        ground = np.where(near & (shore_km > 0), above + 1.0 + rise * shore_km**0.8, ground)
    return ground


def pond_bed(ground, near_pond, level_m):
    """Ground about the pond slopes down to it."""
    weight = 1 - _ramp(near_pond, 0.1, 0.9)
    return ground * (1 - weight) + np.maximum(level_m + 1 + 12 * near_pond, np.minimum(ground, level_m + 60)) * weight
