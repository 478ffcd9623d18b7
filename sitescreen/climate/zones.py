"""Which climate zone a plot is in, and how firmly."""

import difflib
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, fields

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.errors import BriefError
from sitescreen.settings import ZoneFit, ZoneSettings, in_order_of_precedence

FloatArray = NDArray[np.float64]

DRY_ZONES = ("hot_arid", "savannah")
WATER_ZONES = ("hot_humid_coast", "lake_basin")

MISSING_NORMALS = "the humidity of the place (climate normals)"
MISSING_SHORE = "the distance to sea and lakes (a shoreline)"
MISSING_HEIGHT = "the height of the plot (terrain)"


@dataclass(frozen=True)
class ZoneShares:
    """The zones of each plot.

    Parameters
    ----------
    shares : DataFrame, one row a plot, one column a zone
        Each row sums to 1; all 0 where the plot has no firm zone.
    zone : Series of str
        The zone with the largest share, "" where there is none.
    zone_share : Series of float
        Its share, NaN where there is none.
    outside : Series of bool
        The plot's height is known and it fits no zone to the stated least.
    provisional : Series of bool
        Zones that this plot might be in cannot be told apart for want of a figure: all are shown, its rank is
        provisional.
    missing : Series of str
        The figure that is wanted, "" where none.
    given : Series of bool
        Somebody stated the zone.
    """

    shares: pd.DataFrame
    zone: pd.Series
    zone_share: pd.Series
    outside: pd.Series
    provisional: pd.Series
    missing: pd.Series
    given: pd.Series

    def at(self, rows: NDArray[np.int64]) -> "ZoneShares":
        """The zones of some rows, numbered anew from 0; a row may come more than once."""
        return ZoneShares(*(getattr(self, one.name).iloc[rows].reset_index(drop=True) for one in fields(self)))


def memberships(
    elevation_m: FloatArray,
    sea_km: FloatArray | None,
    lake_km: FloatArray | None,
    lake_width_km: FloatArray | None,
    climate: pd.DataFrame | None,
    settings: ZoneSettings,
) -> pd.DataFrame:
    """How well each plot fits each zone, raw.

    Parameters
    ----------
    elevation_m : float64 array or Series, shape (n,)
        [m] NaN where unknown: so are the memberships.
    sea_km, lake_km : float64 arrays, shape (n,), or None
        Distance to the nearest sea and lake shore. [km] Where one is NaN and the other known, the shoreline holds no
        such water: it counts as out of reach. Where both are NaN, nobody has said.
    lake_width_km : float64 array, shape (n,), or None
        Width of that lake. [km]
    climate : DataFrame or None
        As :func:`sitescreen.climate.normals.plot_climate` gives it, n rows; rows of NaN do without.
    settings : ZoneSettings

    Returns
    -------
    DataFrame, n rows
        A column a zone, 0–1, in the settings' order; ``undecided`` (bool), where zones cannot be told apart for want of
        a figure; ``missing`` (str), that figure.

    Notes
    -----
    A membership is the weakest of the zone's ramps (config/defaults.toml), and at most 1 minus that of zones that take
    precedence. A ramp whose figure nobody gave does not limit the zone: the plot may be in it.
    """
    index = elevation_m.index if isinstance(elevation_m, pd.Series) else None
    height = np.asarray(elevation_m, dtype=np.float64)
    quantities = {"elevation_m": height, **_water(len(height), sea_km, lake_km, lake_width_km)}
    fit = _by_zone(settings.without_normals, quantities, len(height))
    has_climate: NDArray[np.bool_] = np.zeros(len(height), dtype=np.bool_)
    if climate is not None:
        figures = ("t_mean_c", "t_range_k", "rh_mean", "hottest_month_max_c")
        quantities |= {name: climate[name].to_numpy(dtype=np.float64) for name in figures}
        has_climate = np.logical_and.reduce([np.isfinite(quantities[name]) for name in figures])
        with_climate = _by_zone(settings.with_normals, quantities, len(height))
        fit = {zone: np.where(has_climate, with_climate[zone], fit[zone]) for zone in with_climate}
    table = pd.DataFrame(fit, index=index)
    known: NDArray[np.bool_] = np.isfinite(height)
    table.loc[~known] = np.nan
    fits = table.to_numpy() >= settings.least_membership
    at = {zone: column for column, zone in enumerate(table.columns)}
    no_water = np.isnan(quantities["sea_km"])
    dry: NDArray[np.bool_] = fits[:, [at[zone] for zone in DRY_ZONES]].min(axis=1) & ~has_climate
    wet = fits[:, [at[zone] for zone in WATER_ZONES]].max(axis=1) & no_water
    missing = np.where(dry & wet, f"{MISSING_NORMALS} and {MISSING_SHORE}", "")
    missing = np.where(dry & ~wet, MISSING_NORMALS, missing)
    missing = np.where(~dry & wet, MISSING_SHORE, missing)
    table["undecided"] = dry | wet
    table["missing"] = pd.Series(np.where(known, missing, MISSING_HEIGHT), index=table.index, dtype=object)
    return table


def _water(
    count: int, sea_km: FloatArray | None, lake_km: FloatArray | None, lake_width_km: FloatArray | None
) -> dict[str, FloatArray]:
    """Distances to water, out of reach where the shoreline holds none of the kind; NaN where there is no shoreline."""
    nothing = np.full(count, np.nan)
    sea = nothing if sea_km is None else np.asarray(sea_km, dtype=np.float64)
    lake = nothing if lake_km is None else np.asarray(lake_km, dtype=np.float64)
    width = nothing if lake_width_km is None else np.asarray(lake_width_km, dtype=np.float64)
    told = np.isfinite(sea) | np.isfinite(lake)
    sea = np.where(told & np.isnan(sea), np.inf, sea)
    lake = np.where(told & np.isnan(lake), np.inf, lake)
    # a lake of unknown width counts by its distance alone
    with np.errstate(invalid="ignore", divide="ignore"):
        per_width = np.where(np.isfinite(lake), lake / width, lake)
    return {"sea_km": sea, "lake_km": lake, "lake_km_per_width": per_width, "lake_width_km": width}


def _by_zone(fits: Mapping[str, ZoneFit], quantities: Mapping[str, FloatArray], count: int) -> dict[str, FloatArray]:
    """Membership of every zone, as far as the figures allow it."""
    certain: dict[str, FloatArray] = {}
    possible: dict[str, FloatArray] = {}
    # precedence first: a zone's `unless` looks at memberships that are complete
    for zone in in_order_of_precedence(fits):
        most = np.ones(count)
        surely = np.ones(count)
        for name, ramp in fits[zone].ramps().items():
            value = quantities[name]
            fit = np.interp(value, [x for x, _ in ramp], [y for _, y in ramp])
            unknown = np.isnan(value)
            most = np.minimum(most, np.where(unknown, 1.0, fit))
            surely = np.minimum(surely, np.where(unknown, 0.0, fit))
        for other in fits[zone].unless:
            # only what is certain keeps a zone out
            most = np.minimum(most, 1.0 - certain[other])
            surely = np.minimum(surely, 1.0 - possible[other])
        possible[zone], certain[zone] = most, surely
    return {zone: possible[zone] for zone in fits}


def check_zone(zone: str, known: Iterable[str], where: str) -> str:
    """A stated zone's name, or the error that suggests the nearest one.

    Parameters
    ----------
    zone : str
        As stated; spaces, hyphens and capitals do not matter.
    known : iterable of str
        Zones that have a profile.
    where : str
        Who stated it, for the message: "the plot K-12", "the brief".
    """
    names = list(known)
    tidy = zone.strip().lower().replace("-", "_").replace(" ", "_")
    if tidy in names:
        return tidy
    near = difflib.get_close_matches(tidy, names, n=1, cutoff=0.6)
    raise BriefError(
        f"{where} states the zone {zone!r}",
        f"one of {', '.join(names)} is needed",
        f"Perhaps {near[0]!r} was meant" if near else "Correct it, or add a profile of that name",
    )


def zone_shares(
    table: pd.DataFrame, given: Sequence[str] | None, settings: ZoneSettings, known: Iterable[str] | None = None
) -> ZoneShares:
    """The zones of each plot, scaled to shares.

    Parameters
    ----------
    table : DataFrame, n rows
        As :func:`memberships` gives it.
    given : sequence of str, length n, or None
        The zone that somebody stated for each plot, "" where nobody did. It takes the whole share.
    settings : ZoneSettings
    known : iterable of str, optional
        Zones that have a profile, if there are more than the built-in ones.

    Returns
    -------
    ZoneShares

    Raises
    ------
    BriefError
        If a stated zone is not known.
    """
    raw = table.drop(columns=["undecided", "missing"])
    names = [*raw.columns, *(zone for zone in known or () if zone not in raw.columns)]
    raw = raw.reindex(columns=names, fill_value=0.0)
    values = raw.to_numpy(dtype=np.float64)
    stated = np.array(["" if zone is None else str(zone) for zone in given or [""] * len(raw)], dtype=object)
    is_given = stated != ""
    tidy = {zone: check_zone(zone, names, _who(stated, zone, raw.index)) for zone in dict.fromkeys(stated[is_given])}
    unknown = np.isnan(values).any(axis=1)
    outside = ~unknown & (np.nan_to_num(values).max(axis=1, initial=0.0) < settings.least_membership)
    with np.errstate(invalid="ignore", divide="ignore"):
        shares = np.nan_to_num(values) / np.nan_to_num(values).sum(axis=1, keepdims=True)
    shares[outside | unknown] = 0.0
    for zone, name in tidy.items():
        rows = stated == zone
        shares[rows] = 0.0
        shares[rows, names.index(name)] = 1.0
    has_zone = shares.sum(axis=1) > 0
    largest = shares.argmax(axis=1)
    zone_name = np.where(has_zone, np.array(names, dtype=object)[largest], "")
    largest_share = np.where(has_zone, shares.max(axis=1), np.nan)
    undecided = table["undecided"].to_numpy(dtype=np.bool_) & ~is_given
    missing = np.where(undecided | (unknown & ~is_given), table["missing"].to_numpy(dtype=object), "")
    index = raw.index
    return ZoneShares(
        shares=pd.DataFrame(shares, index=index, columns=names),
        zone=pd.Series(zone_name, index=index, dtype=object),
        zone_share=pd.Series(largest_share, index=index),
        outside=pd.Series(outside & ~is_given, index=index),
        provisional=pd.Series(undecided & has_zone, index=index),
        missing=pd.Series(missing, index=index, dtype=object),
        given=pd.Series(is_given, index=index),
    )


def _who(stated: NDArray[np.object_], zone: str, index: pd.Index) -> str:
    rows = np.flatnonzero(stated == zone)
    return "the brief" if len(rows) == len(stated) > 1 else f"plot {index[rows[0]]}"
