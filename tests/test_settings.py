"""Settings: what is shipped is sound and sourced, and what is wrong is named."""

import math
import re
from pathlib import Path
from typing import Any

import pytest

from sitescreen.errors import ConfigError
from sitescreen.settings import Defaults, checked, config_folder, load_defaults, read_settings

SHIPPED = config_folder() / "defaults.toml"


def changed(section: str, **values: Any) -> dict[str, Any]:
    """The shipped settings with some values of a section replaced."""
    content = load_defaults().model_dump(exclude_none=True)
    content[section] = {**content[section], **values}
    return content


def test_every_number_has_its_source_on_the_line_above() -> None:
    """A key whose line above is no comment would be a number from nowhere; precedence lists are no numbers."""
    lines = SHIPPED.read_text(encoding="utf-8").splitlines()
    keys = [n for n, line in enumerate(lines) if re.match(r"^\w+ = ", line) and not line.startswith("unless")]
    assert len(keys) > 60
    assert [lines[n] for n in keys if not lines[n - 1].startswith("# ")] == []


def test_the_strength_of_cold_air_follows_from_brunts_formula() -> None:
    """4 K × net longwave / 64 W/m², σT⁴(1 − 0.52 − 0.065 √e) after Brunt 1932, at the temperature in the comment.

    Written anew here, with the Magnus formula of the WMO for the vapour pressure (6.112·exp(17.62 t/(243.12 + t)) hPa).
    The settings are rounded to 0.5 K, so they may differ by 0.25 K, and 0.15 K for the rounding of the inputs.
    """
    text = SHIPPED.read_text(encoding="utf-8")
    states = re.findall(r"^# (\d+) °C, (\d+) %\n(\w+) = ([\d.]+)$", text, flags=re.MULTILINE)
    assert len(states) == len(load_defaults().cold_air.strength_k) == 6
    for t_c, humidity_pct, zone, strength_k in states:
        vapour_hpa = float(humidity_pct) / 100 * 6.112 * math.exp(17.62 * float(t_c) / (243.12 + float(t_c)))
        net_w_m2 = 5.670374e-8 * (float(t_c) + 273.15) ** 4 * (1 - 0.52 - 0.065 * math.sqrt(vapour_hpa))
        assert float(strength_k) == pytest.approx(4 * net_w_m2 / 64, abs=0.4), zone


@pytest.mark.parametrize(
    ("section", "values", "message"),
    [
        ("wind", {"shelter_most": 2}, r"mine\.toml has wind\.shelter_most = 2; a number from 0 to 1 is needed"),
        ("breeze", {"tail_length_km": 0}, r"breeze\.tail_length_km = 0; a number above 0 to 1e\+06 is needed"),
        ("terrain", {"sky_azimuths": 2.5}, r"terrain\.sky_azimuths = 2\.5"),
        ("terrain", {"rise_radius": 500}, r"unknown key 'terrain\.rise_radius'.*'rise_radius_m' was meant"),
        ("judgement", {"mark_tie": float("nan")}, r"judgement\.mark_tie = nan"),
    ],
)
def test_a_wrong_value_is_refused_with_file_key_and_range(section: str, values: dict[str, Any], message: str) -> None:
    with pytest.raises(ConfigError, match=message):
        checked(changed(section, **values), Defaults, "mine.toml")


def test_a_missing_key_is_named() -> None:
    content = load_defaults().model_dump(exclude_none=True)
    del content["wind"]["shelter_reach_m"]
    with pytest.raises(ConfigError, match=r"no key 'wind\.shelter_reach_m'"):
        checked(content, Defaults, "mine.toml")


def test_a_ramp_must_rise() -> None:
    zones = load_defaults().zones.model_dump(exclude_none=True)
    zones["with_normals"]["upland"]["t_mean_c"] = [[20.0, 0.0], [20.0, 1.0]]
    with pytest.raises(ConfigError, match=r"zones\.with_normals\.upland\.t_mean_c .* rise from point to point"):
        checked(changed("zones", **zones), Defaults, "mine.toml")


def test_a_circle_of_precedence_is_refused() -> None:
    zones = load_defaults().zones.model_dump(exclude_none=True)
    zones["with_normals"]["lake_basin"]["unless"] = ["savannah"]
    with pytest.raises(ConfigError, match="circle of `unless` between"):
        checked(changed("zones", **zones), Defaults, "mine.toml")


def test_files_that_cannot_be_read_are_named(tmp_path: Path) -> None:
    with pytest.raises(ConfigError, match=r"none\.toml cannot be read"):
        read_settings(tmp_path / "none.toml", Defaults)
    broken = tmp_path / "broken.toml"
    broken.write_text("wind = = 3")
    with pytest.raises(ConfigError, match=r"broken\.toml is not valid TOML"):
        read_settings(broken, Defaults)
    broken.write_bytes(b'title = "\xff"')
    with pytest.raises(ConfigError, match=r"broken\.toml is not valid TOML"):
        read_settings(broken, Defaults)
