"""What the page needs to weigh the questions anew by the program's own arithmetic: marks, limits, weights, shares.

The numbers go over as the program holds them, 8 bytes each, so that the page adds the same numbers in the same order
and comes to the same ranks, ties included (:mod:`sitescreen.judgement.overall`).
"""

import base64
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from sitescreen.settings import load_defaults

if TYPE_CHECKING:
    from sitescreen.screening import Screening


def weighing(screening: "Screening") -> dict[str, Any]:
    """The figures behind every ranked plot's mark, ready for JSON.

    Parameters
    ----------
    screening : Screening

    Returns
    -------
    dict
        ``tie``: marks that differ by less are equal. ``open``: places in the table whose zone is undecided.
        ``zones``: for each zone that has a share in a ranked plot its ``rows`` (places in the table), their ``shares``
        and ``criteria``, each with its ``question``, its ``weight`` in this run, its ``known`` marks (NaN where
        unknown) and, where some are unknown, ``gaps`` (which) with their ``low`` and ``high`` limits.
    """
    judged, zones = screening.judged, screening.zones
    place_of = {plot: place for place, plot in enumerate(screening.table["plot"].tolist())}
    places = np.array([place_of[plot] for plot in judged.table.index.tolist()], dtype=np.int64)
    is_ranked = screening.table["rank"].notna().to_numpy()
    provisional = zones.provisional.to_numpy(dtype=np.bool_)
    out = []
    for zone, one in judged.by_zone.items():
        kept = np.flatnonzero(is_ranked[places[one.rows]])
        if not len(kept):
            continue
        share = zones.shares[zone].to_numpy(dtype=np.float64)[one.rows[kept]]
        criteria = []
        for criterion in screening.profiles[zone].criteria:
            name = f"mark_{criterion.name}"
            known, low, high = (
                frame[name].to_numpy(dtype=np.float64)[kept] for frame in (one.marks, one.lowest, one.highest)
            )
            gaps = np.flatnonzero(np.isnan(known))
            limits = {"gaps": gaps.tolist(), "low": packed(low[gaps]), "high": packed(high[gaps])} if gaps.size else {}
            criteria.append(
                {
                    "name": criterion.name,
                    "question": criterion.question,
                    "weight": one.weights[criterion.name],
                    "known": packed(known),
                    **limits,
                }
            )
        rows = places[one.rows[kept]].tolist()
        out.append({"zone": zone, "rows": rows, "shares": packed(share), "criteria": criteria})
    return {
        "tie": load_defaults().judgement.mark_tie,
        "open": sorted(int(place) for place in places[provisional] if is_ranked[place]),
        "zones": out,
    }


def packed(values: NDArray[np.float64]) -> str | float:
    """Numbers as the bytes of little-endian doubles, in base 64; the number itself where all are the same."""
    if values.size and np.all(values == values[0]):
        return float(values[0])
    return base64.b64encode(np.ascontiguousarray(values, dtype="<f8").tobytes()).decode("ascii")
