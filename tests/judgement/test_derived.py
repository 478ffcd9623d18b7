"""Readings that follow from other readings."""

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sitescreen.judgement.derived import facing_ns, possible_range, sky_hidden_share, unknown_because, with_derived


@pytest.mark.parametrize(
    ("slope", "aspect", "facing"),
    [(12.0, 0.0, 1.0), (12.0, 180.0, 1.0), (12.0, 90.0, -1.0), (12.0, 225.0, 0.0), (5.0, 180.0, 0.5), (0.0, 90.0, 0.0)],
)
def test_ground_faces_north_or_south(slope: float, aspect: float, facing: float) -> None:
    assert facing_ns(np.array([slope]), np.array([aspect]))[0] == pytest.approx(facing)


def test_an_open_slope_hides_no_sky() -> None:
    """An open 30° slope sees (1 + cos 30°)/2 = 0.9330 of the sky (Dozier & Frew 1990): its own slope takes the rest."""
    assert sky_hidden_share(np.array([30.0]), np.array([0.9330127]))[0] == pytest.approx(0.0, abs=1e-7)


def test_a_basin_hides_the_sky_below_its_rim() -> None:
    """Level ground in a basin with a horizon of 30° all round: sky view cos²(30°) = 0.75."""
    assert sky_hidden_share(np.array([0.0]), np.array([0.75]))[0] == pytest.approx(0.25)


def test_noise_never_hides_less_than_nothing() -> None:
    assert sky_hidden_share(np.array([0.0]), np.array([1.001]))[0] == 0.0


def test_unknown_stays_unknown() -> None:
    blank = np.array([np.nan])
    assert np.isnan(facing_ns(np.array([5.0]), blank)).all()
    assert np.isnan(sky_hidden_share(blank, np.array([0.9]))).all()
    assert np.isnan(sky_hidden_share(np.array([5.0]), blank)).all()


@given(slope=st.floats(0, 60), aspect=st.floats(0, 360))
def test_a_known_direction_lies_in_the_range_of_the_unknown_one(slope: float, aspect: float) -> None:
    low, high = possible_range("facing_ns", pd.DataFrame({"slope_deg": [slope]}))
    assert low[0] <= facing_ns(np.array([slope]), np.array([aspect]))[0] <= high[0]


def test_the_table_handed_in_stays_as_it_is() -> None:
    table = pd.DataFrame({"slope_deg": [5.0], "sky_view": [0.9]})
    assert {"facing_ns", "sky_hidden_share"} <= set(with_derived(table))
    assert list(table) == ["slope_deg", "sky_view"]


def test_the_reason_comes_from_what_it_follows_from() -> None:
    why = pd.DataFrame({"aspect_deg": ["too level"], "slope_deg": [""]}, index=["a"])
    assert unknown_because("facing_ns", why, "a") == "too level"
    assert unknown_because("rise_m", why, "a") == ""
