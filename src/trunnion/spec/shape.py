"""From pydantic's errors to faults with places: what is wrong with the shape of the file, said in the spec's
words."""

from __future__ import annotations

from typing import Any

from pydantic import ValidationError

from trunnion.errors import Fault, Place
from trunnion.spec.fields import known_keys
from trunnion.spec.kinds import KINDS, fault, nearest, suggestion
from trunnion.spec.parts.envelopes import ENVELOPE_FORMS
from trunnion.spec.parts.forms import FORMS
from trunnion.spec.parts.hardware import PASS_FORMS, TERM_FORMS
from trunnion.spec.parts.mounts import MOUNT_FORMS
from trunnion.spec.tree import Node
from trunnion.spec.values import what_it_is

#: What a value of a built-in type is called, with an example, by pydantic's error type.
_EXPECTED = {
    "list_type": ("a list", "[one, two]"),
    "dict_type": ("a mapping of keys to values", "{key: value}"),
    "model_type": ("a mapping of keys to values", "{key: value}"),
    "model_attributes_type": ("a mapping of keys to values", "{key: value}"),
    "dataclass_type": ("a mapping of keys to values", "{key: value}"),
}

#: An example for each key that may be missing; anything else shows `key: …`.
_EXAMPLES = {
    "workbook": "workbook: 1",
    "document": "document: {number: …, title: …, revision: A}",
    "axes": "axes: [forward, starboard, down]",
    "between samples": "between samples: slerp",
    "roll": "roll: any",
    "scalar": "scalar: first",
    "about": "about: moving axes",
    "sequence": "sequence: 3-2-1",
    "column": "column: t_s",
    "unit": "unit: s",
    "status": "status: open",
    "over": "over: [ordinary, wing-last]",
    "rests on": "rests on: [C02]",
    "result": "result: lock margin",
}
_FORM_EXAMPLES = {
    "types": "types: [sine, sine]",
    "heading from": "heading from: north",
    "headings grow": "headings grow: clockwise",
    "azimuth from": "azimuth from: north",
    "azimuths grow": "azimuths grow: clockwise",
    "roll": "roll: right-handed",
    "maps": "maps: body to reference",
}


def shape_faults(error: ValidationError, root: Node, file: str) -> list[Fault]:
    """A fault for each of pydantic's errors that is not the echo of an earlier one."""
    entries = error.errors(include_url=False)
    misspelt = {
        (*entry["loc"][:-1], nearest(str(entry["loc"][-1]), known_keys(entry["loc"][:-1])))
        for entry in entries
        if entry["type"] == "extra_forbidden"
    }
    told = [entry for entry in entries if entry["type"] != "missing" or entry["loc"] not in misspelt]
    return [made for entry in told if (made := _fault(entry, root, file)) is not None]


def spoiled_entries(error: ValidationError) -> set[tuple[str | int, ...]]:
    """The entries (`("frames", "local")`, `("requirements", 2)`) or sections that pydantic refused."""
    spoiled: set[tuple[str | int, ...]] = set()
    for entry in error.errors(include_url=False, include_context=False, include_input=False):
        steps = [step for step in entry["loc"] if not (isinstance(step, str) and step.startswith("\0"))]
        spoiled.add(tuple(steps[:2]))
    return spoiled


def walk(root: Node, loc: tuple[str | int, ...]) -> tuple[Node, list[str | int], list[str | int]]:
    """Follow a location through the tree: the last node reached, the steps taken, the steps that led nowhere."""
    node, taken, lost = root, [], []  # type: ignore[var-annotated]
    for step in loc:
        if isinstance(step, str) and step.startswith("\0"):
            continue
        child = node.child(step) if not lost else None
        if child is None:
            lost.append(step)
        else:
            node = child
            taken.append(step)
    return node, taken, lost


def place_of(node: Node, steps: list[str | int], root: Node, file: str) -> Place:
    """The place of a node, its key path in words (list items by their id)."""
    return Place(node.file or file, node.line, node.column, words_of(root, steps))


def key_place(node: Node, key: str, steps: list[str | int], root: Node, file: str) -> Place:
    """The place of a key of a mapping node."""
    line, column = node.keys.get(key, (node.line, node.column))
    return Place(node.file or file, line, column, words_of(root, [*steps, key]))


def words_of(root: Node, steps: list[str | int]) -> str:
    """`requirements.ATT-04.at least`: the key path in words."""
    words, node = [], root
    for step in steps:
        child = node.child(step)
        if isinstance(step, int):
            identity = child.child("id") if child is not None else None
            named = identity is not None and isinstance(identity.value, str | int)
            words.append(str(identity.value) if named and identity is not None else str(step + 1))
        else:
            words.append(step)
        if child is None:
            break
        node = child
    return ".".join(words)


def _fault(entry: Any, root: Node, file: str) -> Fault | None:
    kind, loc, context = entry["type"], entry["loc"], dict(entry.get("ctx") or {})
    node, taken, lost = walk(root, loc)
    if kind == "extra_forbidden":
        return _unknown_key(loc, root, file)
    if kind != "missing" and node.holds_faulty():
        return None
    if kind == "missing":
        return _missing_key(node, str(loc[-1]), taken, root, file)
    if lost and lost[-1] == "[key]":
        place = key_place(walk(root, loc[:-2])[0], str(loc[-2]), taken[:-1], root, file)
    else:
        place = place_of(node, taken, root, file)
    if kind in ("union_tag_invalid", "union_tag_not_found"):
        return _form(node, taken, place)
    if kind in _EXPECTED:
        expected, example = _EXPECTED[kind]
        words = {"what": what_it_is(node.plain()), "expected": expected, "example": example}
        return fault("wrong-type", place, **words)
    if kind == "not-one-of":
        context["hint"] = suggestion(context["value"], context["words"], "they are")
    if kind not in KINDS:
        raise AssertionError(f"pydantic error type {kind} has no fault kind")
    context.pop("kind", None)
    return fault(kind, place, **context)


def _unknown_key(entry_loc: tuple[str | int, ...], root: Node, file: str) -> Fault:
    owner, taken, _ = walk(root, entry_loc[:-1])
    key = str(entry_loc[-1])
    place = key_place(owner, key, taken, root, file)
    free = [known for known in known_keys(entry_loc[:-1]) if known not in owner.keys]
    hint = suggestion(key, free, "the keys here are")
    return fault("unknown-key", place, key=key, hint=hint)


def _missing_key(node: Node, key: str, taken: list[str | int], root: Node, file: str) -> Fault:
    place = place_of(node, taken, root, file)
    in_convention = len(taken) == 2 and taken[0] == "conventions"
    frames = root.child("frames")
    names = ", ".join(frames.keys) if frames is not None and frames.keys else "(none yet)"
    if (key == "reference" and in_convention) or key == "relative to":
        return fault("no-reference", place, key=key, frames=names)
    if key == "maps" and in_convention:
        return fault("no-maps", place)
    if taken[:1] == ["forms"] and key in _FORM_EXAMPLES:
        return fault("missing-key", place, name=key, example=_FORM_EXAMPLES[key])
    return fault("missing-key", place, name=key, example=_EXAMPLES.get(key, f"{key}: …"))


def _form(node: Node, taken: list[str | int], place: Place) -> Fault | None:
    if not node.is_mapping:
        words = {"what": what_it_is(node.plain()), "expected": "a mapping of keys to values", "example": "{key: value}"}
        return fault("wrong-type", place, **words)
    thing, forms = _forms_at(taken)
    given = [form for form in forms if form in node.value]
    if len(given) < 2:
        meant = [(key, near) for key in node.value if (near := nearest(key, forms)) is not None]
        hint = f"write `{meant[0][1]}` for `{meant[0][0]}`" if meant else f"give one of the keys {', '.join(forms)}"
        return fault("no-form", place, thing=thing, hint=hint)
    return fault("two-forms", place, given=" and ".join(f"`{form}`" for form in given), thing=thing)


def _forms_at(taken: list[str | int]) -> tuple[str, tuple[str, ...]]:
    if taken[0] == "envelopes" and len(taken) == 2:
        return "envelope", tuple(ENVELOPE_FORMS)
    if taken[0] == "mounts":
        return "mount", tuple(MOUNT_FORMS)
    if taken[0] == "passes":
        return "pass", tuple(PASS_FORMS)
    if taken[0] == "forms":
        return "form", tuple(FORMS)
    if taken[0] == "budgets":
        return "term", tuple(TERM_FORMS)
    if taken[-1] == "north":
        return "north", ("magnetic", "grid", "wander")
    return "rotation", ("matrix", "quaternion", "angles", "angle")
