"""A mountain with water gaps, from a sample array whose y limits come swapped; no shoreline is given."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from affine import Affine

from sitescreen.brief import load_brief
from sitescreen.screening import Screening, screen

pytestmark = pytest.mark.real_terrain


@pytest.fixture(scope="module")
def ridge(open_data: Callable[[str], Path], tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    """Two files of the same ground, one with north up and one with latitude ascending, and their screenings."""
    with np.load(open_data("ridge_90m.npz")) as data:
        heights = data["elevation"]
        west, step = float(data["xmin"]), float(data["dx"])
        south, north = sorted((float(data["ymin"]), float(data["ymax"])))
    folder = tmp_path_factory.mktemp("ridge")
    rows, cols = heights.shape
    made: dict[str, Any] = {}
    for name, values, transform in (
        ("north_up", heights, Affine(step, 0, west, 0, -step, north)),
        ("south_up", heights[::-1], Affine(step, 0, west, 0, step, south)),
    ):
        with rasterio.open(
            folder / f"{name}.tif", "w", "GTiff", cols, rows, 1, "EPSG:4326", transform, dtype="int16"
        ) as out:
            out.write(values, 1)
        lines = ["plot,lon,lat"]
        lines += [
            f"{i}-{j},{west + step * cols * (i + 0.5) / 6},{south + (north - south) * (j + 0.5) / 4}"
            for j in range(4)
            for i in range(6)
        ]
        (folder / "plots.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
        brief = folder / f"{name}.toml"
        brief.write_text(
            f'[terrain]\nfiles = ["{name}.tif"]\n[plots]\nfile = "plots.csv"\nid = "plot"\npoint_radius_m = 200\n',
            encoding="utf-8",
        )
        made[name] = screen(load_brief(brief))
    made["heights"] = heights
    return made


def test_ascending_latitude_gives_the_same_answer(ridge: dict[str, Any]) -> None:
    """The same cells written from the south up: the warp sees the same ground."""
    north_up, south_up = (ridge[name].table.set_index("plot") for name in ("north_up", "south_up"))
    assert np.nanmax(np.abs(north_up["elevation_m"] - south_up["elevation_m"].loc[north_up.index])) < 0.01
    assert north_up["rank"].to_dict() == south_up["rank"].to_dict()


def test_heights_lie_where_the_array_has_them(ridge: dict[str, Any]) -> None:
    """Plot by plot against the mean of the array's own cells within 200 m; the warp and the disc's rim leave metres."""
    heights = ridge["heights"].astype(np.float64)
    table = ridge["north_up"].table.set_index("plot")
    rows, cols = heights.shape
    for plot, row in table.iterrows():
        i, j = (int(part) for part in str(plot).split("-"))
        r, c = rows - rows * (j + 0.5) / 4, cols * (i + 0.5) / 6
        y, x = np.indices(heights.shape)
        near = np.hypot((y + 0.5 - r) * 92.5, (x + 0.5 - c) * 74.5) < 200.0
        assert row["elevation_m"] == pytest.approx(heights[near].mean(), abs=10.0)


def test_without_a_shore_nothing_is_said_about_water(ridge: dict[str, Any]) -> None:
    """Unknown, not zero and not far away; and the run says that it assumes none."""
    screening: Screening = ridge["north_up"]
    for column in ("shore_distance_km", "breeze_reach", "onshore_from_deg"):
        assert screening.table[column].isna().all()
    assert any(note.level == "assumed" and note.where == "shore" for note in screening.notes)
