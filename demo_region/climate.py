"""Invented wind roses and station normals: plausible for 7° south, the same 6.5 K per km as the ground's zones."""

import math
from typing import NamedTuple

MONTHS = range(1, 13)


class Station(NamedTuple):
    """A station's year: annual means, and how they swing. The hottest month is the given one."""

    name: str
    x: float
    y: float
    mean_c: float
    range_k: float
    swing_k: float
    hottest: int
    humidity: float
    humidity_swing: float
    rain_mm: float
    clear_calm: float
    water_c: float | None = None  # of the sea or lake beside it


# Inland means follow 29.6 °C − 6.5 K/km; the coast is held 3 K cooler by the sea.
STATIONS = [
    Station("Tavrick airfield", 51.0, 17.0, 26.5, 7.4, 1.7, 2, 78, 4, 1080, 4, 27.3),
    Station("Kharune post", 38.5, 10.5, 26.9, 14.6, 2.2, 11, 43, 8, 260, 14),
    Station("Yellandor school", 32.5, 31.0, 24.8, 12.8, 2.0, 11, 57, 9, 640, 11),
    Station("Ondurwen pier", 24.3, 16.6, 22.2, 9.4, 1.0, 2, 74, 4, 1180, 7, 23.8),
    Station("Brennoch mission", 18.0, 28.6, 18.2, 11.2, 1.7, 11, 70, 9, 1240, 10),
    Station("Skarrow hut", 6.5, 31.2, 14.4, 9.8, 1.8, 11, 76, 8, 1520, 9),
]


def normals(height_at, lon_lat):
    """Rows of normals.csv. The station's height is the ground's at its place."""
    rows = []
    for s in STATIONS:
        lon, lat = lon_lat(s.x, s.y)
        height = round(float(height_at(s.x, s.y)))
        for month in MONTHS:
            warm = math.cos(2 * math.pi * (month - s.hottest) / 12)
            lag = math.cos(2 * math.pi * (month - s.hottest - 1) / 12)  # water follows a month behind the air
            wet = math.cos(2 * math.pi * (month - 2.5) / 12)  # rains from November to April
            mean = s.mean_c + s.swing_k * warm
            span = s.range_k * (1 - 0.14 * wet)
            rain = s.rain_mm / 12 * max(0.06, 1 + 1.15 * wet)
            rows.append(
                {
                    "station": s.name,
                    "lon": f"{lon:.5f}",
                    "lat": f"{lat:.5f}",
                    "elevation_m": height,
                    "month": month,
                    "t_max_c": f"{mean + span / 2:.1f}",
                    "t_min_c": f"{mean - span / 2:.1f}",
                    "rh_mean": round(s.humidity + s.humidity_swing * wet),
                    "rain_mm": round(rain),
                    "clear_calm_nights": round(s.clear_calm * (1 - 0.55 * wet)),
                    "water_c": "" if s.water_c is None else f"{s.water_c + 0.8 * lag:.1f}",
                }
            )
    return rows


class Rose(NamedTuple):
    """Wind of one season and part of day: calm share, then lobes (from °, spread °, weight, speed m/s)."""

    season: str
    part: str
    calm: float
    lobes: list[tuple[float, float, float, float]]


# Coast: sea breeze from the east by day, a weak land breeze by night, trades from the south-east in the cool season.
COAST = [
    Rose("hot", "afternoon", 0.03, [(85, 28, 0.85, 5.2), (40, 40, 0.15, 3.4)]),
    Rose("hot", "night", 0.28, [(280, 35, 0.7, 1.6), (60, 50, 0.3, 2.2)]),
    Rose("cool", "afternoon", 0.02, [(125, 25, 0.9, 6.3), (90, 30, 0.1, 4.6)]),
    Rose("cool", "night", 0.22, [(200, 40, 0.5, 2.4), (280, 30, 0.5, 1.9)]),
    Rose("rain", "all", 0.08, [(45, 40, 0.75, 4.4), (330, 45, 0.25, 3.6)]),
    Rose("year", "all", 0.12, [(110, 40, 0.7, 4.6), (40, 45, 0.3, 3.5)]),
]
# Uplands: steady south-easterlies by day, often calm or a draught off the ridge in the west by night.
UPLAND = [
    Rose("hot", "afternoon", 0.04, [(95, 40, 0.8, 4.1), (320, 45, 0.2, 3.0)]),
    Rose("hot", "night", 0.38, [(275, 40, 0.75, 1.5), (120, 50, 0.25, 2.4)]),
    Rose("cool", "afternoon", 0.03, [(135, 24, 0.95, 6.8), (60, 45, 0.05, 3.4)]),
    Rose("cool", "night", 0.40, [(270, 35, 0.65, 1.6), (140, 35, 0.35, 4.2)]),
    Rose("rain", "all", 0.10, [(50, 45, 0.6, 4.0), (330, 50, 0.4, 3.8)]),
    Rose("year", "all", 0.15, [(125, 38, 0.75, 5.0), (330, 60, 0.25, 3.1)]),
]
PLACES = [(51.0, 17.0, COAST), (18.0, 28.6, UPLAND)]


def roses(height_at, lon_lat):
    """Rows of wind.csv: sixteen directions and the calms, for a place on the coast and one in the uplands."""
    rows = []
    for x, y, table in PLACES:
        lon, lat = lon_lat(x, y)
        height = round(float(height_at(x, y)))
        for rose in table:
            shares, speeds = [], []
            for sector in range(16):
                parts = [
                    (w * math.exp(-(((sector * 22.5 - a + 180) % 360 - 180) ** 2) / (2 * s * s)) / s, u)
                    for a, s, w, u in rose.lobes
                ]
                shares.append(sum(p for p, _ in parts) + 2e-5)
                speeds.append((sum(p * u for p, u in parts) + 2e-5 * 2.0) / shares[-1])
            whole = sum(shares)
            place = {"lon": f"{lon:.5f}", "lat": f"{lat:.5f}", "elevation_m": height}
            rounded = [round((1 - rose.calm) * share / whole, 4) for share in shares]
            for sector, (share, speed) in enumerate(zip(rounded, speeds, strict=True)):
                rows.append(
                    {
                        "season": rose.season,
                        "part": rose.part,
                        "direction_deg": f"{sector * 22.5:g}",
                        "share": f"{share:.4f}",
                        "speed_m_s": f"{speed:.1f}",
                        **place,
                    }
                )
            calm = {"season": rose.season, "part": rose.part, "direction_deg": "", "share": f"{1 - sum(rounded):.4f}"}
            rows.append({**calm, "speed_m_s": "0.0", **place})
    return rows
