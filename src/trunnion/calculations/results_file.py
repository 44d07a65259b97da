"""Reading `results.json`: it may come from others, so its shape is checked before anything is taken from it."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from trunnion.calculations.results import result_from_plain
from trunnion.errors import StoreError

LARGEST = 64 * 1024 * 1024  # bytes; a package of hundreds of calculations needs a few million
SCHEMA = 1

_TEXT, _LISTS, _MAP = (str,), (list,), (dict,)
_WORDS = (str, type(None))
_CALCULATION: dict[str, tuple[type, ...]] = {
    "id": _TEXT, "template": _TEXT, "key": _TEXT, "digest": _TEXT, "state": _TEXT,
    "inputs": _LISTS, "results": _LISTS, "checks": _LISTS, "findings": _LISTS,
}  # fmt: skip
_INPUT: dict[str, tuple[type, ...]] = {"path": _TEXT, "sha256": _TEXT, "held": _WORDS, "size": (int,)}
_FIGURE: dict[str, tuple[type, ...]] = {"id": _TEXT, "sha256": _TEXT}
_FINDING: dict[str, tuple[type, ...]] = {"id": _TEXT, "text": _TEXT}
_REQUIREMENT: dict[str, tuple[type, ...]] = {
    "id": _TEXT, "of": _TEXT, "comparison": _TEXT, "limit": _TEXT, "verdict": _WORDS, "candidates": _LISTS,
}  # fmt: skip
_CANDIDATE: dict[str, tuple[type, ...]] = {"name": _TEXT, "counts": (bool,), "verdict": _TEXT}
_DECISION: dict[str, tuple[type, ...]] = {"id": _TEXT, "chosen": _TEXT, "over": _LISTS, "rests_on": _LISTS}


def read_results(path: Path) -> dict[str, Any]:
    """The results in a file, their shape checked; StoreError says what is wrong where."""
    from trunnion.calculations.baselines import read_json

    try:
        size = path.stat().st_size
    except OSError as err:
        raise StoreError(f"{path} can't be read ({err.strerror})", remedy="give a folder with results.json") from err
    if size > LARGEST:
        raise StoreError(f"{path} has {size} bytes, more than {LARGEST}", remedy="give a results.json of Trunnion")
    return require_results(read_json(path), str(path))


def require_results(value: Any, name: str) -> dict[str, Any]:
    """`value`, if it has the shape of `results.json`; StoreError names the place where it has not."""
    if not isinstance(value, dict) or value.get("schema") != SCHEMA:
        raise _wrong(name, "it is not of schema 1")
    _has(value, {"document": _MAP, "calculations": _LISTS, "requirements": _LISTS, "decisions": _LISTS}, name)
    for calculation in _each(value, "calculations", _CALCULATION, name):
        place = f"{name}, calculation {calculation['id']}"
        _require_calculation(calculation, place)
    for requirement in _each(value, "requirements", _REQUIREMENT, name):
        _each(requirement, "candidates", _CANDIDATE, f"{name}, requirement {requirement['id']}")
    for decision in _each(value, "decisions", _DECISION, name):
        if not all(isinstance(entry, str) for entry in (*decision["over"], *decision["rests_on"])):
            raise _wrong(name, f"decision {decision['id']} lists something that is no name")
    return value


def _require_calculation(calculation: Mapping[str, Any], place: str) -> None:
    _each(calculation, "inputs", _INPUT, place)
    _each(calculation, "findings", _FINDING, place)
    _each({"figures": calculation.get("figures", [])}, "figures", _FIGURE, place)
    _each(calculation, "checks", {}, place)
    for result in _each(calculation, "results", {}, place):
        result_from_plain(str(calculation["id"]), result)


def _each(owner: Mapping[str, Any], key: str, keys: Mapping[str, tuple[type, ...]], place: str) -> list[Any]:
    if not isinstance(owner[key], list):
        raise _wrong(place, f"'{key}' is no list")
    for index, entry in enumerate(owner[key], 1):
        if not isinstance(entry, dict):
            raise _wrong(place, f"entry {index} of '{key}' is no record")
        _has(entry, keys, f"{place}, {key} {index}")
    return list(owner[key])


def _has(record: Mapping[str, Any], keys: Mapping[str, tuple[type, ...]], place: str) -> None:
    for key, kinds in keys.items():
        if key not in record or not isinstance(record[key], kinds):
            raise _wrong(place, f"'{key}' is missing or of another kind")


def _wrong(place: str, what: str) -> StoreError:
    return StoreError(f"{place}: {what}", remedy="take it from version control, or compute again")
