"""What all tests share: the open data, outside programs, and the switch that turns every skip into a failure."""

import os
import shutil
from collections.abc import Callable, Generator
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

if TYPE_CHECKING:
    from sitescreen.climate.sun_path import SunPath

REPO = Path(__file__).parent.parent
REQUIRE_ALL = os.environ.get("SITESCREEN_REQUIRE_ALL") == "1"
OPEN_DATA = Path(os.environ.get("SITESCREEN_OPEN_DATA") or REPO / ".real_terrain")


@pytest.hookimpl(wrapper=True)
def pytest_runtest_makereport(
    item: pytest.Item, call: pytest.CallInfo[None]
) -> Generator[None, pytest.TestReport, pytest.TestReport]:
    """With SITESCREEN_REQUIRE_ALL=1 (as .ci/run sets it) a test that skips has failed: nothing may be missing there."""
    report = yield
    if REQUIRE_ALL and report.skipped and not hasattr(report, "wasxfail"):
        report.outcome = "failed"
        report.longrepr = f"{item.nodeid} was skipped although SITESCREEN_REQUIRE_ALL=1: {report.longrepr}"
    return report


@pytest.hookimpl(wrapper=True)
def pytest_make_collect_report(
    collector: pytest.Collector,
) -> Generator[None, pytest.CollectReport, pytest.CollectReport]:
    """The same for a whole file that skips itself."""
    report = yield
    if REQUIRE_ALL and report.skipped:
        report.outcome = "failed"
        report.longrepr = f"{collector.nodeid} was skipped although SITESCREEN_REQUIRE_ALL=1: {report.longrepr}"
    return report


@pytest.fixture(scope="session")
def repo() -> Path:
    """The folder that holds README.md."""
    return REPO


@pytest.fixture(scope="session")
def open_data() -> Callable[[str], Path]:
    """Gives the path of one file of open data; skips where .ci/open_data.py has not fetched it."""

    def path(name: str) -> Path:
        if not (OPEN_DATA / name).is_file():
            pytest.skip(f"open data {name} are not here; python .ci/open_data.py .real_terrain fetches them")
        return OPEN_DATA / name

    return path


@pytest.fixture(scope="session")
def outside_program() -> Callable[[str], str]:
    """Gives the path of a program such as gdaldem; skips where it is not installed."""

    def path(name: str) -> str:
        found = shutil.which(name)
        if found is None:
            pytest.skip(f"{name} is not installed here (.ci/run installs it)")
        return found

    return path


@pytest.fixture(scope="session")
def clear_year() -> "Callable[..., SunPath]":
    """Gives a year's sun at a latitude, none of it the program's own.

    Spherical geometry in solar time: twelve days, a month apart, ``shift_days`` later if wanted. The clear sky of
    ASHRAE 2013 (Handbook of Fundamentals, ch. 14), τb 0.4 and τd 2.4.
    """
    import numpy as np

    from sitescreen.climate.sun_path import SunPath

    def path(latitude_deg: float, shift_days: float = 0.0) -> SunPath:
        day = np.arange(15.2, 365.25, 365.25 / 12) + shift_days
        declination = np.radians(23.45 * np.sin(2 * np.pi * (284 + day) / 365.0))[:, None]
        hour = (np.arange(288) + 0.5) / 12
        angle = np.radians((hour - 12.0) * 15.0)[None, :]
        latitude = np.radians(latitude_deg)
        east = -np.cos(declination) * np.sin(angle)
        north = np.cos(latitude) * np.sin(declination) - np.sin(latitude) * np.cos(declination) * np.cos(angle)
        up = np.sin(latitude) * np.sin(declination) + np.cos(latitude) * np.cos(declination) * np.cos(angle)
        height = np.degrees(np.arcsin(up))
        shown = np.maximum(height, 0.0)
        airmass = 1.0 / (np.sin(np.radians(shown)) + 0.50572 * (shown + 6.07995) ** -1.6364)
        tau_b, tau_d = 0.4, 2.4
        beam_power = 1.454 - 0.406 * tau_b - 0.268 * tau_d + 0.021 * tau_b * tau_d
        sky_power = 0.507 + 0.205 * tau_b - 0.080 * tau_d - 0.190 * tau_b * tau_d
        extra = 1367.0 * (1.0 + 0.033 * np.cos(2 * np.pi * day / 365.0))[:, None]
        beam = np.where(height > 0, extra * np.exp(-tau_b * airmass**beam_power), 0.0)
        sky = np.where(height > 0, extra * np.exp(-tau_d * airmass**sky_power), 0.0)
        azimuth = np.degrees(np.arctan2(east, north)) % 360.0
        return SunPath(day.astype(np.int64), hour, height, azimuth, beam, sky, 1 / 12, 0.0)

    return path
