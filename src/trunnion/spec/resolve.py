"""Finding parts of a workbook by name and building each once."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from trunnion.attitude.frames import Frame
from trunnion.errors import TrunnionError
from trunnion.spec.kinds import suggestion
from trunnion.spec.meaning.context import Context, Note, Steps
from trunnion.spec.meaning.conventions import build_convention
from trunnion.spec.meaning.frames import build_frame
from trunnion.spec.model import NAMED_SECTIONS, WorkbookFile


def _ignore(kind: str, steps: Steps, *, key: bool = False, **words: object) -> None:
    """A note for parts that have been checked before."""


class Resolver:
    """Builds the parts of one workbook on demand. Parts that are spoiled, or noted while built, come out as
    None."""

    def __init__(self, model: WorkbookFile, note: Note = _ignore, spoiled: set[tuple[str, str]] | None = None) -> None:
        self.model, self.note, self.spoiled = model, note, spoiled or set()
        self._built: dict[tuple[str, str], Any] = {}
        self._building: list[tuple[str, str]] = []

    def context(self, *steps: str | int) -> Context:
        """The context of the part at some steps."""
        return Context(self.find, self.note, steps)

    def names(self, section: str) -> list[str]:
        """All names of a section, spoiled ones included (they exist, and are told of where they stand)."""
        extra = [name for owner, name in self.spoiled if owner == section]
        return list(dict.fromkeys([*getattr(self.model, section), *extra]))

    def find(self, section: str, reference: Any, steps: Steps) -> Any:
        """The numerical object a name stands for. Envelopes come as parts. None when it cannot be had."""
        if section == "frame pair":
            return self._pair(reference, steps)
        if not isinstance(reference, str):
            self.note("inline-part", steps, what=NAMED_SECTIONS[section], section=section)
            return None
        if reference not in self.names(section):
            hint = suggestion(reference, self.names(section), f"the {section} are")
            self.note("unknown-reference", steps, what=NAMED_SECTIONS[section], name=reference, hint=hint)
            return None
        return self.build(section, reference)

    def build(self, section: str, name: str) -> Any:
        """Build a part once; what is wrong with it is noted once."""
        this = (section, name)
        if this in self.spoiled:
            return None
        if this not in self._built:
            if this in self._building:
                return None  # a circle; noted by its own check
            self._building.append(this)
            try:
                part = getattr(self.model, section).get(name)
                self._built[this] = None if part is None else self._made(section, name, part)
            finally:
                self._building.pop()
        return self._built[this]

    def _made(self, section: str, name: str, part: Any) -> Any:
        """The object a builder makes; what the numerical rooms refuse is noted at the part."""
        try:
            return BUILDERS[section](self.context(section, name), name, part)
        except TrunnionError as err:
            self.note("refused", (section, name), why=err.fault.cause, remedy=err.fault.remedy or "correct it")
            return None

    def _pair(self, wanted: tuple[Any, ...], steps: Steps) -> tuple[Frame, Frame] | None:
        *stated, word = wanted
        names = self.pair_names(*stated)
        if names is None:
            if all(self.build("conventions", name) for name in self.names("conventions")):
                self.note("frames-open", steps, word=word)
            return None
        reference, body = (self.build("frames", name) for name in names)
        return None if reference is None or body is None else (reference, body)

    def pair_names(self, reference: Any, body: Any, maps: str | None = None) -> tuple[str, str] | None:
        """(reference, body) names: as stated, else the one pair of the conventions that fits what is stated.

        maps: the words of a table's `maps`, which may name the frames too.
        """
        if isinstance(reference, str) and isinstance(body, str):
            return reference, body
        named = {word.strip() for word in (maps or "body").split(" to ")} - {"body", "reference"}
        pairs = {
            (convention.reference, convention.body)
            for convention in self.model.conventions.values()
            if isinstance(convention.reference, str)
            and isinstance(convention.body, str)
            and convention.reference != convention.body
        }
        fits = [
            pair
            for pair in sorted(pairs)
            if reference in (None, pair[0]) and body in (None, pair[1]) and named <= set(pair)
        ]
        return fits[0] if len(fits) == 1 else None


def _mount(ctx: Context, name: str, part: Any) -> Any:
    from trunnion.spec.meaning.mounts import build_mount

    return build_mount(ctx, name, part)


def _envelope(ctx: Context, name: str, part: Any) -> Any:
    from trunnion.spec.meaning.envelopes import check_envelope

    return part if check_envelope(ctx, name, part) else None


def _form(ctx: Context, name: str, part: Any) -> Any:
    from trunnion.spec.meaning.forms import build_form

    return build_form(ctx, name, part)


def _link(ctx: Context, name: str, part: Any) -> Any:
    from trunnion.spec.meaning.links import check_link

    return check_link(ctx, name, part)


def _hardware(function: str) -> Callable[[Context, str, Any], Any]:
    """A builder of the hardware parts, loaded when a workbook has one."""

    def build(ctx: Context, name: str, part: Any) -> Any:
        from trunnion.spec.meaning import hardware

        return getattr(hardware, function)(ctx, name, part)

    return build


BUILDERS: dict[str, Callable[[Context, str, Any], Any]] = {
    "links": _link,
    "gimbals": _hardware("build_gimbal"),
    "passes": _hardware("check_pass"),
    "sectors": _hardware("build_sector"),
    "surveys": _hardware("build_survey"),
    "budgets": _hardware("build_budget"),
    "frames": build_frame,
    "conventions": build_convention,
    "forms": _form,
    "mounts": _mount,
    "envelopes": _envelope,
}
