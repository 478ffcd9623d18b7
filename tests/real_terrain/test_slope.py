"""Slope and aspect of real terrain against gdaldem, cell by cell."""

import subprocess
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import rasterio
from numpy.typing import NDArray

from sitescreen.grid import Field
from sitescreen.screening import Screening
from sitescreen.terrain.slope import aspect_deg, slope_deg

pytestmark = pytest.mark.real_terrain


def gdaldem(program: str, mode: str, elevation: Field, folder: Path) -> NDArray[np.float64]:
    """What GDAL's own program makes of a field (Horn's window is its default); NaN where it has no answer."""
    source, target = folder / "elevation.tif", folder / f"{mode}.tif"
    rows, cols = elevation.grid.shape
    profile = {"driver": "GTiff", "height": rows, "width": cols, "count": 1, "dtype": "float32", "nodata": np.nan}
    with rasterio.open(source, "w", crs=elevation.grid.crs, transform=elevation.grid.transform, **profile) as out:
        out.write(elevation.values, 1)
    subprocess.run([program, mode, str(source), str(target), "-q"], check=True)
    with rasterio.open(target) as made:
        return made.read(1, masked=True).astype(np.float64).filled(np.nan)


@pytest.fixture(params=["lake_screening", "ocean_screening"])
def elevation(request: pytest.FixtureRequest) -> Field:
    """Ground of each tile on the program's own grid, as the screening saw it."""
    screening: Screening = request.getfixturevalue(request.param)
    return screening.fields["elevation_m"]


def test_slope_agrees_with_gdaldem(elevation: Field, outside_program: Callable[[str], str], tmp_path: Path) -> None:
    found = slope_deg(elevation).values.astype(np.float64)
    expected = gdaldem(outside_program("gdaldem"), "slope", elevation, tmp_path)
    assert np.array_equal(np.isnan(found), np.isnan(expected))
    # both keep float32; 1e-4° is some hundred roundings of a height of 500 m over 90 m cells
    assert np.nanmax(np.abs(found - expected)) < 1e-3


def test_aspect_agrees_with_gdaldem(elevation: Field, outside_program: Callable[[str], str], tmp_path: Path) -> None:
    """Where the ground is steeper than 0.1°: on flatter ground one rounding turns the arrow."""
    steep = slope_deg(elevation).values > 0.1
    found = aspect_deg(elevation).values.astype(np.float64)[steep]
    expected = gdaldem(outside_program("gdaldem"), "aspect", elevation, tmp_path)[steep]
    apart = np.abs((found - expected + 180.0) % 360.0 - 180.0)
    assert steep.mean() > 0.5
    assert np.nanmax(apart) < 0.1
    assert not np.isnan(apart).any()
