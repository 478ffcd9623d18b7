"""Fields as GeoTIFF."""

import subprocess
import sys
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio

from sitescreen.deliverables.layers import file_name, write_layer
from sitescreen.grid import Field, Grid


def test_a_layer_comes_back_as_it_went_in(tmp_path: Path) -> None:
    """Values, place (south of the equator in the northern system), unit, meaning; unknown stays unknown."""
    grid = Grid("EPSG:32637", 450_000.0, -180_000.0, 30.0, 40, 50)
    values = np.random.default_rng(1).normal(size=grid.shape).astype(np.float32)
    values[3, 4] = np.nan
    write_layer(Field(values, grid, "K", "Colder than open ground"), tmp_path / "x.tif")
    with rasterio.open(tmp_path / "x.tif") as layer:
        assert np.isnan(layer.read(1)[3, 4])
        assert layer.read(1) == pytest.approx(values, abs=0.5 / 64, nan_ok=True), "to the nearest 1/64 K"
        assert layer.crs.to_epsg() == 32637
        assert layer.transform == grid.transform
        assert np.isnan(layer.nodata)
        assert layer.units == ("K",)
        assert layer.descriptions == ("Colder than open ground",)
        assert layer.tags()["unit"] == "K"
        assert layer.tags(ns="IMAGE_STRUCTURE")["LAYOUT"] == "COG"


def test_large_layers_have_overviews(tmp_path: Path) -> None:
    grid = Grid("EPSG:32637", 450_000.0, -180_000.0, 30.0, 600, 1100)
    write_layer(Field(np.zeros(grid.shape), grid, "m", "Height"), tmp_path / "x.tif")
    with rasterio.open(tmp_path / "x.tif") as layer:
        assert layer.overviews(1)
        assert layer.block_shapes == [(512, 512)]


def test_a_full_disk_is_an_os_error(tmp_path: Path) -> None:
    """GDAL has a word of its own for it, which is no OSError."""
    code = (
        "import resource, signal, sys, numpy as np; from pathlib import Path\n"
        "from sitescreen.grid import Field, Grid; from sitescreen.deliverables.layers import write_layer\n"
        "grid = Grid('EPSG:32637', 450_000.0, -180_000.0, 30.0, 300, 300)\n"
        "field = Field(np.random.default_rng(1).normal(size=grid.shape), grid, 'K', 'x')\n"
        "signal.signal(signal.SIGXFSZ, signal.SIG_IGN)\n"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (100_000, 100_000))\n"
        "try:\n    write_layer(field, Path(sys.argv[1]))\nexcept OSError:\n    sys.exit(28)\n"
    )
    done = subprocess.run([sys.executable, "-c", code, str(tmp_path / "x.tif")], capture_output=True, check=False)
    assert done.returncode == 28, done.stderr


def test_file_names_are_tame() -> None:
    assert file_name("slope_deg_utm37") == "slope_deg_utm37.tif"
    assert "/" not in file_name("../../x y")


def test_every_field_gets_a_layer(screening: Any) -> None:
    assert len({file_name(key) for key in screening.fields}) == len(screening.fields)
