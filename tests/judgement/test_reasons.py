"""Reasons in sentences."""

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.zones import ZoneShares
from sitescreen.errors import ConfigError
from sitescreen.judgement.cautions import load_cautions
from sitescreen.judgement.overall import judge
from sitescreen.judgement.profiles import Criterion, ZoneProfile, load_profiles
from sitescreen.judgement.reasons import CommonWords, Reasons, load_words, reasons
from sitescreen.settings import load_defaults

SETTINGS = load_defaults().judgement
PROFILES = load_profiles()
RULES = load_cautions()
NO_WHY = pd.DataFrame()

Plots = Callable[..., pd.DataFrame]
InZone = Callable[..., ZoneShares]


def told(
    readings: pd.DataFrame, zones: ZoneShares, why: pd.DataFrame = NO_WHY, halved: tuple[str, ...] = ()
) -> dict[str, Reasons]:
    return reasons(judge(readings, zones, PROFILES, RULES, SETTINGS, halved), why, PROFILES, SETTINGS)


def test_what_gains_and_what_costs_most_comes_first(plots: Plots, in_zone: InZone) -> None:
    """Against an ordinary coastal plot: breeze +14, ventilation −14 (0.35·(25 − 65)), ponding −9, slope −7.2."""
    readings = plots({"ventilation": 0.6, "pond_depth_m": 4.0, "slope_deg": 11.31, "rise_m": -20.0})
    one = told(readings, in_zone(readings, "hot_humid_coast"))["a"]
    assert one.for_ == ("The sea breeze reaches it almost undiminished, from the south-east, 3.0 km from the shore.",)
    assert one.against == (
        "Lies 20 m below the ground within 1 km: hot-afternoon winds are 40 % weaker here than over open level ground.",
        "Partly in a hollow where water could stand up to 4.0 m deep.",
        "Steep, 20 % on average: building needs terraces.",
    )


def test_an_ordinary_plot_has_nothing_to_say(plots: Plots, in_zone: InZone) -> None:
    """Readings whose marks are the profile's ordinary ones: 60 for breeze, 65, 90 and 85."""
    readings = plots({"breeze_reach": 0.546, "ventilation": 1.0, "pond_depth_m": 0.25, "slope_deg": 5.71})
    one = told(readings, in_zone(readings, "hot_humid_coast"))["a"]
    assert one.for_ == ("Nothing lifts it above an ordinary plot of its zone.",)
    assert one.against == ("Nothing puts it below an ordinary plot of its zone.",)


def test_no_more_than_three_are_shown(plots: Plots, in_zone: InZone) -> None:
    bad = {
        "slope_deg": 11.0,
        "cold_deficit_k": 3.0,
        "ridge_exposure": 1.6,
        "aspect_deg": 90.0,
        "morning_sun_share": 0.6,
    }
    good = {"slope_deg": 3.0, "ridge_exposure": 0.6, "morning_sun_share": 1.0}
    readings = plots(bad, good)
    both = told(readings, in_zone(readings, "upland"))
    assert len(both["a"].against) == len(both["b"].for_) == 3
    assert both["a"].for_ == ("Nothing lifts it above an ordinary plot of its zone.",)
    assert both["b"].against == ("Nothing puts it below an ordinary plot of its zone.",)


def test_an_unknown_reading_is_named_with_its_reason_and_counts_against(plots: Plots, in_zone: InZone) -> None:
    readings = plots({"ventilation": np.nan})
    why = pd.DataFrame({"ventilation": ["the terrain model ends within 3 km upwind"]}, index=["a"])
    one = told(readings, in_zone(readings, "hot_humid_coast"), why)["a"]
    said = (
        "Unknown: air movement on hot afternoons, because the terrain model ends within 3 km upwind. "
        "It counts at its worst."
    )
    assert one.against[0] == said
    assert one.unknown == (said,)


def test_nothing_is_said_that_was_not_measured(plots: Plots, in_zone: InZone) -> None:
    """The bearing and the distance are unknown here, so the sentence does without."""
    readings = plots({"onshore_from_deg": np.nan}, {"onshore_from_deg": np.nan, "shore_distance_km": np.nan})
    both = told(readings, in_zone(readings, "hot_humid_coast"))
    assert both["a"].for_[0] == "The sea breeze reaches it almost undiminished, 3.0 km from the shore."
    assert both["b"].for_[0] == "The breeze of sea or lake reaches it almost undiminished."


def test_an_assumed_wind_is_said(plots: Plots, in_zone: InZone) -> None:
    readings = plots({"ventilation": 1.4, "rise_m": 0.0})
    one = told(readings, in_zone(readings, "hot_humid_coast"), halved=("wind",))["a"]
    assert any(text.endswith("(From an assumed input, so it counts half.)") for text in one.for_)


def test_cautions_are_told_with_their_level(plots: Plots, in_zone: InZone) -> None:
    readings = plots({"share_in_water": 0.7, "cells": 3.0})
    one = told(readings, in_zone(readings, "upland"))["a"]
    assert [text.split(":")[0] for text in one.cautions] == ["stop", "note"]


def test_a_plot_that_was_not_measured_gets_no_reasons(plots: Plots, in_zone: InZone) -> None:
    readings = plots({}, {})
    readings.loc["b", ["slope_deg", "breeze_reach", "ventilation", "pond_depth_m", "still_air"]] = np.nan
    readings.loc["b", "outcome"] = "outside the terrain model"
    assert told(readings, in_zone(readings, "hot_humid_coast"))["b"] == Reasons((), ())


def test_only_the_plots_asked_for_are_told(plots: Plots, in_zone: InZone) -> None:
    readings = plots({}, {}, {})
    judged = judge(readings, in_zone(readings, "upland"), PROFILES, RULES, SETTINGS)
    assert list(reasons(judged, NO_WHY, PROFILES, SETTINGS, plots=["c", "a"])) == ["c", "a"]


@pytest.mark.parametrize("zone", list(PROFILES))
def test_every_reading_gives_a_whole_sentence(plots: Plots, in_zone: InZone, zone: str) -> None:
    """Every criterion at 40 readings from below its curve to above it: no gap, no brace, no "nan", a full stop."""
    for criterion in PROFILES[zone].criteria:
        if criterion.reading == "facing_ns":
            continue
        first, last = criterion.curve[0][0], criterion.curve[-1][0]
        values = np.linspace(min(first, last) - 0.1 * (last - first), last + 0.1 * (last - first), 40)
        readings = plots(*({criterion.reading: float(value)} for value in values))
        for one in told(readings, in_zone(readings, zone)).values():
            for text in (*one.for_, *one.against):
                assert text.endswith("."), text
                assert not set("{}") & set(text), text
                assert "nan" not in text, text
                assert "-" not in text.replace("-afternoon", "").replace("-season", "").replace("south-east", ""), text


def test_a_criterion_of_ones_own_says_its_own_sentence(plots: Plots, in_zone: InZone) -> None:
    common = {"question": "own", "weight": 1.0, "ordinary_mark": 50.0, "source": "test, no source"}
    mine = ZoneProfile(
        zone="upland",
        title="Mine",
        wants="Large plots.",
        criteria=(
            Criterion(name="large", reading="area_ha", title="area", unit="ha", curve=((0.0, 0.0), (2.0, 100.0)),
                      says="It has {area_ha:.1f} hectares.", **common),
            Criterion(name="flat", reading="elevation_m", title="height", unit="m", curve=((0.0, 100.0), (50.0, 0.0)),
                      **common),
        ),
    )  # fmt: skip
    readings = plots({})
    judged = judge(readings, in_zone(readings, "upland"), {"upland": mine}, RULES, SETTINGS)
    one = reasons(judged, NO_WHY, {"upland": mine}, SETTINGS)["a"]
    assert one.for_ == ("It has 2.0 hectares.",)
    assert one.against == ("Height: 50.00 m, a mark of 0 out of 100.",)


def test_bands_must_rise_to_an_open_end(tmp_path: Path) -> None:
    shipped = load_words.__wrapped__  # the cache must not remember files that change
    path = tmp_path / "words.toml"
    path.write_text('[slope]\n[[slope.bands]]\nup_to = 3\nsay = ["x."]\n[words]\n', encoding="utf-8")
    with pytest.raises(ConfigError, match=r"words\.toml has no key"):
        shipped(path)
    common = "".join(f'{name} = "x"\n' for name in CommonWords.model_fields)
    path.write_text(path.read_text(encoding="utf-8") + common, encoding="utf-8")
    with pytest.raises(ConfigError, match=r"words\.toml \[slope\] .*an up_to in every band but the last"):
        shipped(path)
