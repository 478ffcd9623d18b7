"""Coordinates that people typed: decimal points or commas, degrees, minutes and seconds, hemispheres."""

import re
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

Axis = Literal["lon", "lat"]

_HEMISPHERES = {"lon": {"E": 1.0, "W": -1.0}, "lat": {"N": 1.0, "S": -1.0}}

# signs and marks that mean the same, brought to one form
_SAME = str.maketrans(dict(zip("−–º˚′’‘´`″”“", "--°°'''''\"\"\"", strict=True)))
_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?")
_GROUPED = {mark: re.compile(rf"[+-]?\d{{1,3}}({re.escape(mark)}\d{{3}})+") for mark in ",."}
_HEMISPHERE_WORDS = re.compile(r"\b(north|south|east|west)\b", re.IGNORECASE)

# d ° m ' s ", every mark optional as long as something stands between the parts
_SEXAGESIMAL = re.compile(
    r"(?P<sign>[+-])?\s*(?P<d>\d{1,3}(?:\.\d+)?)\s*(?:°|deg|d|:|\s)?\s*"
    r"(?:(?P<m>\d{1,2}(?:\.\d+)?)\s*(?:'|min|m|:|\s|$)\s*(?:(?P<s>\d{1,2}(?:\.\d+)?)\s*(?:\"|''|sec|s)?)?)?",
    re.IGNORECASE,
)


class Parsed(NamedTuple):
    """Values [°, or the unit of the file], NaN where unreadable; and why, "" where readable."""

    values: NDArray[np.float64]
    problems: NDArray[np.object_]


def plain_number(text: str) -> float:
    """A number with a decimal point or a decimal comma; NaN if it is neither.

    A single mark is the decimal mark. Where both stand in one number, or one stands more than once, marks that part
    the digits by threes are let go: ``1.234,5``, ``1,234.5`` and ``9.850.000``.
    """
    text = text.strip().translate(_SAME).replace("\u00a0", "").replace("\u202f", "")
    dots, commas = text.count("."), text.count(",")
    if dots + commas > 1:
        decimal = max(text.rfind("."), text.rfind(",")) if dots and commas else len(text)
        whole, fraction = text[:decimal], text[decimal + 1 :]
        if not any(pattern.fullmatch(whole) for pattern in _GROUPED.values()):
            return np.nan
        text = f"{whole.replace('.', '').replace(',', '')}.{fraction}"
    text = text.replace(",", ".")
    return float(text) if _NUMBER.fullmatch(text) else np.nan


def angle_deg(text: str, axis: Axis) -> tuple[float, str]:
    """A longitude or latitude in decimal degrees, and "" – or NaN, and what is wrong with it.

    Reads ``36.82``, ``36,82``, ``-1.29``, ``1.29° S``, ``S 1 17 24``, ``1°17'24"S``, ``36:49:12``, ``36d49m12s E``.
    A minus sign together with a letter for the hemisphere is refused, since it can be read both ways.
    """
    shown = text.strip()
    if not shown:
        return np.nan, f"its {_WORD[axis]} is empty"
    value = plain_number(shown) if shown.count(".") + shown.count(",") <= 1 else np.nan  # no angle has thousands
    if not np.isnan(value):
        return value, ""
    cleaned = shown.translate(_SAME).replace("\u00a0", " ").replace("''", '"')
    cleaned = _HEMISPHERE_WORDS.sub(lambda found: found.group(1)[0], cleaned).replace(",", ".")
    letters = re.findall(r"(?:^\s*([NSEWO])(?=[\s\d+-]))|(?:(?<=[\d\s°'\".dms])([NSEWO])\s*$)", cleaned, re.IGNORECASE)
    found = [(first or last).upper() for first, last in letters]
    if len(found) > 1:
        return np.nan, f"its {_WORD[axis]} “{shown}” names two hemispheres"
    hemisphere = 1.0
    if found:
        if found[0] == "O":
            return np.nan, f"its {_WORD[axis]} “{shown}” ends in O, which is west in some languages and east in others"
        if found[0] not in _HEMISPHERES[axis]:
            return np.nan, f"its {_WORD[axis]} “{shown}” ends in {found[0]}, which is not a {_WORD[axis]}"
        hemisphere = _HEMISPHERES[axis][found[0]]
        cleaned = re.sub(r"(^\s*[NSEW])|([NSEW]\s*$)", "", cleaned, flags=re.IGNORECASE).strip()
    match = _SEXAGESIMAL.fullmatch(cleaned.strip())
    if match is None:
        return np.nan, f"its {_WORD[axis]} “{shown}” cannot be read"
    if match["sign"] and found:
        return np.nan, f"its {_WORD[axis]} “{shown}” has both a sign and a hemisphere"
    minutes, seconds = float(match["m"] or 0.0), float(match["s"] or 0.0)
    split = (match["m"] is not None and "." in match["d"]) or (match["s"] is not None and "." in (match["m"] or ""))
    if minutes >= 60.0 or seconds >= 60.0 or split:
        return np.nan, f"its {_WORD[axis]} “{shown}” has minutes or seconds that do not exist"
    sign = -1.0 if match["sign"] == "-" else hemisphere
    return sign * (float(match["d"]) + minutes / 60.0 + seconds / 3600.0), ""


_WORD = {"lon": "longitude", "lat": "latitude"}


def angles_deg(texts: NDArray[np.object_], axis: Axis) -> Parsed:
    """:func:`angle_deg` of many texts; the plain numbers among them are read at once."""
    values = np.full(len(texts), np.nan)
    problems = np.full(len(texts), "", dtype=object)
    for row, text in enumerate(texts):
        try:
            values[row] = float(
                text.replace("_", "?")
            )  # most rows of most files; float() also takes "nan" and "inf", caught below
        except ValueError:
            values[row], problems[row] = angle_deg(text, axis)
    for row in np.flatnonzero(~np.isfinite(values) & (problems == "")).tolist():
        values[row], problems[row] = np.nan, f"its {_WORD[axis]} “{texts[row].strip()}” is not a number"
    return Parsed(values, problems)


def plain_numbers(texts: NDArray[np.object_], heading: str) -> Parsed:
    """:func:`plain_number` of many texts, for coordinates in metres."""
    values = np.array([plain_number(text) for text in texts], dtype=np.float64)
    problems = np.full(len(texts), "", dtype=object)
    for row in np.flatnonzero(~np.isfinite(values)):
        shown = texts[row].strip()
        problems[row] = f"its {heading} “{shown}” is not a number" if shown else f"its {heading} is empty"
        values[row] = np.nan
    return Parsed(values, problems)
