"""How sure the order is, in words."""

from typing import Any

import numpy as np
import pandas as pd
import pytest

from sitescreen.deliverables.sureness import above_breeze, alike, of_trials, ordinal, sureness


def ranking(chances: list[float], groups: list[float], ranks: list[Any] | None = None) -> pd.DataFrame:
    return pd.DataFrame({
        "plot": [f"p{i}" for i in range(len(chances))],
        "rank": pd.array(ranks or list(range(1, len(chances) + 1)), dtype="Int64"),
        "chance_first": chances,
        "group": groups,
    })  # fmt: skip


def test_ordinals() -> None:
    got = [ordinal(n) for n in (1, 2, 3, 4, 11, 12, 13, 21, 22, 101, 111, 113)]
    assert got == ["1st", "2nd", "3rd", "4th", "11th", "12th", "13th", "21st", "22nd", "101st", "111th", "113th"]


def test_chances_are_never_rounded_to_certainty() -> None:
    assert of_trials(1.0) == "in every trial"
    assert of_trials(0.9994) == "in more than 99 of 100 trials"
    assert of_trials(0.99) == "in 99 of 100 trials"
    assert of_trials(0.0005) == "in fewer than 1 of 100 trials"
    assert of_trials(0.0) == "in no trial"


def test_a_firm_first_place_and_a_tie_behind_it() -> None:
    said = sureness(ranking([0.99, 0.01, 0.0, 0.0, 0.0], [1, 2, 3, 3, 5]), 5, {})
    assert said == (
        "First place is firm as far as the weights go (first in 99 of 100 trials); 3rd and 4th cannot be told apart. "
        "The terrain's error and the wind are not in this."
    )


@pytest.mark.parametrize(
    ("chance", "words"),
    [(0.95, "is firm"), (0.94, "fairly firm"), (0.79, "likely but not firm"), (0.49, "First place is open")],
)
def test_weak_first_places_are_not_called_firm(chance: float, words: str) -> None:
    said = sureness(ranking([chance, 1 - chance], [1, 2]), 5, {})
    assert words in said
    assert said.endswith("The terrain's error and the wind are not in this.")


def test_ties_beyond_the_shortlist_are_not_told_but_those_that_reach_into_it_are() -> None:
    table = ranking([1.0] + [0.0] * 6, [1, 2, 3, 4, 4, 6, 6])
    assert "cannot" not in sureness(table, 3, {})
    assert "4th and 5th cannot be told apart" in sureness(table, 4, {})
    assert "6th" not in sureness(table, 5, {})


def test_two_ties_are_both_told() -> None:
    said = sureness(ranking([0.6, 0.4, 0.0, 0.0], [1, 1, 3, 3]), 4, {})
    assert "1st and 2nd cannot be told apart, nor can 3rd and 4th" in said


def test_nothing_is_said_where_nothing_was_tried() -> None:
    table = ranking([np.nan, np.nan], [np.nan, np.nan])
    assert sureness(table, 5, {}) == ""
    assert sureness(table.drop(columns=["chance_first", "group"]), 5, {}) == ""
    assert sureness(ranking([1.0], [1]), 5, {}) == ""
    assert alike(table) == ["", ""]


def test_alike_names_the_ranks_of_a_group() -> None:
    table = ranking([1.0, 0, 0, 0, 0, np.nan], [1, 2, 2, 2, 5, np.nan], [1, 2, 3, 4, 5, None])
    assert alike(table) == ["", "2nd to 4th", "2nd to 4th", "2nd to 4th", "", ""]
    assert alike(ranking([1.0, 0, 0, 0], [1, 2, 3, 2])) == ["", "2nd and 4th", "", "2nd and 4th"]


def test_only_plots_that_the_breeze_cannot_reach_up_to_lie_above_it() -> None:
    """The breeze of a sea is taken as 750 m deep, that of a lake as 500 m."""
    table = pd.DataFrame({
        "shore_kind": ["sea", "sea", "sea", "lake", "lake", ""],
        "elevation_m": [760.0, 740.0, 760.0, 1700.0, 1700.0, np.nan],
        "over_water_m": [np.nan, np.nan, np.nan, 510.0, 490.0, np.nan],
        "breeze_screen": [1.0, 1.0, np.nan, 1.0, 1.0, np.nan],
    })  # fmt: skip
    assert above_breeze(table) == [True, False, False, True, False, False]
    assert above_breeze(table.drop(columns="breeze_screen")) == [False] * 6


def test_what_the_trials_vary_is_said_and_what_they_leave_out() -> None:
    both = {"certainty": {"varies": "the weights and the wind", "left_out": "the terrain's error"}}
    said = sureness(ranking([0.99, 0.01], [1, 2]), 5, both)
    assert "firm as far as the weights and the wind go" in said
    assert said.endswith("The terrain's error is not in this.")
    said = sureness(ranking([0.99, 0.01], [1, 2]), 5, {"certainty": {"varies": "all", "left_out": ""}})
    assert said.endswith("in 99 of 100 trials).")
