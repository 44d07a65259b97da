"""Which keys a place of the file may have, found by following the models' own types."""

from __future__ import annotations

import types
import typing
from collections.abc import Iterator
from typing import Any

from pydantic import Tag

from trunnion.spec.model import NAMED_SECTIONS, WorkbookFile
from trunnion.spec.parts.base import Part, key_of


def known_keys(loc: tuple[str | int, ...]) -> list[str]:
    """The keys a mapping may have, by pydantic's location of it (union tags included)."""
    kinds: list[Any] = [WorkbookFile]
    for step in loc:
        kinds = [inner for kind in kinds for inner in _inside(kind, step)]
    models = [kind for kind in kinds if _is_part(kind)]
    keys = dict.fromkeys(key_of(attribute) for model in models for attribute in model.model_fields)
    if loc and loc[0] in NAMED_SECTIONS:
        keys.pop("name", None)
        keys.pop("files", None)
    return list(keys)


def _is_part(kind: Any) -> bool:
    return isinstance(kind, type) and issubclass(kind, Part)


def _inside(kind: Any, step: str | int) -> list[Any]:
    """The types a step leads to: a key of a model, an entry of a mapping or list, or one case of a union."""
    if typing.get_origin(kind) is typing.Annotated:
        inner, *notes = typing.get_args(kind)
        tagged = [note.tag for note in notes if isinstance(note, Tag)]
        if tagged:
            return list(_cases(inner)) if step == tagged[0] else []
        return [found for case in _cases(inner) for found in _inside(case, step)]
    if _is_part(kind):
        infos = {key_of(attribute): info for attribute, info in kind.model_fields.items()}
        return list(_cases(infos[step].annotation)) if step in infos else []
    arguments = typing.get_args(kind)
    return list(_cases(arguments[-1])) if arguments else []


def _cases(annotation: Any) -> Iterator[Any]:
    """The alternatives of an annotation; those with a tag keep it."""
    origin = typing.get_origin(annotation)
    if origin in (typing.Union, types.UnionType):
        for part in typing.get_args(annotation):
            yield from _cases(part)
    elif origin is typing.Annotated and not any(isinstance(n, Tag) for n in typing.get_args(annotation)[1:]):
        yield from _cases(typing.get_args(annotation)[0])
    else:
        yield annotation
