"""Templates: where they are found, what they declare, and whether given parameters fit the declaration.

A template is a notebook with one code cell tagged `parameters` (plain assignments, the defaults) and the
metadata `trunnion: {title, purpose, takes: {name: {kind, help}}, records: [quantity]}`. It is copied, filled
and run, never edited in place. A template of the workbook's own lies in `<workbook>/templates/`, bears no
shipped name, and runs only with consent.
"""

from __future__ import annotations

import ast
import difflib
import json
import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from trunnion.calculations.digest import sha256, sha256_json
from trunnion.calculations.notebooks import PARAMETERS_TAG, Notebook, read_notebook, tagged, tags
from trunnion.errors import Fault, Place, TemplateError

_EMPTY: tuple[Any, ...] = (None, "", [], {})  # defaults that say "must be given"


@dataclass(frozen=True)
class Take:
    """One declared parameter: its kind (what the spec gives for it), help, and whether it may be left out."""

    name: str
    kind: str
    help: str
    required: bool


@dataclass(frozen=True)
class Template:
    """A parameterized notebook and its declaration."""

    name: str
    path: Path
    local: bool
    notebook: Notebook

    @property
    def _declaration(self) -> Mapping[str, Any]:
        return self.notebook["metadata"].get("trunnion", {})

    @property
    def title(self) -> str:
        """The title a calculation has when the spec gives none."""
        return str(self._declaration.get("title", self.name))

    @property
    def purpose(self) -> str:
        """What it is for, one sentence."""
        return str(self._declaration.get("purpose", ""))

    @property
    def records(self) -> tuple[str, ...]:
        """The quantities it records."""
        return tuple(self._declaration.get("records", ()))

    @cached_property
    def defaults(self) -> dict[str, Any]:
        """The assignments of the cell tagged `parameters`, as plain values."""
        return _defaults(self)

    @cached_property
    def takes(self) -> dict[str, Take]:
        """The declared parameters by name; required unless the parameters cell gives a default that is not
        None.
        """
        found = {}
        for name, entry in self._declaration.get("takes", {}).items():
            required = bool(entry.get("required", self.defaults.get(name) in _EMPTY))
            found[name] = Take(name, str(entry.get("kind", "value")), str(entry.get("help", "")), required)
        return found

    @cached_property
    def cells_digest(self) -> str:
        """SHA-256 of what the template says: per cell its type, tags and source, text cells included."""
        cells = [[cell["cell_type"], tags(cell), cell["source"]] for cell in self.notebook["cells"]]
        return sha256_json(cells)

    @cached_property
    def file_digest(self) -> str:
        """SHA-256 of the file, as shown when consent is asked for a local template."""
        return sha256(self.path.read_bytes())

    def check(self, parameters: Mapping[str, Any], *, place: Place | None = None) -> list[Fault]:
        """Everything wrong with `parameters`: unknown, missing, not plain JSON. Nothing is run before this
        is empty.
        """
        where = place or Place()
        faults = [
            Fault(f"template '{self.name}' takes no '{name}'", _nearest_help(name, self.takes), where)
            for name in parameters
            if name not in self.takes
        ]
        for take in self.takes.values():
            if take.required and parameters.get(take.name) in _EMPTY:
                cause = f"template '{self.name}' needs '{take.name}', which is not given"
                faults.append(Fault(cause, take.help or f"give a {take.kind}", where))
        for name, value in parameters.items():
            wrong = not_plain(value)
            if wrong:
                cause = f"'{name}' given to template '{self.name}' is not plain: {wrong}"
                faults.append(Fault(cause, "give text, finite numbers, lists and mappings", where))
        return faults


def shipped_folder() -> Path:
    """Where the templates that come with Trunnion lie: in the wheel, or in the checkout it is installed
    from.
    """
    package = Path(__file__).parents[1]
    for folder in (package / "shipped_templates", package.parents[1] / "templates"):
        if folder.is_dir():
            return folder
    raise TemplateError("the shipped templates are missing", remedy="install Trunnion again")


def shipped() -> dict[str, Path]:
    """Shipped template files by name."""
    return {path.stem: path for path in sorted(shipped_folder().glob("*.ipynb"))}


def local(workbook: Path) -> dict[str, Path]:
    """Template files of a workbook's own, by name."""
    return {path.stem: path for path in sorted((workbook / "templates").glob("*.ipynb"))}


def own_of(workbook: Any) -> dict[Path, str]:
    """SHA-256 by file of the templates of its own that a loaded workbook's calculations name."""
    named = {calculation.template for calculation in workbook.calculations}
    return {path: sha256(path.read_bytes()) for name, path in local(workbook.root).items() if name in named}


def find(name: str, workbook: Path | None = None, *, place: Place | None = None) -> Template:
    """The template of that name; TemplateError with the nearest name, or when a local one bears a shipped
    name.
    """
    ours, own = shipped(), local(workbook) if workbook is not None else {}
    if name in own and name in ours:
        raise TemplateError(
            f"local template '{own[name]}' bears the name of a shipped one",
            remedy=f"rename it, for instance to {name}-own.ipynb, and name it so in the spec",
            place=place,
        )
    path = own.get(name) or ours.get(name)
    if path is None:
        known = {**ours, **own}
        raise TemplateError(f"there is no template '{name}'", remedy=_nearest_help(name, known), place=place)
    return load(name, path, is_local=name in own)


def load(name: str, path: Path, *, is_local: bool) -> Template:
    """Read a template and its declaration; TemplateError if it has no parameters cell or an unusable
    declaration.
    """
    template = Template(name, path, is_local, read_notebook(path, error=TemplateError))
    declaration = template.notebook["metadata"].get("trunnion")
    if not isinstance(declaration, Mapping) or not isinstance(declaration.get("takes", {}), Mapping):
        raise TemplateError(
            f"{path} does not declare what it takes",
            remedy="notebook metadata trunnion: {title, purpose, takes: {name: {kind, help}}, records: []}",
        )
    undeclared = sorted(set(template.defaults) - set(template.takes))
    missing = sorted(set(template.takes) - set(template.defaults))
    if undeclared or missing:
        raise TemplateError(
            f"{path}: its parameters cell and its takes differ in {', '.join(undeclared + missing)}",
            remedy="assign each declared parameter there (None when it must be given), and no other",
        )
    return template


def not_plain(value: Any, path: str = "") -> str:
    """Why a value is not plain JSON (papermill would turn it into text), or "" if it is."""
    if value is None or type(value) in (str, int, bool):
        return ""
    if type(value) is float:
        return "" if math.isfinite(value) else f"{path or 'it'} is {value}"
    if type(value) is list:
        return next((why for index, entry in enumerate(value) if (why := not_plain(entry, f"{path}[{index}]"))), "")
    if type(value) is dict:
        for key, entry in value.items():
            if type(key) is not str:
                return f"{path or 'it'} has the key {key!r}"
            if why := not_plain(entry, f"{path}.{key}" if path else key):
                return why
        return ""
    return f"{path or 'it'} is a {type(value).__name__}"


def nearest(name: str, known: Mapping[str, Any]) -> str | None:
    """The known name nearest to a misspelt one, if any is near."""
    found = difflib.get_close_matches(name, list(known), n=1, cutoff=0.6)
    return found[0] if found else None


def _nearest_help(name: str, known: Mapping[str, Any]) -> str:
    guess = nearest(name, known)
    return f"did you mean '{guess}'?" if guess else f"known: {', '.join(sorted(known)) or 'none'}"


def _defaults(template: Template) -> dict[str, Any]:
    """Read the parameters cell as assignments of literals, without running it."""
    cells = [cell for _, cell in tagged(template.notebook, PARAMETERS_TAG)]
    remedy = "one code cell tagged 'parameters' with lines such as limit_deg = 10.0"
    if len(cells) != 1 or cells[0]["cell_type"] != "code":
        raise TemplateError(f"{template.path} has {len(cells)} cells tagged 'parameters', not one", remedy=remedy)
    try:
        statements = ast.parse(cells[0]["source"]).body
        return dict(_assignment(statement) for statement in statements)
    except (SyntaxError, ValueError) as err:
        raise TemplateError(f"{template.path}: its parameters cell is not plain: {err}", remedy=remedy) from err


def _assignment(statement: ast.stmt) -> tuple[str, Any]:
    if isinstance(statement, ast.Assign) and len(statement.targets) == 1:
        target, value = statement.targets[0], statement.value
    elif isinstance(statement, ast.AnnAssign) and statement.value is not None:
        target, value = statement.target, statement.value
    else:
        raise ValueError(f"line {statement.lineno} assigns no literal")
    if not isinstance(target, ast.Name):
        raise ValueError(f"line {statement.lineno} assigns no name")
    return target.id, json.loads(json.dumps(ast.literal_eval(value)))
