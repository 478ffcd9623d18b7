"""Two rankings side by side."""

from typing import Any

import numpy as np
import pandas as pd
import pytest

from sitescreen.judgement.comparison import agreement, compare, standing, why_moved


def rows(**ranks: int | None) -> list[dict[str, Any]]:
    """Rows as a table holds them: text, "" where there is no rank; the mark follows the rank."""
    return [
        {
            "plot": plot,
            "name": "",
            "zone": "upland" if rank else "",
            "set_aside": "" if rank else "in water",
            "rank": "" if rank is None else str(rank),
            "mark_low": "" if rank is None else f"{100 - rank:.1f}",
            "mark_slope": "" if rank is None else f"{100 - rank:.1f}",
            "mark_wind": "50.0",
        }
        for plot, rank in ranks.items()
    ]


@pytest.mark.parametrize(
    ("first", "second", "tau_b", "rho"),
    [
        # the examples of SciPy's documentation of kendalltau and spearmanr
        ([12, 2, 1, 12, 2], [1, 4, 7, 1, 0], -0.47140452079103173, None),
        ([1, 2, 3, 4, 5], [5, 6, 7, 8, 7], None, 0.8207826816681233),
        # by hand: 3 of 15 pairs discordant; 1 − 6·6/210
        ([1, 2, 3, 4, 5, 6], [2, 1, 4, 3, 6, 5], 0.6, 1.0 - 36.0 / 210.0),
        ([1, 2, 3, 4, 5], [1, 2, 3, 5, 4], 0.8, 0.9),
        ([1, 2, 3, 4], [4, 3, 2, 1], -1.0, -1.0),
    ],
)
def test_agreement_is_that_of_published_examples(
    first: list[int], second: list[int], tau_b: float | None, rho: float | None
) -> None:
    told = agreement(first, second)
    assert tau_b is None or told[0] == pytest.approx(tau_b, abs=1e-12)
    assert rho is None or told[1] == pytest.approx(rho, abs=1e-12)


@pytest.mark.parametrize(("first", "second"), [([], []), ([1], [1]), ([1, 1], [1, 2])])
def test_agreement_has_no_value_where_it_has_no_meaning(first: list[int], second: list[int]) -> None:
    assert np.isnan(agreement(first, second)).all()


def test_who_stays_enters_and_leaves() -> None:
    before, after = standing(rows(a=1, b=2, c=3, d=None)), standing(rows(a=2, c=1, d=3, e=4))
    found = compare(before, after, 2)
    assert (found.kept, found.entered, found.left) == (("a",), ("c",), ("b",))
    assert found.common == 2
    assert found.moves.loc["b", "rank_before"] == 2
    assert np.isnan(found.moves.loc["b", "rank_after"])
    assert found.most_changed == ("c", 2.0)
    assert found.mean_change == pytest.approx(1.5)


def test_plots_that_share_the_last_place_of_the_shortlist_are_all_on_it() -> None:
    found = compare(standing(rows(a=1, b=2, c=3)), standing(rows(a=1, b=2, c=2)), 2)
    assert found.entered == ("c",)


def test_nothing_moves_between_a_run_and_itself() -> None:
    same = standing(rows(a=1, b=2, c=None))
    found = compare(same, same, 1)
    assert (found.tau_b, found.entered, found.left, found.most_changed) == (1.0, (), (), None)


PROFILES = {
    "upland": {
        "criteria": [
            {"name": "slope", "title": "Gentle slope", "weight": 3.0, "curve": [[0, 100], [30, 0]]},
            {"name": "wind", "title": "Shelter", "weight": 1.0, "curve": [[0, 0], [1, 100]]},
        ]
    }
}


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"mark_low": 70.0, "mark_slope": 80.0}, "chiefly by “Gentle slope” (mark 90 to 80)"),
        # 3/4 of 10 points against 1/4 of 50
        ({"mark_low": 70.0, "mark_slope": 80.0, "mark_wind": 0.0}, "chiefly by “Shelter” (mark 50 to 0)"),
        # an unknown mark counts as the worst of its curve
        ({"mark_low": 60.0, "mark_slope": np.nan}, "chiefly by “Gentle slope” (mark 90 to unknown)"),
        ({"mark_low": 89.9, "rank": 12.0}, "others moved past it"),
        ({"mark_low": 90.2, "rank": 8.0}, "others fell behind it"),
        ({"mark_low": 40.0, "zone": "savannah"}, "judged as savannah instead of upland"),
        ({"set_aside": "in water"}, "the second run sets it aside: in water"),
    ],
)
def test_a_move_names_its_cause(change: dict[str, Any], says: str) -> None:
    before = standing(rows(a=10))
    after = before.copy()
    for name, value in change.items():
        after.loc["a", name] = value
    assert says in why_moved("a", before, after, PROFILES, PROFILES)


def test_a_changed_weight_is_named_as_such() -> None:
    before = standing(rows(a=10))
    after = before.assign(mark_low=80.0)
    lighter = {"upland": {"criteria": [PROFILES["upland"]["criteria"][0] | {"weight": 1.0}, PROFILES["upland"]["criteria"][1]]}}  # fmt: skip  # noqa: E501
    assert "chiefly by “Gentle slope” (its weight)" in why_moved("a", before, after, PROFILES, lighter)


def test_a_plot_of_one_run_only_says_so() -> None:
    one, two = standing(rows(a=1)), standing(rows(b=1))
    assert "not among the plots of the second" in why_moved("a", one, two, PROFILES, PROFILES)
    assert "not among the plots of the first" in why_moved("b", one, two, PROFILES, PROFILES)
    back = standing(rows(a=None))
    assert "set it aside: in water" in why_moved("a", back, one, PROFILES, PROFILES)


def test_a_standing_reads_text_and_numbers_alike() -> None:
    text = standing(rows(a=1, b=None))
    numbers = standing([{**row, "rank": int(row["rank"]) if row["rank"] else None} for row in rows(a=1, b=None)])
    pd.testing.assert_frame_equal(text, numbers)
