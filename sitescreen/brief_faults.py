"""What is wrong with a brief, in plain words: the first fault that the check of its keys and values found."""

import difflib
import typing
from typing import Any

from pydantic import BaseModel, ValidationError

from sitescreen.errors import BriefError


def first_fault(error: ValidationError, called: str, brief: type[BaseModel]) -> BriefError:
    """The first fault; an unknown key before others, since a slip of the pen is often why another key is missing.

    Parameters
    ----------
    error : pydantic.ValidationError
    called : str
        What messages call the brief.
    brief : type
        The model of the whole brief, whose keys the message may offer.
    """
    fault = sorted(error.errors(), key=lambda one: one["type"] != "extra_forbidden")[0]
    key = _as_written(fault["loc"], brief)
    if fault["type"] == "extra_forbidden":
        return _unknown_key(called, key, fault["loc"], brief)
    if fault["type"] == "missing":
        return BriefError(f"{called} has no {key}", "that key is needed", "Add it")
    given = repr(fault["input"])
    given = given if len(given) <= 60 else given[:57] + "…"
    return BriefError(f"{called} has {key} = {given}", f"{_needed(fault)} is needed", "Correct that value")


_MEANT = {
    ("shore", "polygons"): "file",
    ("shore", "lines"): "file",
    ("zones", "zone"): "force",
    ("zones", "file"): "polygons",
    ("plots", "plot"): "id",
    ("wind", "stations"): "file",
    ("climate", "file"): "stations",
}
"""Keys that belong to another section, by the key that does here what they seem to ask for."""


def _unknown_key(called: str, key: str, loc: tuple[int | str, ...], brief: type[BaseModel]) -> BriefError:
    name, owner = str(loc[-1]), _model_at(loc[:-1], brief)
    known = list(owner.model_fields)
    homes = [section for section, field in brief.model_fields.items() if name in _fields_of(field.annotation)]
    near = difflib.get_close_matches(name.lower(), known, n=1)
    meant = _MEANT.get((str(loc[0]), name))
    if meant is not None:
        way_out = f"“{meant}” is what it is called there"
    elif near:
        way_out = f"Perhaps “{near[0]}” was meant"
    elif homes:
        way_out = f"It belongs under [{homes[0]}]"
    else:
        way_out = "Remove it, or correct its spelling"
    return BriefError(f"{called} has the unknown key {key}", f"known keys there are {', '.join(known)}", way_out)


def _model_in(annotation: Any) -> type[BaseModel] | None:
    """The model that an annotation is or holds, as ``list[Model]`` and ``Model | None`` do."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    found = (_model_in(inner) for inner in typing.get_args(annotation))
    return next((one for one in found if one is not None), None)


def _fields_of(annotation: Any) -> list[str]:
    model = _model_in(annotation)
    return list(model.model_fields) if model is not None else []


def _model_at(loc: tuple[int | str, ...], brief: type[BaseModel]) -> type[BaseModel]:
    """The model at the end of a path; numbers and the keys of a table of classes stay with the model they hold."""
    model = brief
    for part in loc:
        if part in model.model_fields:
            model = _model_in(model.model_fields[str(part)].annotation) or model
    return model


def _as_written(loc: tuple[int | str, ...], brief: type[BaseModel]) -> str:
    """A key as the brief writes it: ``[terrain] files``, ``[[constraint]] 2, level``; entries are counted from 1."""
    words = [str(part + 1) if isinstance(part, int) else part for part in loc]
    section = brief.model_fields.get(words[0])
    if section is None or _model_in(section.annotation) is None:
        return " ".join(words)
    is_list = typing.get_origin(section.annotation) is list
    head = f"[[{words[0]}]]" if is_list else f"[{words[0]}]"
    return f"{head} {', '.join(words[1:])}".rstrip()


_PLAIN = {
    "string_type": "text in quotes",
    "string_too_short": "some text",
    "float_type": "a number without quotes",
    "int_type": "a whole number without quotes",
    "int_from_float": "a whole number",
    "finite_number": "an ordinary number",
    "bool_type": "true or false",
    "list_type": "a list in [ ]",
    "tuple_type": "a pair of numbers in [ ]",
    "dict_type": "a table of keys",
    "model_type": "a table of keys",
}
_BOUNDS = {"ge": "from {} up", "gt": "above {}", "le": "up to {}", "lt": "below {}"}


def _needed(fault: Any) -> str:
    """What a fault asks for, in plain words."""
    if fault["type"] == "value_error":
        return str(fault["ctx"]["error"])
    if fault["type"] == "literal_error":
        return f"one of {fault['ctx']['expected']}"
    if fault["type"] in _PLAIN:
        return _PLAIN[fault["type"]]
    for name, words in _BOUNDS.items():
        if name in fault.get("ctx", {}):
            return "a number " + words.format(f"{fault['ctx'][name]:g}")
    return str(fault["msg"]).replace("Input should be", "a value that is").rstrip(".")
