"""Is “likely” right? The table of benchmarks/cold_calibration.py, and a part of it computed again."""

import csv
import importlib.util
import sys
from collections.abc import Iterable
from pathlib import Path
from types import ModuleType

import pytest

from sitescreen.settings import load_defaults

ROOT = Path(__file__).parents[2]
TABLE = Path(__file__).with_name("cold_calibration.csv")


@pytest.fixture(scope="module")
def calibration() -> ModuleType:
    """The script that wrote the table."""
    found = importlib.util.spec_from_file_location("cold_calibration", ROOT / "benchmarks" / "cold_calibration.py")
    assert found is not None
    assert found.loader is not None
    module = importlib.util.module_from_spec(found)
    sys.modules[found.name] = module
    found.loader.exec_module(module)
    return module


@pytest.fixture(scope="module")
def rows() -> list[dict[str, float]]:
    with TABLE.open(newline="") as file:
        return [{name: float(value) for name, value in row.items()} for row in csv.DictReader(file)]


def of(
    rows: Iterable[dict[str, float]], name: str, error_m: float | None = None, range_m: float | None = None
) -> float:
    """Sum of a column, of one error and range or of all."""
    return sum(
        row[name]
        for row in rows
        if error_m in (None, row["vertical_error_m"]) and range_m in (None, row["error_range_m"])
    )


def test_table_is_whole_and_its_grounds_were_never_seen(rows: list[dict[str, float]], calibration: ModuleType) -> None:
    """Every ground under every error and range, and none of those that the limits were chosen by."""
    keys = {(row["ground"], row["vertical_error_m"], row["error_range_m"]) for row in rows}
    assert len(keys) == len(rows) == 6 * len(calibration.NEVER_SEEN)
    assert not {row["ground"] for row in rows} & set(calibration.CHOOSING)


@pytest.mark.parametrize("error_m", [1.6, 2.5, 4.0])
@pytest.mark.parametrize("range_m", [100.0, 500.0])
def test_likely_is_right_at_least_85_times_of_100(rows: list[dict[str, float]], error_m: float, range_m: float) -> None:
    """The rule's promise, for every terrain error and range; and cold ground that is told "none" is rare."""
    likely = of(rows, "likely", error_m, range_m)
    assert likely > 1000
    assert of(rows, "likely_right", error_m, range_m) / likely >= 0.85
    assert of(rows, "missed", error_m, range_m) / of(rows, "cold", error_m, range_m) < 0.06


def test_chances_mean_what_they_say(rows: list[dict[str, float]]) -> None:
    """Where some draws say no, "likely" still is right more often than not, and "possible" is cold in between."""
    assert of(rows, "doubted_right") / of(rows, "doubted") > 0.75
    assert 0.2 < of(rows, "possible_cold") / of(rows, "possible") < 0.8


def test_a_part_of_the_table_comes_out_again(rows: list[dict[str, float]], calibration: ModuleType) -> None:
    """One ground under one error: truth, measurement, nest and all its draws, hollows and layer, computed anew.

    The counts may differ by 1 % of the patches, since sines and logarithms differ in the last bit between machines.
    """
    settings = load_defaults()
    number, error_m, range_m = calibration.NEVER_SEEN[1], 2.5, 100.0
    told = [
        row
        for row in rows
        if (row["ground"], row["vertical_error_m"], row["error_range_m"]) == (number, error_m, range_m)
    ]
    again = calibration.tally(number, error_m, range_m, settings.judgement.data_draws, settings)._asdict()
    assert again.pop("ground") == number
    for name, count in again.items():
        assert count == pytest.approx(told[0][name], abs=9.0), name
