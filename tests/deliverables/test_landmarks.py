"""Landmarks on the page: cut to the map, thinned to be light, and said where they are too many."""

from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from shapely.geometry import LineString, MultiLineString, Point, box

from sitescreen.deliverables import landmarks as module
from sitescreen.deliverables.landmarks import landmarks
from sitescreen.deliverables.sheet import Sheet

SHEET = Sheet((0.0, 0.0, 111_319.49, 111_325.14), 1000, 1000)  # 0–1° east and north


def layer(name: str, *things: tuple[str, Any]) -> Any:
    shapes = np.array([shape for _, shape in things] + [None], dtype=object)[:-1]
    return SimpleNamespace(name=name, shapes=shapes, labels=tuple(label for label, _ in things))


def corners(part: list[int]) -> Any:
    return np.cumsum(np.array(part).reshape(-1, 2), axis=0) / 1e5


def test_lines_are_cut_at_the_edge_and_come_back_to_the_metre() -> None:
    far = LineString([(0.5, 0.5), (0.6, 0.6), (3.0, 0.6)])
    drawn, left_out = landmarks([layer("roads", ("Long road", far), ("Elsewhere", Point(5, 5)))], SHEET)
    (thing,) = drawn[0]["things"]
    assert (thing["label"], thing["kind"]) == ("Long road", "line")
    np.testing.assert_allclose(corners(thing["parts"][0]), [(0.5, 0.5), (0.6, 0.6), (1.0, 0.6)], atol=1.1e-5)
    assert left_out == []


def test_an_area_is_its_own_edge_without_that_of_the_sheet_and_has_a_place_for_its_name() -> None:
    drawn, _ = landmarks([layer("waters", ("Sea", box(0.6, -2, 3, 3)))], SHEET)
    (thing,) = drawn[0]["things"]
    assert thing["kind"] == "area"
    edge = np.vstack([corners(part) for part in thing["parts"]])
    np.testing.assert_allclose(edge[:, 0], 0.6, atol=1.1e-5)
    x, y = corners(thing["at"])[0]
    assert 0.7 < x < 0.9
    assert 0.1 < y < 0.9


def test_many_parts_are_drawn_one_by_one() -> None:
    both = MultiLineString([[(0.1, 0.1), (0.2, 0.1)], [(0.1, 0.3), (0.2, 0.3)]])
    drawn, _ = landmarks([layer("rivers", ("Twin", both), ("Well", Point(0.5, 0.5)))], SHEET)
    assert [(t["label"], t["kind"]) for t in drawn[0]["things"]] == [
        ("Twin", "line"),
        ("Twin", "line"),
        ("Well", "point"),
    ]


def test_lines_are_thinned_until_they_fit_and_the_last_layer_goes_first(monkeypatch: pytest.MonkeyPatch) -> None:
    x = np.linspace(0.01, 0.99, 2001)
    wavy = LineString(np.column_stack([x, 0.5 + 0.0003 * np.sin(900 * x)]))
    monkeypatch.setattr(module, "MOST_CORNERS", 100)
    drawn, left_out = landmarks([layer("river", ("", wavy))], SHEET)
    assert 2 <= len(drawn[0]["things"][0]["parts"][0]) / 2 <= 100
    assert left_out == []
    wells = layer("wells", *(("", Point(*at)) for at in np.random.default_rng(1).uniform(0.1, 0.9, (150, 2))))
    drawn, left_out = landmarks([layer("river", ("", wavy)), wells], SHEET)
    assert [one["name"] for one in drawn] == ["river"]
    assert left_out == ["The landmarks “wells” are too many for one page and are not drawn."]
