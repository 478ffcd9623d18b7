"""Which files belong together, and where their cells lie."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from pyproj import CRS

from sitescreen.inputs.terrain_files import RasterFile
from sitescreen.inputs.terrain_mosaic import lattice_of, mosaics

WGS84 = CRS("EPSG:4326").to_wkt()
SECOND = 1 / 3600


def file(
    west: float, north: float, step_x: float = SECOND, step_y: float | None = None, n: int = 3600, crs: str = WGS84
) -> RasterFile:
    return RasterFile(
        path=Path(f"{west}_{north}.tif"),
        crs_wkt=crs,
        west=west,
        north=north,
        step_x=step_x,
        step_y=step_y or step_x,
        rows=n,
        cols=n,
        upside_down=False,
        mirrored=False,
        unit_m=1.0,
        scale=1.0,
        offset=0.0,
        nodata=None,
        masked=False,
    )


@pytest.mark.parametrize("step", [SECOND, 0.000277777777778, 0.00027777778, 0.00027778])
def test_whole_second_tiles_join_however_many_digits_their_headers_have(step: float) -> None:
    tiles = [file(36.0, -2.0, step), file(37.0, -2.0, step), file(37.0, 11.0)]
    (mosaic,) = mosaics(tiles)
    assert mosaic.lattice.step_x == SECOND
    assert mosaic.places == ((7200, 129600), (7200, 133200), (-39600, 133200))


def test_tiles_with_a_shared_row_and_column_lie_half_a_cell_off() -> None:
    half = SECOND / 2
    (mosaic,) = mosaics([file(36.0 - half, -2.0 + half, n=3601), file(37.0 - half, -2.0 + half, n=3601)])
    assert (mosaic.lattice.phase_x, mosaic.lattice.phase_y) == (0.5, 0.5)
    assert mosaic.places[1][1] - mosaic.places[0][1] == 3600


def test_files_off_the_lattice_step_or_system_stand_apart() -> None:
    whole = file(36.0, -2.0)
    assert len(mosaics([whole, file(37.0 - SECOND / 2, -2.0)])) == 2
    assert len(mosaics([whole, file(37.0, -2.0, 3 * SECOND, n=1200)])) == 2
    assert len(mosaics([whole, file(37.0, -2.0, SECOND, 1.5 * SECOND)])) == 2
    assert len(mosaics([whole, file(37.0, -2.0, crs=CRS("EPSG:4258").to_wkt())])) == 2


def test_two_wordings_of_one_system_are_one() -> None:
    other = CRS("EPSG:32637").to_wkt("WKT1_GDAL")
    one = CRS("EPSG:32637").to_wkt()
    assert other != one
    assert len(mosaics([file(5e5, 0.0, 30.0, crs=one, n=10), file(5e5 + 300, 0.0, 30.0, crs=other, n=10)])) == 1


def test_a_step_that_is_not_round_is_kept() -> None:
    odd = lattice_of(file(36.123, -2.0, 0.00031234567, n=500))
    assert odd.step_x == 0.00031234567
    assert lattice_of(file(500_010.0, 30.0, 27.3, crs=CRS("EPSG:32637").to_wkt())).step_x == 27.3


def test_positions_go_there_and_back() -> None:
    lattice = lattice_of(file(36.0, -2.0))
    x, y = np.array([36.0, 36.5]), np.array([-2.0, -2.75])
    assert lattice.x_of(lattice.cells_x(x)) == pytest.approx(x, abs=1e-12)
    assert lattice.y_of(lattice.cells_y(y)) == pytest.approx(y, abs=1e-12)


def test_the_outline_is_that_of_the_union() -> None:
    """Corners only where the outline turns, whatever tiles it is made of; holes stay."""
    whole = mosaics([file(36.0, 0.0, n=600)])[0].outline()
    parts = [file(36.0 + i * 300 * SECOND, -j * 300 * SECOND, n=300) for i in range(2) for j in range(2)]
    assert mosaics(parts)[0].outline().wkb == whole.wkb
    ring = [
        replace(one, path=Path(f"r{k}"))
        for k, one in enumerate(
            file(36.0 + i * 0.1, -j * 0.1, n=360) for i in range(3) for j in range(3) if (i, j) != (1, 1)
        )
    ]
    outline = mosaics(ring)[0].outline()
    assert outline.area == pytest.approx(8 * 0.01)
    assert len(outline.geoms[0].interiors) == 1


def test_once_round_the_earth_is_known_for_degrees_only() -> None:
    assert mosaics([file(36.0, 0.0)])[0].turn_cells == 1_296_000
    assert mosaics([file(36.0, 0.0, 0.00031234567, n=10)])[0].turn_cells is None
    assert mosaics([file(5e5, 0.0, 30.0, crs=CRS("EPSG:32637").to_wkt())])[0].turn_cells is None
