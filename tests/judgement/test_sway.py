"""The smallest change of one weight that changes the first."""

from collections.abc import Mapping

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sitescreen.climate.zones import ZoneShares
from sitescreen.judgement.overall import Judged, judge
from sitescreen.judgement.profiles import Criterion, ZoneProfile
from sitescreen.judgement.sway import Sway, Turn, sway_notes, sways
from sitescreen.settings import load_defaults

HOW = load_defaults().judgement
NAMES = ("one", "two", "three")


def profile(zone: str, weights: Mapping[str, float]) -> ZoneProfile:
    """Criteria that give a reading of 0–100 as the mark."""
    criteria = tuple(
        Criterion(
            name=name, reading=name, question="own", title=name, weight=weight, weight_spread_pct=30.0,
            curve=((0.0, 0.0), (100.0, 100.0)), source="x",
        )
        for name, weight in weights.items()
    )  # fmt: skip
    return ZoneProfile(zone=zone, title=zone, wants="Anything.", criteria=criteria)


def shares_of(share_in_a: list[float], provisional: list[bool]) -> ZoneShares:
    index = pd.Index([str(k) for k in range(len(share_in_a))])
    shares = pd.DataFrame({"a": share_in_a, "b": [1.0 - share for share in share_in_a]}, index=index)
    leading = pd.Series(np.where(shares["a"] >= 0.5, "a", "b"), index=index, dtype=object)
    none = pd.Series(False, index=index)
    words = pd.Series("", index=index, dtype=object)
    return ZoneShares(shares, leading, shares.max(axis=1), none, pd.Series(provisional, index=index), words, none)


def judged(marks: list[tuple[float, ...]], zones: ZoneShares, profiles: dict[str, ZoneProfile]) -> Judged:
    readings = pd.DataFrame(marks, columns=NAMES, index=zones.shares.index)
    return judge(readings, zones, profiles, (), HOW)


def applied(profiles: dict[str, ZoneProfile], zone: str, name: str, factor: float) -> dict[str, ZoneProfile]:
    weights = {one.name: one.weight * (factor if one.name == name else 1.0) for one in profiles[zone].criteria}
    return profiles | {zone: profile(zone, weights)}


def only_a(marks: list[tuple[float, ...]], weights: Mapping[str, float]) -> Sway:
    zones = shares_of([1.0] * len(marks), [False] * len(marks))
    profiles = {"a": profile("a", weights)}
    return sways(judged(marks, zones, profiles), zones, profiles)[0]


def test_a_case_by_hand() -> None:
    """Marks (80, 40, 60) and (60, 70, 60) at weights 60, 20, 20.

    The first weight times f: level where 48f + 8 + 12 = 36f + 14 + 12, so f = 0.5. The second times g: level where
    48 + 8g + 12 = 36 + 14g + 12, so g = 2: a larger change.
    """
    found = only_a([(80.0, 40.0, 60.0), (60.0, 70.0, 60.0)], {"one": 60.0, "two": 20.0, "three": 20.0})
    assert found.turn is not None
    assert (found.turn.first, found.turn.then_first, found.turn.criterion) == ("0", "1", "one")
    assert found.turn.change_pct == pytest.approx(-50.0)
    assert found.turn.weight_then == pytest.approx(30.0)
    assert found.turn.share_then == pytest.approx(30.0 / 70.0)
    assert not found.turn.in_dispute
    assert "“one” in the profile a at 42.9 % of the mark instead of 60.0 % (50 % less); then plot 1" in found.sentence()
    assert "beyond the ± 30 %" in found.sentence()


def test_a_plot_that_is_better_throughout_stays_first() -> None:
    found = only_a([(80.0, 80.0, 80.0), (60.0, 70.0, 80.0)], dict.fromkeys(NAMES, 1.0))
    assert found.turn is None
    assert found.sentence() == "No change of a single weight would put another plot before plot 0."


def test_equal_plots_share_the_first_place() -> None:
    found = only_a([(80.0, 80.0, 80.0), (80.0, 80.0, 80.0), (1.0, 1.0, 1.0)], dict.fromkeys(NAMES, 1.0))
    assert found.first == ("0", "1")
    assert "share the first place" in found.sentence()


MARK = st.integers(0, 100).map(float)
PLOT = st.tuples(st.tuples(MARK, MARK, MARK), st.sampled_from([0.0, 0.3, 0.6, 1.0]), st.booleans())
WEIGHT = st.integers(1, 60).map(lambda whole: whole / 1000.0)  # far below the most that a profile allows


@given(st.lists(PLOT, min_size=2, max_size=5), st.tuples(*[WEIGHT] * 5))
@settings(max_examples=15, deadline=None)
def test_applying_the_change_dethrones_the_first_and_nothing_smaller_does(
    plots: list[tuple[tuple[float, ...], float, bool]], weights: tuple[float, ...]
) -> None:
    """In one zone, in blends and in undecided zones."""
    zones = shares_of([share for _, share, _ in plots], [is_open and 0 < share < 1 for _, share, is_open in plots])
    marks = [mark for mark, _, _ in plots]
    profiles = {
        "a": profile("a", dict(zip(NAMES, weights[:3], strict=True))),
        "b": profile("b", dict(zip(NAMES[:2], weights[3:], strict=True))),
    }
    for found in sways(judged(marks, zones, profiles), zones, profiles):
        column = "rank" if found.among == "all" else "rank_in_zone"

        def firsts(by: dict[str, ZoneProfile], column: str = column, among: str = found.among) -> set[str]:
            table = judged(marks, zones, by).table
            table = table if among == "all" else table[table["zone"] == among]
            return set(table.index[table[column] == 1])

        if len(found.first) > 1:
            assert firsts(profiles) == set(found.first)
            continue
        turn = found.turn
        if turn is not None:
            ratio = 1.0 + turn.change_pct / 100.0
            beyond = ratio * (1.0 + 1e-4 * np.sign(ratio - 1.0)) if ratio != 1.0 else ratio
            assert found.first[0] not in firsts(applied(profiles, turn.profile, turn.criterion, beyond))
        # nothing smaller, of any weight, either way
        least = abs(turn.change_pct) / 100.0 * 0.999 if turn is not None else 0.9
        for zone in profiles:
            for one in profiles[zone].criteria:
                for factor in (1.0 + least, 1.0 - least):
                    if 0.0 < factor < 1e4:
                        assert found.first[0] in firsts(applied(profiles, zone, one.name, factor))


def test_the_note_is_about_all_plots() -> None:
    turn = Turn("all", "K-1", "K-2", "upland", "cold", "cold air", 0.3, 0.35, 30.0, 37.7, 25.6, 30.0)
    notes = sway_notes((Sway("all", ("K-1",), turn), Sway("upland", ("K-1",), None)))
    assert [note.level for note in notes] == ["info"]
    assert (
        "35.0 % of the mark instead of 30.0 % (26 % more); then plot K-2 would be first. That is within"
        in notes[0].text
    )
    assert sway_notes(()) == ()
