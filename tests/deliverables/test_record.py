"""The record."""

import json
from pathlib import Path

import numpy as np
import pytest

from sitescreen.deliverables.record import outputs, plain, write_record
from sitescreen.notes import Note


def test_record_is_json_that_any_reader_takes(tmp_path: Path) -> None:
    """No NaN, keys sorted, whatever kinds of value went in."""
    content = {
        "b": float("nan"),
        "a": np.float32(1.5),
        "c": Path("x/y"),
        "d": (np.int64(3), {"z", "y"}),
        "e": np.arange(2),
    }
    write_record(content, tmp_path / "r.json")
    text = (tmp_path / "r.json").read_text(encoding="utf-8")
    assert "NaN" not in text
    assert list(json.loads(text)) == ["a", "b", "c", "d", "e"]
    assert json.loads(text) == {"a": 1.5, "b": None, "c": "x/y", "d": [3, ["y", "z"]], "e": [0, 1]}


def test_dataclasses_become_mappings() -> None:
    assert plain(Note("info", "wind", "x")) == {"level": "info", "where": "wind", "text": "x"}


def test_what_has_no_plain_form_is_a_fault() -> None:
    with pytest.raises(TypeError, match="complex"):
        plain({"a": 1j})


def test_outputs_are_stamped(tmp_path: Path) -> None:
    (tmp_path / "layers").mkdir()
    (tmp_path / "layers" / "a.tif").write_bytes(b"abc")
    # SHA-256 of "abc": FIPS 180-2, appendix B.1
    assert outputs(tmp_path) == {
        "layers/a.tif": {"bytes": 3, "sha256": "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"}
    }
