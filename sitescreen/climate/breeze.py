"""How much of the day's sea or lake breeze reaches a plot: by its distance, the lake's width and the ground between."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from pyproj import Transformer

from sitescreen.climate.breeze_path import Way, screen_share, ways
from sitescreen.grid import Field
from sitescreen.settings import BreezeSettings
from sitescreen.terrain.shore_fetch import OpenShore

FloatArray = NDArray[np.float64]


def arrival_h(distance_km: FloatArray, settings: BreezeSettings) -> FloatArray:
    """Local hour at which the breeze front reaches a plot: onset plus distance over the front's speed. [h]

    NaN where the front would arrive after the breeze has ended.
    """
    hour = settings.onset_h + np.asarray(distance_km) * 1000.0 / settings.front_speed_m_s / 3600.0
    return np.where(hour < settings.end_h, hour, np.nan)


def sea_reach(distance_km: FloatArray, settings: BreezeSettings) -> FloatArray:
    """Share of the sea breeze that reaches a plot, 1 at the shore and strictly falling.

    Parameters
    ----------
    distance_km : array
        Distance to the shore. [km] NaN stays NaN.

    Returns
    -------
    float64 array
        Share of the daytime breeze hours left when the front arrives (front 3 m/s: Linacre & Geerts, *Climates and
        Weather Explained*, ch. 14, morning fronts at Jakarta; onset and end likewise), times a tail beyond the design
        band: exp(−(D − 8 km)/20 km), our closure. 0.99 at 1 km, 0.91 at 8 km.
    """
    distance = np.asarray(distance_km, dtype=np.float64)
    length_h = settings.end_h - settings.onset_h
    hours_left = np.clip(1.0 - distance * 1000.0 / settings.front_speed_m_s / 3600.0 / length_h, 0.0, 1.0)
    tail = np.exp(-np.maximum(distance - settings.tail_from_km, 0.0) / settings.tail_length_km)
    return hours_left * tail


def lake_weight(width_km: FloatArray, settings: BreezeSettings) -> FloatArray:
    """How much of a breeze a lake of this width makes: 0 at 2 km across, 1 at 25 km, linear between (our closure)."""
    low, high = settings.lake_width_none_km, settings.lake_width_full_km
    return np.clip((np.asarray(width_km, dtype=np.float64) - low) / (high - low), 0.0, 1.0)


def lake_reach(distance_km: FloatArray, width_km: FloatArray, settings: BreezeSettings) -> FloatArray:
    """Share of a lake's breeze that reaches a plot, its weight by width included.

    By early afternoon the breeze of a lake under about 50 km reaches less far inland than the lake is wide (Segal et
    al. 1997, BAMS 78:1135–1147), so the share fades over the outer half of that distance and ends there.
    """
    distance = np.asarray(distance_km, dtype=np.float64)
    width = np.asarray(width_km, dtype=np.float64)
    with np.errstate(invalid="ignore", divide="ignore"):
        within = np.clip((width - distance) / (0.5 * width), 0.0, 1.0)
    return lake_weight(width, settings) * within * sea_reach(distance, settings)


class PlotBreeze(NamedTuple):
    """The breeze of plots, and the shore that it comes from; arrays of shape (n,).

    Of sea and lake the one whose breeze reaches the plot most; where neither's does, the one whose breeze would over
    level ground; else the nearer.
    """

    kind: NDArray[np.object_]
    """"sea", "lake", or "" without an open shore."""
    distance_m: FloatArray
    bearing_deg: FloatArray
    """From the plot to the nearest point of that shore, from true north. [°] NaN in the water."""
    reach: FloatArray
    """Share of a full breeze that reaches the plot, 0–1; NaN where the ground on the way is not known."""
    screen: FloatArray
    """Share of it that the ground on the way takes, 0–1; NaN likewise."""
    way: Way
    shore_lon: FloatArray
    """The nearest point of that shore. [°, WGS 84] NaN without one."""
    shore_lat: FloatArray


def plot_breeze(
    elevation: Field,
    lon_deg: FloatArray,
    lat_deg: FloatArray,
    sea: OpenShore,
    lake: OpenShore,
    settings: BreezeSettings,
) -> PlotBreeze:
    """The breeze that reaches each plot: what distance and the lake's width leave, times 1 − screen.

    Parameters
    ----------
    elevation : Field
        Height, in the UTM system of the block. [m]
    lon_deg, lat_deg : array, shape (n,)
        Plots. [°]
    sea, lake : OpenShore
        Their nearest open sea, and the lake whose breeze is strongest.
    settings : BreezeSettings
    """
    to_grid = Transformer.from_crs("EPSG:4326", elevation.grid.crs, always_xy=True)
    x, y = to_grid.transform(lon_deg, lat_deg)
    found = []
    for kind, shore in (("sea", sea), ("lake", lake)):
        km = shore.distance_m / 1000.0
        level_ground = sea_reach(km, settings) if kind == "sea" else lake_reach(km, shore.width_km, settings)
        # in the water there is no way to look along
        away = shore.distance_m != 0.0
        to_x, to_y = to_grid.transform(np.where(away, shore.lon, lon_deg), np.where(away, shore.lat, lat_deg))
        some = np.isfinite(to_x)
        way = ways(elevation, x, y, np.where(some, to_x, np.nan), np.where(some, to_y, np.nan), settings)
        if kind == "sea":
            screen = screen_share(way, np.zeros(len(km)), settings.sea_depth_m, settings)
        else:
            # the ground at a lake's shore is its level; where the shore is too far to see, the lowest on the way
            level = np.where(np.isnan(way.shore_m), way.lowest_m, way.shore_m)
            screen = screen_share(way, level, settings.lake_depth_m, settings)
        # a lake of unknown width may be as good as the sea; and nothing stays nothing behind unknown ground
        most = np.where(np.isnan(level_ground), sea_reach(km, settings), level_ground)
        reach = np.where(level_ground == 0.0, 0.0, level_ground * (1.0 - screen))
        found.append(_Found(shore, most, reach, screen, way))
    return _stronger(*found)


class _Found(NamedTuple):
    """The breeze of one kind of water; ``most``: over level ground, NaN without a shore; ``reach``: NaN if unknown."""

    shore: OpenShore
    most: FloatArray
    reach: FloatArray
    screen: FloatArray
    way: Way


def _stronger(sea: _Found, lake: _Found) -> PlotBreeze:
    """Of two breezes the stronger at each plot; one that is unknown is given the benefit, and stays unknown."""

    def prefer(one: _Found, other: _Found) -> NDArray[np.bool_]:
        """Whether the one is at least as good: by what reaches, then over level ground, then by distance."""
        by = [
            (np.where(np.isnan(each.reach), each.most, each.reach), each.most, -each.shore.distance_m)
            for each in (one, other)
        ]
        better = np.zeros(len(one.most), dtype=bool)
        level = np.ones(len(one.most), dtype=bool)
        for mine, theirs in zip(*by, strict=True):
            mine, theirs = (np.where(np.isnan(values), -np.inf, values) for values in (mine, theirs))
            better |= level & (mine > theirs)
            level &= mine == theirs
        return better | level

    sea_first = prefer(sea, lake)
    dry = np.isnan(sea.shore.distance_m) & np.isnan(lake.shore.distance_m)

    def of(one: FloatArray, other: FloatArray) -> FloatArray:
        return np.where(sea_first, one, other)

    return PlotBreeze(
        kind=np.where(dry, "", np.where(sea_first, "sea", "lake")).astype(object),
        distance_m=of(sea.shore.distance_m, lake.shore.distance_m),
        bearing_deg=of(sea.shore.bearing_deg, lake.shore.bearing_deg),
        reach=of(sea.reach, lake.reach),
        screen=of(sea.screen, lake.screen),
        shore_lon=of(sea.shore.lon, lake.shore.lon),
        shore_lat=of(sea.shore.lat, lake.shore.lat),
        way=Way(*(np.where(sea_first, one, other) for one, other in zip(sea.way, lake.way, strict=True))),
    )


__all__ = ["PlotBreeze", "arrival_h", "lake_reach", "lake_weight", "plot_breeze", "sea_reach"]
