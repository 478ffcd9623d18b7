"""A second opinion from the climate normals: the Mahoney indicators, and what they ask of a building.

References
----------
.. [1] United Nations, *Climate and House Design*, Design of Low-Cost Housing and Community Facilities I,
   ST/SOA/93, New York 1971 (tables by C. Mahoney with O. H. Koenigsberger and M. Evans).
.. [2] O. H. Koenigsberger, T. G. Ingersoll, A. Mayhew, S. V. Szokolay, *Manual of Tropical Housing and Building* I,
   London 1974. The limits of the humidity groups, the rules of the indicators and the recommendations are given here
   from memory of that; the comfort limits were checked against a published sheet (Kisumu; see the test).
"""

from collections.abc import Mapping
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike, NDArray

if TYPE_CHECKING:
    from sitescreen.inputs.normals import Normals

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

HUMIDITY_LIMITS_PCT = (30.0, 50.0, 70.0)
"""Below the first: group 1; to the second: 2; to the third: 3; above: 4 [2]_. [%]"""

RANGE_LIMIT_K, RAIN_LIMIT_MM = 10.0, 200.0
"""A month's range is large, its rain heavy, above these [2]_."""

# by the year's mean temperature: above 20 °C, 15 to 20 °C, below 15 °C; rows: humidity groups 1 to 4 [1]_ [°C]
DAY_LIMITS_C = np.array([
    [(26, 34), (25, 31), (23, 29), (22, 27)],
    [(23, 32), (22, 30), (21, 28), (20, 25)],
    [(21, 30), (20, 27), (19, 26), (18, 24)],
], dtype=np.float64)  # fmt: skip
NIGHT_LIMITS_C = np.array([
    [(17, 25), (17, 24), (17, 23), (17, 21)],
    [(14, 23), (14, 22), (14, 21), (14, 20)],
    [(12, 21), (12, 20), (12, 19), (12, 18)],
], dtype=np.float64)  # fmt: skip

INDICATORS = ("H1", "H2", "H3", "A1", "A2", "A3")

HUMID_ZONES, DRY_ZONES = ("hot_humid_coast", "lake_basin"), ("hot_arid", "savannah")
MONTHS_MANY = 6
"""Half the year or more makes a place humid or dry for the second opinion: our choice, no source."""


class Mahoney(NamedTuple):
    """The indicators of places.

    Parameters
    ----------
    annual_mean_c, annual_range_k : float64 arrays, shape (n,)
        (highest monthly maximum + lowest monthly minimum)/2, and their difference; not the mean of the months.
    group : int array, shape (n, 12)
        Humidity group of each month, 1 driest to 4.
    day, night : int arrays, shape (n, 12)
        Stress: 1 hot, 0 comfortable, −1 cold.
    months : mapping of "H1" … "A3" to int array, shape (n,)
        Months a year in which each indicator holds. H1 air movement is essential, H2 desirable, H3 rain protection
        is needed; A1 thermal storage, A2 sleeping outdoors, A3 the cold season is a problem.
    """

    annual_mean_c: FloatArray
    annual_range_k: FloatArray
    group: IntArray
    day: IntArray
    night: IntArray
    months: Mapping[str, IntArray]


def mahoney(t_max_c: ArrayLike, t_min_c: ArrayLike, rh_mean: ArrayLike, rain_mm: ArrayLike) -> Mahoney:
    """The Mahoney indicators of places from twelve months each.

    Parameters
    ----------
    t_max_c, t_min_c : arrays, shape (n, 12)
        Means of the daily extremes. [°C]
    rh_mean : array, shape (n, 12)
        Mean of the morning's and the afternoon's relative humidity. [%]
    rain_mm : array, shape (n, 12)

    Returns
    -------
    Mahoney

    Notes
    -----
    The sheets of [1]_ round temperatures to 0.5 °C; here they are taken as they are.
    """
    hot, cool, humidity, rain = (
        np.atleast_2d(np.asarray(one, dtype=np.float64)) for one in (t_max_c, t_min_c, rh_mean, rain_mm)
    )
    highest, lowest = hot.max(axis=1), cool.min(axis=1)
    annual = 0.5 * (highest + lowest)
    band = np.where(annual > 20.0, 0, np.where(annual >= 15.0, 1, 2))
    dry, middle, moist = HUMIDITY_LIMITS_PCT
    group = 1 + (humidity >= dry).astype(np.int64) + (humidity > middle) + (humidity > moist)
    day = _stress(hot, DAY_LIMITS_C[band[:, None], group - 1])
    night = _stress(cool, NIGHT_LIMITS_C[band[:, None], group - 1])
    wide = hot - cool > RANGE_LIMIT_K
    hot_day, humid, dryish = day == 1, group == 4, group <= 2
    narrow = hot - cool < RANGE_LIMIT_K
    holds = {
        "H1": hot_day & (humid | ((group == 2) | (group == 3)) & narrow),
        "H2": (day == 0) & humid,
        "H3": rain > RAIN_LIMIT_MM,
        "A1": ~humid & wide,
        "A2": ((night == 1) & dryish) | (hot_day & (night == 0) & dryish & wide),
        "A3": day == -1,
    }
    return Mahoney(annual, highest - lowest, group, day, night, {name: holds[name].sum(axis=1) for name in INDICATORS})


def _stress(value: FloatArray, limits: FloatArray) -> IntArray:
    return np.asarray((value > limits[..., 1]).astype(np.int64) - (value < limits[..., 0]))


def asks_for(months: Mapping[str, int]) -> tuple[str, ...]:
    """What the indicators recommend for the layout, in plain clauses [1]_, [2]_.

    Parameters
    ----------
    months : mapping of "H1" … "A3" to int
    """
    h1, h2, h3, a1, a2, a3 = (int(months[name]) for name in INDICATORS)
    said = [
        "compact layout round courtyards" if a1 >= 11 and a3 <= 4 else "long faces to north and south",
        "open spacing for the breeze"
        if h1 >= 11
        else "open spacing, with protection from hot or cold wind"
        if h1 >= 2
        else "compact spacing",
    ]
    if h1 >= 3 or (h1 >= 1 and a1 <= 5):
        said.append("rooms in a single row with lasting cross-ventilation")
    elif h1 >= 1 or h2 >= 2:
        said.append("double rows of rooms, cross-ventilation at times")
    else:
        said.append("no need of cross-ventilation")
    if a1 <= 1 and a3 == 0:
        said.append("large openings (40–80 % of the wall)")
    elif a1 >= 11 and a3 <= 1:
        said.append("very small openings (10–20 %)")
    else:
        said.append("medium openings (20–40 %)")
    said.append("light walls" if a1 <= 2 else "heavy walls")
    said.append("a light insulated roof" if a1 <= 5 else "a heavy roof")
    said += ["room to sleep outdoors"] * (a2 >= 2) + ["protection from heavy rain"] * (h3 >= 3)
    return tuple(said)


def zone_doubt(months: Mapping[str, int], zone: str) -> str:
    """Where the indicators speak against the plot's zone, in a clause; "" where they do not."""
    humid, dry = int(months["H1"]) + int(months["H2"]), int(months["A1"])
    if zone in HUMID_ZONES and humid == 0:
        return "they see no humid month here, unlike the zone it is judged by"
    if zone in DRY_ZONES and humid >= MONTHS_MANY and dry < MONTHS_MANY:
        return f"they see {humid} humid months here, unlike the zone it is judged by"
    return ""


def second_opinion(normals: "Normals", climate: pd.DataFrame, zone: pd.Series) -> pd.DataFrame:
    """The indicators at each plot, from the normals of its station moved to its height.

    Parameters
    ----------
    normals : Normals
    climate : DataFrame, n rows
        As :func:`sitescreen.climate.normals.plot_climate` gives it.
    zone : Series of str, n rows
        The zone that each plot is judged by.

    Returns
    -------
    DataFrame, n rows
        ``mahoney``, as "H1 0, H2 0, H3 1, A1 12, A2 0, A3 0", and ``mahoney_says``, a sentence; "" where the plot's
        height is unknown.

    Notes
    -----
    All monthly temperatures move with the station's mean; humidity and rain stay the station's.
    """
    months = normals.stations.sort_values(["station", "month"])
    tables = {name: months.pivot_table(index="station", columns="month", values=name) for name in _MONTHLY}
    at = climate["station"].to_numpy(dtype=object)
    own = {name: table.loc[at].to_numpy(dtype=np.float64) for name, table in tables.items()}
    station_mean = 0.5 * (own["t_max_c"] + own["t_min_c"]).mean(axis=1)
    warmer = (climate["t_mean_c"].to_numpy(dtype=np.float64) - station_mean)[:, None]
    known = np.isfinite(warmer[:, 0])
    shift = np.where(known[:, None], warmer, 0.0)
    found = mahoney(own["t_max_c"] + shift, own["t_min_c"] + shift, own["rh_mean"], own["rain_mm"])
    short, says = [], []
    for row, (place, name, is_known) in enumerate(zip(at, zone, known, strict=True)):
        counts = {one: int(found.months[one][row]) for one in INDICATORS}
        doubt = zone_doubt(counts, str(name))
        short.append(", ".join(f"{one} {count}" for one, count in counts.items()) if is_known else "")
        says.append(
            f"From the normals of {place}, moved to the plot's height, the Mahoney indicators ask for "
            f"{', '.join(asks_for(counts))}" + (f"; {doubt}." if doubt else ".")
            if is_known
            else ""
        )
    return pd.DataFrame({"mahoney": short, "mahoney_says": says}, index=climate.index)


_MONTHLY = ("t_max_c", "t_min_c", "rh_mean", "rain_mm")
