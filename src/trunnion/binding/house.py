"""`house.yaml`: how an organization adapts the look without touching code."""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from trunnion.binding.words import LANGUAGES
from trunnion.errors import BindingError, Fault, Place

PAPERS = {"A4": "a4", "Letter": "us-letter"}
_KEYS = ("house", "organization", "paper", "language", "logo", "classes", "title block")
_LARGEST = 1_000_000


@dataclass(frozen=True)
class House:
    """The house style: paper, language of fixed words, organization, logo, classes, further title-block fields."""

    organization: str = ""
    paper: str = "A4"
    language: str = "en"
    logo: tuple[str, bytes] | None = None  # media type and content
    classes: tuple[str, ...] = ()
    fields: tuple[tuple[str, str], ...] = ()  # key in `Document.extra`, label printed
    source: str = field(default="", compare=False)

    def require_class(self, classification: str) -> None:
        """Refuse a document class that the house does not know."""
        if self.classes and classification and classification not in self.classes:
            fault = Fault(
                f"the document class {classification!r} is not one of the house's",
                f"use one of {', '.join(self.classes)}, or add it to the house file",
                Place(self.source or None, key="classes"),
            )
            raise BindingError([fault])


def load_house(path: Path | str) -> House:
    """Read a house file; every mistake is named with the key it stands at."""
    file = Path(path)
    data = _read(file)
    faults = [
        Fault(f"unknown key {key!r}", _nearest(str(key)), Place(file, key=str(key))) for key in data if key not in _KEYS
    ]
    if data.get("house") != 1:
        faults.append(Fault("house files start with `house: 1`", "write `house: 1`", Place(file, key="house")))
    for key in ("organization", "paper", "language", "logo"):
        if key in data and not isinstance(data[key], str):
            faults.append(Fault(f"{key} is not a text", "put it in quotes", Place(file, key=key)))
    for key, allowed in (("paper", tuple(PAPERS)), ("language", LANGUAGES)):
        if isinstance(data.get(key), str) and data[key] not in allowed:
            faults.append(Fault(f"{key} is {data[key]!r}", f"use one of {', '.join(allowed)}", Place(file, key=key)))
    classes = data.get("classes") or []
    if not isinstance(classes, list) or not all(isinstance(c, str) for c in classes):
        faults.append(Fault("classes is not a list of texts", "write [OPEN, INTERNAL]", Place(file, key="classes")))
        classes = []
    fields = _fields(data.get("title block") or [], file, faults)
    if faults:
        raise BindingError(faults)
    logo = _logo(file, data["logo"]) if data.get("logo") else None
    return House(
        organization=data.get("organization", ""),
        paper=data.get("paper", "A4"),
        language=data.get("language", "en"),
        logo=logo,
        classes=tuple(classes),
        fields=fields,
        source=str(file),
    )


def _read(file: Path) -> dict[Any, Any]:
    import yaml

    try:
        text = file.read_text("utf-8")
        if len(text) > 100_000:
            raise BindingError([Fault("a house file above 100 kB", "it holds a dozen lines", Place(file))])
        data = yaml.safe_load(text)
    except OSError as error:
        raise BindingError([Fault(f"cannot be read: {error.strerror}", "", Place(file))]) from error
    except (yaml.YAMLError, UnicodeDecodeError) as error:
        mark = getattr(error, "problem_mark", None)
        place = Place(file, mark.line + 1, mark.column + 1) if mark else Place(file)
        raise BindingError([Fault("is not YAML", "see the example in the README", place)]) from error
    if not isinstance(data, dict):
        raise BindingError([Fault("is not a list of keys", "start with `house: 1`", Place(file))])
    return data


def _nearest(key: str) -> str:
    close = difflib.get_close_matches(key, _KEYS, n=1)
    return f"did you mean {close[0]!r}?" if close else f"known keys: {', '.join(_KEYS)}"


def _fields(rows: Any, file: Path, faults: list[Fault]) -> tuple[tuple[str, str], ...]:
    out = []
    for row in rows if isinstance(rows, list) else [None]:
        values = row.values() if isinstance(row, Mapping) and set(row) == {"key", "label"} else [None]
        if isinstance(row, Mapping) and all(isinstance(value, str) and 0 < len(value) <= 60 for value in values):
            out.append((row["key"], row["label"]))
        else:
            remedy = "write {key: contract, label: Contract}, 60 characters at most"
            faults.append(Fault("a title-block field needs key and label", remedy, Place(file, key="title block")))
    return tuple(out)


def _logo(file: Path, name: str) -> tuple[str, bytes]:
    from trunnion.binding.notebook import clean_svg

    path = (file.parent / name).resolve()
    place = Place(file, key="logo")
    if not path.is_relative_to(file.parent.resolve()):
        raise BindingError([Fault(f"the logo {name!r} lies outside the house file's folder", "", place)])
    try:
        content = path.read_bytes()
    except OSError as error:
        raise BindingError([Fault(f"the logo {name!r} cannot be read: {error.strerror}", "", place)]) from error
    if len(content) > _LARGEST:
        raise BindingError([Fault(f"the logo {name!r} is above 1 MB", "use an SVG of its outline", place)])
    if content.startswith(b"\x89PNG\r\n\x1a\n"):
        return ("image/png", content)
    try:
        return ("image/svg+xml", clean_svg(content.decode("utf-8")))
    except ValueError as error:
        raise BindingError([Fault(f"the logo {name!r}: {error}", "use a plain SVG or PNG", place)]) from error
