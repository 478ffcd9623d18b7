"""Closed hollows against an answer key that somebody else made: 1 m terrain, 400 × 400 cells."""

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import rasterio
from numpy.typing import NDArray

from sitescreen.grid import Field, Grid
from sitescreen.terrain.hollows import Hollows, hollows

pytestmark = pytest.mark.real_terrain


@pytest.fixture(scope="module")
def found(open_data: Callable[[str], Path]) -> Hollows:
    """Every hollow of the terrain; there is no water to drain into."""
    with rasterio.open(open_data("hollows_1m.tif")) as source:
        heights = source.read(1)
        grid = Grid("EPSG:26915", source.bounds.left, source.bounds.top, source.res[0], *heights.shape)
    return hollows(Field(heights, grid, "m", "ground"), np.zeros(heights.shape, dtype=bool))


@pytest.fixture(scope="module")
def key(open_data: Callable[[str], Path]) -> NDArray[np.bool_]:
    """The key's depressions: it holds the height of the ground there, and 0 elsewhere."""
    with rasterio.open(open_data("hollows_1m_key.tif")) as source:
        return np.asarray(source.read(1) > 0)


def test_the_great_hollow_is_the_key_s_cell_by_cell(found: Hollows, key: NDArray[np.bool_]) -> None:
    """The key holds one depression, of 71,886 cells and 15.5 m deep; its cells are ours, none more and none less."""
    largest = int(np.argmax(found.pools.cells)) + 1  # pool 0 is no pool
    assert key.sum() == 71_886
    assert np.array_equal(found.pool_id == largest, key)
    assert np.max(found.depth_m.values[key]) == pytest.approx(15.461, abs=0.001)


def test_beyond_the_key_there_are_only_shallow_dips(found: Hollows, key: NDArray[np.bool_]) -> None:
    """All hollows together overlap with the key by 0.985: the rest are dips under 0.4 m that the key leaves out."""
    below = found.depth_m.values > 0
    assert (below & key).sum() / (below | key).sum() == pytest.approx(0.985, abs=0.001)
    assert np.max(found.depth_m.values[below & ~key]) < 0.4
