"""The table of clear sky."""

from pathlib import Path

import pytest

from sitescreen.errors import InputError
from sitescreen.inputs.sky import read_sky


def written(folder: Path, rows: list[str]) -> Path:
    path = folder / "cloud.csv"
    path.write_text("\n".join(["month,part,clear_share", *rows]), encoding="utf-8")
    return path


ALL = [f"{month},all,0.5" for month in range(1, 13)]


def test_parts_of_the_day_go_before_all_of_it(tmp_path: Path) -> None:
    sky = read_sky(written(tmp_path, [*ALL, "7,morning,0.2", "7,night,0.9"]))
    assert sky.share[6].tolist() == [0.2, 0.5]
    assert sky.share[0].tolist() == [0.5, 0.5]
    assert sky.stamp.name == "cloud.csv"


def test_per_cent_are_taken_as_such_and_said(tmp_path: Path) -> None:
    sky = read_sky(written(tmp_path, [f"{month},all,{month * 5}" for month in range(1, 13)]))
    assert sky.share[3].tolist() == [0.2, 0.2]
    assert any("per cent" in note.text for note in sky.notes)


@pytest.mark.parametrize(
    ("rows", "said"),
    [
        (ALL[1:], "month 1 in cloud.csv has neither “morning” nor “all”"),
        ([*ALL[1:], "1,morning,0.5"], "month 1 in cloud.csv has neither “afternoon” nor “all”"),
        ([*ALL, "1,all,0.4"], "month 1 has “all” twice"),
        ([*ALL[1:], "1.5,all,0.4"], "month is “1.5”"),
        ([*ALL[1:], "1,evening,0.4"], "part is “evening”"),
        ([*ALL[1:], "1,all,101"], "clear_share is “101”"),
        ([*ALL[1:], "1,all,1.2"], "clear_share in cloud.csv reaches 1.2"),
        ([*ALL[1:], "1,all,"], "clear_share is “”"),
    ],
)
def test_a_table_that_cannot_be_right_is_refused(tmp_path: Path, rows: list[str], said: str) -> None:
    with pytest.raises(InputError, match=said):
        read_sky(written(tmp_path, rows))
