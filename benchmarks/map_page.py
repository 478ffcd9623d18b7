"""Weight and speed of the map page: bytes, load, and from a changed weight to painted, for 40 to 10,000 plots.

    python benchmarks/map_page.py            the demo region with plots strewn over it, in Chromium
    python benchmarks/map_page.py 40 1000    only these numbers of plots

Wants chromium and chromedriver. Times are the least of several, since other work on the machine only ever adds.
"""

import json
import sys
import tempfile
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
from selenium import webdriver
from selenium.webdriver.chrome.service import Service
from shapely.geometry import Point

from sitescreen.brief import load_brief
from sitescreen.deliverables.columns import columns_of
from sitescreen.deliverables.map import write_map
from sitescreen.screening import screen

DEMO = Path(__file__).parent.parent / "demo_region" / "brief.toml"
BUDGETS = {40: (3.0, 0.6, 60), 1_000: (4.0, 0.8, 80), 10_000: (7.0, 1.5, 150)}
"""Plots: MB, seconds to load, milliseconds from a changed weight to painted."""

FLAGS = (
    "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-sync",
    "--disable-background-networking", "--disable-component-update", "--window-size=1440,900",
)  # fmt: skip

PAINTED = """
const done = arguments[0], inputs = [...document.querySelectorAll('input[name=weight-wind]')], times = [];
const once = (k) => {
  if (k === 8) { done(times); return; }
  const start = performance.now();
  inputs[k % 2 ? 2 : 3].click();
  const painted = () => { times.push(performance.now() - start); setTimeout(() => once(k + 1), 500); };
  requestAnimationFrame(() => setTimeout(painted));
};
once(0);
"""


def strewn(count: int, folder: Path) -> Path:
    """A layer of so many plots over the demo's land, and the brief's own path to it."""
    rng = np.random.default_rng(3)
    demo = load_brief(DEMO)
    west, south, east, north = gpd.read_file(demo.plots.file).total_bounds
    at = rng.uniform((west, south), (east, north), (count, 2))
    path = folder / f"plots{count}.gpkg"
    names = [f"Field {k}" for k in range(count)]
    frame = gpd.GeoDataFrame(
        {"plot": [str(k) for k in range(count)], "name": names}, geometry=[Point(*p) for p in at], crs="EPSG:4326"
    )
    frame["geometry"] = frame.geometry.to_crs("EPSG:32741").buffer(70, quad_segs=2).to_crs("EPSG:4326")
    frame.to_file(path)
    return path


def page_of(count: int, folder: Path) -> Path:
    """The page of a screening of so many plots."""
    brief = load_brief(DEMO)
    if count != 40:
        brief = brief.model_copy(update={"plots": brief.plots.model_copy(update={"file": strewn(count, folder)})})
    screening = screen(brief)
    path = folder / f"map{count}.html"
    write_map(screening, columns_of(screening.table, screening.profiles), path)
    return path


def browser() -> Any:
    """A fresh headless Chromium."""
    options = webdriver.ChromeOptions()
    options.binary_location = "/usr/bin/chromium"
    for flag in (*FLAGS, f"--user-data-dir={tempfile.mkdtemp()}"):
        options.add_argument(flag)
    return webdriver.Chrome(options=options, service=Service("/usr/bin/chromedriver"))


def measured(path: Path) -> dict[str, float]:
    """Bytes, seconds until the page is ready and painted, milliseconds from a weight to painted."""
    driver = browser()
    try:
        driver.set_script_timeout(60)
        loads = []
        for _ in range(5):
            driver.get("about:blank")
            driver.get(path.as_uri())
            driver.execute_async_script("requestAnimationFrame(() => setTimeout(arguments[0]))")
            loads.append(driver.execute_script("return performance.getEntriesByType('navigation')[0].loadEventEnd"))
        paints = driver.execute_async_script(PAINTED)
    finally:
        driver.quit()
    return {"MB": path.stat().st_size / 1e6, "load_s": min(loads) / 1000, "reweigh_ms": min(paints)}


def main() -> None:
    """Measure and say."""
    counts = [int(word) for word in sys.argv[1:]] or list(BUDGETS)
    with tempfile.TemporaryDirectory() as name:
        for count in counts:
            got = measured(page_of(count, Path(name)))
            print(
                json.dumps({"plots": count, **{k: round(v, 3) for k, v in got.items()}, "budget": BUDGETS.get(count)})
            )


if __name__ == "__main__":
    main()
