"""The relief picture: warm grey ground lit from the north-west, water as fine horizontal lines."""

import base64
import io
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from sitescreen.deliverables.sheet import Sheet, on_sheet, warped
from sitescreen.grid import Field

# red, green, blue
SHADE = np.array([150, 140, 124], dtype=np.float32)
LEVEL = np.array([236, 230, 217], dtype=np.float32)
LIGHT = np.array([253, 250, 243], dtype=np.float32)
WATER = np.array([247, 244, 236], dtype=np.float32)
WATER_LINE = np.array([176, 170, 156], dtype=np.float32)

SUN_HEIGHT_DEG = 45.0
LINE_EVERY = 5
QUALITY = 60


def shading(elevation: Field) -> Field:
    """How much light ground takes from the north-west, against level ground.

    Parameters
    ----------
    elevation : Field
        [m]

    Returns
    -------
    Field
        0 on level ground, up to about ±0.7. Heights are drawn out so that the steeper tenth of the ground stands out.
    """
    north, east = np.gradient(elevation.values.astype(np.float32), elevation.grid.cell_size_m)
    north = -north  # rows run south
    steep = np.hypot(north, east)
    known = steep[np.isfinite(steep) & (steep > 0)]
    exaggeration = float(np.clip(0.55 / np.percentile(known, 90), 1.0, 5.0)) if known.size else 1.0
    z_east, z_north = exaggeration * east, exaggeration * north
    height = np.radians(SUN_HEIGHT_DEG)
    # light from 315°: it comes from the west (−x) and the north (+y)
    lit = np.sin(height) + np.cos(height) * (z_east - z_north) * np.sqrt(0.5)
    lit = lit / np.sqrt(1.0 + z_east**2 + z_north**2) - np.sin(height)
    return Field(lit, elevation.grid, "1", "Light from the north-west")


def water_on(shore_distance: Sequence[Field], sheet: Sheet) -> NDArray[np.bool_]:
    """Where the sheet shows mapped water: the distance to the shore is 0 there."""
    parts = [part for field in shore_distance if (part := on_sheet(field, sheet)) is not None]
    if not parts:
        return np.zeros((sheet.rows, sheet.cols), dtype=np.bool_)
    return np.asarray(warped(parts, sheet, exact=True) == 0.0)


def relief_picture(elevation: Sequence[Field], water: NDArray[np.bool_], sheet: Sheet) -> NDArray[np.uint8] | None:
    """The ground of the sheet in colour, shape (rows, cols, 4); unknown ground is clear. None without any ground."""
    parts = [part for field in elevation if (part := on_sheet(field, sheet)) is not None]
    parts = [part for part in parts if min(part.grid.shape) > 1]
    if not parts:
        return None
    light = warped([shading(part) for part in parts], sheet, exact=False)
    bare = np.isnan(light)
    light = np.nan_to_num(light)[..., None]
    darker, brighter = np.clip(-light / 0.6, 0, 1) ** 0.8, np.clip(light / 0.35, 0, 1)
    colour = LEVEL + darker * (SHADE - LEVEL) + brighter * (LIGHT - LEVEL)
    lines = np.zeros_like(water)
    lines[::LINE_EVERY] = True
    colour = np.where(water[..., None], np.where(lines[..., None], WATER_LINE, WATER), colour)
    alpha = np.where(bare & ~water, 0, 255)
    return np.dstack([colour, alpha]).round().astype(np.uint8)


def webp(picture: NDArray[np.uint8], *, lossless: bool) -> str:
    """A picture as a data address, for a page that must not ask the network for anything.

    Parameters
    ----------
    picture : uint8 array, shape (rows, cols, 4)
        Red, green, blue, alpha.
    lossless : bool
        For pictures whose colours are classes.
    """
    from PIL import Image

    file = io.BytesIO()
    # for lossless pictures quality and method are effort only: more buys 2 % of the bytes for twice the time
    effort = {"lossless": True, "quality": 0, "method": 1} if lossless else {"quality": QUALITY, "method": 4}
    Image.fromarray(picture, "RGBA").save(file, "WEBP", **effort)
    return "data:image/webp;base64," + base64.b64encode(file.getvalue()).decode("ascii")
