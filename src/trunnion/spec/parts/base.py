"""What all parts of a spec share: keys with spaces, strict types, no unknown keys, and the plain form."""

from __future__ import annotations

from typing import Annotated, Any, ClassVar

from pydantic import BaseModel, ConfigDict, PlainValidator, TypeAdapter, WithJsonSchema

from trunnion.spec.values import Name, Range
from trunnion.units import Quantity


def key_of(attribute: str) -> str:
    """The key of an attribute: `max_body_rate` is `max body rate`, `as_` is `as`."""
    return attribute.rstrip("_").replace("_", " ")


class Part(BaseModel):
    """A part of the spec. Attributes are its keys with underscores for spaces."""

    model_config = ConfigDict(
        defer_build=True, strict=True, extra="forbid", frozen=True, alias_generator=key_of, protected_namespaces=()
    )

    #: keys that no number depends on; left out of the plain form
    words_only: ClassVar[frozenset[str]] = frozenset({"text"})

    def plain(self) -> dict[str, Any]:
        """The part as JSON values under its keys, without what no number depends on. Quantities keep their
        units."""
        made = {}
        for attribute, info in type(self).model_fields.items():
            key = info.alias or attribute
            value = getattr(self, attribute)
            if value is not None and key not in self.words_only:
                made[key] = to_plain(value)
        return made | {key: to_plain(value) for key, value in (self.model_extra or {}).items()}


def to_plain(value: Any) -> Any:
    """JSON values of anything a part holds."""
    if isinstance(value, Part | Range):
        return value.plain()
    if isinstance(value, Quantity):
        return value.text
    if isinstance(value, dict):
        return {str(key): to_plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [to_plain(item) for item in value]
    if isinstance(value, bool) or value is None:
        return value
    if isinstance(value, int):
        return int(value)
    return float(value) if isinstance(value, float) else str(value)


def key_named(*forms: str) -> Any:
    """A discriminator: which of the keys `forms` a mapping has. None when it has none of them or several."""

    def which(value: Any) -> str | None:
        if isinstance(value, Part):
            return next(f"\0{form}" for form in forms if key_of(form) in value.plain())
        given = [form for form in forms if isinstance(value, dict) and form in value]
        return f"\0{given[0]}" if len(given) == 1 else None

    return which


class NamedPart(Part):
    """A part of a section that names its parts. The file gives the name as a key; the plain form carries it
    inside."""

    name: Name | None = None


def _reference(value: Any) -> str | dict[str, Any]:
    if isinstance(value, dict):
        return value
    name: str = _NAME.validate_python(value)
    return name


_NAME: TypeAdapter[str] = TypeAdapter(Name)

#: The name of another part; in plain forms that part itself, written out.
Reference = Annotated[str | dict[str, Any], PlainValidator(_reference), WithJsonSchema({"type": "string"})]
