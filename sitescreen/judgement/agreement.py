"""How far two rankings of the same plots agree."""

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike


class Agreement(NamedTuple):
    """Kendall's τ_b and Spearman's ρ, −1 to 1, and how many plots both rankings hold."""

    tau_b: float
    rho: float
    plots: int


def agreement(first: ArrayLike, second: ArrayLike) -> Agreement:
    """Agreement of two rankings over the plots that both rank.

    Parameters
    ----------
    first, second : arrays, shape (n,)
        Ranks of the same plots; NaN where a plot has none. Equal ranks are ties.

    Returns
    -------
    Agreement
        NaN where fewer than two plots are in both, or one of them ranks all alike.
    """
    from scipy import stats

    one, two = np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    both = np.isfinite(one) & np.isfinite(two)
    one, two = one[both], two[both]
    if len(one) < 2 or len(set(one)) < 2 or len(set(two)) < 2:
        return Agreement(np.nan, np.nan, len(one))
    return Agreement(float(stats.kendalltau(one, two).statistic), float(stats.spearmanr(one, two).statistic), len(one))
