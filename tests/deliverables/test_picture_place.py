"""A known cell is found where it belongs on the map's picture, within half a cell, near and far from the equator."""

import numpy as np
import pandas as pd
import pytest
from pyproj import Transformer

from sitescreen.deliverables.sheet import Sheet, warped
from sitescreen.grid import Field, Grid


@pytest.mark.parametrize("latitude", [0.0, 10.0, 20.0])
@pytest.mark.parametrize("east_of_middle", [0.0, 2.4])
def test_a_known_cell_lies_within_half_a_cell(latitude: float, east_of_middle: float) -> None:
    """The middle of the marked cell by PROJ, against the middle of its pixels; a raw UTM picture misses by far."""
    lon = 39.0 + east_of_middle
    cell, size = 30.0, 801
    there = Transformer.from_crs("EPSG:4326", "EPSG:32637", always_xy=True)
    x, y = there.transform(lon, latitude)
    west, north = cell * round(x / cell) - 400 * cell, cell * round(y / cell) + 400 * cell
    values = np.zeros((size, size), dtype=np.float32)
    row, col = 97, 701  # far from the middle, where a wrong grid is off most
    values[row, col] = 1.0
    field = Field(values, Grid("EPSG:32637", west, north, cell, size, size), "1", "one cell")
    known_x, known_y = field.grid.x_centres_m()[col], field.grid.y_centres_m()[row]
    lon_cell, lat_cell = Transformer.from_crs("EPSG:32637", "EPSG:4326", always_xy=True).transform(known_x, known_y)
    to_page = Transformer.from_crs("EPSG:4326", "EPSG:3857", always_xy=True)
    page_x, page_y = to_page.transform(lon_cell, lat_cell)
    pixel = 5.0
    cols, rows = 3001, 2801
    bounds = (page_x - 1400.3 * pixel, page_y - 1500.7 * pixel, page_x + 1600.7 * pixel, page_y + 1300.3 * pixel)
    sheet = Sheet(bounds, cols, rows)
    picture = warped([field], sheet, exact=True)
    found_rows, found_cols = np.nonzero(picture == 1.0)
    assert len(found_rows) > 0
    found = pd.DataFrame(
        {"x": bounds[0] + (found_cols + 0.5) * pixel, "y": bounds[3] - (found_rows + 0.5) * pixel}
    ).mean()
    on_ground = np.cos(np.radians(lat_cell))  # a metre on the page is shorter on the ground
    off_m = np.hypot(found["x"] - page_x, found["y"] - page_y) * on_ground
    assert off_m < cell / 2
    place = sheet.pixels(np.array([lon_cell]), np.array([lat_cell]))[0]
    assert place == pytest.approx([1400.3, 1300.3], abs=0.01)
