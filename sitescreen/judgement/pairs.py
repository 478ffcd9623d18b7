"""Weights from pairwise comparisons: "breeze over ground = 3", by Saaty's method."""

import difflib
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any, NamedTuple, get_args

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import BriefError
from sitescreen.judgement.profiles import Question, ZoneProfile
from sitescreen.notes import Note

FloatArray = NDArray[np.float64]

MOST_THINGS = 10
"""The random index is published to ten things, and few people compare more without contradicting themselves."""

RANDOM_INDEX = {3: 0.58, 4: 0.90, 5: 1.12, 6: 1.24, 7: 1.32, 8: 1.41, 9: 1.45, 10: 1.49}
"""Mean consistency index of random matrices, by size: Saaty's older set (1980), not his .52, .89, 1.11 … of later."""

RATIO_MOST = 0.10
"""Consistency ratio above which comparisons contradict one another too much (Saaty 1980)."""

_PAIR = re.compile(r"^\s*(?P<first>.+?)\s+over\s+(?P<second>.+?)\s*=\s*(?P<times>[^=]+?)\s*$", re.IGNORECASE)


class Pair(NamedTuple):
    """One comparison: the first is so many times as important as the second."""

    first: str
    second: str
    times: float


@dataclass(frozen=True)
class Compared:
    """The weights that comparisons amount to.

    Parameters
    ----------
    kind : "question" or "criterion"
        What was compared.
    names : tuple of str, length n
        In the order in which the brief first speaks of them.
    matrix : float64 array, shape (n, n)
        Row over column; what was not compared is filled in.
    weights : float64 array, shape (n,)
        The principal eigenvector, scaled to sum to 1.
    lambda_max : float
        The principal eigenvalue; n where nothing contradicts.
    consistency_ratio : float
        0 where nothing contradicts; above 0.10 the comparisons should be thought over.
    filled_in : int
        Pairs that were not compared.
    """

    kind: str
    names: tuple[str, ...]
    matrix: FloatArray
    weights: FloatArray
    lambda_max: float
    consistency_ratio: float
    filled_in: int

    def for_record(self) -> dict[str, Any]:
        """What ``record.json`` keeps of it."""
        return {
            "compared": self.kind,
            "weights": dict(zip(self.names, self.weights.tolist(), strict=True)),
            "lambda_max": self.lambda_max,
            "consistency_ratio": self.consistency_ratio,
            "pairs_filled_in": self.filled_in,
        }

    def notes(self) -> tuple[Note, ...]:
        """The weights in words, and a warning where the comparisons contradict one another."""
        listed = ", ".join(
            f"{name} {100 * weight:.0f} %" for name, weight in zip(self.names, self.weights, strict=True)
        )
        text = f"Weights come from the comparisons in the brief: {listed}; what was not compared keeps its weight."
        if self.filled_in == len(self.names) * (len(self.names) - 1) // 2 - (len(self.names) - 1):
            text += " There are too few comparisons for them to contradict one another."
        else:
            text += f" Consistency ratio {self.consistency_ratio:.2f}; up to {RATIO_MOST:.2f} is usual."
            if self.filled_in:
                text += f" {self.filled_in} pairs were filled in from the others, which flatters that ratio."
        notes = [Note("info", "judgement", text)]
        if self.consistency_ratio > RATIO_MOST:
            notes.append(
                Note(
                    "warning",
                    "judgement",
                    f"The comparisons under [judge] pairs contradict one another: consistency ratio "
                    f"{self.consistency_ratio:.2f}, over {RATIO_MOST:.2f}. Think them over before the ranking is used.",
                )
            )
        return tuple(notes)


def read_pairs(texts: Sequence[str]) -> list[Pair]:
    """Comparisons as the brief writes them.

    Parameters
    ----------
    texts : sequence of str
        Such as ``breeze over ground = 3`` or ``sun over slope = 1/2``; from 1/9 to 9.

    Raises
    ------
    BriefError
        If one cannot be understood, or compares the same two things again; the message counts from 1.
    """
    pairs: list[Pair] = []
    seen: set[frozenset[str]] = set()
    for number, text in enumerate(texts, start=1):
        match = _PAIR.match(text)
        times = _times(match["times"]) if match else None
        if match is None or times is None:
            raise BriefError(
                f"[judge] pairs {number} is {text!r}",
                "a comparison such as “breeze over ground = 3” is needed, with a number from 1/9 to 9",
                "Correct that line",
            )
        first, second = match["first"].casefold(), match["second"].casefold()
        both = frozenset((first, second))
        if len(both) == 1 or both in seen:
            what = "compares a thing with itself" if len(both) == 1 else "compares two things a second time"
            raise BriefError(f"[judge] pairs {number}, {text!r}, {what}", "each two things once is needed", "Remove it")
        seen.add(both)
        pairs.append(Pair(first, second, times))
    return pairs


def _times(text: str) -> float | None:
    """A number or a fraction from 1/9 to 9; None for anything else."""
    short = text.replace(" ", "")
    if len(short) > 12 or "e" in short.casefold():  # Fraction would write out 1e99999999 digit by digit
        return None
    try:
        value = Fraction(short)
    except (ValueError, ZeroDivisionError):
        return None
    return float(value) if Fraction(1, 9) <= value <= 9 else None


def compare(pairs: Sequence[Pair], kind: str = "criterion") -> Compared:
    """The weights that comparisons amount to.

    Parameters
    ----------
    pairs : sequence of Pair
        At least one; each two things at most once.
    kind : "question" or "criterion"

    Raises
    ------
    BriefError
        If no chain of comparisons leads from some things to the others, or more than ten are compared.

    Notes
    -----
    Saaty's method [1]_: the weights are the principal eigenvector of the matrix of comparisons, CI = (λmax − n)/(n − 1)
    and CR = CI/RI. A pair that nobody compared is filled in by the least squares of the logarithms, which is the
    geometric mean over all spanning trees of comparisons, so over all ways to chain them [2]_.

    References
    ----------
    .. [1] T. L. Saaty, The Analytic Hierarchy Process. McGraw-Hill, 1980 (random index, limit of 0.10).
    .. [2] S. Bozóki and V. Tsyganok, "The (logarithmic) least squares optimality of the arithmetic (geometric) mean of
       weight vectors calculated from all spanning trees …," Int. J. Gen. Syst., vol. 48, 2019. From memory.
    """
    names = tuple(dict.fromkeys(name for pair in pairs for name in (pair.first, pair.second)))
    if len(names) > MOST_THINGS:
        raise BriefError(
            f"[judge] pairs compares {len(names)} things",
            f"at most {MOST_THINGS} are needed, since more cannot be compared without contradiction",
            "Compare questions (breeze, wind, cold, sun, ground) instead of criteria, or fewer criteria",
        )
    place = {name: k for k, name in enumerate(names)}
    matrix = np.full((len(names), len(names)), np.nan)
    np.fill_diagonal(matrix, 1.0)
    for pair in pairs:
        matrix[place[pair.first], place[pair.second]] = pair.times
        matrix[place[pair.second], place[pair.first]] = 1.0 / pair.times
    apart = _apart(names, matrix)
    if apart:
        raise BriefError(
            f"[judge] pairs compares {_listed(apart)} with none of the others",
            "a chain of comparisons between all things is needed",
            f"Add one, such as “{apart[0]} over {next(name for name in names if name not in apart)} = 2”",
        )
    filled_in = int(np.isnan(matrix).sum()) // 2
    return _weighed(kind, names, _filled(matrix), filled_in)


def _apart(names: Sequence[str], matrix: FloatArray) -> list[str]:
    """The things that no chain connects to the first."""
    reached, waiting = {0}, [0]
    while waiting:
        row = waiting.pop()
        new = {int(k) for k in np.flatnonzero(~np.isnan(matrix[row]))} - reached
        reached |= new
        waiting += sorted(new)
    return [name for k, name in enumerate(names) if k not in reached]


def _filled(matrix: FloatArray) -> FloatArray:
    """The matrix with what was not compared as ratios of the logarithmic least-squares weights."""
    known = ~np.isnan(matrix)
    if known.all():
        return matrix
    logs = np.where(known, np.log(np.where(known, matrix, 1.0)), 0.0)
    laplacian = np.diag(known.sum(axis=1)) - known.astype(np.float64)
    level = np.linalg.lstsq(laplacian, logs.sum(axis=1), rcond=None)[0]
    return np.asarray(np.where(known, matrix, np.exp(level[:, None] - level[None, :])))


def _weighed(kind: str, names: tuple[str, ...], matrix: FloatArray, filled_in: int) -> Compared:
    values, vectors = np.linalg.eig(matrix)
    largest = int(np.argmax(values.real))
    vector = np.abs(vectors[:, largest].real)
    n = len(names)
    # rounding puts the eigenvalue of a consistent matrix a hair below n
    lambda_max = max(float(values[largest].real), float(n))
    ratio = (lambda_max - n) / (n - 1) / RANDOM_INDEX[n] if n in RANDOM_INDEX else 0.0
    return Compared(kind, names, matrix, np.asarray(vector / vector.sum()), lambda_max, ratio, filled_in)


def compare_for(profiles: Mapping[str, ZoneProfile], texts: Sequence[str]) -> Compared:
    """The weights that the brief's comparisons amount to, of questions or of criteria that the profiles know.

    Raises
    ------
    BriefError
        If a name is unknown, or questions are mixed with criteria.

    Notes
    -----
    Some words name both a question and a criterion (breeze, cold, sun). They mean the questions where all names do.
    """
    pairs = read_pairs(texts)
    named = list(dict.fromkeys(name for pair in pairs for name in (pair.first, pair.second)))
    questions = [name for name in get_args(Question) if any(_holds(one, name) for one in profiles.values())]
    criteria = list(dict.fromkeys(one.name for profile in profiles.values() for one in profile.criteria))
    if set(named) <= set(questions):
        return compare(pairs, "question")
    if set(named) <= set(criteria):
        return compare(pairs, "criterion")
    unknown = [name for name in named if name not in questions and name not in criteria]
    if not unknown:
        raise BriefError(
            f"[judge] pairs compares questions with criteria: {_listed(named)}",
            f"either questions ({', '.join(questions)}) or criteria ({', '.join(criteria)}) are needed",
            "Use names of one kind",
        )
    near = difflib.get_close_matches(unknown[0], [*questions, *criteria], n=1)
    raise BriefError(
        f"[judge] pairs names {unknown[0]!r}",
        f"questions ({', '.join(questions)}) or criteria ({', '.join(criteria)}) are needed",
        f"Perhaps “{near[0]}” was meant" if near else "Correct that name",
    )


def with_weights(profiles: Mapping[str, ZoneProfile], compared: Compared) -> dict[str, ZoneProfile]:
    """The profiles with the compared weights.

    In each profile the compared things that it has share among them the weight that they had before; a question's
    weight goes to its criteria in their old proportion. Everything else keeps its weight.
    """
    told = dict(zip(compared.names, compared.weights.tolist(), strict=True))
    return {zone: _reweighed(profile, told, compared.kind) for zone, profile in profiles.items()}


def _reweighed(profile: ZoneProfile, told: Mapping[str, float], kind: str) -> ZoneProfile:
    def thing(criterion: Any) -> str:
        return str(criterion.question if kind == "question" else criterion.name)

    before: dict[str, float] = {}
    for criterion in profile.criteria:
        if thing(criterion) in told:
            before[thing(criterion)] = before.get(thing(criterion), 0.0) + criterion.weight
    if len(before) < 2:  # nothing to compare with in this zone
        return profile
    scale = sum(before.values()) / sum(told[name] for name in before)
    criteria = [
        criterion.model_copy(
            update={
                "weight": criterion.weight / before[thing(criterion)] * told[thing(criterion)] * scale,
                "source": f"{criterion.source}; weight: comparisons in the brief",
            }
        )
        if thing(criterion) in before
        else criterion
        for criterion in profile.criteria
    ]
    # built anew: a copy would carry the old criteria along in its cache
    return ZoneProfile(zone=profile.zone, title=profile.title, wants=profile.wants, criteria=tuple(criteria))


def _holds(profile: ZoneProfile, question: str) -> bool:
    return any(criterion.question == question for criterion in profile.criteria)


def _listed(names: Iterable[str]) -> str:
    return ", ".join(f"“{name}”" for name in names)
