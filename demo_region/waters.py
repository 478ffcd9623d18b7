"""Sea, lake, islands, a creek and a pond: the shorelines, drawn first as lines, then given to the ground."""

import numpy as np
import rasterio.features
import shapely
from affine import Affine
from frame import CELL, COLLAR_CELL, COLLAR_COLS, COLLAR_REACH, COLLAR_ROWS, COLS, KM_EAST, KM_NORTH, ROWS
from shapely.geometry import LineString, Polygon

LAKE_LEVEL_M = 1130.0
POND_LEVEL_M = 722.0


def _waves(seed, count, longest):
    """A smooth random curve: sums of sines with wavelengths from ``longest`` down, about ±1."""
    rng = np.random.Generator(np.random.PCG64(seed))
    lengths = longest / np.arange(1, count + 1)
    phases = rng.uniform(0, 2 * np.pi, count)
    heights = rng.normal(0, 1, count) / np.arange(1, count + 1) ** 0.9
    return lambda t: sum(
        h * np.sin(2 * np.pi * np.asarray(t) / length + p)
        for h, length, p in zip(heights, lengths, phases, strict=True)
    )


def coast_x_km(y_km):
    """Where the open coast lies at each northing, in kilometres."""
    return 53.3 + 0.45 * _waves(11, 30, 46.0)(y_km) + 0.75 * np.sin((np.asarray(y_km) - 3) / 5.1)


def _blob(x, y, radius, seed, rough=0.12, stretch=1.0):
    """A rounded shape about a centre, in kilometres."""
    turn = np.linspace(0, 2 * np.pi, 361)[:-1]
    curve = _waves(seed, 14, 2 * np.pi)(turn)
    reach = radius * (1 + rough * curve)
    return Polygon(np.column_stack([x + reach * np.cos(turn), y + stretch * reach * np.sin(turn)]))


def draw_waters():
    """All waters in kilometres: {name: (kind, polygon)}; islands are holes, the creek is a tongue of the sea.

    The sea reaches 45 km beyond the terrain, as a shoreline file would.
    """
    y = np.arange(-50, 90.01, 0.05)
    coast = np.column_stack([coast_x_km(y), y])
    sea = Polygon([*coast, (105, 90), (105, -50)])
    mouth = float(coast_x_km(6.4))
    bends = [(0.4, 6.4), (-0.6, 6.5), (-1.3, 6.1), (-2.2, 6.3), (-3.0, 6.9), (-3.9, 6.7)]
    creek = [(mouth + x, y) for x, y in bends]
    sea = sea.union(rounded(creek).buffer(0.09))
    sea = sea.difference(_blob(56.6, 16.6, 0.62, 31, stretch=1.5))
    lake = _blob(18.5, 10.2, 6.8, 23, rough=0.07, stretch=1.0).difference(_blob(23.6, 13.2, 0.33, 41, stretch=0.8))
    pond = _blob(36.1, 30.2, 0.26, 51, stretch=0.8)
    return {
        "Amberlith Sea": ("sea", sea),
        "Lake Ondurwen": ("lake", lake),
        "Pemmarick Pond": ("lake", pond),
    }


def rounded(points, times=3):
    """A line through (near) some points, its corners cut three times (Chaikin)."""
    points = np.asarray(points, dtype=float)
    for _ in range(times):
        inner = np.empty((2 * len(points) - 2, 2))
        inner[0::2] = 0.75 * points[:-1] + 0.25 * points[1:]
        inner[1::2] = 0.25 * points[:-1] + 0.75 * points[1:]
        points = np.vstack([points[:1], inner, points[-1:]])
    return LineString(points)


def cells_inside(shape, *, collar=False):
    """Cells of the tile (or of the collar) whose centre lies in a shape given in kilometres."""
    if collar:
        step, rows, cols, reach = COLLAR_CELL, COLLAR_ROWS, COLLAR_COLS, COLLAR_REACH
    else:
        step, rows, cols, reach = CELL, ROWS, COLS, 0
    east, north = step * KM_EAST, step * KM_NORTH
    transform = Affine(east, 0, -reach * east, 0, -north, (rows - reach) * north)
    return rasterio.features.rasterize([(shape, 1)], (rows, cols), transform=transform, dtype="uint8").astype(bool)


def width_km(shape):
    """Twice the radius of the largest circle that fits, in kilometres."""
    line = shapely.maximum_inscribed_circle(shape)
    return 2 * line.length
