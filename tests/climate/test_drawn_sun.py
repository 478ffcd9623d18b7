"""The sun over one plot, as it is drawn."""

import numpy as np

from sitescreen.climate.drawn_sun import NIGHT, SHADED, SUNNY, drawn_suns, hour_state
from sitescreen.climate.plot_sun import PlotSkies
from sitescreen.climate.seasons import seasons_without_normals
from sitescreen.climate.sun_path import sun_paths
from sitescreen.settings import load_defaults

SUN = load_defaults().sun


def three_plots() -> PlotSkies:
    """Open ground, a wall of 30° in the east, and ground of unknown height."""
    lines = np.zeros((3, 72), dtype=np.float32)
    lines[1, 1:36] = 30.0
    lon, lat, height = np.full(3, 30.0), np.full(3, 0.0), np.array([900.0, 900.0, np.nan])
    normal = np.tile([0.0, 0.0, 1.0], (3, 1))
    skies = sun_paths(lon, lat, height, SUN)
    return PlotSkies(lines, skies, seasons_without_normals(lat), None, np.ones(3), normal)


def test_a_plots_strip_and_arcs_know_its_skyline() -> None:
    found = drawn_suns([(["a", "b", "c"], three_plots())], ["c", "b", "a"], SUN, True)
    assert list(found) == ["b", "a"]
    shut, free = found["b"], found["a"]
    assert free.hour_state[2, 0] == NIGHT
    assert free.hour_state[2, 7] == SUNNY
    assert shut.hour_state[2, 7] == SHADED  # 30° takes two hours and more to climb
    assert shut.hour_state[2, 9] == SUNNY
    assert (shut.lit[2] <= free.lit[2]).all()
    assert shut.first_h[2] > free.first_h[2] + 1.9
    assert shut.last_h[2] == free.last_h[2]
    assert (free.hour_state > NIGHT).sum(axis=1).min() >= 11
    assert free.elevation_deg is shut.elevation_deg
    assert (free.utc_offset_h, free.clock_is_assumed) == (2.0, True)
    assert free.cool.sum() == free.hot.sum() == 3


def test_plots_of_other_blocks_keep_their_own_sun() -> None:
    suns = three_plots()
    found = drawn_suns([(["a", "b", "c"], suns), (["d", "e", "f"], suns)], ["e"], SUN, False)
    assert list(found) == ["e"]
    assert np.nanmax(found["e"].skyline_deg) == 30.0


def test_an_hour_is_what_most_of_it_is() -> None:
    hour = np.array([0.25, 0.75, 1.25, 1.75, 2.25, 2.75])
    up = np.tile([False, True, True, True, False, False], (12, 1))
    seen = np.tile([False, False, False, True, False, False], (12, 1))
    assert hour_state(hour, up, seen)[0, :4].tolist() == [SHADED, SUNNY, NIGHT, NIGHT]
