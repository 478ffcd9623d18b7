"""Cautions: named alerts, from rules in ``config/cautions.toml``."""

from collections.abc import Iterable
from pathlib import Path
from typing import Annotated, Literal, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from pydantic import AfterValidator, Field, model_validator

from sitescreen.judgement.sentences import check_template, facts, fill, is_known
from sitescreen.settings import Section, config_folder, read_settings

Level = Literal["note", "concern", "stop"]

LEVELS: tuple[Level, ...] = ("stop", "concern", "note")
"""The gravest first."""

BoolArray = NDArray[np.bool_]


class Caution(NamedTuple):
    """One alert on one plot."""

    level: Level
    name: str
    text: str


class Condition(Section):
    """One thing that must hold. Exactly one of the tests is given.

    Parameters
    ----------
    reading : str
    above, below, at_most : float
        The reading must be greater, less, or not greater.
    one_of : tuple of str
        The reading must be one of these words.
    unknown : bool
        The reading must be unknown (true) or known (false).
    if_unknown : bool
        What an unknown reading counts as; left out, the condition is undecided.
    """

    reading: Annotated[str, Field(min_length=1)]
    above: float | None = None
    below: float | None = None
    at_most: float | None = None
    one_of: tuple[str, ...] | None = None
    unknown: bool | None = None
    if_unknown: bool | None = None

    @model_validator(mode="after")
    def _one_test(self) -> "Condition":
        tests = (self.above, self.below, self.at_most, self.one_of, self.unknown)
        if sum(test is not None for test in tests) != 1:
            raise ValueError("exactly one of above, below, at_most, one_of and unknown")
        return self

    def holds(self, readings: pd.DataFrame) -> tuple[BoolArray, BoolArray]:
        """Where the condition holds, and where it cannot be said. Two arrays of shape (n,)."""
        nowhere = np.zeros(len(readings), dtype=np.bool_)
        column = readings[self.reading] if self.reading in readings else pd.Series(np.nan, index=readings.index)
        is_unknown = _is_unknown(column)
        if self.unknown is not None:
            return is_unknown == self.unknown, nowhere
        if self.one_of is not None:
            true = np.isin(column.to_numpy(dtype=object).astype(str), self.one_of) & ~is_unknown
        else:
            true = self._compare(pd.to_numeric(column, errors="coerce").to_numpy(dtype=np.float64))
        if self.if_unknown is not None:
            return true | (is_unknown & self.if_unknown), nowhere
        return true, is_unknown

    def _compare(self, values: NDArray[np.float64]) -> BoolArray:
        """NaN compares as false."""
        if self.above is not None:
            return np.asarray(values > self.above)
        if self.below is not None:
            return np.asarray(values < self.below)
        return np.asarray(values <= (self.at_most or 0.0))


def _is_unknown(column: pd.Series) -> BoolArray:
    if pd.api.types.is_numeric_dtype(column) or pd.api.types.is_bool_dtype(column):
        return np.asarray(column.isna().to_numpy())
    return np.array([not is_known(value) or value == "unknown" for value in column], dtype=np.bool_)


class CautionRule(Section):
    """A caution and when it is raised.

    Parameters
    ----------
    name : str
    level : "note", "concern" or "stop"
        A plot with a stop is set aside.
    when : tuple of Condition
        All must hold.
    zones : tuple of str
        Only plots whose leading zone is one of these; empty for all.
    say : tuple of str
        Wordings, the fullest first; the first whose facts are known is used. Plain sentences without a closing stop.
    unknown_level, say_unknown
        What to raise where the conditions cannot be decided; left out, nothing.
    source : str
    """

    name: Annotated[str, Field(pattern=r"^[a-z][a-z0-9_]*$")]
    level: Level
    when: Annotated[tuple[Condition, ...], Field(min_length=1)]
    zones: tuple[str, ...] = ()
    say: Annotated[tuple[Annotated[str, AfterValidator(check_template)], ...], Field(min_length=1)]
    unknown_level: Level | None = None
    say_unknown: str = ""
    source: Annotated[str, Field(min_length=1)]

    @model_validator(mode="after")
    def _last_wording_always_fits(self) -> "CautionRule":
        if "{" in self.say[-1]:
            raise ValueError("a last wording without figures, for plots that lack them")
        if self.unknown_level and not self.say_unknown:
            raise ValueError("a say_unknown with every unknown_level")
        return self

    def raised(self, readings: pd.DataFrame, zone: NDArray[np.object_]) -> tuple[BoolArray, BoolArray]:
        """Where the rule's conditions hold, and where they cannot be decided. Two arrays of shape (n,)."""
        true = np.ones(len(readings), dtype=np.bool_)
        possible = np.ones(len(readings), dtype=np.bool_)
        for condition in self.when:
            holds, undecided = condition.holds(readings)
            true &= holds
            possible &= holds | undecided
        if self.zones:
            here = np.isin(zone.astype(str), self.zones)
            true, possible = true & here, possible & here
        return true, possible & ~true


class CautionRules(Section):
    """The content of ``config/cautions.toml``."""

    caution: tuple[CautionRule, ...]


def load_cautions(path: Path | None = None) -> tuple[CautionRule, ...]:
    """The rules of ``config/cautions.toml``, or of another file of the same form.

    Raises
    ------
    ConfigError
        If the file is wrong; the message names file, key and what is allowed.
    """
    return read_settings(path or config_folder() / "cautions.toml", CautionRules).caution


def cautions(
    readings: pd.DataFrame, zone: Iterable[str], rules: Iterable[CautionRule], judged: BoolArray | None = None
) -> dict[str, tuple[Caution, ...]]:
    """The cautions of every plot that has any.

    Parameters
    ----------
    readings : DataFrame, n rows, indexed by plot
        Readings and whatever else the rules look at; a column that is missing is unknown for all.
    zone : n strings
        The leading zone, "" where there is none.
    rules : iterable of CautionRule
    judged : bool array, shape (n,), optional
        Plots to look at; the others were never measured.

    Returns
    -------
    dict of plot to its cautions
        The gravest first, then in the rules' order.
    """
    zones = np.array(list(zone), dtype=object)
    look = np.ones(len(readings), dtype=np.bool_) if judged is None else judged
    found: list[tuple[int, Level, CautionRule, bool]] = []
    for rule in rules:
        true, undecided = rule.raised(readings, zones)
        found += [(int(row), rule.level, rule, True) for row in np.flatnonzero(true & look)]
        if rule.unknown_level is not None:
            found += [(int(row), rule.unknown_level, rule, False) for row in np.flatnonzero(undecided & look)]
    found.sort(key=lambda one: (one[0], LEVELS.index(one[1])))  # a stable sort: the rules keep their order
    records = _records(readings, {row for row, _, _, _ in found})
    raised: dict[str, list[Caution]] = {}
    for row, level, rule, is_true in found:
        text = fill(rule.say, records[row]) if is_true else rule.say_unknown
        raised.setdefault(str(readings.index[row]), []).append(Caution(level, rule.name, text))
    return {plot: tuple(alerts) for plot, alerts in raised.items()}


def _records(readings: pd.DataFrame, rows: set[int]) -> dict[int, dict[str, object]]:
    chosen = sorted(rows)
    return {row: facts(one) for row, one in zip(chosen, readings.iloc[chosen].to_dict("records"), strict=True)}
