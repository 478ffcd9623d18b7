"""Mapped water against the terrain's own."""

import numpy as np
import pandas as pd
import pytest

from sitescreen.judgement.waters import waters_disagree


@pytest.mark.parametrize(
    ("mapped", "flat", "over_water_m", "says"),
    [
        (1.0, 1.0, 0.0, 0.0),  # a lake on the map, level in the terrain
        (1.0, 0.0, 40.0, 1.0),  # a lake on the map, a hill in the terrain
        (1.0, 0.0, 3.0, 0.0),  # rough ground at the lake's level: noise over water, never called dry
        (0.01, 0.0, 40.0, 0.0),  # a sliver is the drawing accuracy of the map
        (0.0, 1.0, np.nan, 1.0),  # level as water, and no water mapped
        (0.2, 1.0, 0.0, 1.0),  # open sea in the terrain, four fifths of it mapped as land
        (0.6, 1.0, 0.0, 0.0),  # most of it mapped: both say water
        (0.51, 1.0, 0.0, 0.0),  # and so does a bare majority: it must not lose its "in water"
        (0.4, 0.6, 0.0, 0.0),  # a plot at the rim, much the same in both
        (np.nan, 1.0, np.nan, 1.0),  # the same without a shoreline
        (np.nan, 0.0, np.nan, np.nan),  # no shoreline, ordinary ground: nobody can say
        (0.0, 0.0, np.nan, 0.0),
    ],
)
def test_who_says_water(mapped: float, flat: float, over_water_m: float, says: float) -> None:
    readings = pd.DataFrame({"share_in_water": [mapped], "share_flat_water": [flat], "over_water_m": [over_water_m]})
    assert waters_disagree(readings, vertical_error_m=2.0).tolist() == pytest.approx([says], nan_ok=True)
