"""Climate normals of stations."""

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from sitescreen.errors import InputError
from sitescreen.inputs.normals import Normals, read_normals

COLUMNS = ["station", "lon", "lat", "elevation_m", "month", "t_max_c", "t_min_c", "rh_mean", "rain_mm"]


def months(station: str = "Airfield", **changes: Any) -> list[dict[str, Any]]:
    usual = {"lon": 39.6, "lat": -4.0, "elevation_m": 55, "t_max_c": 30.5, "t_min_c": 23, "rh_mean": 78, "rain_mm": 90}
    return [{"station": station, **usual, "month": month, **changes} for month in range(1, 13)]


def read(folder: Path, rows: list[dict[str, Any]], more: tuple[str, ...] = ()) -> Normals:
    columns = [*COLUMNS, *more]
    lines = [",".join(columns)] + [",".join(str(row.get(column, "")) for column in columns) for row in rows]
    (folder / "normals.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    return read_normals(folder / "normals.csv")


def test_stations_and_months_come_out_in_order(tmp_path: Path) -> None:
    """However the file has them."""
    found = read(tmp_path, [*months("B")[::-1], *months("A", lon=37.0)[::-1]])
    assert found.stations["station"].tolist() == ["A"] * 12 + ["B"] * 12
    assert found.stations["month"].tolist() == [*range(1, 13)] * 2
    assert found.stations.loc[0, ["lon", "lat", "t_max_c", "t_min_c", "rh_mean", "rain_mm"]].tolist() == [
        37.0,
        -4.0,
        30.5,
        23.0,
        78.0,
        90.0,
    ]
    assert "clear_calm_nights" not in found.stations
    assert found.stamp.name == "normals.csv"


def test_the_waters_temperature_may_stand_beside_some_stations(tmp_path: Path) -> None:
    rows = [*months("A", water_c=26.5), *months("B", lon=38)]
    water = read(tmp_path, rows, ("water_c",)).stations["water_c"]
    assert water.iloc[:12].tolist() == [26.5] * 12
    assert water.iloc[12:].isna().all()
    with pytest.raises(InputError, match="water_c is “300”"):
        read(tmp_path, months("A", water_c=300), ("water_c",))


def test_clear_calm_nights_may_be_missing_for_some(tmp_path: Path) -> None:
    rows = [*months("A", clear_calm_nights=12), *months("B", lon=38)]
    nights = read(tmp_path, rows, ("clear_calm_nights",)).stations["clear_calm_nights"]
    assert nights[:12].tolist() == [12.0] * 12
    assert np.isnan(nights[12:]).all()


@pytest.mark.parametrize(
    ("row", "change", "message"),
    [
        (
            3,
            {"t_max_c": 20, "t_min_c": 21},
            r"line 5 of the table of climate normals normals\.csv: t_min_c 21 is above t_max_c",
        ),
        (3, {"month": 3}, "“Airfield” has month 3 twice"),
        (3, {"month": 13}, "month is “13”"),
        (3, {"month": 3.5}, "month is “3.5”; a whole number"),
        (3, {"month": "April"}, "month is “April”"),
        (3, {"rh_mean": 104}, "rh_mean is “104”"),
        (3, {"rain_mm": -1}, "rain_mm is “-1”"),
        (3, {"t_max_c": 88}, "t_max_c is “88”"),
        (3, {"t_min_c": ""}, "t_min_c is “”"),
        (3, {"elevation_m": 9999}, "elevation_m is “9999”"),
        (3, {"lat": 95}, "lat is “95”"),
        (3, {"lon": 39.7}, "lies elsewhere than in the row before"),
        (3, {"elevation_m": 56}, "lies elsewhere"),
        (3, {"station": ""}, "names no station"),
        (3, {"station": "Airfeild"}, "“Airfield” in normals.csv has no month 4"),
    ],
)
def test_rows_that_cannot_be_right_are_refused(tmp_path: Path, row: int, change: dict[str, Any], message: str) -> None:
    rows = months()
    rows[row].update(change)
    with pytest.raises(InputError, match=message):
        read(tmp_path, rows)


def test_missing_months_are_named(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"“Airfield” in normals\.csv has no month 2, 12; twelve months"):
        read(tmp_path, [row for row in months() if row["month"] not in (2, 12)])


def test_humidity_as_a_share_and_fahrenheit_are_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"rh_mean in normals\.csv is nowhere above 0\.8"):
        read(tmp_path, months(rh_mean=0.8))
    with pytest.raises(InputError, match=r"reaches 58 in normals\.csv"):
        read(tmp_path, months(t_max_c=58))


def test_two_stations_at_one_place_are_told(tmp_path: Path) -> None:
    found = read(tmp_path, [*months("A"), *months("B")])
    assert "A and B in normals.csv lie at the same place" in "".join(note.text for note in found.notes)


def test_longitudes_counted_to_360_are_turned(tmp_path: Path) -> None:
    assert read(tmp_path, months(lon=290.0)).stations["lon"].tolist() == [-70.0] * 12
