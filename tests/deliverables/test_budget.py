"""Pictures fit what a page may weigh; what goes, goes in a stated order and is said."""

from typing import Any

import pytest

from sitescreen.deliverables.budget import budget_bytes, fit_pictures


def questions() -> list[dict[str, Any]]:
    def view(title: str) -> dict[str, Any]:
        return {"title": title, "picture": "x" * 1000}

    return [
        {"name": "breeze", "views": [view("Reach"), view("Reach inland")]},
        {"name": "wind", "views": [view("Air"), view("Shelter"), view("Ridges")]},
        {"name": "sun", "views": [view("Hours")]},
    ]


def kept(asked: list[dict[str, Any]]) -> list[str]:
    return [view["title"] for one in asked for view in one["views"] if view["picture"]]


@pytest.mark.parametrize(
    ("over", "left"),
    [
        (0, ["Reach", "Reach inland", "Air", "Shelter", "Ridges", "Hours"]),
        (1, ["Reach", "Reach inland", "Air", "Shelter", "Hours"]),
        (1001, ["Reach", "Reach inland", "Air", "Hours"]),
        (2001, ["Reach", "Air", "Hours"]),
        (3001, ["Reach", "Air"]),
        (4001, ["Reach"]),
        (9999, []),
    ],
)
def test_pictures_go_in_their_order(over: int, left: list[str]) -> None:
    asked = questions()
    said = fit_pictures(asked, over)
    assert kept(asked) == left
    assert len(said) == 6 - len(left)
    if said:
        assert said[0] == "The picture “Ridges” is left out, to keep this page light enough to mail."


def test_more_plots_may_weigh_more_up_to_a_limit() -> None:
    assert [budget_bytes(n) for n in (1, 40, 1_000, 10_000, 99_999)] == [
        3_000_000,
        3_000_000,
        4_000_000,
        7_000_000,
        7_000_000,
    ]
