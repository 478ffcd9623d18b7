"""Readings under drawn terrain."""

import numpy as np

from sitescreen.judgement.draws import NO_DRAWS, ReadingDraws


def test_what_was_not_drawn_is_as_in_the_run() -> None:
    """A plot without draws, and a reading without draws, keep the run's own value in every column."""
    draws = ReadingDraws(
        {
            "slope_deg": np.array([[1.0, 2.0, 3.0], [np.nan, np.nan, np.nan]]),
            "cold_pool_kind": np.array([[""] * 3, ["none", "leaky", "none"]], dtype=object),
        }
    )
    assert draws.count == 3
    np.testing.assert_array_equal(draws.of("slope_deg", np.array([9.0, 7.0])), [[1.0, 2.0, 3.0], [7.0, 7.0, 7.0]])
    np.testing.assert_array_equal(
        draws.of("cold_pool_kind", np.array(["closed", "closed"], dtype=object)),
        [["closed"] * 3, ["none", "leaky", "none"]],
    )
    np.testing.assert_array_equal(draws.of("rise_m", np.array([4.0, 5.0])), [[4.0] * 3, [5.0] * 3])


def test_without_draws_there_is_one_column() -> None:
    """So that what reads the draws need not ask whether there are any."""
    assert NO_DRAWS.count == 0
    np.testing.assert_array_equal(NO_DRAWS.of("slope_deg", np.array([4.0, 5.0])), [[4.0], [5.0]])
