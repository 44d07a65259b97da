"""From plain (JSON) parts, as notebooks carry them, back to numerical objects.

Plain parts have their references written out, so nothing but the part itself is needed; tables are opened by
the caller. Everything wrong raises TrunnionError with cause and remedy.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import cache
from typing import Any

from pydantic import TypeAdapter, ValidationError

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.errors import Place, TrunnionError
from trunnion.spec import parts
from trunnion.spec.kinds import KINDS
from trunnion.spec.meaning.context import Context, Steps, raise_fault
from trunnion.spec.meaning.envelopes import OpenTable, build_region
from trunnion.spec.resolve import BUILDERS
from trunnion.units import shown


def frame_from_plain(plain: Mapping[str, Any]) -> Frame:
    """The frame a plain part describes (`{name, axes, …}`)."""
    frame: Frame = _find("frames", dict(plain), ())
    return frame


def convention_from_plain(plain: Mapping[str, Any]) -> Convention:
    """The convention a plain part describes, its frames written out."""
    convention: Convention = _find("conventions", dict(plain), ())
    return convention


def form_from_plain(plain: Mapping[str, Any]) -> Any:
    """The `attitude.stated_forms.StatedForm` a plain part describes, its frames written out."""
    return _find("forms", dict(plain), ())


def mount_from_plain(plain: Mapping[str, Any]) -> Any:
    """The `hardware.mounts.Mount` a plain part describes, its host written out."""
    return _find("mounts", dict(plain), ())


def region_from_plain(plain: Mapping[str, Any], *, open_table: OpenTable) -> Any:
    """The envelope region a plain part describes.

    open_table: takes a table's plain statement (the keys `trunnion.tables.statements` reads; a convention is
    written out under `convention`) and returns something with `times` (N,) s and `quaternions` (N, 4), scalar
    first, body to reference.
    """
    part = _find("envelopes", dict(plain), ())
    return build_region(Context(_find, raise_fault), part, open_table)


def link_from_plain(plain: Mapping[str, Any], *, open_table: OpenTable) -> Any:
    """The `hardware.frame_chains.Link` a plain part describes, its frames, mount or table written out."""
    from trunnion.spec.meaning.links import build_link

    part = _find("links", dict(plain), ())
    return build_link(Context(_find, raise_fault), part, open_table)


def gimbal_from_plain(plain: Mapping[str, Any]) -> Any:
    """The `hardware.gimbals.GimbalChain` a plain part describes, its base written out."""
    return _find("gimbals", dict(plain), ())


def sector_from_plain(plain: Mapping[str, Any]) -> Any:
    """The `hardware.sectors.Sector` a plain part describes."""
    return _find("sectors", dict(plain), ())


def survey_from_plain(plain: Mapping[str, Any]) -> dict[str, Any]:
    """The arguments of `hardware.surveys.survey_directions` a plain part describes, its host and mount written out."""
    survey: dict[str, Any] = _find("surveys", dict(plain), ())
    return survey


def budget_from_plain(plain: Mapping[str, Any]) -> Any:
    """The `hardware.budgets.Budget` a plain part describes, its mounts written out."""
    return _find("budgets", dict(plain), ())


def pass_from_plain(plain: Mapping[str, Any], *, open_pass: Callable[[dict[str, Any]], Any]) -> Any:
    """The `hardware.passes.Pass` a plain part describes.

    open_pass: takes `{table, columns: {time: {column, unit}, azimuth, elevation, unit}}` and returns something with
    `times` (N,) s, `azimuth` and `elevation` (N,) rad.
    """
    from trunnion.spec.meaning.hardware import build_pass

    part = _find("passes", dict(plain), ())
    return build_pass(part.name or "pass", part, open_pass)


@cache
def _adapter(section: str) -> TypeAdapter[Any]:
    kinds: dict[str, Any] = {
        "frames": parts.Frame,
        "conventions": parts.Convention,
        "forms": parts.Form,
        "mounts": parts.Mount,
        "envelopes": parts.Envelope,
        "links": parts.Link,
        "gimbals": parts.Gimbal,
        "passes": parts.Pass,
        "sectors": parts.Sector,
        "surveys": parts.Survey,
        "budgets": parts.Budget,
    }
    return TypeAdapter(kinds[section])


def _find(section: str, reference: Any, steps: Steps) -> Any:
    """A part that is written out where it is used; envelopes stay parts, all others become numerical
    objects."""
    if section == "frame pair" or not isinstance(reference, dict):
        where = ".".join(str(step) for step in steps)
        raise TrunnionError(
            f"'{where or section}' is not written out", remedy="plain parts carry their frames and conventions inside"
        )
    try:
        part = _adapter(section).validate_python(reference)
    except ValidationError as error:
        raise _misshapen(error, steps) from error
    ctx, name = Context(_find, raise_fault, steps), part.name or section
    return part if section == "envelopes" else BUILDERS[section](ctx, name, part)


def _misshapen(error: ValidationError, steps: Steps) -> TrunnionError:
    """The first of pydantic's errors, in words. Plain parts come from a checked spec, so one is enough."""
    entry = error.errors(include_url=False)[0]
    path = [str(step) for step in (*steps, *entry["loc"]) if not str(step).startswith("\0")]
    kind, context = KINDS.get(entry["type"]), entry.get("ctx") or {}
    cause = kind.cause.format_map(context | {"hint": ""}) if kind is not None else entry["msg"].lower()
    return TrunnionError(shown(cause, 300), remedy="take the part from the spec again", place=Place(key=".".join(path)))
