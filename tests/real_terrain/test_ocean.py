"""The main job on the ocean-coast tile: 90 m, sea at 0 without any no-data, UTM zone 25 south."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import rasterio

from sitescreen.brief import load_brief
from sitescreen.screening import Screening, screen

pytestmark = pytest.mark.real_terrain

# By the file's own cells and the land polygons, apart from the program:
IN_THE_SEA = ["06"]  # all at 0 m, all outside the mapped land
AT_THE_RIM = ["05", "12"]  # 05: all at 0 m, four fifths on mapped land; 12: half and half in both


def test_every_plot_has_an_outcome(ocean_screening: Screening) -> None:
    table = ocean_screening.table.set_index("plot")
    assert sorted(table.index) == [f"{k:02d}" for k in range(1, 25)]
    assert ((table["rank"].notna()) | (table["set_aside"].str.len() > 0)).all()


def test_a_plot_in_the_sea_is_set_aside(ocean_screening: Screening) -> None:
    table = ocean_screening.table.set_index("plot")
    for plot in IN_THE_SEA:
        assert "water" in table.loc[plot, "set_aside"]
    assert pd.notna(table["rank"]).sum() >= 20


def test_plots_at_the_rim_carry_a_caution_or_are_set_aside(ocean_screening: Screening) -> None:
    """Terrain and shoreline disagree about one, both halve the other: nobody may read these as plain dry ground."""
    table = ocean_screening.table.set_index("plot")
    for plot in AT_THE_RIM:
        assert table.loc[plot, "set_aside"] + table.loc[plot, "cautions"] != ""


def test_open_sea_of_the_terrain_on_mapped_land_is_told(ocean_screening: Screening) -> None:
    """Plot 05 is level at 0 m all over, and four fifths of it are mapped as land."""
    (plot,) = ocean_screening.table.set_index("plot").loc[["05"]].itertuples()
    assert "the terrain shows" in plot.cautions


def test_distances_agree_with_geodesics(
    ocean_screening: Screening,
    ocean_place: Any,
    by_geodesics: Callable[..., pd.DataFrame],
    nearest_km: Callable[..., pd.Series],
) -> None:
    """To the rim of the land polygons; islets off the shore have a sea shore too."""
    table = ocean_screening.table.set_index("plot").drop(index=[*IN_THE_SEA, *AT_THE_RIM])
    walked = by_geodesics(ocean_place.shore, "land", table)
    assert set(table["shore_kind"]) == {"sea"}
    # half the spacing of the walked points, and a line that is straight in metres bends by metres in degrees
    assert np.abs(nearest_km(ocean_place.brief, "sea", table) - walked["km"]).max() < 0.015
    # the reading asks for open water, so its shore may be a farther one; but a shore of this water it must be
    assert (table["shore_distance_km"] > walked["km"] - 0.015).all()
    assert walked["off_m"].max() < 20.0


def test_the_sea_wind_comes_from_the_east(ocean_screening: Screening) -> None:
    """The coast runs north to south with the ocean in the east, so the onshore breeze comes from the eastern half."""
    onshore = ocean_screening.table["onshore_from_deg"].dropna()
    assert len(onshore) >= 15
    assert np.cos(np.radians(onshore - 90.0)).mean() > 0.5


def test_the_nameless_coordinate_system_is_understood(
    ocean_screening: Screening, ocean_place: Any, open_data: Callable[[str], Path]
) -> None:
    """The file as it comes: "UTM Zone 25, Southern Hemisphere" on an unknown datum of the GRS 1980 ellipsoid.

    Its projection is fully described, so it is usable; GRS 1980 and WGS 84 differ by under a millimetre here.
    """
    brief = ocean_place.brief.with_name("nameless.toml")
    text = ocean_place.brief.read_text(encoding="utf-8")
    brief.write_text(text.replace(str(ocean_place.terrain), str(open_data("ocean_90m.tif"))), encoding="utf-8")
    found = screen(load_brief(brief)).table.set_index("plot")
    expected = ocean_screening.table.set_index("plot").loc[found.index]
    assert np.nanmax(np.abs(found["elevation_m"] - expected["elevation_m"])) < 0.01
    assert (found["shore_distance_km"] == expected["shore_distance_km"]).all()


def test_sea_at_zero_stays_at_zero(ocean_screening: Screening, ocean_place: Any) -> None:
    """The file has no no-data value: its 2,054 cells at 0 are sea, and must not become holes or be filled."""
    elevation = ocean_screening.fields["elevation_m"]
    with rasterio.open(ocean_place.terrain) as source:
        share_at_zero = float((source.read(1) == 0).mean())
    known = elevation.values[np.isfinite(elevation.values)]
    assert (np.abs(known) < 0.01).mean() == pytest.approx(share_at_zero, abs=0.02)
