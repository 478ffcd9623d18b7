"""Low marks under other weights and other draws of the data: the one sum that trials and what-ifs share."""

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.zones import ZoneShares
from sitescreen.judgement.drawn_marks import DrawnMarks
from sitescreen.judgement.overall import Judged

FloatArray = NDArray[np.float64]

ZoneWeights = Mapping[str, Mapping[str, FloatArray]]
"""Zone → criterion → the weight in each trial, shape (trials,)."""


def run_weights(judged: Judged, count: int) -> ZoneWeights:
    """The weights of the run, so many times."""
    return {
        zone: {name: np.full(count, weight) for name, weight in one.weights.items()}
        for zone, one in judged.by_zone.items()
    }


def low_marks(
    judged: Judged,
    zones: ZoneShares,
    rows: NDArray[np.int64],
    weights: ZoneWeights,
    data: DrawnMarks | None = None,
    draw: NDArray[np.int64] | None = None,
) -> FloatArray:
    """The marks that ranks go by, under other weights and other draws of the data.

    Parameters
    ----------
    judged : Judged
    zones : ZoneShares
        Of the same plots.
    rows : int64 array, shape (m,)
        Which plots.
    weights : mapping of zone to criterion to float64 array, shape (trials,)
        Each at least 0, and not all 0 in a zone.
    data : DrawnMarks, optional
        Of the same plots; without it the readings are those of the run.
    draw : int64 array, shape (trials,), optional
        Which draw of the data each trial takes; needed with ``data``.

    Returns
    -------
    float64 array, shape (trials, m)
        Unknown readings at their worst; blended over the zones that share a plot; where its zone is undecided, that of
        the zone that suits it least. With the weights and readings of the run this is ``mark_low``. NaN without a zone,
        −inf where the draw sets the plot aside.
    """
    trials = len(next(iter(next(iter(weights.values())).values()))) if weights else 0
    place = np.full(len(judged.table), -1, dtype=np.int64)
    place[rows] = np.arange(len(rows))
    provisional = zones.provisional.to_numpy(dtype=np.bool_)[rows]
    marks = np.zeros((trials, len(rows)))
    marks[:, provisional] = np.inf
    for zone, one in judged.by_zone.items():
        here = np.flatnonzero(place[one.rows] >= 0)
        if not len(here):
            continue
        at = place[one.rows[here]]
        total = np.zeros((trials, len(here)))
        weight_sum = np.zeros(trials)
        # criterion by criterion, as the overall mark is added: plots with equal marks keep equal sums, whoever is near
        drawn = data.by_zone.get(zone, {}) if data is not None and draw is not None else {}
        for name, weight in weights[zone].items():
            if name in drawn:
                total += weight[:, None] * drawn[name][draw]
            else:
                total += weight[:, None] * one.lowest[f"mark_{name}"].to_numpy(dtype=np.float64)[here][None, :]
            weight_sum += weight
        total /= weight_sum[:, None]
        open_zone = provisional[at]
        share = zones.shares[zone].to_numpy(dtype=np.float64)[one.rows[here]]
        marks[:, at[~open_zone]] += share[~open_zone] * total[:, ~open_zone]
        marks[:, at[open_zone]] = np.minimum(marks[:, at[open_zone]], total[:, open_zone])
    has_zone = zones.zone.to_numpy(dtype=object)[rows] != ""
    marks[:, ~has_zone] = np.nan
    if data is not None and draw is not None:
        marks[data.stopped[:, np.searchsorted(data.rows, rows)][draw]] = -np.inf
    return marks
