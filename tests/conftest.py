"""What all tests share: the open data, outside programs, and the switch that turns every skip into a failure."""

import os
import shutil
from collections.abc import Callable, Generator
from pathlib import Path

import pytest

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
