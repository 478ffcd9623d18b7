"""Weights from pairwise comparisons."""

from itertools import combinations

import numpy as np
import pytest

from sitescreen.errors import BriefError
from sitescreen.judgement.pairs import Compared, Pair, compare, compare_for, read_pairs, with_weights
from sitescreen.judgement.profiles import load_profiles

PROFILES = load_profiles()


def from_matrix(rows: list[list[float]]) -> Compared:
    """Compare things called 0, 1, 2 … by the upper half of a reciprocal matrix."""
    n = len(rows)
    return compare([Pair(str(i), str(j), rows[i][j]) for i in range(n) for j in range(i + 1, n)])


def test_weights_match_the_drinks_of_saaty_2008() -> None:
    """Int. J. Services Sciences 1:83–98: coffee, wine, tea, beer, sodas, milk, water; CR .022."""
    drinks = [
        [1, 9, 5, 2, 1, 1, 1 / 2],
        [1 / 9, 1, 1 / 3, 1 / 9, 1 / 9, 1 / 9, 1 / 9],
        [1 / 5, 3, 1, 1 / 3, 1 / 4, 1 / 3, 1 / 9],
        [1 / 2, 9, 3, 1, 1 / 2, 1, 1 / 3],
        [1, 9, 4, 2, 1, 2, 1 / 2],
        [1, 9, 3, 1, 1 / 2, 1, 1 / 3],
        [2, 9, 9, 3, 2, 3, 1],
    ]
    found = from_matrix(drinks)
    # printed to three decimals
    assert found.weights == pytest.approx([0.177, 0.019, 0.042, 0.116, 0.190, 0.129, 0.327], abs=1e-3)
    assert found.consistency_ratio == pytest.approx(0.022, abs=1e-3)


@pytest.mark.parametrize(
    ("rows", "weights", "lambda_max", "ratio"),
    [
        ([[1, 3, 5], [1 / 3, 1, 3], [1 / 5, 1 / 3, 1]], [0.6370, 0.2583, 0.1047], 3.0385, 0.0332),
        ([[1, 1 / 3, 5], [3, 1, 7], [1 / 5, 1 / 7, 1]], [0.2790, 0.6491, 0.0719], 3.0649, 0.0559),
        ([[1, 2, 4], [0.5, 1, 2], [0.25, 0.5, 1]], [4 / 7, 2 / 7, 1 / 7], 3.0, 0.0),
    ],
)
def test_small_matrices(rows: list[list[float]], weights: list[float], lambda_max: float, ratio: float) -> None:
    """Computed apart from this code, to four decimals; the third is consistent."""
    found = from_matrix(rows)
    assert found.weights == pytest.approx(weights, abs=5e-5)
    assert found.lambda_max == pytest.approx(lambda_max, abs=5e-5)
    assert found.consistency_ratio == pytest.approx(ratio, abs=6e-5)


def test_what_was_not_compared_is_the_geometric_mean_over_all_ways_to_chain() -> None:
    """A ring of four things has four spanning trees: the weights of each are plain products along its chains."""
    ring = [Pair("a", "b", 2), Pair("b", "c", 3), Pair("c", "d", 1 / 2), Pair("d", "a", 1 / 5)]
    logs = []
    for tree in combinations(ring, 3):
        level = {tree[0].first: 0.0}
        while len(level) < 4:
            for pair in tree:
                if pair.first in level:
                    level.setdefault(pair.second, level[pair.first] - np.log(pair.times))
                elif pair.second in level:
                    level[pair.first] = level[pair.second] + np.log(pair.times)
        logs.append(level["a"] - level["c"])
    found = compare(ring)
    assert found.names == ("a", "b", "c", "d")
    assert found.filled_in == 2
    assert found.matrix[0, 2] == pytest.approx(np.exp(np.mean(logs)))
    assert found.matrix[0, 2] * found.matrix[2, 0] == pytest.approx(1.0)


def test_one_chain_gives_its_own_products() -> None:
    found = compare([Pair("a", "b", 2), Pair("b", "c", 2)])
    assert found.weights == pytest.approx([4 / 7, 2 / 7, 1 / 7])
    assert found.consistency_ratio == pytest.approx(0.0, abs=1e-12)
    assert "too few comparisons" in found.notes()[0].text


def test_contradictions_are_a_warning() -> None:
    circle = compare([Pair("a", "b", 5), Pair("b", "c", 5), Pair("c", "a", 5)])
    assert circle.consistency_ratio > 0.10
    assert [note.level for note in circle.notes()] == ["info", "warning"]
    assert f"{circle.consistency_ratio:.2f}" in circle.notes()[1].text


def test_pairs_are_read_as_written() -> None:
    assert read_pairs(["Breeze over ground = 3", "sun  over slope=1/2"]) == [
        Pair("breeze", "ground", 3.0),
        Pair("sun", "slope", 0.5),
    ]


@pytest.mark.parametrize(
    ("texts", "says"),
    [
        (["breeze > ground"], "pairs 1 is 'breeze > ground'"),
        (["breeze over ground = 3", "wind over ground = 12"], "pairs 2 is 'wind over ground = 12'"),
        (["breeze over ground = -3"], "= -3"),
        (["breeze over ground = nan"], "= nan"),
        (["breeze over ground = 1/0"], "= 1/0"),
        (["breeze over breeze = 1"], "with itself"),
        (["breeze over ground = 3", "ground over breeze = 3"], "a second time"),
    ],
)
def test_a_pair_that_makes_no_sense_is_refused(texts: list[str], says: str) -> None:
    with pytest.raises(BriefError, match=says):
        read_pairs(texts)


def test_things_that_nothing_connects_are_refused_by_name() -> None:
    with pytest.raises(BriefError, match="“cold”, “sun” with none of the others"):
        compare([Pair("breeze", "ground", 3), Pair("cold", "sun", 2)])


def test_more_than_ten_things_are_refused() -> None:
    with pytest.raises(BriefError, match="compares 11 things"):
        compare([Pair("0", str(k), 2) for k in range(1, 11)])


def test_names_are_of_one_kind_and_known() -> None:
    assert compare_for(PROFILES, ["breeze over ground = 3"]).kind == "question"
    assert compare_for(PROFILES, ["breeze over slope = 3"]).kind == "criterion", "slope is no question, breeze is both"
    with pytest.raises(BriefError, match="Perhaps “breeze” was meant"):
        compare_for(PROFILES, ["breze over ground = 3"])
    with pytest.raises(BriefError, match="questions with criteria"):
        compare_for(PROFILES, ["wind over slope = 3"])


@pytest.mark.parametrize("zone", list(PROFILES))
def test_each_zone_shares_the_compared_weight_among_what_it_has(zone: str) -> None:
    compared = compare_for(PROFILES, ["wind over ground = 3", "wind over breeze = 2"])
    before, after = PROFILES[zone], with_weights(PROFILES, compared)[zone]

    def of(profile: object, question: str) -> float:
        return sum(one.weight for one in profile.criteria if one.question == question)  # type: ignore[attr-defined]

    assert sum(one.weight for one in after.criteria) == pytest.approx(sum(one.weight for one in before.criteria))
    assert of(after, "cold") == of(before, "cold"), "not compared"
    if of(before, "wind") and of(before, "ground"):
        assert of(after, "wind") / of(after, "ground") == pytest.approx(3.0)
        assert "comparisons in the brief" in next(one.source for one in after.criteria if one.question == "wind")
    ground_before = [one.weight for one in before.criteria if one.question == "ground"]
    ground_after = [one.weight for one in after.criteria if one.question == "ground"]
    assert np.array(ground_after) / sum(ground_after) == pytest.approx(np.array(ground_before) / sum(ground_before))
    assert after.by_name["slope"].weight == next(one.weight for one in after.criteria if one.name == "slope")
