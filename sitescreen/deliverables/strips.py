"""What the leaf draws all round a plot: skyline and sun, wind by sector, the ground to the shore, the year by hours."""

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from sitescreen.settings import load_defaults

if TYPE_CHECKING:
    from sitescreen.screening import Screening

MOST_STRIPS = 200
"""Plots with drawings on their leaves, the best first; the others have words and figures only."""

TENTHS = 10
"""Angles go over in tenths of a degree: finer than any screen shows."""


def strips(screening: "Screening") -> dict[str, Any]:
    """The drawings' data, ready for JSON.

    Parameters
    ----------
    screening : Screening

    Returns
    -------
    dict
        ``plots``: for each of the first plots its ``skyline`` (72 tenths of a degree), ``sky`` (which of ``skies``),
        ``lit`` (for each month the runs of steps with sun: begin, length …), ``first`` and ``last`` sun by month [h],
        ``hours`` (12 × 24 digits: 0 night, 1 shaded, 2 sun), ``cool`` and ``hot`` months, ``clock`` (hours ahead of
        universal time, and whether that is assumed), ``winds`` (speed over that of open level ground, by sector),
        ``section``; each left out where it is not known. ``skies``: for each sun that plots share the ``hour`` of its
        steps and by month where they begin (``from``), ``height`` and ``bearing``. ``depths``: how deep the breeze of
        sea and lake is [m].
    """
    breeze = load_defaults().breeze
    names = screening.table["plot"].head(MOST_STRIPS).tolist()
    winds = screening.winds.of(tuple(names))
    skies: dict[bytes, int] = {}
    drawn: list[dict[str, Any]] = []
    out = []
    for row, plot in enumerate(names):
        one: dict[str, Any] = {}
        sun = screening.suns.get(plot)
        if sun is not None:
            # suns alike to a quarter of a degree, half a pixel, share their arcs
            arcs = np.rint(4.0 * np.stack([sun.elevation_deg, sun.azimuth_deg])[:, ::3, ::8])
            alike = (arcs * (sun.elevation_deg[::3, ::8] > 0)).tobytes()
            if alike not in skies:
                skies[alike] = len(drawn)
                drawn.append(_sky(sun))
            one |= _sun(sun) | {"sky": skies[alike]}
        if np.isfinite(winds.speed_ratio[row]).any():
            one["winds"] = _rounded(winds.speed_ratio[row], 2)
        section = screening.sections.get(plot)
        if section is not None:
            one["section"] = _section(section)
        out.append(one)
    return {
        "plots": out,
        "skies": drawn,
        "depths": {"sea": breeze.sea_depth_m, "lake": breeze.lake_depth_m},
    }


def _sky(sun: Any) -> dict[str, Any]:
    """The arcs above the horizon, month by month."""
    begin, height, bearing = [], [], []
    for month in range(12):
        up = np.flatnonzero(sun.elevation_deg[month] > 0.0)
        begin.append(int(up[0]) if up.size else 0)
        height.append(_tenths(sun.elevation_deg[month, up]))
        bearing.append(_tenths(sun.azimuth_deg[month, up]))
    return {"hour": _rounded(sun.hour, 3), "from": begin, "height": height, "bearing": bearing}


def _sun(sun: Any) -> dict[str, Any]:
    return {
        "skyline": _tenths(sun.skyline_deg),
        "lit": [_runs(sun.lit[month]) for month in range(12)],
        "first": _rounded(sun.first_h, 2),
        "last": _rounded(sun.last_h, 2),
        "hours": "".join(map(str, sun.hour_state.ravel().tolist())),
        "cool": np.flatnonzero(sun.cool).tolist(),
        "hot": np.flatnonzero(sun.hot).tolist(),
        "clock": [sun.utc_offset_h, bool(sun.clock_is_assumed)],
    }


def _section(section: Any) -> dict[str, Any]:
    return {
        "distance": _rounded(section.distance_m, 0),
        "ground": _rounded(section.ground_m, 1),
        **{
            name: None if np.isnan(value) else round(float(value), 1)
            for name, value in (
                ("shore", section.shore_distance_m),
                ("bearing", section.bearing_deg),
                ("crest_at", section.crest_distance_m),
                ("crest", section.crest_m),
            )
        },
    }


def _runs(lit: NDArray[np.bool_]) -> list[int]:
    """First step and length of each stretch of True."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], lit, [False]]).astype(np.int8)))
    return [int(number) for begin, end in edges.reshape(-1, 2) for number in (begin, end - begin)]


def _tenths(angles: NDArray[Any]) -> list[int | None]:
    return [None if np.isnan(angle) else round(TENTHS * float(angle)) for angle in angles.tolist()]


def _rounded(values: NDArray[Any], decimals: int) -> list[float | None]:
    return [None if np.isnan(value) else round(float(value), decimals) for value in np.asarray(values).tolist()]
