"""Readings that follow from other readings."""

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sitescreen.judgement.derived import facing_ns, possible_range, unknown_because, with_derived


@pytest.mark.parametrize(
    ("slope", "aspect", "facing"),
    [(12.0, 0.0, 1.0), (12.0, 180.0, 1.0), (12.0, 90.0, -1.0), (12.0, 225.0, 0.0), (5.0, 180.0, 0.5), (0.0, 90.0, 0.0)],
)
def test_ground_faces_north_or_south(slope: float, aspect: float, facing: float) -> None:
    assert facing_ns(np.array([slope]), np.array([aspect]))[0] == pytest.approx(facing)


def test_unknown_stays_unknown() -> None:
    assert np.isnan(facing_ns(np.array([5.0]), np.array([np.nan]))).all()


@given(slope=st.floats(0, 60), aspect=st.floats(0, 360))
def test_a_known_direction_lies_in_the_range_of_the_unknown_one(slope: float, aspect: float) -> None:
    low, high = possible_range("facing_ns", pd.DataFrame({"slope_deg": [slope]}))
    assert low[0] <= facing_ns(np.array([slope]), np.array([aspect]))[0] <= high[0]


def test_the_table_handed_in_stays_as_it_is() -> None:
    table = pd.DataFrame({"slope_deg": [5.0], "aspect_deg": [0.0]})
    assert set(with_derived(table)) == {"slope_deg", "aspect_deg", "facing_ns"}
    assert list(table) == ["slope_deg", "aspect_deg"]


def test_the_reason_comes_from_what_it_follows_from() -> None:
    why = pd.DataFrame({"aspect_deg": ["too level"], "slope_deg": [""]}, index=["a"])
    assert unknown_because("facing_ns", why, "a") == "too level"
    assert unknown_because("rise_m", why, "a") == ""
