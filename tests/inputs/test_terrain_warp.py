"""Positions on the source, and the loops that read heights there."""

import numpy as np
import pytest
from pyproj import CRS, Transformer

from sitescreen.grid import Grid
from sitescreen.inputs import _cubic_kernel as kernel
from sitescreen.inputs.datum import to_wgs84
from sitescreen.inputs.terrain_mosaic import SourceLattice
from sitescreen.inputs.terrain_warp import NODE_CELLS, positions


def lagrange(nodes: np.ndarray, at: float) -> np.ndarray:
    """The cubic through nodes −1, 0, 1, 2 by numpy's own fit."""
    return np.polyval(np.polyfit([-1.0, 0.0, 1.0, 2.0], nodes, 3), at)


@pytest.mark.parametrize(
    ("grid_crs", "west", "north", "source", "metres"),
    [
        ("EPSG:32637", 405_000.0, -1_900_080.0, "EPSG:4326", 111_000.0),
        ("EPSG:32637", 166_500.0, 450_000.0, "EPSG:4326", 111_000.0),
        ("EPSG:32637", 405_000.0, -1_900_080.0, "EPSG:32736", 1.0),
        ("EPSG:32637", 405_000.0, 8_000_010.0, "EPSG:3035", 1.0),  # 72° north, another projection
    ],
)
def test_interpolated_positions_are_those_of_each_cell(
    grid_crs: str, west: float, north: float, source: str, metres: float
) -> None:
    """At 90 m cells a node is 2,880 m from the next: half way between, a micrometre is the most that is lost."""
    grid = Grid(grid_crs, west, north, 90.0, 400, 400)
    lattice = SourceLattice(CRS(source).to_wkt(), 1.0, 1.0, 0.0, 0.0)
    datum = to_wgs84(CRS(source), "the source", None)
    u, v, offset_row, offset_col = positions(grid, slice(0, 400), slice(0, 400), lattice, datum)
    direct = Transformer.from_crs(grid_crs, source, always_xy=True)
    for row, col in [(0, 0), (17, 200), (399, 399), (133, 5), (240, 301)]:
        x, y = direct.transform(grid.x_centres_m()[col], grid.y_centres_m()[row])
        at_row, at_col = row + offset_row, col + offset_col
        k, n = at_row // NODE_CELLS, at_col // NODE_CELLS
        t_row, t_col = (at_row % NODE_CELLS) / NODE_CELLS, (at_col % NODE_CELLS) / NODE_CELLS
        for nodes, expected in ((u, x), (v, -y)):
            rows = np.array([lagrange(nodes[k - 1 : k + 3, n - 1 + j] - expected, t_row) for j in range(4)])
            assert abs(lagrange(rows, t_col)) * metres < 2e-6


def test_a_part_of_a_grid_uses_the_same_nodes() -> None:
    grid = Grid("EPSG:32637", 405_000.0, -1_900_080.0, 30.0, 300, 300)
    lattice = SourceLattice(CRS("EPSG:4326").to_wkt(), 1 / 3600, 1 / 3600, 0.0, 0.5)
    datum = to_wgs84(CRS("EPSG:4326"), "the source", None)
    u, v, row, col = positions(grid, slice(0, 300), slice(0, 300), lattice, datum)
    u2, v2, row2, col2 = positions(grid, slice(100, 200), slice(150, 290), lattice, datum)
    k, n = (row + 100 - row2) // NODE_CELLS, (col + 150 - col2) // NODE_CELLS
    assert (row + 100 - row2) % NODE_CELLS == (col + 150 - col2) % NODE_CELLS == 0
    assert u[k : k + u2.shape[0], n : n + u2.shape[1]].tobytes() == u2.tobytes()
    assert v[k : k + u2.shape[0], n : n + u2.shape[1]].tobytes() == v2.tobytes()


def test_cubic_weights_match_keys_1981() -> None:
    """Keys 1981, doi:10.1109/TASSP.1981.1163711, Eq. 15: 1 at 0, 0 at 1 and 2; by hand 0.5625 at ½, −0.0625 at 1½."""
    for cubic in (kernel._cubic, kernel._cubic.py_func):
        assert [cubic(x) for x in (0.0, 1.0, 2.0, 2.5)] == [1.0, 0.0, 0.0, 0.0]
        assert cubic(0.5) == cubic(-0.5) == 0.5625
        assert cubic(1.5) == cubic(-1.5) == -0.0625
        for past in (0.0, 0.2, 0.77):
            assert sum(cubic(k - past) for k in range(-2, 4)) == pytest.approx(1.0, abs=1e-15)


def run(
    ground: np.ndarray, u0: float, v0: float, step: float, shape: tuple[int, int], compiled: bool
) -> tuple[np.ndarray, ...]:
    """Cells of ``step`` source cells a side whose first centre lies at column u0 and row v0."""
    nodes = np.arange(-1, 4) * float(NODE_CELLS)
    u, v = np.meshgrid(u0 + nodes * step, v0 + nodes * step)
    heights = np.full(shape, np.nan, np.float32)
    under = np.zeros(shape, np.uint8)
    stored = np.full(shape, np.nan, np.float32)
    everywhere = np.ones(ground.shape, bool)
    function = kernel.read_cells if compiled else kernel.read_cells.py_func
    function(
        ground.astype(np.float32),
        everywhere,
        ~everywhere,
        np.ones(shape, bool),
        0,
        0,
        u,
        v,
        NODE_CELLS,
        NODE_CELLS,
        NODE_CELLS,
        64,
        heights,
        under,
        stored,
    )
    known = under == kernel.KNOWN
    rows = np.floor(v0 + step * np.arange(shape[0])).astype(int)
    cols = np.floor(u0 + step * np.arange(shape[1])).astype(int)
    rr, cc = np.meshgrid(rows, cols, indexing="ij")
    assert (stored[known] == ground.astype(np.float32)[rr[known], cc[known]]).all(), (
        "the cell under each centre, as it is"
    )
    assert np.isnan(stored[~known]).all()
    return heights, under


@pytest.mark.parametrize("compiled", [True, False])
def test_a_parabola_is_read_exactly_between_cells(compiled: bool) -> None:
    """Keys' cubic reproduces second-degree polynomials (its Eq. 15 has third-order accuracy)."""
    row, col = np.indices((40, 40)) + 0.5
    ground = 0.5 * (col - 20) ** 2 - 0.3 * (row - 18) ** 2 + col
    heights, under = run(ground, 10.37, 12.81, 1.0, (12, 15), compiled)
    v, u = np.indices((12, 15)) + np.array([12.81, 10.37])[:, None, None]
    assert heights == pytest.approx(0.5 * (u - 20) ** 2 - 0.3 * (v - 18) ** 2 + u, abs=1e-4)
    assert (under == kernel.KNOWN).all()


@pytest.mark.parametrize("compiled", [True, False])
def test_beside_a_gap_heights_carry_on_along_the_slope(compiled: bool) -> None:
    ground = 10.0 + 5.0 * (np.indices((40, 40))[1] + 0.5)
    ground[:, 21:24] = np.nan
    heights, under = run(ground, 10.3, 12.0, 1.0, (10, 20), compiled)
    expected = 10.0 + 5.0 * (10.3 + np.arange(20))
    expected[11:14] = np.nan
    assert heights == pytest.approx(np.broadcast_to(expected, (10, 20)), abs=1e-4, nan_ok=True)
    # the centre's own source cell decides: columns 21.3, 22.3 and 23.3 lie in the gap
    assert np.isnan(heights).any(axis=0).nonzero()[0].tolist() == [11, 12, 13]
    assert (under[:, 11:14] == kernel.VOID).all()


@pytest.mark.parametrize("compiled", [True, False])
def test_outside_the_window_is_outside(compiled: bool) -> None:
    heights, under = run(np.full((20, 20), 5.0), -3.5, 2.5, 1.0, (4, 10), compiled)
    assert (under[:, :4] == kernel.OUTSIDE).all()
    assert (heights[:, 4:] == 5.0).all()


@pytest.mark.parametrize("compiled", [True, False])
def test_cells_coarser_than_the_source_average_it(compiled: bool) -> None:
    """A chequer board of 0 and 2 read at 4 × 4 cells is 1 nearly everywhere."""
    ground = 2.0 * (np.indices((80, 80)).sum(axis=0) % 2)
    heights, _ = run(ground, 20.3, 20.3, 4.0, (8, 8), compiled)
    assert heights == pytest.approx(1.0, abs=0.02)
    sharp, _ = run(ground, 20.5, 20.5, 1.0, (8, 8), compiled)
    assert set(np.unique(sharp)) == {0.0, 2.0}
