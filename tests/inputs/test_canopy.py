"""Trees taken off a terrain model that shows their tops."""

from pathlib import Path

import numpy as np
import pytest
import rasterio
from affine import Affine

from sitescreen.brief import TerrainBrief
from sitescreen.errors import BriefError, InputError
from sitescreen.grid import Grid
from sitescreen.inputs.terrain import open_terrain

CELLS = 60
WEST, NORTH = 500_010.0, 300_030.0
WHERE = Affine(30.0, 0.0, WEST, 0.0, -30.0, NORTH)
INNER = Grid("EPSG:32641", WEST + 150.0, NORTH - 150.0, 30.0, CELLS - 10, CELLS - 10)


def write(path: Path, values: np.ndarray) -> Path:
    with rasterio.open(
        path, "w", "GTiff", CELLS, CELLS, 1, "EPSG:32641", WHERE, dtype="float32", nodata=-9999.0
    ) as out:
        out.write(np.where(np.isnan(values), -9999.0, values).astype(np.float32), 1)
    return path


def ground() -> np.ndarray:
    return np.repeat(400.0 - 0.6 * np.arange(CELLS)[:, None], CELLS, axis=1)


def trees() -> np.ndarray:
    """18 m everywhere but in a clearing of 360 m."""
    out = np.full((CELLS, CELLS), 18.0)
    out[24:36, 24:36] = 0.0
    return out


def test_the_clearing_reads_as_bare_ground(tmp_path: Path) -> None:
    """The trap: 18 m of canopy round a clearing of 360 m on ground of 2 % slope makes a hollow that is none."""
    tops = write(tmp_path / "tops.tif", ground() + trees())
    canopy = write(tmp_path / "trees.tif", trees())
    bare = open_terrain(TerrainBrief(files=[write(tmp_path / "bare.tif", ground())], surface="bare"))
    given = open_terrain(TerrainBrief(files=[tops], surface="canopy", canopy_height=canopy))
    assert given.surface == "bare"
    assert given.stamps[-1].name == "trees.tif"
    wanted = bare.elevation(INNER).values
    assert given.elevation(INNER).values == pytest.approx(wanted, abs=1e-3)
    without = open_terrain(TerrainBrief(files=[tops], surface="canopy"))
    assert without.surface == "canopy"
    assert (without.elevation(INNER).values - wanted).max() == pytest.approx(18.0, abs=2.0)


def test_where_the_canopy_has_no_value_nothing_is_taken_off(tmp_path: Path) -> None:
    holey = trees()
    holey[:, :30] = np.nan
    tops = write(tmp_path / "tops.tif", ground() + trees())
    terrain = open_terrain(
        TerrainBrief(files=[tops], surface="canopy", canopy_height=write(tmp_path / "trees.tif", holey))
    )
    found = terrain.elevation(INNER).values
    assert found[2, 2] == pytest.approx(ground()[7, 7] + 18.0, abs=1e-3)
    assert found[2, -3] == pytest.approx(ground()[7, -8], abs=1e-3)
    assert any("where it has none" in note.text for note in terrain.notes)


def test_heights_that_no_tree_has_are_refused(tmp_path: Path) -> None:
    tops = write(tmp_path / "tops.tif", ground() + trees())
    wrong = write(tmp_path / "wrong.tif", ground())
    terrain = open_terrain(TerrainBrief(files=[tops], surface="canopy", canopy_height=wrong))
    with pytest.raises(InputError, match=r"wrong\.tif is 36\d"):
        terrain.elevation(INNER)


def test_a_bare_model_has_no_trees_to_take_off(tmp_path: Path) -> None:
    tops, canopy = write(tmp_path / "tops.tif", ground()), write(tmp_path / "trees.tif", trees())
    with pytest.raises(BriefError, match="bare ground"):
        open_terrain(TerrainBrief(files=[tops], surface="bare", canopy_height=canopy))
