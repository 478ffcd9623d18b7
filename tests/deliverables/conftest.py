"""An invented screening, to test deliverables without running one: twelve plots between a sea and a ridge."""

import os
import shutil
import tempfile
import time
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from types import SimpleNamespace
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pytest
from pyproj import Transformer
from shapely.geometry import Polygon

from sitescreen.climate.breeze_section import Section
from sitescreen.climate.drawn_sun import PlotSun
from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.climate.zones import ZoneShares
from sitescreen.deliverables.columns import columns_of
from sitescreen.deliverables.map import write_map
from sitescreen.grid import Field, Grid
from sitescreen.judgement.overall import Judged, judge
from sitescreen.judgement.profiles import load_profiles
from sitescreen.judgement.siting import Eave, PlotSiting, Turn
from sitescreen.notes import Note
from sitescreen.settings import load_defaults

NAMES = ("Ammerling Field", "Brisk Hanger", "Corrow", "Dunmarrel", "Eastle Bank", "Fennow", "Gorse Neap", "Hollin Pit",
         "Ister Point", "Jarrow Lea", "Kestel Ridge", "Lowmere")  # fmt: skip


@dataclass(frozen=True)
class Invented:
    """Looks like a Screening."""

    brief: Any
    table: gpd.GeoDataFrame
    fields: Mapping[str, Field]
    reasons: Mapping[str, Any]
    profiles: Mapping[str, Any]
    notes: tuple[Note, ...]
    not_measured: tuple[str, ...]
    not_checked: tuple[str, ...]
    record: dict[str, Any]
    judged: Judged
    zones: ZoneShares
    patches: Any = None
    context: tuple[Any, ...] = ()
    siting: Mapping[str, PlotSiting] = field(default_factory=dict)
    winds: SectorWinds = field(default_factory=lambda: winds_over(()))
    sections: Mapping[str, Section] = field(default_factory=dict)
    suns: Mapping[str, PlotSun] = field(default_factory=dict)

    def with_(self, **changes: Any) -> "Invented":
        """The same with some parts replaced; another table is judged anew."""
        if "table" in changes:
            judged, zones = judgement_on(changes["table"], changes.get("profiles", self.profiles))
            changes = {"judged": judged, "zones": zones} | changes
        return replace(self, **changes)


def ground(grid: Grid) -> dict[str, Field]:
    """A sea in the east at 0 m, hills that rise to the west, one hollow."""
    x = (np.arange(grid.cols) + 0.5) / grid.cols
    y = (np.arange(grid.rows) + 0.5)[:, None] / grid.rows
    inland = np.clip(0.85 + 0.05 * np.sin(9 * y) - x, 0, None)
    height = 900 * inland**1.3 + 90 * np.sin(14 * x + 5 * y) * np.sin(11 * y) * np.clip(inland * 4, 0, 1)
    pit = np.exp(-((x - 0.35) ** 2 + (y - 0.6) ** 2) / 0.004)
    height = np.where(inland > 0, np.maximum(height - 60 * pit, 1), 0)
    north, east = np.gradient(height, grid.cell_size_m)
    shore_km = inland * grid.cols * grid.cell_size_m / 1000
    rise = height - height.mean(axis=1, keepdims=True)

    def made(values: Any, unit: str, what: str) -> Field:
        return Field(np.asarray(values, np.float32) + np.zeros(grid.shape, np.float32), grid, unit, what)

    wind = np.clip(1 + rise / 600, 0.3, 2.2)
    return {
        "elevation_m": made(height, "m", "Height of the ground"),
        "slope_deg": made(np.degrees(np.arctan(np.hypot(north, east))), "°", "Slope"),
        "shore_distance_km": made(shore_km, "km", "Distance to the nearest shore"),
        "breeze_reach": made(np.exp(-shore_km / 9), "1", "Share of the daytime breeze that gets there"),
        "ventilation": made(wind, "1", "Mean wind over that of open level ground"),
        "ridge_exposure": made(wind**1.2, "1", "Strong wind over that of open level ground"),
        "cold_deficit_k": made(np.where(pit > 0.2, 4 * pit, 0), "K", "Colder than open ground on a clear calm night"),
    }


def build(
    names: tuple[str, ...] = NAMES,
    *,
    zone: int = 37,
    shape: tuple[int, int] = (48, 64),
    zones: tuple[str, ...] = ("hot_humid_coast", "upland"),
    ids: tuple[str, ...] | None = None,
    seed: int = 4,
) -> Invented:
    """A screening of as many plots as there are names; south of the equator, so northings are negative."""
    rng = np.random.default_rng(seed)
    cell = 90.0
    grid = Grid(f"EPSG:{32600 + zone}", 500_040.0 - 45 * 900, -180_000.0, cell, *shape)
    fields = ground(grid)
    profiles = load_profiles()
    count = len(names)
    rows = rng.integers(4, shape[0] - 6, count)
    cols = rng.integers(4, int(shape[1] * 0.8), count)
    x, y = grid.x_centres_m()[cols], grid.y_centres_m()[rows]
    to_degrees = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
    half = rng.uniform(90, 260, count)
    corners = [(-1, -0.8), (1, -1), (0.9, 0.8), (-1, 1)]
    shapes = [Polygon([to_degrees.transform(e + h * a, n + h * b) for a, b in corners])
              for e, n, h in zip(x, y, half, strict=True)]  # fmt: skip
    lon, lat = to_degrees.transform(x, y)
    table = pd.DataFrame({
        "plot": list(ids) if ids else [str(i + 1) for i in range(count)],
        "name": list(names),
        "zone": [zones[0] if fields["elevation_m"].values[r, c] < 300 else zones[-1]
                 for r, c in zip(rows, cols, strict=True)],
        "zone_share": rng.uniform(0.6, 1, count),
        "cautions": "",
        "area_ha": half**2 * 4 / 1e4,
        "lon": lon,
        "lat": lat,
        "shore_kind": "sea",
    })  # fmt: skip
    for key, one in fields.items():
        table[key] = one.values[rows, cols].astype(np.float64)
    table["cold_pool_kind"] = np.where(table["cold_deficit_k"] > 0, "closed", "none")
    table["pond_depth_m"] = 0.0
    table["onshore_from_deg"] = 92.4
    table.loc[table.index == 1, "ventilation"] = np.nan
    overall = np.full(count, np.nan)
    for i, row in table.iterrows():
        profile, sums = profiles[row["zone"]], []
        for c in profile.criteria:
            if c.reading in table and not np.isnan(row[c.reading]):
                curve = np.array(c.curve)
                mark = float(np.interp(row[c.reading], curve[:, 0], curve[:, 1]))
                table.loc[i, f"mark_{c.name}"] = mark
                sums.append((c.weight, mark))
        overall[i] = sum(w * m for w, m in sums) / sum(w for w, _ in sums)
        table.loc[i, f"membership_{row['zone']}"] = 0.9
    aside = np.zeros(count, bool)
    aside[[i for i in (4, 7) if i < count]] = True
    table["set_aside"] = np.where(aside, "3.2 m of water could stand on it.", "")
    table["overall_mark"] = np.where(aside, np.nan, overall)
    table["mark_low"] = table["overall_mark"] - 4
    table["mark_high"] = table["overall_mark"] + 3
    table["rank"] = table["overall_mark"].rank(ascending=False, method="first").astype("Int64")
    table["rank_in_zone"] = table.groupby("zone")["overall_mark"].rank(ascending=False, method="first").astype("Int64")
    table["weakest"] = "slope"
    order = table["rank"].astype("float64").fillna(1e9).argsort(kind="stable")
    plots = gpd.GeoDataFrame(table, geometry=shapes, crs="EPSG:4326").iloc[order].reset_index(drop=True)
    reasons = {
        plot: SimpleNamespace(
            for_=["Sea breeze: 0.82 of it gets here.", "Level ground: 3.1°."],
            against=["Little air moves: 0.71 times open ground."],
            cautions=["Concern: low-lying shore."] if i % 3 == 0 else [],
        )
        for i, plot in enumerate(plots["plot"])
    }
    brief = SimpleNamespace(
        title="Sites for three small clinics",
        judge=SimpleNamespace(shortlist=3),
        output=SimpleNamespace(layers=True, online_map=None, online_credit=None),
        terrain=SimpleNamespace(surface="bare", vertical_error_m=2.5),
    )
    return Invented(
        brief, plots, fields, reasons, profiles,
        (
            Note("assumed", "wind", "No wind table was given: equal wind from 16 sectors at 3 m/s, its weight halved."),
            Note("warning", "shore", "The mapped shore runs over ground up to 12 m high."),
            Note("info", "terrain", "Cells of 90 m."),
        ),
        ("hours of sun", "cold air behind narrows"),
        ("flood levels", "protected land", "landslides"),
        {"version": "0.1.0", "inputs": {"terrain": [{"name": "tile.tif", "sha256": "00"}]}, "seconds": {"read": 0.1}},
        *judgement_on(table, profiles),
    )  # fmt: skip


def winds_over(plots: tuple[str, ...]) -> SectorWinds:
    """Winds that double from the east and are halved from the west."""
    bearing = np.arange(16) * 22.5
    ratio = np.tile(1.25 + 0.75 * np.sin(np.radians(bearing)), (len(plots), 1))
    return SectorWinds(plots, bearing, ratio, np.ones_like(ratio), ratio - 1.0)


def sun_over() -> PlotSun:
    """A sun that rises due east at 6, stands in the north at noon and sets due west; a wall of 30° from 45° to 90°."""
    hour = np.arange(96) * 0.25 + 0.125
    height = np.tile(60.0 * np.sin(np.pi * (hour - 6.0) / 12.0), (12, 1)) - np.abs(np.arange(12) - 5.5)[:, None]
    azimuth = np.tile((90.0 - 15.0 * (hour - 6.0)) % 360.0, (12, 1))
    skyline = np.where((np.arange(72) >= 9) & (np.arange(72) < 18), 30.0, 2.0).astype(np.float32)
    lit = (height > 0) & (height > np.interp(azimuth, np.arange(73) * 5.0, np.append(skyline, skyline[0])))
    first = np.array([hour[row].min() for row in lit])
    last = np.array([hour[row].max() for row in lit])
    state = np.where(lit, 2, np.where(height > 0, 1, 0)).astype(np.uint8)[:, ::4]
    cool, hot = np.arange(12) < 3, np.arange(12) > 8
    return PlotSun(skyline, hour, height, azimuth, lit, first, last, state, cool, hot, 3.0, clock_is_assumed=True)


def drawn(made: Invented) -> Invented:
    """The same with sun, wind and a section to the shore for every plot."""
    plots = made.table["plot"].tolist()
    sun = sun_over()
    way = np.linspace(0, 6000, 61, dtype=np.float32)
    ground = (200 - way / 30 + 90 * np.exp(-(((way - 1500) / 200) ** 2))).astype(np.float32)
    table = made.table.assign(offshore_from_deg=272.4)
    return made.with_(
        table=table, winds=winds_over(tuple(plots)), suns=dict.fromkeys(plots, sun),
        sections=dict.fromkeys(plots, Section(way, ground, 6000.0, 92.0, 1500.0, 240.0)),
    )  # fmt: skip


@pytest.fixture(scope="session")
def with_drawings() -> Invented:
    """The usual one, with what the leaves draw."""
    return drawn(build())


def judgement_on(table: pd.DataFrame, profiles: Mapping[str, Any]) -> tuple[Judged, ZoneShares]:
    """The program's own judgement on the readings of a table, whose plots each lie in one zone or between two."""
    readings = table.set_index("plot")
    names = list(profiles)
    shares = pd.DataFrame(0.0, index=readings.index, columns=names)
    for plot, row in readings[readings["zone"] != ""].iterrows():
        shares.loc[plot, row["zone"]] = row["zone_share"]
        second = names[(names.index(row["zone"]) + 1) % len(names)]
        shares.loc[plot, second] += 1.0 - row["zone_share"]
    nothing = pd.Series(data=False, index=readings.index)
    zones = ZoneShares(
        shares, readings["zone"], readings["zone_share"], nothing, nothing,
        pd.Series("", index=readings.index), nothing,
    )  # fmt: skip
    return judge(readings, zones, profiles, (), load_defaults().judgement), zones


@pytest.fixture(scope="session")
def invent() -> Callable[..., Invented]:
    """Builds an invented screening; see ``build``."""
    return build


@pytest.fixture(scope="session")
def screening() -> Invented:
    """The usual one."""
    return build()


def unsure(made: Invented) -> Invented:
    """The same as after the trials: ranks 2 to 4 alike, plot of rank 3 with a mark that may fall by 22.6."""
    table = made.table.copy()
    ranked = table["rank"].notna()
    rank = table["rank"].astype("float64")
    table["chance_first"] = np.where(ranked, np.where(rank == 1, 0.97, 0.0), np.nan)
    table["rank_low"] = np.where(ranked, np.maximum(rank - 1, 1), np.nan)
    table["rank_high"] = np.where(ranked, rank + 2, np.nan)
    table["group"] = np.where(ranked, np.where(rank.isin([2, 3, 4]), 2, rank), np.nan)
    table["mark_low"] = table["overall_mark"] - np.where(rank == 3, 22.6, 0.4)
    table["breeze_arrival_h"] = 10.3
    table["breeze_screen"] = np.where(rank == 1, 0.0, np.where(rank == 2, 0.4, 1.0))
    table["elevation_m"] = np.where(rank == 3, 1200.0, 100.0)
    for column, value in (("crest_bearing_deg", 92.0), ("crest_distance_m", 1020.0), ("crest_above_plot_m", 42.0)):
        table[column] = np.where(rank == 4, value, np.nan)
    return made.with_(table=table)


@pytest.fixture(scope="session")
def tried() -> Invented:
    """The usual one with chances, ties and a screened breeze."""
    return unsure(build())


FLAGS = (
    "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-sync",
    "--disable-background-networking", "--disable-component-update", "--hide-scrollbars",
)  # fmt: skip


def _program(*names: str) -> str:
    found = next((path for name in names if (path := shutil.which(name))), None)
    if found is None:
        said = f"{names[0]} is not installed here (.ci/run installs it)"
        if os.environ.get("SITESCREEN_REQUIRE_ALL") == "1":
            pytest.fail(said)
        pytest.skip(said)
    return found


@pytest.fixture(scope="session")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Any]:
    """Headless Chromium that is told it has no network, and notes every request."""
    from selenium import webdriver
    from selenium.webdriver.chrome.service import Service

    options = webdriver.ChromeOptions()
    options.binary_location = _program("chromium", "chromium-browser", "google-chrome")
    profile = tempfile.mkdtemp(dir=tmp_path_factory.mktemp("browser"))
    for flag in (*FLAGS, f"--user-data-dir={profile}", "--window-size=1440,900"):
        options.add_argument(flag)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    driver = webdriver.Chrome(options=options, service=Service(_program("chromedriver")))
    try:
        yield driver
    finally:
        driver.quit()


def sized(browser: Any, width: int, height: int) -> None:
    size = {"width": width, "height": height, "deviceScaleFactor": 1, "mobile": width < 500}
    browser.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", size)


@pytest.fixture(scope="session")
def opened(browser: Any, tmp_path_factory: pytest.TempPathFactory) -> Callable[..., Any]:
    """Writes a screening's page, opens it offline and waits until it is ready."""
    count = iter(range(1000))

    def open_page(screening: Any, width: int = 1440, height: int = 900) -> Any:
        path = tmp_path_factory.mktemp("page") / f"map{next(count)}.html"
        write_map(screening, columns_of(screening.table, screening.profiles), path)
        browser.get_log("browser")
        browser.get_log("performance")
        sized(browser, width, height)
        browser.execute_cdp_cmd("Network.enable", {})
        nothing = {"offline": True, "latency": 0, "downloadThroughput": 0, "uploadThroughput": 0}
        browser.execute_cdp_cmd("Network.emulateNetworkConditions", nothing)
        browser.get(path.as_uri())
        wait(lambda: browser.execute_script("return document.documentElement.dataset.ready") == "yes")
        return browser

    return open_page


def wait(condition: Callable[[], bool], seconds: float = 10) -> None:
    until = time.monotonic() + seconds
    while not condition():
        assert time.monotonic() < until, "waited too long"
        time.sleep(0.02)


class Reading:
    """What a page shows, as the tests read it."""

    def __init__(self, browser: Any) -> None:
        self.browser = browser

    def run(self, script: str, *given: Any) -> Any:
        """What a script gives back."""
        return self.browser.execute_script(script, *given)

    def texts(self, selector: str) -> list[str]:
        """The text of every element that fits, in the order of the page."""
        return list(self.run("return [...document.querySelectorAll(arguments[0])].map((e) => e.textContent)", selector))

    def text(self, selector: str) -> str:
        """The text of the first element that fits."""
        return self.texts(selector)[0]

    def one(self, selector: str) -> Any:
        """The first element that fits."""
        return self.browser.find_element("css selector", selector)

    def press(self, selector: str) -> None:
        """A click that needs the element in no special place."""
        self.run("document.querySelector(arguments[0]).click()", selector)

    def wait(self, condition: Callable[[], bool]) -> None:
        """Until a condition holds."""
        wait(condition)

    def problems(self) -> list[str]:
        """What the console complains of."""
        return [entry["message"] for entry in self.browser.get_log("browser")]


@pytest.fixture
def read(opened: Callable[..., Any]) -> Callable[..., Reading]:
    """Opens a screening's page and gives what reads it."""
    return lambda *given, **how: Reading(opened(*given, **how))


@pytest.fixture(scope="session")
def hint() -> PlotSiting:
    """How to place a house on some plot."""
    return PlotSiting(
        axis_deg=77,
        decided_by="sun",
        sun_axis_deg=90.0,
        wind_axis_deg=16.0,
        wind="sea breeze",
        wind_wanted=True,
        wind_from_deg=106.0,
        wind_incidence_deg=61.0,
        cost_pct=tuple(np.abs(np.arange(0.0, 180.0, 5.0) - 77.0).tolist()),
        turns=tuple(Turn(turn, 5.0, 9.0, 4.0, 0.0, -8.0) for turn in (10, 20, 30)),
        contour_deg=None,
        contour_cost_pct=None,
        rows_for="air",
        row_gap_heights=6.0,
        row_gap_m=18.0,
        eaves=(Eave(167.0, 0.8), Eave(347.0, None)),
        says=("Long walls facing SSE and NNW: axis 77° (nearly east–west).", "A siting hint, <b>not</b> a design."),
    )
