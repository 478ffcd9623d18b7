"""Reasons: what lifts a plot above an ordinary one of its zone, and what costs it most, in sentences with numbers."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from functools import cache
from pathlib import Path
from typing import Annotated, Any, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from pydantic import AfterValidator, Field, model_validator

from sitescreen.judgement.derived import unknown_because
from sitescreen.judgement.marks import mark
from sitescreen.judgement.overall import Judged, ZoneMarks
from sitescreen.judgement.profiles import Criterion, ZoneProfile
from sitescreen.judgement.sentences import check_template, facts, fill
from sitescreen.judgement.wind_slots import IN_WORDS, SLOT_OF
from sitescreen.settings import JudgementSettings, Section, checked, config_folder, read_toml

LEAST_POINTS = 1.0
"""A difference of less than one point of the overall mark is no reason: our choice, no source."""


@dataclass(frozen=True)
class Reasons:
    """What speaks for and against one plot, in plain sentences, the weightiest first.

    Parameters
    ----------
    for_, against : tuple of str
    cautions : tuple of str
        As ``level: sentence``, the gravest first.
    unknown : tuple of str
        Readings that its marks lack, each with the reason why.
    """

    for_: tuple[str, ...]
    against: tuple[str, ...]
    cautions: tuple[str, ...] = ()
    unknown: tuple[str, ...] = field(default=())


class Band(Section):
    """Wordings for readings up to a value; without ``up_to`` for all above."""

    up_to: float | None = None
    say: Annotated[tuple[Annotated[str, AfterValidator(check_template)], ...], Field(min_length=1)]


class CriterionWords(Section):
    """The sentences of one criterion, by bands of its reading."""

    bands: Annotated[tuple[Band, ...], Field(min_length=1)]

    @model_validator(mode="after")
    def _bands_rise_to_the_end(self) -> "CriterionWords":
        limits = [band.up_to for band in self.bands]
        if limits[-1] is not None or None in limits[:-1]:
            raise ValueError("an up_to in every band but the last")
        known = [limit for limit in limits if limit is not None]
        if known != sorted(set(known)):
            raise ValueError("bands whose up_to rise")
        return self

    def for_value(self, value: float) -> tuple[str, ...]:
        """The wordings for a reading."""
        return next(band.say for band in self.bands if band.up_to is None or value <= band.up_to)


class CommonWords(Section):
    """Sentences that belong to no criterion."""

    any: str
    unknown: str
    unknown_no_reason: str
    assumed: str
    nothing_for: str
    nothing_against: str
    where_best: str
    where_part: str
    where_middle: str
    where_alike: str
    where_too_small: str


class Words(NamedTuple):
    """The content of ``config/reasons.toml``."""

    criteria: Mapping[str, CriterionWords]
    words: CommonWords


class _Gain(NamedTuple):
    """What one criterion adds to a plot's overall mark against an ordinary plot, in points."""

    points: float
    criterion: Criterion
    is_known: bool


@cache
def load_words(path: Path | None = None) -> Words:
    """The sentences of ``config/reasons.toml``, or of another file of the same form.

    Raises
    ------
    ConfigError
        If the file is wrong.
    """
    path = path or config_folder() / "reasons.toml"
    content = read_toml(path)
    common = checked(content.pop("words", {}), CommonWords, path.name)
    return Words({name: checked(one, CriterionWords, f"{path.name} [{name}]") for name, one in content.items()}, common)


def reasons(
    judged: Judged,
    why_unknown: pd.DataFrame,
    profiles: Mapping[str, ZoneProfile],
    settings: JudgementSettings,
    plots: Iterable[str] | None = None,
) -> dict[str, Reasons]:
    """The reasons of plots, from their leading zone.

    Parameters
    ----------
    judged : Judged
    why_unknown : DataFrame, indexed by plot
        Why a reading is missing; "" or no column where it is not.
    profiles : mapping of zone to ZoneProfile
    settings : JudgementSettings
    plots : iterable of str, optional
        Which plots; all if left out.

    Returns
    -------
    dict of plot to Reasons
        Plots without a firm zone, or with no mark that is known, have cautions only.

    Notes
    -----
    What a criterion gains or costs is its weight times the distance of its mark from that of an ordinary plot of the
    zone, as a part of all weights: points of the overall mark. An unknown reading costs what its worst mark would.
    """
    words = load_words()
    wanted = list(judged.table.index) if plots is None else list(plots)
    leading = judged.table["zone"]
    place = {
        zone: pd.Series(np.arange(len(one.rows)), index=judged.table.index[one.rows])
        for zone, one in judged.by_zone.items()
    }
    records = dict(zip(wanted, judged.facts.loc[wanted].to_dict("records"), strict=True))
    out: dict[str, Reasons] = {}
    for plot in wanted:
        alerts = tuple(f"{alert.level}: {alert.text}" for alert in judged.cautions.get(plot, ()))
        zone = leading.at[plot]
        if not zone or judged.table.at[plot, "known_weight_share"] == 0.0:
            out[plot] = Reasons((), (), alerts)
            continue
        gains = _gains(judged.by_zone[zone], int(place[zone].at[plot]), profiles[zone])
        record = records[plot]
        told = facts(record)

        def sentence(gain: _Gain, plot: str = plot, told: dict[str, Any] = told) -> str:
            one = gain.criterion
            text = (
                _known_sentence(one, told, words)
                if gain.is_known
                else _unknown_sentence(one, unknown_because(one.column, why_unknown, plot), words)
            )
            return text + words.words.assumed if gain.is_known and one.is_among(judged.halved) else text

        best = [gain for gain in gains if gain.is_known and gain.points >= LEAST_POINTS][: settings.reasons_shown]
        worst = [gain for gain in reversed(gains) if gain.points <= -LEAST_POINTS][: settings.reasons_shown]
        out[plot] = Reasons(
            tuple(sentence(gain) for gain in best) or (words.words.nothing_for,),
            tuple(sentence(gain) for gain in worst) or (words.words.nothing_against,),
            alerts,
            tuple(
                _unknown_sentence(gain.criterion, unknown_because(gain.criterion.column, why_unknown, plot), words)
                for gain in gains
                if not gain.is_known
            ),
        )
    return out


def _gains(one: ZoneMarks, row: int, profile: ZoneProfile) -> list[_Gain]:
    """What each criterion adds to the plot's mark against an ordinary plot, the most first."""
    known: NDArray[np.float64] = one.marks.iloc[row].to_numpy(dtype=np.float64)
    lowest: NDArray[np.float64] = one.lowest.iloc[row].to_numpy(dtype=np.float64)
    total = sum(one.weights.values())
    gains = []
    for criterion, earned, least in zip(profile.criteria, known, lowest, strict=True):
        is_known = bool(np.isfinite(earned))
        points = one.weights[criterion.name] * ((earned if is_known else least) - criterion.ordinary_mark) / total
        gains.append(_Gain(float(points), criterion, is_known))
    return sorted(gains, key=lambda gain: -gain.points)


def _known_sentence(one: Criterion, told: Mapping[str, Any], words: Words) -> str:
    if one.kinds:
        word = str(told[one.column])
        more = {**told, "value": word, "title": one.title, "amount": word, "mark": float(one.kinds[word])}
        text = fill((one.says, words.words.any) if one.says else (words.words.any,), more)
        return text[:1].upper() + text[1:]
    value = float(told[one.column])
    amount = f"{value:.2f} {one.unit}" if one.unit not in ("", "1") else f"{value:.2f}"
    more = {**told, "value": value, "title": one.title, "amount": amount, "mark": mark(value, one).item()}
    if one.reading in SLOT_OF:
        slot = one.slot or SLOT_OF[one.reading]
        strong = "strong winds" if slot == "year" else f"strong {IN_WORDS[slot]}"
        more |= {"winds": IN_WORDS[slot], "strong_winds": strong}
        more |= {"more_pct": 100.0 * (value - 1.0), "less_pct": 100.0 * (1.0 - value)}
    if one.says:
        wordings: tuple[str, ...] = (one.says,)
    elif one.name in words.criteria:
        wordings = words.criteria[one.name].for_value(value)
    else:
        wordings = ()
    text = fill((*wordings, words.words.any), more)
    return text[:1].upper() + text[1:]


def _unknown_sentence(one: Criterion, reason: str, words: Words) -> str:
    template = words.words.unknown if reason else words.words.unknown_no_reason
    return template.format(title=one.title, reason=reason)
