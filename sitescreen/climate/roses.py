"""What a rose amounts to in each sector, and which rose serves a point where the table has several places."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sitescreen.inputs.wind import Rose, WindTable

FloatArray = NDArray[np.float64]

LEAST_AWAY_M = 100.0
"""Nearer to a place than this, its wind counts as if this far off: our choice, so that no weight is infinite. [m]"""


@dataclass(frozen=True)
class RoseSums:
    """A rose by sector: all that the wind's readings need of it. Arrays of shape (sectors,) or (n, sectors).

    Two roses are mixed by adding their sums, each times its weight. None of them need sum to anything: readings divide
    by their totals.

    Parameters
    ----------
    time : array
        Share of the time, Σ p.
    flow : array
        Σ p·U. [m/s]
    power : array
        Σ p·U³. [m³/s³]
    """

    time: FloatArray
    flow: FloatArray
    power: FloatArray


def sector_bearings_deg(sectors: int) -> FloatArray:
    """Centres of the sectors: the bearing the wind comes from, clockwise from true north. [°]"""
    return np.asarray(np.arange(sectors) * (360.0 / sectors), dtype=np.float64)


def rose_sums(rose: Rose, sectors: int = 16) -> RoseSums:
    """A rose's time, flow and power by sector, shape (sectors,).

    Parameters
    ----------
    rose : Rose
        In 16 sectors.
    sectors : int
        16, or 8: then every second sector is shared between its two neighbours.
    """
    sector = np.round(rose.direction_deg / 22.5).astype(np.int64) % 16

    def total(weight: FloatArray) -> FloatArray:
        by_16 = np.bincount(sector, weights=weight, minlength=16)
        if sectors == 16:
            return np.asarray(by_16, dtype=np.float64)
        between = by_16[1::2]
        return np.asarray(by_16[::2] + 0.5 * (between + np.roll(between, 1)), dtype=np.float64)

    share, speed = rose.share, rose.speed_m_s
    return RoseSums(total(share), total(share * speed), total(share * speed**3))


def place_weights(table: WindTable, lon_deg: FloatArray, lat_deg: FloatArray) -> FloatArray:
    """How much each place of a wind table counts at each point.

    Parameters
    ----------
    table : WindTable
    lon_deg, lat_deg : array, shape (n,)
        WGS 84. [°]

    Returns
    -------
    float64 array, shape (n, places)
        Each row sums to 1: all on the nearest place, or shared by the inverse square of the distance (Shepard 1968,
        Proc. 23rd ACM Natl. Conf., 517–524, power 2), as the table says.
    """
    if len(table.places) == 1:
        return np.ones((len(lon_deg), 1))
    away = distances_m(table, lon_deg, lat_deg)
    if not table.blended:
        nearest = np.zeros_like(away)
        nearest[np.arange(len(away)), np.argmin(away, axis=1)] = 1.0
        return nearest
    near = 1.0 / np.maximum(away, LEAST_AWAY_M) ** 2
    return np.asarray(near / near.sum(axis=1, keepdims=True))


def distances_m(table: WindTable, lon_deg: FloatArray, lat_deg: FloatArray) -> FloatArray:
    """From each point to each place, along the ground; shape (n, places). [m] NaN for a place without lon and lat."""
    from pyproj import Geod

    places = np.array(table.places, dtype=np.float64)
    lon, lat = (
        np.repeat(np.asarray(one, dtype=np.float64)[:, None], len(places), axis=1) for one in (lon_deg, lat_deg)
    )
    there_lon, there_lat = (np.broadcast_to(places[:, k], lon.shape).copy() for k in (0, 1))
    _, _, metres = Geod(ellps="WGS84").inv(lon, lat, there_lon, there_lat)
    return np.asarray(metres, dtype=np.float64)


def roses_at(
    table: WindTable,
    slot: str,
    lon_deg: FloatArray,
    lat_deg: FloatArray,
    sectors: int,
    factors: FloatArray | None = None,
) -> RoseSums:
    """A slot's wind at each point; arrays of shape (n, sectors).

    ``factors``, shape (places, sectors), multiply each place's rose first, for roses drawn anew.

    Raises
    ------
    KeyError
        If the table does not have that slot (see :meth:`WindTable.has`).
    """
    weights = place_weights(table, lon_deg, lat_deg)
    at_places = [rose_sums(table.roses[slot, number], sectors) for number in range(len(table.places))]
    by = np.ones((len(at_places), sectors)) if factors is None else factors

    def mixed(name: str) -> FloatArray:
        # place by place, so that a plot's sum cannot depend on how many plots stand beside it
        return np.asarray(
            sum(weights[:, [k]] * (getattr(one, name) * by[k])[None, :] for k, one in enumerate(at_places)),
            dtype=np.float64,
        )

    return RoseSums(mixed("time"), mixed("flow"), mixed("power"))
