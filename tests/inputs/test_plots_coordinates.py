"""Coordinates that people typed."""

import numpy as np
import pytest

from sitescreen.inputs.coordinates import angle_deg, angles_deg, plain_number


@pytest.mark.parametrize(
    ("text", "axis", "expected"),
    [
        ("36.82", "lon", 36.82),
        ("36,82", "lon", 36.82),
        (" −1.29 ", "lat", -1.29),
        ("1.29° S", "lat", -1.29),
        ("S1.29", "lat", -1.29),
        ("1.29 south", "lat", -1.29),
        ("1°17'24\"S", "lat", -1.29),
        ("1°17′24″S", "lat", -1.29),
        ("1º17’24''S", "lat", -1.29),
        ("S 1 17 24", "lat", -1.29),
        ("-1 17 24", "lat", -1.29),
        ("-1:17:24", "lat", -1.29),
        ("36d49m12sE", "lon", 36.82),
        ("36 49.2' E", "lon", 36.82),
        ("36°49'12,0\" W", "lon", -36.82),
        ("0°30'S", "lat", -0.5),
    ],
)
def test_spellings_of_one_place_agree(text: str, axis: str, expected: float) -> None:
    """1°17'24" is 1 + 17/60 + 24/3600 = 1.29; the sign belongs to the whole, also where the degrees are 0."""
    value, problem = angle_deg(text, axis)  # type: ignore[arg-type]
    assert problem == ""
    assert value == pytest.approx(expected, abs=1e-12)


@pytest.mark.parametrize(
    ("text", "axis", "why"),
    [
        ("", "lat", "empty"),
        ("abc", "lat", "cannot be read"),
        ("nan", "lon", "cannot be read|not a number"),
        ("inf", "lon", "cannot be read|not a number"),
        ("1_0", "lon", "cannot be read"),
        ("-1.2 S", "lat", "both a sign and a hemisphere"),
        ("36.8E", "lat", "not a latitude"),
        ("36.8 O", "lon", "west in some languages and east in others"),
        ("36 61 0", "lon", "do not exist"),
        ("36.5 30", "lon", "do not exist"),
        ("1.2.3", "lat", "cannot be read"),
        ("1,234,567", "lat", "do not exist|cannot be read"),
        ("=1+1", "lat", "cannot be read"),
    ],
)
def test_what_can_be_read_two_ways_is_not_read(text: str, axis: str, why: str) -> None:
    parsed = angles_deg(np.array([text, "1.5"], dtype=object), axis)  # type: ignore[arg-type]
    assert np.isnan(parsed.values[0])
    assert any(part in parsed.problems[0] for part in why.split("|"))
    assert parsed.values[1] == 1.5
    assert parsed.problems[1] == ""


def test_thousands_marks_are_told_from_decimal_marks() -> None:
    texts = ["1.234,5", "1,234.5", "9.850.000", "9,850,000", "423456,7", "1.23.5", "12,34,5"]
    values = [plain_number(text) for text in texts]
    np.testing.assert_array_equal(values, [1234.5, 1234.5, 9850000, 9850000, 423456.7, np.nan, np.nan])
