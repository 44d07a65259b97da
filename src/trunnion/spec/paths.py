"""Key paths in words, `requirements.ATT-04.at least`, and trial values put at them."""

from __future__ import annotations

from collections.abc import Iterable

from trunnion.errors import Fault, Place
from trunnion.spec.kinds import fault, suggestion
from trunnion.spec.tree import Node, read_text


def locate(root: Node, path: str) -> list[str | int]:
    """The steps to a key path, as far as it exists. Names may hold dots: the longest that fits is taken."""
    steps, _ = _follow(root, path)
    return steps


def find(root: Node, steps: Iterable[str | int]) -> Node:
    """The node at the end of some steps."""
    node = root
    for step in steps:
        child = node.child(step)
        if child is None:
            break
        node = child
    return node


def _follow(root: Node, path: str) -> tuple[list[str | int], str]:
    """The steps that exist and what is left of the path."""
    steps: list[str | int] = []
    node, rest = root, path
    while rest:
        fits = [(name, step) for name, step in _children(node) if rest == name or rest.startswith(name + ".")]
        if not fits:
            break
        name, step = max(fits, key=lambda pair: len(pair[0]))
        child = node.child(step)
        if child is None:
            break
        steps.append(step)
        node, rest = child, rest[len(name) + 1 :]
    return steps, rest


def _children(node: Node) -> list[tuple[str, str | int]]:
    """What may follow in a key path: keys of a mapping; ids (or 1, 2, …) of the items of a list."""
    if node.is_mapping:
        return [(key, key) for key in node.value]
    if not node.is_list:
        return []
    named: list[tuple[str, str | int]] = []
    for number, item in enumerate(node.value):
        identity = item.child("id")
        plain = identity.value if identity is not None else None
        named.append((str(plain) if isinstance(plain, str | int) else str(number + 1), number))
    return named


def apply_overrides(root: Node, overrides: Iterable[tuple[str, str]], faults: list[Fault]) -> None:
    """Put trial values into the tree. A path must exist, or its last key be new in a mapping that exists."""
    for path, text in overrides:
        origin = f"--set '{path}={text}'"
        steps, rest = _follow(root, path)
        node = find(root, steps)
        new_key = rest and node.is_mapping and steps and "." not in rest
        if rest and not new_key:
            known = [name for name, _ in _children(node)]
            hint = suggestion(rest.partition(".")[0], known, "here are")
            faults.append(fault("no-such-path", Place(origin), path=path, hint=hint))
            continue
        value = read_text(text, origin, faults)
        if value is not None:
            _put(root, steps, rest, value)


def _put(root: Node, steps: list[str | int], new_key: str, value: Node) -> None:
    if new_key:
        owner = find(root, steps)
        owner.value[new_key] = value
        owner.keys[new_key] = (value.line, value.column)
        return
    owner, last = find(root, steps[:-1]), steps[-1]
    owner.value[last] = value
