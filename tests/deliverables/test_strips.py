"""What the leaf draws, as data: angles, runs of sun and sections come back as the program holds them."""

import json
from typing import Any

import numpy as np

from sitescreen.deliverables.strips import strips


def test_arcs_runs_and_skyline_come_back(with_drawings: Any) -> None:
    data = json.loads(json.dumps(strips(with_drawings), allow_nan=False))
    sun = with_drawings.suns[with_drawings.table["plot"][0]]
    one = data["plots"][0]
    sky = data["skies"][one["sky"]]
    np.testing.assert_allclose(np.array(one["skyline"]) / 10, sun.skyline_deg, atol=0.051)
    for month in range(12):
        up = np.flatnonzero(sun.elevation_deg[month] > 0)
        assert sky["from"][month] == up[0]
        np.testing.assert_allclose(np.array(sky["height"][month]) / 10, sun.elevation_deg[month, up], atol=0.051)
        np.testing.assert_allclose(np.array(sky["bearing"][month]) / 10, sun.azimuth_deg[month, up], atol=0.051)
        lit = np.zeros(96, dtype=bool)
        for begin, length in np.array(one["lit"][month]).reshape(-1, 2):
            lit[begin : begin + length] = True
        np.testing.assert_array_equal(lit, sun.lit[month])
    np.testing.assert_array_equal(np.array(list(one["hours"]), dtype=int).reshape(12, 24), sun.hour_state)
    assert (one["cool"], one["hot"], one["clock"]) == ([0, 1, 2], [9, 10, 11], [3.0, True])


def test_plots_under_one_sun_share_its_arcs(with_drawings: Any) -> None:
    data = strips(with_drawings)
    assert len(data["skies"]) == 1
    assert [one["sky"] for one in data["plots"]] == [0] * len(with_drawings.table)


def test_sections_and_winds_are_those_of_the_plot(with_drawings: Any) -> None:
    one = strips(with_drawings)["plots"][2]
    assert one["winds"][4] == 2.0
    assert one["winds"][12] == 0.5
    section = one["section"]
    assert (section["distance"][-1], section["shore"], section["bearing"]) == (6000.0, 6000.0, 92.0)
    assert (section["crest_at"], section["crest"]) == (1500.0, 240.0)


def test_what_is_not_known_is_left_out(screening: Any, with_drawings: Any) -> None:
    assert strips(screening)["plots"] == [{}] * len(screening.table)
    first = with_drawings.table["plot"][0]
    unknown = with_drawings.suns[first].skyline_deg.copy()
    unknown[3] = np.nan
    sun = type(with_drawings.suns[first])(**{**vars(with_drawings.suns[first]), "skyline_deg": unknown})
    assert strips(with_drawings.with_(suns={first: sun}))["plots"][0]["skyline"][3] is None
