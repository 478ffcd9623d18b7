"""Skylines and upwind angles: closed forms, exact rays, unknown ground, the lattice, the Earth's curve."""

import math
from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.terrain import _horizon_kernel as kernel
from sitescreen.terrain import _march_kernel as march_kernel
from sitescreen.terrain import _profile_kernel as profile_kernel
from sitescreen.terrain.horizon import (
    EARTH_RADIUS_M,
    REFRACTION,
    _lines,
    _near_samples,
    _rays,
    horizon_profile,
    horizon_stream,
    horizon_sweep,
    horizon_tangent,
    transposed,
    upwind_tangent,
)

EVERY_22_5 = [22.5 * k for k in range(16)]


def field(values: object, cell_size_m: float = 30.0, west_m: float = 0.0, north_m: float = 0.0) -> Field:
    array = np.asarray(values, dtype=np.float32)
    return Field(array, Grid("EPSG:32637", west_m, north_m, cell_size_m, *array.shape), "m", "test ground")


def ground(formula: Callable[..., object], cells: int, cell_size_m: float = 30.0) -> Field:
    """Ground z(x, y), x east and y north, both 0 in the middle."""
    across = (np.arange(cells) - cells // 2) * cell_size_m
    x, y = np.meshgrid(across, -across)
    return field(formula(x, y), cell_size_m)


def hills(cells: int, seed: int, smooth_cells: float = 6.0, height_m: float = 150.0) -> np.ndarray:
    """Rounded hills, higher than the cells are wide: slopes of about 10°."""
    from scipy.ndimage import gaussian_filter

    noise = gaussian_filter(np.random.default_rng(seed).standard_normal((cells, cells)), smooth_cells, mode="wrap")
    return (noise / noise.std() * height_m / 2 + 800).astype(np.float32)


def angle(f: Field, azimuth: float, earth_curvature: bool = False) -> np.ndarray:
    return np.degrees(np.arctan(horizon_tangent(f, azimuth, earth_curvature)))


# closed forms


@pytest.mark.parametrize("azimuth", [0.0, 10.0, 45.0, 80.0, 90.0, 135.0, 200.0, 270.0, 333.0])
def test_plane_shows_its_own_rise_in_every_azimuth(azimuth: float) -> None:
    """A plane's skyline is its directional slope, up or down."""
    f = ground(lambda x, y: 0.3 * x - 0.4 * y, 31)
    rise = 0.3 * math.sin(math.radians(azimuth)) - 0.4 * math.cos(math.radians(azimuth))
    assert horizon_tangent(f, azimuth, False)[5:-5, 5:-5] == pytest.approx(rise, abs=2e-5)


@pytest.mark.parametrize("azimuth", [315.0, 337.5, 0.0, 10.0, 45.0])
def test_wall_to_the_north(azimuth: float) -> None:
    """A straight east–west wall, 60 m over the plain from 600 m on: tan = 0.1·cos(azimuth); nothing to the south."""
    f = ground(lambda _, y: 60.0 * (y >= 600.0), 121)
    got = horizon_tangent(f, azimuth, False)[60, 60]
    assert got == pytest.approx(0.1 * math.cos(math.radians(azimuth)), abs=1e-6)
    assert horizon_tangent(f, 180.0 - azimuth, False)[60, 60] == 0.0


@pytest.mark.parametrize("azimuth", [60.0, 75.0, 285.0])
def test_wall_at_a_glance_is_read_a_sample_late_at_most(azimuth: float) -> None:
    """Rays nearer to east–west are read a column at a time: the wall's foot may lie up to one sample further.

    Mixing the lines beside the viewer, whose walls are nearer and further, adds half a hundredth at most.
    """
    f = ground(lambda _, y: 60.0 * (y >= 600.0), 241)
    got = horizon_tangent(f, azimuth, False)[120, 120]
    distance = 600.0 / math.cos(math.radians(azimuth))
    sample = 30.0 / abs(math.sin(math.radians(azimuth)))
    assert 60.0 / (distance + sample) <= got <= 60.0 / distance * 1.005


@pytest.mark.parametrize("azimuth", EVERY_22_5)
def test_cone_pit_has_one_skyline_all_round(azimuth: float) -> None:
    """At the apex of a pit with sides of 30° the skyline stands at 30° (openness 90° − 30° = 60°).

    Between the eight compass directions the ground between cells, which is what counts, stands 2° above the cone.
    """
    f = ground(lambda x, y: np.hypot(x, y) * math.tan(math.radians(30)), 81)
    got = angle(f, azimuth)[40, 40]
    middle = np.array([40.5 * 30.0]), np.array([-40.5 * 30.0])
    exact = horizon_profile(f, *middle, np.array([azimuth]), earth_curvature=False).angle_deg[0, 0]
    assert got == pytest.approx(exact, abs=1e-4)
    assert got == pytest.approx(30.0, abs=1e-4 if azimuth % 45 == 0 else 2.1)


def test_valley_floor_sees_its_walls_foreshortened() -> None:
    """V-shaped valley from north to south, walls of 30°: 30° across, 22.2077° on the diagonals, 0° along."""
    f = ground(lambda x, _: np.abs(x) * math.tan(math.radians(30)), 61)
    floor = {az: angle(f, az)[30, 30] for az in (0.0, 45.0, 90.0, 135.0, 180.0, 225.0, 270.0, 315.0)}
    assert floor[0.0] == floor[180.0] == pytest.approx(0.0, abs=1e-5)
    assert floor[90.0] == floor[270.0] == pytest.approx(30.0, abs=1e-4)
    assert floor[45.0] == pytest.approx(22.2077, abs=1e-4)
    assert sum(90.0 - a for a in floor.values()) / 8 == pytest.approx(71.396, abs=1e-3)  # openness


@pytest.mark.parametrize("turn", EVERY_22_5)
def test_valley_turned_by_22_5_degrees(turn: float) -> None:
    """The same valley turned with the map and sampled anew: along it, across it and on its diagonals."""
    s, c = math.sin(math.radians(turn)), math.cos(math.radians(turn))
    f = ground(lambda x, y: np.abs(x * c - y * s) * math.tan(math.radians(30)), 121)
    floor = {off: float(angle(f, (turn + off) % 360)[60, 60]) for off in (0.0, 45.0, 90.0, 180.0, 225.0, 270.0)}
    # where the sharp floor runs askew, the ground between cell centres beside it stands in the way
    middle = np.array([60.5 * 30.0]), np.array([-60.5 * 30.0])
    along = horizon_profile(f, *middle, np.array([turn, turn + 180.0]), earth_curvature=False).angle_deg[0]
    if turn % 45 == 0:
        assert along == pytest.approx(0.0, abs=1e-3)
    assert [floor[0.0], floor[180.0]] == pytest.approx(list(along), abs=1e-3)
    assert floor[90.0] == pytest.approx(30.0, abs=0.01)
    assert floor[270.0] == pytest.approx(30.0, abs=0.01)
    assert floor[45.0] == pytest.approx(22.2077, abs=0.01)
    assert floor[225.0] == pytest.approx(22.2077, abs=0.01)


@pytest.mark.parametrize("turn", EVERY_22_5)
def test_plane_turned_by_22_5_degrees(turn: float) -> None:
    """Whatever way a slope of 20° faces, it rises by as much towards its own back."""
    s, c = math.sin(math.radians(turn)), math.cos(math.radians(turn))
    f = ground(lambda x, y: math.tan(math.radians(20)) * (x * s + y * c), 61)
    for off in (0.0, 22.5, 90.0, 157.5, 180.0, 300.0):
        expected = math.tan(math.radians(20)) * math.cos(math.radians(off))
        assert horizon_tangent(f, (turn + off) % 360, False)[5:-5, 5:-5] == pytest.approx(expected, abs=2e-5)


def test_sum_of_eight_skylines_on_a_wall() -> None:
    """A 20° wall to the north only: 20 + 2·atan(tan 20°·cos 45°) = 48.866° over the eight compass directions."""
    f = ground(lambda _, y: 600.0 * math.tan(math.radians(20)) * (y >= 600.0), 201)
    total = sum(max(float(angle(f, az)[100, 100]), 0.0) for az in (0, 45, 90, 135, 180, 225, 270, 315))
    assert total == pytest.approx(48.866, abs=1e-3)


def test_far_ground_sinks_behind_the_curve() -> None:
    """A 500 m summit 60 km away: tan = 500/d − d·(1 − 0.13)/2R."""
    values = np.zeros((3, 2001))
    values[:, 2000] = 500.0
    got = horizon_tangent(field(values), 90.0)[1, 0]
    assert got == pytest.approx(500 / 60_000 - 60_000 * (1 - REFRACTION) / (2 * EARTH_RADIUS_M), abs=1e-6)
    assert horizon_tangent(field(values), 90.0, False)[1, 0] == pytest.approx(500 / 60_000, abs=1e-6)


@pytest.mark.parametrize("cells_away", [7, 8, 23, 24, 25, 26])
def test_near_and_far_ground_sink_alike(cells_away: int) -> None:
    """A 500 m summit on cells of 2 km, as near as rays are followed and further: the same closed form.

    The viewer stands in an even column of the lattice, where far ground is looked up; columns between are mixed.
    """
    values = np.full((3, 60), -2000.0)
    values[:, 6] = 0.0
    values[:, 6 + cells_away] = 500.0
    distance = cells_away * 2000.0
    got = horizon_tangent(field(values, 2000.0), 90.0)[1, 6]
    assert got == pytest.approx(500 / distance - distance * (1 - REFRACTION) / (2 * EARTH_RADIUS_M), abs=1e-7)


@pytest.mark.parametrize("azimuth", [10.0, 22.5, 67.5, 101.0, 190.0, 250.0])
def test_skyline_does_not_depend_on_the_window(azimuth: float) -> None:
    """Hills inside a high ring, read in a wide window and in one that just holds the ring: the same bits inside it."""
    values = np.zeros((150, 160), dtype=np.float32)
    values[40:110, 40:120] = 3000.0
    values[48:102, 48:112] = hills(80, 8)[:54, :64]
    whole = horizon_tangent(field(values, west_m=300_000.0, north_m=-60_000.0), azimuth)
    part = field(values[35:115, 36:124], west_m=300_000.0 + 36 * 30, north_m=-60_000.0 - 35 * 30)
    # from four cells off the ring the lines beside a cell meet it too
    np.testing.assert_array_equal(horizon_tangent(part, azimuth)[17:-17, 16:-16], whole[52:98, 52:108])
    assert whole[52:98, 52:108].min() > 0


# against exact rays


@pytest.mark.parametrize("azimuth", [*EVERY_22_5, 10.0, 300.0, 330.0])
@pytest.mark.parametrize(
    ("smooth_cells", "height_m", "limit_deg"), [(6.0, 150.0, 0.1), (3.0, 80.0, 0.1), (3.0, 110.0, 0.15)]
)
def test_sweep_follows_exact_rays(azimuth: float, smooth_cells: float, height_m: float, limit_deg: float) -> None:
    """Within 0.15° RMS of rays over the bilinear surface: over rounded hills, and rough ones of 21° and 27°."""
    f = field(hills(160, 1, smooth_cells, height_m))
    rows, cols = np.mgrid[60:100, 60:100]
    x, y = (cols.ravel() + 0.5) * 30.0, -(rows.ravel() + 0.5) * 30.0
    exact = horizon_profile(f, x, y, np.array([azimuth])).angle_deg[:, 0]
    off = angle(f, azimuth, True)[60:100, 60:100].ravel() - exact
    assert np.sqrt((off**2).mean()) < limit_deg


@pytest.mark.parametrize("turns", [1, 2, 3])
def test_turning_the_map_turns_the_skyline(turns: int) -> None:
    """A quarter turn of the ground and of the azimuth: the same angles, but for where the lines happen to lie."""
    values = hills(60, 2)
    plain = angle(field(values), 22.5)
    turned = angle(field(np.rot90(values, turns)), (22.5 - 90.0 * turns) % 360.0)
    off = np.rot90(turned, -turns)[15:-15, 15:-15] - plain[15:-15, 15:-15]
    assert np.abs(off).max() < 1.0
    assert np.sqrt((off**2).mean()) < 0.2


def test_profile_is_exact_on_a_plane_from_any_point() -> None:
    """Points between cell centres, any azimuth: the plane's directional slope; an eye above it looks down."""
    f = ground(lambda x, y: 0.3 * x - 0.4 * y, 41)
    azimuths = np.arange(0.0, 360.0, 5.0)
    rise = 0.3 * np.sin(np.radians(azimuths)) - 0.4 * np.cos(np.radians(azimuths))
    got = horizon_profile(f, [620.0, 611.3], [-615.0, -640.7], azimuths, earth_curvature=False)
    assert got.angle_deg == pytest.approx(np.degrees(np.arctan(np.tile(rise, (2, 1)))), abs=1e-3)
    raised = horizon_profile(f, [620.0], [-615.0], azimuths, 10.0, earth_curvature=False)
    assert (raised.angle_deg < got.angle_deg[0]).all()


# unknown ground


def test_unknown_ground_hides_nothing_and_gets_no_skyline() -> None:
    """Holes and a missing coast on a level plain: no cell's skyline rises above 0; holes stay unknown."""
    values = np.zeros((40, 44), dtype=np.float32)
    values[10:14, 20:30] = np.nan
    values[:, 40:] = np.nan
    values[25, 25] = np.nan
    for azimuth in (0.0, 20.0, 45.0, 70.0, 100.0, 200.0, 275.0):
        got = horizon_tangent(field(values), azimuth, False)
        assert np.isnan(got[np.isnan(values)]).all()
        known = got[np.isfinite(got)]
        assert (known == 0).all()
        assert known.size > 1200


def test_skyline_behind_a_hole_is_still_seen() -> None:
    """A ridge beyond unknown ground stands as high as it does; the profile says where the unknown began."""
    values = np.zeros((5, 40))
    values[:, 30:] = 90.0
    values[:, 10:20] = np.nan
    f = field(values)
    assert horizon_tangent(f, 90.0, False)[2, 0] == pytest.approx(90 / 900)
    got = horizon_profile(f, [15.0], [-75.0], np.array([90.0]), earth_curvature=False)
    assert math.tan(math.radians(got.angle_deg[0, 0])) == pytest.approx(90 / 900)
    assert got.seen_m[0, 0] == 9 * 30.0


@pytest.mark.parametrize("azimuth", [0.0, 10.0, 45.0, 80.0, 100.0, 290.0])
def test_one_known_cell_amid_unknown_ground_sees_what_lies_beyond(azimuth: float) -> None:
    """A rock of 50 m in unknown water looks from its own height at a far plain of 110 m: never from its neighbours'."""
    f = ground(lambda x, y: np.where(np.hypot(x, y) < 1600.0, np.nan, 110.0), 161)
    values = f.values.copy()
    values[80, 80] = 50.0
    got = horizon_tangent(field(values), azimuth, False)[80, 80]
    # the plain begins within one step of 1600 m, by which it is read late at most
    assert 60.0 / (1600.0 + 45.0) <= got <= 60.0 / 1599.0


def test_nothing_known_ahead_is_unknown() -> None:
    """At the grid's end there is no skyline to tell."""
    got = horizon_tangent(field(np.zeros((4, 5))), 0.0)
    assert np.isnan(got[0]).all()
    assert np.isfinite(got[1:]).all()
    outside = horizon_profile(field(np.zeros((4, 5))), [-50.0], [-10.0], np.array([90.0]))
    assert np.isnan(outside.angle_deg).all()


def test_sweep_streams_degrees() -> None:
    """One field at a time, in degrees, named by its azimuth."""
    f = ground(lambda x, _: 0.1 * x, 9)
    sweep = horizon_sweep(f, [90.0, 270.0], earth_curvature=False)
    azimuth, first = next(sweep)
    assert azimuth == 90.0
    assert first.unit == "°"
    assert first.values[4, 4] == pytest.approx(5.710593, abs=1e-4)
    assert next(sweep)[1].values[4, 4] == pytest.approx(-5.710593, abs=1e-4)


@pytest.mark.parametrize("azimuth", [10.0, 100.0])
def test_one_stream_serves_every_consumer(azimuth: float) -> None:
    """Each consumer is handed each azimuth once, with the tangents of that direction, which it cannot change."""
    f = field(hills(30, 3))
    kept: list[tuple[float, np.ndarray]] = []
    told: list[float] = []

    def keep(direction: float, tangent: np.ndarray) -> None:
        kept.append((direction, tangent.copy()))
        with pytest.raises(ValueError, match="read-only"):
            tangent[0, 0] = 1.0

    horizon_stream(f, [azimuth, 200.0, 290.0], [keep, lambda direction, _: told.append(direction)])
    assert told == [direction for direction, _ in kept] == [azimuth, 200.0, 290.0]
    for direction, tangent in kept:
        np.testing.assert_array_equal(tangent, horizon_tangent(f, direction))


# upwind, within a distance


@pytest.mark.parametrize(("reach_m", "expected_deg"), [(300.0, 8.5308), (200.0, 8.5308), (190.0, 0.0), (100.0, 0.0)])
@pytest.mark.parametrize("azimuth", [0.0, 90.0, 180.0, 270.0])
def test_ridge_upwind_counts_within_the_reach(azimuth: float, reach_m: float, expected_deg: float) -> None:
    """A ridge 30 m high 200 m upwind on level ground: 8.5308° to 300 m, 0° to 100 m (definition of Winstral 2002)."""
    d_col, d_row = round(math.sin(math.radians(azimuth))), -round(math.cos(math.radians(azimuth)))
    values = np.zeros((81, 81))
    if d_col:
        values[:, 40 + 20 * d_col] = 30.0
    else:
        values[40 + 20 * d_row, :] = 30.0
    got = upwind_tangent(field(values, 10.0), azimuth, reach_m, 0.0).values[40, 40]
    assert math.degrees(math.atan(got)) == pytest.approx(expected_deg, abs=1e-4)


@pytest.mark.parametrize("azimuth", EVERY_22_5)
@pytest.mark.parametrize("reach_m", [60.0, 300.0, 900.0])
def test_plane_upwind_is_its_rise_for_any_reach(azimuth: float, reach_m: float) -> None:
    """Rising 10 % upwind: 5.7106°; falling: −5.7106°; oblique: the share that faces the wind."""
    f = ground(lambda _, y: 0.1 * y, 91)
    got = upwind_tangent(f, azimuth, reach_m, 0.0).values[45, 45]
    assert got == pytest.approx(0.1 * math.cos(math.radians(azimuth)), abs=2e-5)


def test_receptor_looks_from_its_height() -> None:
    """From 10 m above level ground all of it lies below: the tangent to the end of the reach, −10/300."""
    got = upwind_tangent(field(np.zeros((31, 31))), 0.0, 300.0, 10.0).values
    assert got[20, 15] == pytest.approx(-10 / 300)


@pytest.mark.parametrize("azimuth", EVERY_22_5)
@pytest.mark.parametrize(("smooth_cells", "height_m"), [(6.0, 150.0), (3.0, 80.0), (3.0, 150.0)])
def test_upwind_angle_follows_exact_rays(azimuth: float, smooth_cells: float, height_m: float) -> None:
    """Within 0.15° RMS of rays over the bilinear surface, cut at the same reach, from 10 m up: gentle and rough."""
    f = field(hills(260, 4, smooth_cells, height_m))
    rows, cols = np.mgrid[105:155:5, 105:155:5]
    x, y = (cols.ravel() + 0.5) * 30.0, -(rows.ravel() + 0.5) * 30.0
    got = upwind_tangent(f, azimuth, 3000.0).values[rows, cols].ravel()
    exact = horizon_profile(f, x, y, np.array([azimuth]), 10.0, False, 3000.0).angle_deg[:, 0]
    off = np.degrees(np.arctan(got)) - exact
    assert np.sqrt((off**2).mean()) < 0.15


def test_upwind_angle_is_unknown_where_the_ray_meets_unknown_ground() -> None:
    """Looking north 150 m (5 cells): unknown for the five rows at the edge and the five south of a hole, no others."""
    values = np.zeros((30, 20), dtype=np.float32)
    values[15, 8] = np.nan
    got = upwind_tangent(field(values), 0.0, 150.0).values
    expected = np.zeros(values.shape, dtype=bool)
    expected[:5] = True
    expected[15:21, 8] = True
    assert (np.isnan(got) == expected).all()


@pytest.mark.parametrize("azimuth", [0.0, 22.5, 67.5, 101.0, 190.0, 250.0])
def test_upwind_angle_does_not_depend_on_the_window(azimuth: float) -> None:
    """A part of the lattice, with the reach as its margin, gives the whole's bits."""
    values = hills(90, 5)
    whole = upwind_tangent(field(values, west_m=300_000.0, north_m=-60_000.0), azimuth, 300.0).values
    part = field(values[13:77, 21:85], west_m=300_000.0 + 21 * 30, north_m=-60_000.0 - 13 * 30)
    got = upwind_tangent(part, azimuth, 300.0).values
    np.testing.assert_array_equal(got[12:-12, 12:-12], whole[25:65, 33:73])
    assert np.isfinite(got[12:-12, 12:-12]).all()


def test_refuses_a_reach_within_the_cell() -> None:
    """The reach and the cell are named."""
    with pytest.raises(GridError, match=r"20 m was asked for on cells of 30 m"):
        upwind_tangent(field(np.zeros((9, 9))), 0.0, 20.0)


# what must always hold


@settings(max_examples=60, deadline=None)
@given(
    st.floats(0, 360),
    st.integers(0, 2**32 - 1),
    st.tuples(st.integers(0, 49), st.integers(0, 49)),
    st.sampled_from([3.0, 100.0, 400.0]),
    st.floats(0.0, 500.0),
)
def test_adding_ground_never_lowers_a_skyline(
    azimuth: float, seed: int, where: tuple[int, int], rough_m: float, more_m: float
) -> None:
    """Raise one cell of rough ground: no skyline falls but those seen from it or from the lines beside it."""
    values = np.random.default_rng(seed).normal(100, rough_m, (50, 50))
    values += 2000.0 * (np.hypot(*(np.mgrid[:50, :50] - 25)) > 23)  # far ground matters as well as near
    raised = values.copy()
    raised[where] += more_m
    row, col = where
    for before, after in (
        (horizon_tangent(field(values), azimuth), horizon_tangent(field(raised), azimuth)),
        (upwind_tangent(field(values), azimuth, 150.0).values, upwind_tangent(field(raised), azimuth, 150.0).values),
    ):
        fell = after < before - 1e-5
        # viewers up to a gap between lines away are read together with the raised cell
        fell[max(row - 4, 0) : row + 5, max(col - 4, 0) : col + 5] = False
        assert not fell.any()


def test_kernels_agree_with_their_python_forms() -> None:
    """Compiled and interpreted, near and far ground, every octant, a hole: equal to float32's steps."""
    values = hills(46, 6)[:42].copy()
    values[5, 5] = np.nan
    for azimuth in (0.0, 25.0, 70.0, 110.0, 225.0, 300.0):
        lines = _lines(field(values).grid, azimuth)
        ground = values if lines.by_row else np.ascontiguousarray(values.T)
        strips = -(-lines.lines // 8)
        rays = _near_samples(lines)
        near = (rays[0][:9], rays[1][:9], rays[2][:9], 8)
        along = (lines.whole, lines.part, lines.spacing_m, 1e-7, lines.first_step, lines.first_line, 8)
        outs = []
        for form in (lambda f: f, lambda f: f.py_func):
            skyline, upwind = np.empty(ground.shape, np.float32), np.empty(values.shape, np.float32)
            with np.errstate(all="ignore"):
                form(kernel.sweep_strips)(ground, lines.ascending, *near, *along, skyline, 0, strips)
                ray = (*_rays(lines, 4), lines.spacing_m)
                form(march_kernel.reach_tangents)(values, lines.by_row, *ray, np.float32(10), upwind, 0, 42)
            outs.append((skyline, upwind))
        for compiled, plain in zip(*outs, strict=True):
            np.testing.assert_allclose(compiled, plain, rtol=1e-5, atol=1e-6)
            assert np.isfinite(compiled).sum() > 1000
    turned = np.empty((46, 42), np.float32)
    kernel.transpose.py_func(values, turned, 0, 46)
    np.testing.assert_array_equal(turned, values.T)
    np.testing.assert_array_equal(transposed(values), values.T)


def test_profile_kernel_agrees_with_its_python_form() -> None:
    """Compiled and interpreted rays, one of them over a hole."""
    values = hills(14, 7)
    values[3, 9] = np.nan
    outs = []
    for form in (lambda f: f, lambda f: f.py_func):
        tangent, seen = np.empty((2, 8)), np.empty((2, 8))
        points = (np.array([6.3, 7.0]), np.array([6.9, 2.0]), np.radians(np.arange(8) * 45.0 + 0.5))
        squares = np.empty((1, 1))
        form(profile_kernel.tops)(values, squares, 0, 1)
        form(profile_kernel.profiles)(values, squares, 30.0, *points, 2.0, 1e-7, 300.0, tangent, seen, 0, 2)
        outs.append((tangent, seen))
    for compiled, plain in zip(*outs, strict=True):
        np.testing.assert_allclose(compiled, plain, rtol=1e-9)


@pytest.mark.parametrize("has_gap", [False, True])
def test_ground_that_cannot_be_seen_is_passed_over_without_a_change(has_gap: bool) -> None:
    """The same bits, and the same distance seen, as when no square's highest ground is known."""
    rng = np.random.default_rng(8)
    values = (300.0 * np.sin(np.arange(90) / 9.0)[:, None] + rng.normal(0.0, 40.0, (90, 70))).astype(np.float32)
    if has_gap:
        values[30:33, 20:60] = np.nan
    points = rng.uniform(5.0, 60.0, (2, 12))
    found = []
    for knows in (True, False):
        squares = np.full((6, 5), np.inf)
        if knows:
            profile_kernel.tops(values, squares, 0, 6)
        tangent, seen = np.empty((12, 36)), np.empty((12, 36))
        azimuths = np.radians(np.arange(36) * 10.0)
        arguments = (values, squares, 30.0, *points, azimuths, 2.0, 6.8e-8, 1500.0)
        profile_kernel.profiles(*arguments, tangent, seen, 0, 12)
        found.append((tangent, seen))
    assert np.array_equal(found[0][0], found[1][0], equal_nan=True)
    assert np.array_equal(found[0][1], found[1][1])


@pytest.mark.parametrize("kernel", [profile_kernel.tops, profile_kernel.tops.py_func])
def test_highest_ground_of_squares_takes_in_their_far_edge(kernel: Callable[..., None]) -> None:
    side = profile_kernel.TOP_CELLS
    values = np.arange(side * 2 * side, dtype=np.float32).reshape(side, 2 * side)
    values[-1, -1] = np.nan
    squares = np.empty((1, 2))
    kernel(values, squares, 0, 1)
    assert squares.tolist() == [[values[-1, side], np.inf]]
