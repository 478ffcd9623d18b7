"""The whole run on small invented ground: what happens when an input is missing, forced or odd."""

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import rasterio
from affine import Affine
from shapely.geometry import Point, box

from sitescreen.brief import load_brief
from sitescreen.deliverables.columns import CONTRACT, columns_of
from sitescreen.errors import BriefError
from sitescreen.screening import Screening, screen

WEST, SOUTH, SIDE = 40.10, -3.30, 0.14  # about 15 km, inside one block of 90 m cells
STEP = 3.0 / 3600.0

Run = Callable[..., Screening]


@pytest.fixture(scope="module")
def country(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A slope that rises 60 m to the west from a sea in the east; eight plots; a shoreline; a zone map."""
    folder = tmp_path_factory.mktemp("country")
    count = round(SIDE / STEP)
    lon = WEST + (np.arange(count) + 0.5) * STEP
    height = np.maximum((WEST + SIDE - 0.02 - lon) * 500.0, 0.0)
    ground = np.repeat(height[None, :], count, axis=0).astype(np.float32)
    profile = {"driver": "GTiff", "width": count, "height": count, "count": 1, "dtype": "float32", "crs": "EPSG:4326"}
    transform = Affine(STEP, 0, WEST, 0, -STEP, SOUTH + SIDE)
    with rasterio.open(folder / "ground.tif", "w", transform=transform, nodata=-9999, **profile) as out:
        out.write(ground, 1)
    sea = box(WEST + SIDE - 0.02, SOUTH - 1, WEST + SIDE + 1, SOUTH + SIDE + 1)
    gpd.GeoDataFrame({"kind": ["sea"]}, geometry=[sea], crs="EPSG:4326").to_file(folder / "shore.gpkg")
    middle = SOUTH + SIDE / 2
    spots = [(WEST + 0.05 + 0.01 * k, middle) for k in range(6)] + [(WEST + SIDE - 0.01, middle), (WEST - 0.5, middle)]
    plots = gpd.GeoDataFrame(
        {"plot": list("abcdefgh"), "name": [""] * 8}, geometry=[Point(*spot) for spot in spots], crs="EPSG:4326"
    )
    plots.geometry = [point.buffer(0.0015) for point in plots.geometry]
    plots.to_file(folder / "plots.gpkg")
    halves = [box(WEST, SOUTH, WEST + 0.075, SOUTH + SIDE), box(WEST + 0.075, SOUTH, WEST + SIDE, SOUTH + SIDE)]
    gpd.GeoDataFrame({"zone": ["savannah", "upland"]}, geometry=halves, crs="EPSG:4326").to_file(folder / "zones.gpkg")
    (folder / "wind.csv").write_text(
        "season,part,direction_deg,share,speed_m_s\nyear,all,90,0.8,4\nyear,all,,0.2,0\n", encoding="utf-8"
    )
    return folder


@pytest.fixture(scope="module")
def run(country: Path) -> Run:
    """Run the brief of the given sections."""

    def go(*sections: str) -> Screening:
        text = '[terrain]\nfiles = ["ground.tif"]\nvertical_error_m = 1\n[plots]\nfile = "plots.gpkg"\nid = "plot"\n'
        brief = country / f"brief_{abs(hash(sections))}.toml"
        brief.write_text(text + "\n".join(sections), encoding="utf-8")
        return screen(load_brief(brief))

    return go


SHORE = '[shore]\nfile = "shore.gpkg"\nkind = "kind"'


@pytest.fixture(scope="module")
def plain(run: Run) -> Screening:
    """Terrain, shore and plots; nothing else."""
    return run(SHORE)


def _table(screening: Screening) -> Any:
    return screening.table.set_index("plot")


def _assumed(screening: Screening) -> set[str]:
    return {note.where for note in screening.notes if note.level == "assumed"}


def test_every_plot_comes_out_ranked_or_with_its_reason(plain: Screening) -> None:
    table = _table(plain)
    assert sorted(table.index) == list("abcdefgh")
    assert "water" in table.at["g", "set_aside"]
    assert "outside the terrain" in table.at["h", "set_aside"]
    assert ((table["rank"].notna()) == (table["set_aside"] == "")).all()


def test_the_table_has_the_columns_of_the_contract(plain: Screening) -> None:
    assert {column.name for column in CONTRACT} <= set(plain.table.columns)


def test_the_plane_reads_as_it_was_drawn(plain: Screening) -> None:
    """500 m a degree is 0.449 % to the east: 0.2576°, no direction; 1 km is 0.00900° of longitude at 3.2° south."""
    table = _table(plain)
    assert table.at["c", "slope_deg"] == pytest.approx(0.257, abs=0.003)
    assert np.isnan(table.at["c", "aspect_deg"])
    assert table.at["c", "elevation_m"] == pytest.approx((SIDE - 0.02 - 0.07) * 500.0, abs=0.05)
    assert table.at["c", "shore_distance_km"] == pytest.approx(0.05 * 111.15, abs=0.02)
    assert table.at["c", "onshore_from_deg"] == pytest.approx(90.0, abs=1.0)
    assert (table.loc[list("bcdef"), "breeze_reach"].diff().dropna() > 0).all()


def test_level_ground_has_the_wind_of_level_ground(plain: Screening) -> None:
    assert _table(plain).at["c", "ventilation"] == pytest.approx(1.0, abs=0.05)
    assert _table(plain).at["c", "sheltered_fraction"] == pytest.approx(0.0, abs=0.01)


def test_what_nobody_gave_is_said_to_be_assumed(plain: Screening) -> None:
    assert {"wind", "climate"} <= _assumed(plain)
    assert "shore" not in _assumed(plain)


def test_without_a_shore_the_breeze_is_unknown_and_says_so(run: Run) -> None:
    screening = run()
    table = _table(screening)
    assert table["breeze_reach"].isna().all()
    assert "shore" in _assumed(screening)
    assert any("no shoreline was given" in text for text in screening.reasons["c"].unknown)
    assert "shore_distance_km" not in screening.fields


def test_a_missing_shore_never_lifts_a_plot(run: Run, plain: Screening) -> None:
    """All plots stand in one zone: without the breeze's reading, no low mark is above what it was with it."""
    force = '[zones]\nforce = "hot_humid_coast"'
    with_shore, without = _table(run(SHORE, force)), _table(run(force))
    ranked = with_shore.index[with_shore["rank"].notna()]
    assert (without.loc[ranked, "mark_low"] <= with_shore.loc[ranked, "mark_low"] + 1e-9).all()


def test_a_zone_for_all_is_taken(run: Run) -> None:
    assert set(_table(run(SHORE, '[zones]\nforce = "upland"'))["zone"]) >= {"upland"}


def test_an_unknown_zone_is_refused_with_the_nearest(run: Run) -> None:
    with pytest.raises(BriefError, match=r"uplnd.*Perhaps 'upland'"):
        run(SHORE, '[zones]\nforce = "uplnd"')


def test_a_map_of_zones_is_taken_where_it_reaches(run: Run) -> None:
    table = _table(run(SHORE, '[zones]\npolygons = "zones.gpkg"'))
    assert table.at["a", "zone"] == "savannah"
    assert table.at["e", "zone"] == "upland"


def test_a_wind_table_takes_the_assumption_away(run: Run, plain: Screening) -> None:
    screening = run(SHORE, '[wind]\nfile = "wind.csv"')
    given, none = (
        [note.text for note in one.notes if note.where == "wind" and "from all sides" in note.text]
        for one in (screening, plain)
    )
    assert (len(given), len(none)) == (0, 1)
    # of the table's slots only the year's is its own; what others stand in for counts half
    profile, row = screening.profiles["hot_humid_coast"], _table(screening).loc["f"]
    weights = {one.name: one.weight * (0.5 if one.name == "ventilation" else 1.0) for one in profile.criteria}
    by_hand = sum(weights[name] * row[f"mark_{name}"] for name in weights) / sum(weights.values())
    assert row["mark_in_zone"] == pytest.approx(by_hand)
    # 1.2 km behind a shore that rises by 0.4 % to the west, the wind comes off open water in both runs
    assert _table(screening).at["f", "sheltered_fraction"] == pytest.approx(0.0, abs=0.01)


def test_a_profile_that_names_another_slot_gets_its_column_layer_and_words(run: Run, country: Path) -> None:
    """East winds all year, but hot nights have west winds off the slope."""
    from sitescreen.settings import config_folder

    own = country / "own_profiles"
    own.mkdir(exist_ok=True)
    text = (config_folder() / "zones" / "hot_humid_coast.toml").read_text(encoding="utf-8")
    assert 'slot = "hot_afternoon"' in text
    (own / "coast.toml").write_text(text.replace('slot = "hot_afternoon"', 'slot = "hot_night"'), encoding="utf-8")
    rows = "season,part,direction_deg,share,speed_m_s\nyear,all,90,1,4\nhot,afternoon,90,1,4\nhot,night,270,1,2\n"
    (country / "nights.csv").write_text(rows, encoding="utf-8")
    wind, force = '[wind]\nfile = "nights.csv"', '[zones]\nforce = "hot_humid_coast"'
    screening = run(SHORE, wind, force, '[judge]\nprofiles = "own_profiles"')
    table = _table(screening)
    row = screening.winds.plots.index("c")
    assert table.at["c", "ventilation_hot_night"] == pytest.approx(screening.winds.speed_ratio[row, 12])
    assert table.at["c", "ventilation"] == pytest.approx(screening.winds.speed_ratio[row, 4])
    assert "ventilation_hot_night" in screening.fields
    assert "ventilation_hot_night" not in _table(run(SHORE, wind, force))
    columns = {one.name: one for one in columns_of(screening.table, screening.profiles)}
    assert columns["ventilation_hot_night"].title == "ventilation, hot-night winds"
    told = screening.reasons["c"]
    assert not any("hot-afternoon" in text.casefold() for text in (*told.for_, *told.against))


def test_trees_upwind_take_the_wind_away(run: Run, country: Path) -> None:
    """A wood of 20 m from 280 m east of plot c on: the east wind has lost speed behind it, the west wind none."""
    count = round(SIDE / STEP)
    classes = np.zeros((count, count), np.uint8)
    classes[:, round(0.0725 / STEP) :] = 1
    transform = Affine(STEP, 0, WEST, 0, -STEP, SOUTH + SIDE)
    profile = {"driver": "GTiff", "width": count, "height": count, "count": 1, "dtype": "uint8", "crs": "EPSG:4326"}
    with rasterio.open(country / "cover.tif", "w", transform=transform, nodata=0, **profile) as out:
        out.write(classes, 1)
    cover = (
        '[cover]\nfile = "cover.tif"\n[cover.classes]\n1 = { roughness_m = 1.0, canopy_m = 20, cold_air_factor = 1 }'
    )
    bare, wooded = run(SHORE), run(SHORE, cover)
    row = bare.winds.plots.index("c")
    again = wooded.winds.plots.index("c")
    assert wooded.winds.speed_ratio[again, 4] < 0.75 * bare.winds.speed_ratio[row, 4]
    assert wooded.winds.speed_ratio[again, 12] == pytest.approx(bare.winds.speed_ratio[row, 12], abs=0.05)
    assert _table(wooded).at["c", "ventilation"] < _table(bare).at["c", "ventilation"] - 0.02
    assert not any("[cover]" in note.text for note in wooded.notes)


def test_several_places_blend_by_distance_in_plots_and_layers(run: Run, country: Path) -> None:
    """East winds at the southern end and west winds at the northern, on a slope that tells them apart."""
    head = "season,part,direction_deg,share,speed_m_s,lon,lat,elevation_m\n"
    slots = (("hot", "afternoon"), ("hot", "night"), ("cool", "night"), ("year", "all"))
    at = ((90, WEST + 0.07, SOUTH + 0.02), (270, WEST + 0.07, SOUTH + 0.12))
    rows = [f"{season},{part},{d},1,4,{x},{y},20" for season, part in slots for d, x, y in at]
    (country / "two.csv").write_text(head + "\n".join(rows), encoding="utf-8")
    blended = run(SHORE, '[wind]\nfile = "two.csv"\nplaces = "inverse_distance"')
    row = blended.winds.plots.index("c")
    east, west = blended.winds.speed_ratio[row, [4, 12]]
    assert _table(blended).at["c", "ventilation"] == pytest.approx(0.5 * (east + west), abs=1e-3)  # it lies midway
    field = blended.fields["ventilation"]
    from pyproj import Transformer

    x, y = Transformer.from_crs("EPSG:4326", field.grid.crs, always_xy=True).transform(WEST + 0.07, SOUTH + SIDE / 2)
    col, line = int((x - field.grid.west_m) // 90.0), int((field.grid.north_m - y) // 90.0)
    assert field.values[line, col] == pytest.approx(_table(blended).at["c", "ventilation"], abs=0.01)
    said = [note.text for note in blended.notes if "counts, with the others" in note.text]
    assert len(said) == 2
    assert "m above it (it lies at 20 m)" in said[0]


def test_driving_rain_needs_rows_for_the_rainy_season(run: Run, plain: Screening, country: Path) -> None:
    assert _table(plain)["driving_rain"].isna().all()
    text = (country / "wind.csv").read_text(encoding="utf-8") + "rain,all,270,1.0,5\n"
    (country / "wet.csv").write_text(text, encoding="utf-8")
    wet = _table(run(SHORE, '[wind]\nfile = "wet.csv"'))
    assert wet.at["c", "driving_rain"] == pytest.approx(1.0, abs=0.05)
    assert _table(run(SHORE, '[wind]\nfile = "wind.csv"'))["driving_rain"].isna().all()


def test_what_the_wind_is_not_for_is_said_and_sectors_and_sections_are_kept(plain: Screening) -> None:
    assert any("not for calm nights" in note.text for note in plain.notes if note.where == "wind")
    assert plain.winds.plots == tuple(plain.table["plot"])
    row = plain.winds.plots.index("c")
    assert plain.winds.speed_ratio[row].mean() == pytest.approx(_table(plain).at["c", "ridge_exposure"], abs=0.01)
    section = plain.sections["c"]
    assert section.distance_m[-1] == pytest.approx(1000.0 * _table(plain).at["c", "shore_distance_km"], rel=0.001)
    assert section.ground_m[0] == pytest.approx(_table(plain).at["c", "elevation_m"], abs=0.5)
    assert "h" not in plain.sections  # off the terrain


def test_the_breeze_layer_reads_as_the_plots_do(plain: Screening) -> None:
    from pyproj import Transformer

    field, table = plain.fields["breeze_reach"], _table(plain)
    to_grid = Transformer.from_crs("EPSG:4326", field.grid.crs, always_xy=True)
    for plot in "bcdef":
        x, y = to_grid.transform(table.at[plot, "lon"], table.at[plot, "lat"])
        col, row = (
            int((x - field.grid.west_m) // field.grid.cell_size_m),
            int((field.grid.north_m - y) // field.grid.cell_size_m),
        )
        assert field.values[row, col] == pytest.approx(table.at[plot, "breeze_reach"], abs=0.01)


def test_every_row_says_what_nobody_checked(plain: Screening, run: Run) -> None:
    assert set(plain.table["not_checked"]) == {", ".join(plain.not_checked)}
    assert "flood levels" in plain.table["not_checked"].iloc[-1]
    flood = '[[constraint]]\nname = "flood zone"\nfile = "shore.gpkg"'
    assert not run(SHORE, flood).table["not_checked"].str.contains("flood").any()


def test_the_record_can_be_written_and_names_what_went_in(plain: Screening) -> None:
    record = json.loads(json.dumps(plain.record, allow_nan=True))
    assert {stamp["name"] for stamp in record["inputs"]} == {"ground.tif", "shore.gpkg", "plots.gpkg"}
    assert all(len(stamp["sha256"]) == 64 for stamp in record["inputs"])
    assert record["plots"]["read"] == 8


def test_fields_lie_on_the_lattice(plain: Screening) -> None:
    grid = plain.fields["elevation_m"].grid
    assert grid.crs == "EPSG:32637"
    assert grid.cell_size_m == 90.0
    assert grid.west_m % 90.0 == grid.north_m % 90.0 == 0.0


def test_two_runs_give_the_same_table(run: Run, plain: Screening) -> None:
    again = run(SHORE)
    assert again.table.drop(columns="geometry").equals(plain.table.drop(columns="geometry"))


def test_an_assumed_wind_halves_what_the_wind_told_and_nothing_else(run: Run) -> None:
    """No criterion of the savannah reads the wind; height above the surroundings is the terrain's, and counts whole."""
    screening = run(SHORE, '[zones]\nforce = "savannah"')
    profile, row = screening.profiles["savannah"], _table(screening).loc["c"]
    total = sum(one.weight for one in profile.criteria)
    # so small a tile leaves the night air unknown: halfway between its limits
    marks = {one.name: row[f"mark_{one.name}"] for one in profile.criteria}
    half = {one.name: (one.worst_mark + one.best_mark) / 2.0 for one in profile.criteria}
    assert [name for name, found in marks.items() if np.isnan(found)] in ([], ["night_flow"])
    by_hand = sum(
        one.weight * (half[one.name] if np.isnan(marks[one.name]) else marks[one.name]) for one in profile.criteria
    )
    by_hand /= total
    assert {one.reading for one in profile.criteria} & {"ventilation", "ridge_exposure", "sheltered_fraction"} == set()
    assert row["overall_mark"] == pytest.approx(by_hand)
    assert "wind" in _assumed(screening)


# --- how to place a house --------------------------------------------------------------------------------------------


def test_houses_on_an_east_shore_turn_part_of_the_way_to_the_breeze(plain: Screening) -> None:
    """The breeze comes from due east, the sun from east and west: the axis gives way by some 20° (our weights)."""
    table = _table(plain)
    for plot in "bcdef":
        turned = abs(table.at[plot, "long_axis_deg"] - 90.0)
        assert 15.0 <= turned <= 30.0
        assert table.at[plot, "wind_incidence_deg"] == pytest.approx(90.0 - turned, abs=2.0)
    hint = plain.siting["c"]
    assert hint.axis_deg == table.at["c", "long_axis_deg"]
    assert (hint.wind, hint.wind_from_deg) == ("sea breeze", pytest.approx(90.0, abs=1.0))
    assert plain.record["siting"]["c"] == hint.says


def test_plots_that_cannot_be_judged_have_no_axis_and_say_why(plain: Screening) -> None:
    table = _table(plain)
    assert np.isnan(table.at["h", "long_axis_deg"])
    assert "h" not in plain.siting


def test_without_breeze_or_wind_table_the_sun_decides(run: Run) -> None:
    screening = run('[zones]\nforce = "hot_arid"')
    table = _table(screening)
    assert (table.loc[list("abcdef"), "long_axis_deg"] == 90.0).all()
    assert table["wind_incidence_deg"].isna().all()
    assert "The sun alone decided: no table of winds was given." in screening.siting["c"].says[0]


def test_a_wind_table_turns_the_axis_in_dry_zones(run: Run) -> None:
    """Wind from due east all year, weight 0.2 against the sun's 0.8: the axis gives way by less than at the coast."""
    screening = run('[zones]\nforce = "hot_arid"', '[wind]\nfile = "wind.csv"')
    table = _table(screening)
    turned = (table.loc[list("abcdef"), "long_axis_deg"] - 90.0).abs()
    assert turned.between(4.0, 20.0).all()
    assert screening.siting["c"].wind_from_deg == pytest.approx(90.0, abs=3.0)


# --- sun -------------------------------------------------------------------------------------------------------------


def test_without_clouds_normals_or_clock_the_sun_is_measured_and_all_that_is_assumed_said(plain: Screening) -> None:
    table = _table(plain)
    assert table.loc[list("abcdef"), ["sun_year_h", "sun_cool_morning_h", "west_load_kwh_m2"]].notna().all(axis=None)
    assert table.loc["a", "sun_year_h"] == pytest.approx(365 * 12.08, rel=0.01)  # open ground near the equator
    assert table.loc["a", "cool_months"] == "May Jun Jul"
    said = " ".join(note.text for note in plain.notes if note.level == "assumed")
    assert "those of a sky without clouds" in said
    assert "universal time +3 h" in said
    assert "no more than a guess" in said
    assert "sun_year_h" in plain.fields
    assert "hours of sun" not in " ".join(plain.not_measured)
    sun = plain.suns["a"]
    assert sun.clock_is_assumed
    assert sun.hour_state.shape == (12, 24)


def test_clouds_seasons_and_clock_of_the_brief_serve(run: Run, country: Path, plain: Screening) -> None:
    rows = [
        f"{month},{part},{share}" for month in range(1, 13) for part, share in (("morning", 0.4), ("afternoon", 0.8))
    ]
    (country / "cloud.csv").write_text("\n".join(["month,part,clear_share", *rows]), encoding="utf-8")
    found = run(
        SHORE,
        '[sky]\nfile = "cloud.csv"\nutc_offset_h = 4',
        "[climate]\ncool_months = [7, 8]\nhot_months = [2]",
    )
    table, clear = _table(found), _table(plain)
    assert table.loc["a", "sun_year_h"] == pytest.approx(0.6 * clear.loc["a", "sun_year_h"], rel=0.01)
    assert table.loc["a", "morning_sun_share"] == pytest.approx(clear.loc["a", "morning_sun_share"], abs=0.01)
    assert (table.loc["a", "cool_months"], table.loc["a", "hot_months"]) == ("Jul Aug", "Feb")
    first = [one.suns["a"].first_h[6] for one in (found, plain)]
    assert first[0] - first[1] == pytest.approx(1.0, abs=0.02)
    assert not found.suns["a"].clock_is_assumed
    said = " ".join(note.text for note in found.notes)
    assert "without clouds" not in said
    assert "universal time" not in said
    assert "a guess" not in said
    assert any(one["name"] == "cloud.csv" for one in found.record["inputs"])
    values = [np.nanmedian(one.fields["sun_year_h"].values) for one in (found, plain)]
    assert values[0] / values[1] == pytest.approx(0.6, abs=0.01)
