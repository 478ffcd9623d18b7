"""What the record says of a file."""

from pathlib import Path

import pytest

from sitescreen.errors import InputError
from sitescreen.inputs.stamps import stamp


def test_a_stamp_matches_published_digests(tmp_path: Path) -> None:
    """SHA-256 of "abc" and of a million letters a (several chunks), FIPS 180-2 appendix B, 2002."""
    (tmp_path / "abc.txt").write_bytes(b"abc")
    found = stamp(tmp_path / "abc.txt", "EPSG:4326")
    assert found.sha256 == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    assert (found.name, found.size_bytes, found.crs) == ("abc.txt", 3, "EPSG:4326")
    (tmp_path / "million.txt").write_bytes(b"a" * 1_000_000)
    assert stamp(tmp_path / "million.txt").sha256 == "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0"


def test_a_file_longer_than_a_chunk_is_read_to_its_end(tmp_path: Path) -> None:
    (tmp_path / "a").write_bytes(b"a" * (1 << 20) + b"b")
    (tmp_path / "c").write_bytes(b"a" * (1 << 20) + b"c")
    assert stamp(tmp_path / "a").size_bytes == (1 << 20) + 1
    assert stamp(tmp_path / "a").sha256 != stamp(tmp_path / "c").sha256


def test_a_folder_that_serves_as_a_file_counts_names_and_contents(tmp_path: Path) -> None:
    for name, content in (("one", b"x"), ("two", b"x")):
        (tmp_path / name).mkdir()
        (tmp_path / name / f"part_{name}").write_bytes(content)
    assert stamp(tmp_path / "one").size_bytes == 1
    assert stamp(tmp_path / "one").sha256 != stamp(tmp_path / "two").sha256


def test_a_file_that_is_not_there_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"gone\.tif cannot be read"):
        stamp(tmp_path / "gone.tif")
