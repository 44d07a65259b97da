"""Reading a workbook: text, shape, references between parts. Everything wrong is said in one pass."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from trunnion.errors import Fault, Place, SpecError
from trunnion.spec.checks import cross_check
from trunnion.spec.kinds import fault
from trunnion.spec.model import EDITION, NAMED_SECTIONS, WorkbookFile
from trunnion.spec.paths import apply_overrides
from trunnion.spec.shape import key_place, place_of, shape_faults, spoiled_entries
from trunnion.spec.tree import LARGEST_FILE, Node, read_tree
from trunnion.spec.workbook import Workbook

FILE_NAME = "workbook.yaml"

#: Stands in for a title block that cannot be read, so that the rest is still checked.
_BLANK_DOCUMENT = {"number": "-", "title": "-", "revision": "A"}


def load_workbook(path: Path | str, overrides: Iterable[tuple[str, str]] = (), *, check_files: bool = True) -> Workbook:
    """The workbook in a folder (or the file itself), with trial values put in.

    overrides: pairs such as `("requirements.ATT-04.at least", "25 deg")`. check_files: demand that the files
    named by the spec exist. Raises SpecError with every fault found, each with file, line, column, cause and
    remedy.
    """
    file = workbook_file(path)
    return load_text(_read(file), file, overrides, check_files=check_files)


def load_text(
    data: bytes, file: Path, overrides: Iterable[tuple[str, str]] = (), *, check_files: bool = True
) -> Workbook:
    """The workbook whose spec is `data`, as if it stood in `file` (archives and issued revisions keep the bytes)."""
    shown = _short(file)
    tree, text, faults = read_tree(data, shown)
    if tree is None:
        raise SpecError(faults)
    if not tree.is_mapping:
        what = "a list" if tree.is_list else "a single value"
        raise SpecError([*faults, fault("not-a-mapping", Place(shown, tree.line, tree.column), what=what)])
    trials = tuple(overrides)
    apply_overrides(tree, trials, faults)
    model, spoiled = _model(tree, shown, faults)
    if model is not None:
        root = file.parent if check_files else None
        spoiled |= _entries_with_unread_values(tree)
        faults.extend(cross_check(model, tree, shown, root, spoiled))
    if faults or model is None:
        raise SpecError(_in_order(faults))
    return Workbook(file.parent, file, text, model, tree, trials)


def workbook_file(path: Path | str) -> Path:
    """The spec file of a workbook given by its folder or by the file itself. SpecError when there is none."""
    given = Path(path)
    file = given / FILE_NAME if given.is_dir() else given
    if not file.is_file():
        what = f"file {FILE_NAME} in this folder" if given.is_dir() else "such file or folder"
        raise SpecError([fault("file-missing", Place(given), what=what)])
    return file


def _read(file: Path) -> bytes:
    try:
        with file.open("rb") as stream:
            return stream.read(LARGEST_FILE + 1)
    except OSError as err:
        raise SpecError([fault("file-unreadable", Place(file), reason=err.strerror or str(err))]) from err


def _short(file: Path) -> str:
    """The path as people know it: relative to where they stand when that is shorter."""
    try:
        relative = file.resolve().relative_to(Path.cwd())
    except (ValueError, OSError):
        return str(file)
    return str(relative)


def _model(tree: Node, file: str, faults: list[Fault]) -> tuple[WorkbookFile | None, set[tuple[str | int, ...]]]:
    """The typed workbook. Entries with faults are taken out and named, so that the rest can still be
    checked."""
    plain: dict[str, Any] = tree.plain()
    _refuse_inner_names(tree, plain, file, faults)
    spoiled: set[tuple[str | int, ...]] = set()
    for _ in range(4):
        try:
            model = WorkbookFile.model_validate(_without(plain, spoiled))
        except ValidationError as error:
            if not spoiled:
                faults.extend(shape_faults(error, tree, file))
            spoiled |= spoiled_entries(error)
            continue
        if model.workbook != EDITION and ("workbook",) not in spoiled:
            place = place_of(tree.value["workbook"], ["workbook"], tree, file)
            faults.append(fault("wrong-edition", place, value=model.workbook))
        return model, spoiled
    return None, spoiled


def _entries_with_unread_values(tree: Node) -> set[tuple[str | int, ...]]:
    """Entries that hold a value refused while reading: what else is said of them would be an echo."""
    found: set[tuple[str | int, ...]] = set()
    for section, node in tree.value.items():
        inner = node.value.items() if node.is_mapping else enumerate(node.value) if node.is_list else ()
        found |= {(section, step) for step, entry in inner if entry.holds_faulty()}
    return found


def _refuse_inner_names(tree: Node, plain: dict[str, Any], file: str, faults: list[Fault]) -> None:
    """A named part has its name as its key; a `name` inside it would be a second one."""
    for section in NAMED_SECTIONS:
        node = tree.child(section)
        for name, entry in node.value.items() if node is not None and node.is_mapping else ():
            if entry.is_mapping and "name" in entry.value:
                place = key_place(entry, "name", [section, name], tree, file)
                faults.append(fault("inner-name", place, section=section))
                del plain[section][name]["name"]
            if entry.is_mapping and "campaign" in entry.value and "files" in entry.value:
                place = key_place(entry, "files", [section, name], tree, file)
                faults.append(fault("inner-files", place))
                del plain[section][name]["files"]


def _without(plain: dict[str, Any], spoiled: set[tuple[str | int, ...]]) -> dict[str, Any]:
    """The values without spoiled entries; a list keeps its other items, in order."""
    kept: dict[str, Any] = {}
    for section, value in plain.items():
        bad = {steps[1] for steps in spoiled if len(steps) == 2 and steps[0] == section}
        if (section,) in spoiled:
            continue
        if bad and section == "document":
            continue
        if isinstance(value, dict):
            value = {name: item for name, item in value.items() if name not in bad}
        elif isinstance(value, list):
            value = [item for number, item in enumerate(value) if number not in bad]
        kept[section] = value
    if spoiled:
        kept.setdefault("workbook", EDITION)
        kept.setdefault("document", _BLANK_DOCUMENT)
    return kept


def _in_order(faults: list[Fault]) -> list[Fault]:
    """Faults in the order of the file, each once."""
    return sorted(dict.fromkeys(faults), key=lambda f: (str(f.place.file), f.place.line or 0, f.place.column or 0))
