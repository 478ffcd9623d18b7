"""The relief picture."""

import base64
import io

import numpy as np
import pytest
from PIL import Image

from sitescreen.deliverables.relief import LEVEL, relief_picture, shading, water_on, webp
from sitescreen.deliverables.sheet import Sheet
from sitescreen.grid import Field, Grid

GRID = Grid("EPSG:3857", 0.0, 9_000.0, 90.0, 100, 100)
SHEET = Sheet((0.0, 0.0, 9_000.0, 9_000.0), 100, 100)


def cone() -> Field:
    x, y = GRID.x_centres_m()[None, :] - 4_500, GRID.y_centres_m()[:, None] - 4_500
    return Field(np.maximum(0, 400 - 0.2 * np.hypot(x, y)), GRID, "m", "A cone")


def test_light_comes_from_the_north_west() -> None:
    light = shading(cone()).values
    assert light[40, 40] > 0.05  # row 40 lies north of the top, column 40 west of it
    assert light[60, 60] < -0.05
    assert light[40, 60] == pytest.approx(light[60, 40], abs=1e-5)
    assert light[1, 1] == pytest.approx(0, abs=1e-6)  # level ground


def test_light_on_a_plane_is_the_cosine_to_the_sun() -> None:
    """A plane rising 1 in 1 to the south-east faces the sun at 45° squarely: light 1, less that of level ground."""
    x, y = GRID.x_centres_m()[None, :], GRID.y_centres_m()[:, None]
    plane = Field((x - y) / np.sqrt(2), GRID, "m", "A plane")
    assert shading(plane).values[50, 50] == pytest.approx(1 - np.sin(np.radians(45)), abs=1e-5)


def test_level_ground_unknown_ground_and_water() -> None:
    height = np.zeros(GRID.shape, np.float32)
    height[:20] = np.nan
    shore_km = np.ones(GRID.shape, np.float32)
    shore_km[60:] = 0
    water = water_on([Field(shore_km, GRID, "km", "Distance to the shore")], SHEET)
    picture = relief_picture([Field(height, GRID, "m", "Flat")], water, SHEET)
    assert picture is not None
    assert picture[5, 50, 3] == 0
    assert picture[40, 50].tolist() == [*LEVEL.astype(int), 255]
    darkness = picture[70:90, 50, 0].astype(int)
    assert len(set(darkness)) == 2  # lines and the water between them
    assert (picture[70:90, 50, 3] == 255).all()


def test_no_ground_no_picture() -> None:
    nothing = np.zeros((SHEET.rows, SHEET.cols), bool)
    assert relief_picture([], nothing, SHEET) is None
    assert not water_on([], SHEET).any()


def test_pictures_are_in_the_page_itself() -> None:
    picture = np.zeros((4, 6, 4), np.uint8)
    picture[1, 2] = (40, 40, 82, 255)
    address = webp(picture, lossless=True)
    head, body = address.split(",")
    assert head == "data:image/webp;base64"
    back = np.asarray(Image.open(io.BytesIO(base64.b64decode(body))).convert("RGBA"))
    assert back.shape == (4, 6, 4)
    assert back[1, 2].tolist() == [40, 40, 82, 255]
