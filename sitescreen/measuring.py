"""One block of ground, measured: terrain, then climate, then the readings of its plots."""

from collections.abc import Collection, Iterator
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.breeze import PlotBreeze, lake_reach, plot_breeze
from sitescreen.climate.breeze_field import breeze_field
from sitescreen.climate.breeze_section import Section, sections
from sitescreen.climate.cold_air import closed_pools, smallest_pool_seen_m
from sitescreen.climate.cold_flow import Balance
from sitescreen.climate.cold_kinds import KINDS, cold_kinds
from sitescreen.climate.cold_layer import NightGround, cold_layer, night_ground
from sitescreen.climate.hill_speed_up import hill_fields
from sitescreen.climate.normals import plot_climate
from sitescreen.climate.plot_sun import PlotSkies, mean_plane, monthly_sun, plot_skies
from sitescreen.climate.seasons import seasons_from_normals, seasons_without_normals
from sitescreen.climate.sector_winds import SectorWinds, sector_winds
from sitescreen.climate.sun_field import SunField
from sitescreen.climate.wind import FIELD_READINGS, Wanted, wind_fields
from sitescreen.climate.wind_cover import wind_cover
from sitescreen.grid import Field, Grid
from sitescreen.inputs import Inputs
from sitescreen.inputs.cover import Cover
from sitescreen.inputs.shore import Shore
from sitescreen.judgement.cold_readings import with_cold
from sitescreen.judgement.coverage import Coverage, cover
from sitescreen.judgement.draws import DrawableBlock, drawable_block
from sitescreen.judgement.readings import Readings, block_readings
from sitescreen.judgement.shore_readings import with_shore
from sitescreen.judgement.sun_readings import with_sun
from sitescreen.judgement.watercourse_readings import with_watercourses
from sitescreen.judgement.wind_readings import with_wind
from sitescreen.judgement.wind_slots import SLOT_OF, wind_column
from sitescreen.judgement.within_plot import PlotCells, plot_cells
from sitescreen.lattice import Block, blocks_of, convergence_deg, from_true_north
from sitescreen.progress import Progress
from sitescreen.settings import BreezeSettings, Defaults
from sitescreen.terrain.flat_water import WaterDisagreement, water_disagreement
from sitescreen.terrain.ground import Ground, open_to_cold_air, read_ground, water_level_m, with_level_water
from sitescreen.terrain.plot_skyline import plot_skylines
from sitescreen.terrain.shore_distance import ShoreDistance, nearest_shore, onshore_bearing, shore_distance
from sitescreen.terrain.shore_fetch import OpenRule, OpenShore, open_segments, open_shores
from sitescreen.terrain.shore_segments import Segments
from sitescreen.terrain.sky_view import even_azimuths
from sitescreen.terrain.watercourses import watercourses

FloatArray = NDArray[np.float64]

BLOCK_MARGIN_M = 12_600.0
"""Ground computed round a block's core: more than any reading but the night's cold air looks. [m]"""

NIGHT_MARGIN_M = 27_000.0
"""Ground round a block's core from which the night's cold air may come. [m]"""

KIND_CODES = tuple(f"{code} {word}" for code, word in enumerate(KINDS))
"""What the numbers of the layer of kinds stand for."""


@dataclass(frozen=True)
class BlockResult:
    """What one block hands on: of its plots readings, winds by sector and sections to the shore; fields of its core."""

    block: Block
    readings: Readings
    fields: dict[str, Field]
    cells: PlotCells
    disagreement: WaterDisagreement
    winds: SectorWinds
    sections: dict[str, Section]
    suns: PlotSkies
    night_balances: tuple[Balance, ...]
    drawable: DrawableBlock


def plots_by_block(inputs: Inputs) -> Iterator[tuple[Block, NDArray[np.int64]]]:
    """Each block with plots that can be judged, and their rows in the table of plots; in the lattice's order."""
    table = inputs.plots.table
    rows = np.flatnonzero((table["outcome"] == "").to_numpy())
    lon, lat = table["lon"].to_numpy()[rows], table["lat"].to_numpy()[rows]
    found: dict[Block, list[int]] = {}
    for row, block in zip(rows, blocks_of(lon, lat, inputs.terrain.cell_size_m), strict=True):
        found.setdefault(block, []).append(int(row))
    for block in sorted(found):
        yield block, np.array(found[block], dtype=np.int64)


def measure(
    block: Block,
    rows: NDArray[np.int64],
    inputs: Inputs,
    settings: Defaults,
    progress: Progress,
    slots: Collection[tuple[str, str]] = (),
) -> BlockResult:
    """Everything that is read off one block: terrain, then climate, then the readings of its plots.

    Parameters
    ----------
    block : Block
    rows : int64 array, shape (n,)
        The block's plots, as rows of the table of plots.
    inputs : Inputs
    settings : Defaults
    progress : Progress
    slots : collection of (reading, slot)
        Readings of the wind that profiles ask for in another slot than their own.
    """
    terrain, shore = inputs.terrain, inputs.shore
    plots = inputs.plots.table.iloc[rows]
    lon, lat = plots["lon"].to_numpy(), plots["lat"].to_numpy()
    with progress.step("Reading the ground"):
        bounds = terrain.data_bounds(block.crs)
        grid, wide = block.window(BLOCK_MARGIN_M, bounds), block.window(NIGHT_MARGIN_M, bounds)
        heights = terrain.read(wide)
        water_kind = shore.water_kind(wide) if shore else np.zeros(wide.shape, dtype=np.uint8)
        night = _night_ground(heights.ground, water_kind, terrain.vertical_error_m, settings)
        if grid != wide:
            heights, water_kind = heights.part(grid.bounds), water_kind[wide.part(grid.bounds)[1]]
    with progress.step("Measuring slope, hollows and sky"):
        clear_share = inputs.sky.share if inputs.sky else None
        sunshine = SunField(block, grid, even_azimuths(settings.terrain.sky_azimuths), settings.sun, clear_share)
        ground = read_ground(
            *heights, water_kind, terrain.vertical_error_m, terrain.error_range_m, settings.terrain, [sunshine]
        )
        # only the core is this block's to report: neighbours would count the margin twice
        core, inside = grid.part(block.core_bounds)
        disagreement = water_disagreement(
            water_kind[inside], ground.flat.part(core, inside), heights.ground.part(block.core_bounds)
        )
        beds = watercourses(
            ground.elevation,
            water_kind,
            settings.terrain.watercourse_least_km2,
            settings.terrain.watercourse_near_m,
        )
    with progress.step("Measuring wind and shelter"):
        covered = wind_cover(inputs.cover, ground.elevation, settings.wind) if inputs.cover else None
        met = covered.raised(settings.wind) if covered else ground.elevation
        hills = hill_fields(met, settings.wind)
        wanted = [
            Wanted(wind_column(*one), *one) for one in (*_own_slots(), *sorted(slots)) if one[0] in FIELD_READINGS
        ]
        wind = wind_fields(
            met, ground.rise, hills, covered, _block_convergence_deg(grid), inputs.wind, wanted, settings.wind
        )
        steep = ground.slope.values > np.degrees(np.arctan(settings.wind.slope_most))
    with progress.step("Letting a calm night's cold air flow"):
        pools = closed_pools(ground.hollows, terrain.vertical_error_m, settings.cold_air)
        least_m = smallest_pool_seen_m(terrain.vertical_error_m, settings.cold_air)
        made = _cold_factor(inputs.cover, wide)
        layer = cold_layer(night, ground.sky_view, settings.cold_layer, cover=made)
        cold = cold_kinds(layer, pools, ground.elevation, least_m, settings.cold_layer, settings.cold_air.fill_scale_m)
    with progress.step("Measuring distance and way to the shore"):
        coast = _coast(shore, lon, lat, block, ground.elevation, settings.breeze)
    with progress.step("Reading the plots"):
        coverage = cover(plots.geometry.to_crs(block.crs), grid)
        convergence = convergence_deg(block.crs, lon, lat)
        readings = block_readings(
            list(plots["plot"]),
            coverage,
            ground,
            convergence,
            settings.readings,
        )
        readings = with_cold(
            readings, coverage, ground.hollows, pools, cold, convergence, least_m, terrain.surface == "canopy", settings
        )
        winds = sector_winds(
            tuple(plots["plot"]),
            met,
            ground.rise,
            hills,
            covered,
            np.searchsorted(coverage.plot, np.arange(len(plots) + 1)),
            coverage.cell,
            coverage.share,
            convergence,
            settings.readings.known_share_least,
            settings.wind,
        )
        steep_share = coverage.mean(
            np.where(np.isnan(ground.slope.values), np.nan, steep), settings.readings.known_share_least
        )
        readings = with_wind(readings, winds, inputs.wind, lon, lat, steep_share, slots, settings.wind)
        readings = with_watercourses(readings, coverage, beds, settings.readings.known_share_least)
        readings = with_shore(readings, coast.near, coast.lake, coast.breeze, coast.onshore_from_deg, settings.breeze)
    with progress.step("Measuring the sun"):
        suns = _suns(plots, ground, coverage, readings, inputs, settings)
        readings = with_sun(readings, suns, monthly_sun(suns, settings.sun))
    fields = {
        "elevation_m": ground.elevation,
        "slope_deg": ground.slope,
        "aspect_deg": from_true_north(ground.aspect),
        "buildable_chance": ground.buildable,
        "rise_m": ground.rise,
        "sky_view": ground.sky_view,
        "sun_year_h": sunshine.hours(ground.elevation),
        "hollow_depth_m": pools.depth_m,
        "floor_height_m": beds.height_m,
        "cold_depth_m": cold.depth_m,
        "cold_kind": Field(cold.kind.astype(np.float32), grid, "code", "cold air: " + ", ".join(KIND_CODES)),
        "cold_share": Field(cold.fill.values * ground.sky_view.values, grid, "1", cold.fill.what),
        # linear flow over hills does not hold on steep ground: no figure is drawn there
        **{name: _masked(field, steep) for name, field in wind.items()},
        **({"shore_distance_km": coast.distance} if coast.distance is not None else {}),
        **({"breeze_reach": coast.reach} if coast.reach is not None else {}),
    }
    cells = plot_cells(coverage, rows, fields, (water_kind > 0) | (ground.flat.label > 0), grid, settings.readings)
    own = {name: field.part(block.core_bounds) for name, field in fields.items()}
    drawn = {plot: one for plot, one in zip(plots["plot"], coast.sections, strict=True) if one is not None}
    balances = tuple(run.balance for run in layer.runs)
    error = (terrain.vertical_error_m, terrain.error_range_m)
    drawable = drawable_block(rows, plots.geometry.to_crs(block.crs), ground, night, layer, made, error, settings)
    return BlockResult(block, readings, own, cells, disagreement, winds, drawn, suns, balances, drawable)


def _own_slots() -> list[tuple[str, str]]:
    """The wind's readings in the slots that they have in the table of plots."""
    return list(SLOT_OF.items())


def _masked(field: Field, hidden: NDArray[np.bool_]) -> Field:
    """The field, unknown where hidden."""
    return Field(np.where(hidden, np.float32(np.nan), field.values), field.grid, field.unit, field.what)


def _suns(
    plots: Any, ground: Ground, coverage: Coverage, readings: Readings, inputs: Inputs, settings: Defaults
) -> PlotSkies:
    """Skylines, suns and seasons of a block's plots."""
    lon, lat = plots["lon"].to_numpy(), plots["lat"].to_numpy()
    height = readings.values["elevation_m"].to_numpy(dtype=np.float64)
    sun, choices, known = settings.sun, inputs.sun_choices, settings.readings.known_share_least
    eye_m = sun.eye_m + sun.eye_errors * inputs.terrain.vertical_error_m
    if inputs.normals is None:
        seasons = seasons_without_normals(lat, choices.cool_months, choices.hot_months)
    else:
        climate = plot_climate(inputs.normals, lon, lat, height, settings.zones)
        seasons = seasons_from_normals(inputs.normals, climate, settings.zones.lapse_k_km)
    east, north = (coverage.mean(one.values, known) for one in (ground.gradient.east, ground.gradient.north))
    return plot_skies(
        plot_skylines(ground.elevation, lon, lat, eye_m, sun.skyline_reach_m).height_deg,
        lon,
        lat,
        height,
        seasons,
        inputs.sky,
        readings.values["sky_view"].to_numpy(dtype=np.float64),
        mean_plane(east, north, convergence_deg(ground.elevation.grid.crs, lon, lat)),
        sun,
        choices.utc_offset_h,
    )


def _cold_factor(cover: Cover | None, grid: Grid) -> Field | None:
    """How much cold air the ground cover makes, 1 for open ground and where no class is mapped."""
    if cover is None:
        return None
    made = cover.values(cover.classes(grid), "cold_air_factor", 1.0)
    return Field(made, grid, "1", "cold air that the ground cover makes")


def _night_ground(
    elevation: Field, water_kind: NDArray[np.uint8], vertical_error_m: float, settings: Defaults
) -> NightGround:
    """The ground over which a block's cold air flows, sea and large lakes as its outlets."""
    level = with_level_water(elevation, water_kind, water_level_m(elevation, water_kind))
    water = open_to_cold_air(water_kind, elevation.grid.cell_size_m, settings.terrain.smallest_outlet_km2)
    return night_ground(level, water, settings.cold_layer, vertical_error_m)


class _Coast(NamedTuple):
    """What the shore gives a block; all None, and no bearing known, without a shoreline."""

    near: ShoreDistance | None
    lake: OpenShore | None
    breeze: PlotBreeze | None
    onshore_from_deg: FloatArray
    distance: Field | None
    reach: Field | None
    sections: list[Section | None]


def _coast(
    shore: Shore | None,
    lon: FloatArray,
    lat: FloatArray,
    block: Block,
    elevation: Field,
    settings: BreezeSettings,
) -> _Coast:
    """The nearest waters of plots, the breeze of the open ones, and the bearing that it comes from."""
    from_deg = np.full(len(lon), np.nan)
    if shore is None:
        return _Coast(None, None, None, from_deg, None, None, [None] * len(lon))
    crs, least_km = block.crs, settings.lake_width_none_km
    rule = OpenRule(settings.open_fetch_m, settings.open_sector_deg, settings.open_share)
    sea_open = open_segments(shore, "sea", crs, block.core_bounds, rule)
    lake_open = open_segments(shore, "lake", crs, block.core_bounds, rule, least_km)
    sea = open_shores(shore, sea_open, "sea", lon, lat, crs)
    lake = open_shores(shore, lake_open, "lake", lon, lat, crs, lambda km, width_km: lake_reach(km, width_km, settings))
    breeze = plot_breeze(elevation, lon, lat, sea, lake, settings)
    for kind, segments in (("sea", sea_open), ("lake", lake_open)):
        here = breeze.kind == kind
        if here.any():
            from_deg[here] = onshore_bearing(shore, lon[here], lat[here], crs, kind, 0.0, segments).from_deg
    return _Coast(
        nearest_shore(shore, lon, lat, crs, least_km),
        lake,
        breeze,
        from_deg,
        shore_distance(shore, elevation.grid, open_shores=Segments.joined(sea_open, lake_open)),
        breeze_field(elevation, block.core_bounds, shore, sea_open, lake_open, settings),
        _sections(elevation, lon, lat, breeze, settings),
    )


def _sections(
    elevation: Field, lon: FloatArray, lat: FloatArray, breeze: PlotBreeze, settings: BreezeSettings
) -> list[Section | None]:
    """From each plot to the shore that its breeze comes from."""
    from pyproj import Transformer

    to_grid = Transformer.from_crs("EPSG:4326", elevation.grid.crs, always_xy=True)
    # in the water the section is the plot alone
    away = breeze.distance_m != 0.0
    to_lon, to_lat = np.where(away, breeze.shore_lon, lon), np.where(away, breeze.shore_lat, lat)
    some = np.isfinite(to_lon)
    to_x, to_y = to_grid.transform(np.where(some, to_lon, lon), np.where(some, to_lat, lat))
    return sections(
        elevation,
        *to_grid.transform(lon, lat),
        np.where(some, to_x, np.nan),
        np.where(some, to_y, np.nan),
        breeze.way,
        breeze.distance_m,
        breeze.bearing_deg,
        settings.path_most_m,
    )


def _block_convergence_deg(grid: Grid) -> float:
    """Bearing of grid north from true north at the middle of a block's window: one serves all sectors. [°]"""
    from pyproj import Transformer

    west, south, east, north = grid.bounds
    to_lonlat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
    lon, lat = to_lonlat.transform(0.5 * (west + east), 0.5 * (south + north))
    return float(convergence_deg(grid.crs, np.array([lon]), np.array([lat]))[0])
