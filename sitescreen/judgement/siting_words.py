"""The siting hint of a plot in plain sentences."""

from typing import TYPE_CHECKING

from sitescreen.settings import SitingSettings

if TYPE_CHECKING:
    from sitescreen.judgement.siting import PlotSiting

HINT = "A siting hint from terrain, sun and wind, not a design"
SEASONS_ASSUMED = "its hot and cool months are assumed from latitude"

_POINTS = ("N", "NNE", "NE", "ENE", "E", "ESE", "SE", "SSE", "S", "SSW", "SW", "WSW", "W", "WNW", "NW", "NNW")
_ALIKE_DEG = 2.0
_NEARLY_DEG = 15.0
_TOLD_TURN_DEG = 20
_ALIKE_PCT = 3.0
_LEAST_PCT = 1.0


def point(bearing_deg: float) -> str:
    """The nearest of the sixteen points of the compass, as in ENE."""
    return _POINTS[int((bearing_deg % 360.0) / 22.5 + 0.5) % 16]


def along(axis_deg: float) -> str:
    """How an axis lies, in words: "east–west", "nearly north–south", "NE–SW"."""
    for middle, words in ((90.0, "east–west"), (0.0, "north–south")):
        off = abs((axis_deg - middle + 90.0) % 180.0 - 90.0)
        if off <= _NEARLY_DEG:
            return words if off <= _ALIKE_DEG else f"nearly {words}"
    return f"{point(axis_deg)}–{point(axis_deg + 180.0)}"


def sentences(
    hint: "PlotSiting", slope_pct: float, wind_assumed: bool, seasons_assumed: bool, settings: SitingSettings
) -> tuple[str, ...]:
    """The hint in plain sentences, the axis first, the warning that it is but a hint last.

    Parameters
    ----------
    hint : PlotSiting
    slope_pct : float
        Of the ground. [%]
    wind_assumed : bool
        Nobody gave a table of winds.
    seasons_assumed : bool
        Nobody gave the seasons, nor normals that they follow from.
    settings : SitingSettings
    """
    first, second = sorted(((hint.axis_deg + 90) % 360, (hint.axis_deg + 270) % 360))
    told = [
        f"Long walls facing {point(first)} and {point(second)}: axis {hint.axis_deg}° ({along(hint.axis_deg)}). "
        + _because(hint, wind_assumed),
        _turning(hint),
    ]
    if hint.contour_deg is not None:
        told.append(
            f"The ground slopes {slope_pct:.0f} %: along the contour the axis would be {hint.contour_deg}°, which "
            f"saves earthworks and costs {hint.contour_cost_pct:.0f} % of what the worst bearing would."
        )
    told.append(_rows(hint, settings))
    if hint.eaves:
        told.append(_eaves(hint, settings))
    return (*told, f"{HINT}; {SEASONS_ASSUMED}." if seasons_assumed else f"{HINT}.")


def _because(hint: "PlotSiting", wind_assumed: bool) -> str:
    if not hint.wind:
        no_wind = "no table of winds was given" if wind_assumed else "the wind here is unknown"
        return f"The sun alone decided: {no_wind}."
    if hint.wind_from_deg is None or hint.wind_incidence_deg is None:
        met = f"the {hint.wind} comes from all sides alike"
    else:
        met = (
            f"the {hint.wind} from the {point(hint.wind_from_deg)} meets the long wall {hint.wind_incidence_deg:.0f}° "
            "off square"
        )
    if not hint.wind_wanted:
        met += " and is to be kept off"
    words = {"sun": "The sun decided", "wind": f"The {hint.wind} decided", "both": f"Sun and {hint.wind} decided alike"}
    alone = ""
    if hint.sun_axis_deg is not None and hint.wind_axis_deg is not None:
        alone = f" (for the sun alone {hint.sun_axis_deg:.0f}°, for the {hint.wind} alone {hint.wind_axis_deg:.0f}°)"
    return f"{words[hint.decided_by]}{alone}; {met}."


def _turning(hint: "PlotSiting") -> str:
    turn = next(one for one in hint.turns if one.turn_deg == _TOLD_TURN_DEG)
    changes = []
    if turn.sun_pct >= _LEAST_PCT:
        changes.append(f"up to {turn.sun_pct:.0f} % more unwanted sun on the long walls")
    if turn.morning_pct >= _LEAST_PCT:
        changes.append(f"up to {turn.morning_pct:.0f} % less cool-season morning sun")
    if turn.air_pct is not None and abs(turn.air_pct) >= _LEAST_PCT:
        changes.append(f"up to {abs(turn.air_pct):.0f} % {'less' if turn.air_pct < 0 else 'more'} {hint.wind}")
    least, most = sorted((turn.smaller_pct, turn.larger_pct))
    if most - least < _ALIKE_PCT:
        cost = f"Turning it by {turn.turn_deg}° either way costs {most:.0f} % of what the worst bearing would"
    else:
        smaller, larger = ((hint.axis_deg + way * turn.turn_deg) % 180 for way in (-1, 1))
        cost = (
            f"Turning it by {turn.turn_deg}° costs {turn.smaller_pct:.0f} % of what the worst bearing would "
            f"(to {smaller}°) or {turn.larger_pct:.0f} % (to {larger}°)"
        )
    return f"{cost}: {', '.join(changes)}." if changes else f"{cost}."


def _rows(hint: "PlotSiting", settings: SitingSettings) -> str:
    hours = _hours(settings)
    if hint.rows_for == "shade":
        return "Rows close together shade one another, which is wanted here."
    if hint.row_gap_heights is None:
        return f"No gap between rows keeps the foot of the long walls in the cool-season sun from {hours} here."
    gap = (
        f"A clear gap of {hint.row_gap_heights:.1f} eaves heights between rows ({hint.row_gap_m:.1f} m with eaves at "
        f"{settings.eaves_height_m:g} m)"
    )
    if hint.rows_for == "air":
        return f"{gap} lets the wind through."
    return f"{gap} keeps the long walls in the cool-season sun from {hours} on this slope."


def _eaves(hint: "PlotSiting", settings: SitingSettings) -> str:
    parts = []
    for face_deg, metres in hint.eaves:
        wall = f"{point(face_deg)} wall"
        if metres is None:
            parts.append(f"none up to {settings.eave_most_m:g} m is enough for the {wall}")
        elif metres < 0.05:
            parts.append(f"none is needed for the {wall}")
        else:
            parts.append(f"{metres:.1f} m for the {wall}")
    hours = _hours(settings)
    return f"Eaves that shade {settings.shaded_wall_m:g} m of wall from {hours} in the hot season: {', '.join(parts)}."


def _hours(settings: SitingSettings) -> str:
    return "{:g} to {:g} h".format(*settings.sun_hours)
