"""Closed hollows against an answer key that somebody else made: 1 m terrain, 400 × 400 cells."""

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import rasterio
from sitescreen.terrain.hollows import hollows

from sitescreen.grid import Field, Grid

pytestmark = pytest.mark.real_terrain


def test_hollows_agree_with_the_answer_key(open_data: Callable[[str], Path]) -> None:
    """Intersection over union of the cells below a sill, with the key's cells.

    A plain flood fill, made apart from this program, agrees with the key at 0.985; the rest is the key's own smoothing.
    """
    with rasterio.open(open_data("hollows_1m.tif")) as source:
        west, north, size = source.bounds.left, source.bounds.top, source.res[0]
        heights = source.read(1)
    with rasterio.open(open_data("hollows_1m_key.tif")) as source:
        key = source.read(1) > 0  # height of the ground in depressions, 0 elsewhere
    elevation = Field(heights, Grid("EPSG:26915", west, north, size, *heights.shape), "m", "ground")
    found = hollows(elevation, np.zeros(heights.shape, dtype=bool))
    below = found.depth_m.values > 0
    assert (below & key).sum() / (below | key).sum() == pytest.approx(0.985, abs=0.002)
