"""Agreement of two rankings."""

import numpy as np
import pytest

from sitescreen.judgement.agreement import agreement


def test_matches_worked_examples() -> None:
    """Examples of SciPy's documentation of kendalltau and spearmanr, and three small ones worked out by hand."""
    assert agreement([12, 2, 1, 12, 2], [1, 4, 7, 1, 0]).tau_b == pytest.approx(-0.471405, abs=1e-6)
    assert agreement([1, 2, 3, 4, 5], [5, 6, 7, 8, 7]).rho == pytest.approx(0.820783, abs=1e-6)
    assert agreement([1, 2, 3, 4, 5, 6], [2, 1, 4, 3, 6, 5]) == pytest.approx((0.6, 0.828571, 6), abs=1e-6)
    assert agreement([1, 2, 3, 4, 5], [1, 2, 3, 5, 4]) == pytest.approx((0.8, 0.9, 5), abs=1e-6)
    assert agreement([1, 2, 3], [3, 2, 1]) == pytest.approx((-1.0, -1.0, 3))


def test_plots_without_a_rank_take_no_part() -> None:
    assert agreement([1, 2, np.nan, 3, 4], [1, 2, 5, np.nan, 3]) == pytest.approx((1.0, 1.0, 3))
    assert np.isnan(agreement([1, np.nan], [1, 2]).tau_b)
    assert np.isnan(agreement([1, 1, 1], [1, 2, 3]).rho)
