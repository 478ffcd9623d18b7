"""A starter brief from what a folder seems to hold: each guess with its grounds, what is missing as a comment."""

import json
from collections.abc import Sequence
from pathlib import Path

from sitescreen.errors import InputError, OutputError
from sitescreen.inputs.recognised import Found

NAME = "brief.toml"


def draft_text(found: Sequence[Found], title: str) -> str:
    """The brief, in TOML.

    Parameters
    ----------
    found : sequence of Found
        What each file seems to be.
    title : str

    Raises
    ------
    InputError
        If no terrain or no plots are among them: a brief needs both.
    """
    terrain = sorted(_of(found, "terrain"), key=lambda one: one.step_m)  # the finest counts where they overlap
    plots = _of(found, "plots")
    if not terrain or not plots:
        lacks = " and ".join(what for what, has in (("terrain", terrain), ("plots", plots)) if not has)
        seen = ", ".join(f"{one.file.name}: {one.role or one.why}" for one in found[:12]) or "no file of a known kind"
        raise InputError(
            f"the folder holds no {lacks} that can be told from its files ({seen})",
            "a raster of ground heights and a file of plots are needed",
            "Put them there, or name the files yourself: sitescreen rank --terrain FILE --plots FILE",
        )
    parts = [
        f"title = {_quoted(title)}",
        _terrain(terrain, _of(found, "canopy")),
        _shore(_of(found, "shore")),
        _plots(plots),
        _section("wind", _of(found, "wind"), "season, part, direction_deg, share, speed_m_s"),
        _section("climate", _of(found, "normals"), "station, lon, lat, elevation_m, month, t_max_c …", key="stations"),
        _section("sky", _of(found, "sky"), "month, part, clear_share"),
        _cover(_of(found, "cover")),
        _section("zones", _of(found, "zones"), "polygons of climate zones", key="polygons"),
        *(_hazard(one) for one in _of(found, "hazard")),
        *(_context(one) for one in _of(found, "context")),
        "[judge]\nshortlist = 5             # how many plots the client wants to see first",
        '[output]\nfolder = "out"',
    ]
    unused = [_comment(f"not used: {one.file.name}: {one.why}") for one in found if not one.role]
    return "\n\n".join([*parts, *(["\n".join(unused)] if unused else [])]) + "\n"


def write_draft(folder: Path, text: str) -> Path:
    """Write a brief into a folder that has none.

    Raises
    ------
    OutputError
        If there is one already, or it cannot be written.
    """
    path = folder / NAME
    try:
        with path.open("x", encoding="utf-8") as out:
            out.write(text)
    except FileExistsError as error:
        raise OutputError(
            f"{path} is there already", "a place without a brief is needed", "Rename it, or go on with it"
        ) from error
    except OSError as error:
        raise OutputError(
            f"{path} cannot be written ({error.strerror})", "a folder that can be written to is needed", "Check it"
        ) from error
    return path


def _of(found: Sequence[Found], role: str) -> list[Found]:
    return [one for one in found if one.role == role]


def _quoted(text: str) -> str:
    """Text as TOML writes it: JSON's quotes serve, once its escape of DEL is added."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def _said(one: Found, others: Sequence[Found] = ()) -> str:
    """Why this file, and which others it might have been."""
    also = ", ".join(other.file.name for other in others)
    return _comment(f"{one.file.name}: {one.why}{f' (it might also be {also})' if also else ''}")


def _comment(text: str) -> str:
    """One line whatever stands in it: a name may hold a line feed."""
    return "# " + "".join(sign if sign.isprintable() else " " for sign in text)


def _terrain(tiles: Sequence[Found], canopy: Sequence[Found]) -> str:
    lines = ["[terrain]", *(_said(one) for one in tiles)]
    lines.append(
        f"files = [{', '.join(_quoted(one.file.name) for one in tiles)}]   # where they overlap the first counts"
    )
    off = "" if canopy else "# "
    why = "so that the heights of trees below can be taken off" if canopy else "if the model shows treetops and roofs"
    lines.append(f'{off}surface = "canopy"      # {why}')
    lines.append("# vertical_error_m = 2.5  # one standard deviation, from the model's own description")
    if canopy:
        lines += [_said(canopy[0], canopy[1:]), f"canopy_height = {_quoted(canopy[0].file.name)}"]
    return "\n".join(lines)


def _shore(shores: Sequence[Found]) -> str:
    if not shores:
        return (
            '# [shore]\n# file = "…"              # no shoreline was found: breeze and distance to water stay unknown'
        )
    one = shores[0]
    lines = ["[shore]", _said(one, shores[1:]), f"file = {_quoted(one.file.name)}"]
    if one.column:
        lines.append(f"kind = {_quoted(one.column)}")
    else:
        lines.append('# kind = "sea"            # sea, lake or land, or the column that says it')
    return "\n".join(lines)


def _plots(plots: Sequence[Found]) -> str:
    one = plots[0]
    lines = ["[plots]", _said(one, plots[1:]), f"file = {_quoted(one.file.name)}"]
    if one.name_column:
        lines.append(f"name = {_quoted(one.name_column)}")
    if one.column:
        lines.append(f"zone = {_quoted(one.column)}")
    return "\n".join(lines)


def _section(section: str, files: Sequence[Found], needs: str, key: str = "file") -> str:
    if not files:
        return f'# [{section}]\n# {key} = "…"   # none was found ({needs})'
    return "\n".join([f"[{section}]", _said(files[0], files[1:]), f"{key} = {_quoted(files[0].file.name)}"])


def _cover(covers: Sequence[Found]) -> str:
    """Ground cover stays a comment: nobody but the planner knows what its numbers mean."""
    if not covers:
        return '# [cover]\n# file = "…"   # no map of ground cover was found'
    one = covers[0]
    lines = [_said(one, covers[1:]), "# say what each number means, then take the # away:", "# [cover]"]
    lines += [f"# file = {_quoted(one.file.name)}", "# [cover.classes]"]
    lines += [f"# {number} = {{ roughness_m = 0.05, canopy_m = 0, cold_air_factor = 1 }}" for number in one.classes]
    return "\n".join(lines)


def _hazard(one: Found) -> str:
    """A layer that may forbid building: a concern until the planner says that it is a stop."""
    return "\n".join(
        [
            "[[constraint]]",
            _said(one),
            f"name = {_quoted(one.file.stem.replace('_', ' '))}",
            f"file = {_quoted(one.file.name)}",
            "buffer_m = 0",
            'level = "concern"        # note, concern, or stop, which sets plots aside',
            f"say = {_quoted('inside the layer ' + one.file.stem.replace('_', ' '))}",
        ]
    )


def _context(one: Found) -> str:
    lines = ["[[context]]", _said(one), f"file = {_quoted(one.file.name)}"]
    return "\n".join([*lines, *([f"name = {_quoted(one.name_column)}"] if one.name_column else [])])


__all__ = ["draft_text", "write_draft"]
