"""Where the invented region lies, and its ruler: kilometres east and north of its south-west corner.

Open ocean in the southern Indian Ocean, so that no real ground, place or person is meant. The whole region, collar
included, lies inside one block of the program's lattice and at least 29 km from the block's edges.
"""

import numpy as np

# Outer corners of the 1″ tile [°]: about 60 × 40 km.
WEST, SOUTH = 62.48, -6.9
COLS, ROWS = 1953, 1302
CELL = 1 / 3600
# The 3″ collar also lies under the tile and reaches 8 km beyond it to the west, north and south (the east is sea).
COLLAR_CELL = 3 / 3600
COLLAR_REACH = 87  # cells of 3″
COLLAR_WEST, COLLAR_SOUTH = WEST - COLLAR_REACH * COLLAR_CELL, SOUTH - COLLAR_REACH * COLLAR_CELL
COLLAR_COLS, COLLAR_ROWS = COLS // 3 + COLLAR_REACH, ROWS // 3 + 2 * COLLAR_REACH

# Kilometres in a degree at 6.72° S on WGS84; over 0.25° of latitude they change by less than 1 in 1,500.
KM_EAST, KM_NORTH = 110.562, 110.590
CELL_KM = CELL * (KM_EAST + KM_NORTH) / 2
COLLAR_CELL_KM = 3 * CELL_KM


def lon_lat(x_km, y_km):
    """Longitude and latitude of a place given in kilometres east and north of the tile's south-west corner."""
    return WEST + np.asarray(x_km) / KM_EAST, SOUTH + np.asarray(y_km) / KM_NORTH


def tile_km():
    """Cell centres of the 1″ tile: x, y, each of shape (rows, cols), in kilometres."""
    x = (np.arange(COLS) + 0.5) * CELL * KM_EAST
    y = (ROWS - np.arange(ROWS) - 0.5) * CELL * KM_NORTH
    return np.meshgrid(x, y)


def collar_km():
    """Cell centres of the 3″ collar: x, y, each of shape (rows, cols), in kilometres."""
    x = (np.arange(COLLAR_COLS) + 0.5 - COLLAR_REACH) * COLLAR_CELL * KM_EAST
    y = (COLLAR_ROWS - np.arange(COLLAR_ROWS) - 0.5 - COLLAR_REACH) * COLLAR_CELL * KM_NORTH
    return np.meshgrid(x, y)
