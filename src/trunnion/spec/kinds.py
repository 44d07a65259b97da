"""Every kind of fault the loader can find: its cause and its remedy, once.

A kind is a pair of templates. Words in braces are filled in where the fault is found. Tests demand that every
kind has a mistakes file and that no two kinds share both cause and remedy.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass

from trunnion.errors import Fault, Place
from trunnion.units import shown


@dataclass(frozen=True)
class Kind:
    """One kind of fault: a name for tests and two templates for people."""

    name: str
    cause: str
    remedy: str


KINDS: dict[str, Kind] = {}

LONGEST_WORDS = 1000  # characters of anything filled into a message


def _add(name: str, cause: str, remedy: str) -> None:
    KINDS[name] = Kind(name, cause, remedy)


def fault(kind: str, place: Place, **words: object) -> Fault:
    """A fault of a registered kind at a place, its templates filled with `words`."""
    chosen = KINDS[kind]
    safe = {key: word if isinstance(word, int) else shown(str(word), LONGEST_WORDS) for key, word in words.items()}
    return Fault(chosen.cause.format_map(safe), chosen.remedy.format_map(safe), place)


def nearest(word: str, known: Iterable[str]) -> str | None:
    """The known word someone probably meant, or None when nothing is near."""
    best, found = 0.6, None
    for name in known:
        one, other = word.casefold(), name.casefold()
        likeness = difflib.SequenceMatcher(None, one, other).ratio()
        likeness += 0.1 * (sorted(one) == sorted(other))  # letters exchanged
        if likeness > best:
            best, found = likeness, name
    return found


def suggestion(word: str, known: Iterable[str], what: str = "known") -> str:
    """`write 'hover'` when something is near, else what there is to choose from."""
    names = list(known)
    near = nearest(word, names)
    if near is not None:
        return f"write '{near}'"
    if not names:
        return f"there is nothing {what}"
    more = f" … ({len(names)} in all)" if len(names) > 12 else ""
    return f"{what}: {', '.join(names[:12])}{more}"


# --- the file as a whole
# ------------------------------------------------------------------------------------------

_add("file-missing", "there is no {what}", "give the path of a workbook folder or of its workbook.yaml")
_add("file-unreadable", "the file cannot be read: {reason}", "check its permissions and that it is a plain file")
_add("file-too-large", "the file has more than {limit} bytes", "move data into tables beside it")
_add("not-utf8", "byte {offset} (hex {byte}) is not UTF-8", "save the file as UTF-8 text")
_add("not-printable", "the character U+{code:04X} may not stand in the file", "delete it")
_add("not-yaml", "this is not YAML: {problem}", "check indents, colons, quotes and brackets at and above this line")
_add("empty-file", "the file says nothing", "`trunnion start DIR` writes a workbook to begin with")
_add("not-a-mapping", "the file is {what}, not keys with values", "begin with the line `workbook: 1`")
_add("second-document", "a second YAML document begins here", "keep one document a file: delete the `---` line")
_add("too-deep", "this is nested more than {limit} levels deep", "no part of a workbook needs more than ten")
_add("too-many-values", "the file holds more than {limit} values", "move long lists into a table beside the file")

# --- what the YAML text may not hold
# ------------------------------------------------------------------------------

_add("anchor", "the anchor `&{name}` marks a value for reuse", "delete `&{name}`; parts are reused by their names")
_add("alias", "the alias `*{name}` stands for a value written elsewhere", "write the value out here")
_add("tag", "the tag `{tag}` asks for a type of its own", "delete it; quote the value if text is meant")
_add("merge-key", "the merge key `<<` copies keys from elsewhere", "write the keys out")
_add("key-not-text", "a {what} stands where a key belongs", "a key is a plain word, such as `sequence`")
_add("duplicate-key", "the key '{key}' was already given on line {line}", "keep one of the two")
_add("octal", "`{raw}` is {old} in one edition of YAML and {new} in another", "write {new}, or {quoted} if it is text")
_add(
    "base-prefix",
    "`{raw}` is a number in some editions of YAML and text in others",
    "write {new}, or {quoted} if it is text",
)
_add(
    "underscored",
    "`{raw}` is a number in one edition of YAML and text in another",
    "write {new} without underscores, or {quoted} if it is text",
)
_add(
    "sexagesimal",
    "`{raw}` is the number {old} in one edition of YAML and text in another",
    "write {quoted} if it is text, or a decimal number with its unit",
)
_add("date", "`{raw}` is a date in one edition of YAML and text in another", "write {quoted}")
_add("yes-no", "`{raw}` is {old} in one edition of YAML and text in another", "write {old}, or {quoted} if it is text")
_add("capital-word", "`{raw}` is not read alike everywhere", "write {new} in small letters, or {quoted} if it is text")
_add(
    "leading-zeros",
    "`{raw}` begins with zeros that some readers take for octal",
    "write {new}, or {quoted} if it is text",
)
_add("no-value", "no value is given ({raw})", "write a value, or leave the key out")
_add("not-finite", "`{raw}` is not a finite number", "write a number, or `any` for a range without ends")
_add(
    "number-too-long",
    "the number `{raw}` is outside what can be computed with",
    "write at most 40 digits and an exponent within 300, or quotes if it is text",
)
_add("value-sign", "`=` alone has a special meaning in one edition of YAML", 'write "=" in quotes')
_add("control-character", "the text holds the control character U+{code:04X}", "delete it, or write it out in words")

# --- shape
# --------------------------------------------------------------------------------------------------------

_add("unknown-key", "'{key}' is not a key here", "{hint}")
_add("inner-files", "'files' is found by the campaign's pattern, not listed", "delete it; narrow the pattern instead")
_add(
    "inner-name",
    "'name' is given inside a part that already has its name as its key",
    "delete this line; rename the key under `{section}` instead",
)
_add("missing-key", "'{name}' is missing", "add it, as in `{example}`")
_add("wrong-type", "{what} stands here, and {expected} is expected", "write it as in `{example}`")
_add("not-a-list", "{what} stands here, and a list of {expected} is expected", "write [{dots}]: {meaning}")
_add("not-one-of", "'{value}' is not one of the words allowed here", "{hint}")
_add("no-form", "nothing says what kind of {thing} this is", "{hint}")
_add(
    "two-forms",
    "{given} are given together, and one {thing} is one of them",
    "keep one, and give the other a {thing} of its own",
)
_add("wrong-count", "{count} values are given, and {expected} are needed", "list exactly {expected}: {meaning}")
_add(
    "wrong-edition",
    "workbook edition {value} is not known to this program",
    "write `workbook: 1`, or use a newer Trunnion",
)

# --- names and texts
# ----------------------------------------------------------------------------------------------

_add("name-too-long", "the name has {count} characters, and 60 are the limit", "shorten it; say the rest in `text`")
_add("title-too-long", "the title has {count} characters, and 120 are the limit", "shorten it")
_add(
    "blank-name", "the name is empty or has blanks at its ends", "write at least one character and no blanks around it"
)
_add(
    "bad-id",
    "'{value}' cannot be an id: it holds '{character}'",
    "ids are letters, digits, `.`, `_` and `-`, beginning with a letter or digit",
)
_add("duplicate-id", "the id '{id}' was already given on line {line}", "number this one differently")
_add(
    "path-leaves",
    "'{path}' leaves the workbook: {why}",
    "put the file into the workbook's folder and write its path from there, with `/`",
)
_add("path-missing", "there is no file '{path}' in the workbook", "{hint}")
_add("glob-empty", "'{path}' matches no file in the workbook", "check the pattern, as in `runs/*.parquet`")

# --- quantities
# ---------------------------------------------------------------------------------------------------

_add("no-unit", "{number} has no unit", "write it with {units}, as in {example}")
_add("unknown-unit", "'{symbol}' is not a known unit", "{hint}")
_add("wrong-kind", "{text} is {found}, and {wanted} is meant here", "give it in {units}")
_add("not-a-quantity", "'{text}' is not a quantity", "write a number and a unit, as in {example}")
_add("negative", "{text} is negative, and {what} is not", "write it without the minus sign, as in {example}")
_add("not-a-range", "'{text}' is not a range", "write `[lowest, highest]` with units, one value, or `any`")
_add("reversed-range", "the range runs from {lo} down to {hi}", "write [{hi}, {lo}]{otherwise}")
_add("too-large", "{what} of {text} is more than {limit}", "give at most {limit}")

# --- references between parts
# -------------------------------------------------------------------------------------

_add("unknown-reference", "there is no {what} '{name}'", "{hint}")
_add(
    "inline-part", "a {what} is written out where its name belongs", "move it under `{section}` and write its name here"
)
_add("unknown-source", "'{name}' begins with no source id", "{hint}, or add it under `sources`")
_add("unknown-axis", "frame '{frame}' has no axis '{word}'", "{hint}")
_add("unknown-angle", "convention '{convention}' has no angle '{name}'", "{hint}")
_add("missing-angle", "the box says nothing about {names}", "add `{first}: any` or its range")
_add("unknown-person", "there is no person '{name}'", "{hint}, or add them under `people`")
_add(
    "wrong-role",
    "'{name}' may not sign as {role}",
    "add `{role}` to `signs as` of '{name}', or name someone who has it",
)
_add("cycle", "'{name}' rests on itself: {chain}", "break the circle")

# --- frames
# -------------------------------------------------------------------------------------------------------

_add(
    "repeated-axis",
    "the axes {one} and {two} lie along one line",
    "a frame has three different axes, as in [forward, starboard, down]",
)
_add(
    "left-handed",
    "[{axes}] is left-handed",
    "write [{mended}], or declare `handed: left` with `paired with` its right-handed partner",
)
_add("not-left-handed", "[{axes}] is right-handed, and `handed: left` is declared", "delete `handed` and `paired with`")
_add(
    "no-partner",
    "a left-handed frame is used only through its right-handed partner, and none is named",
    "add `paired with: NAME`",
)
_add(
    "partner-without-left",
    "'paired with' belongs to a left-handed frame, and this one is right-handed",
    "delete it, or declare `handed: left`",
)
_add(
    "bad-partner",
    "frame '{partner}' cannot be the partner: {why}",
    "name a right-handed frame that has the same axes or their opposites",
)
_add(
    "left-handed-use", "frame '{frame}' is left-handed, and angles are not taken in it", "use its right-handed partner"
)
_add(
    "no-north",
    "a frame with the axis '{axis}' must say which north it means",
    'add `north: true`, `north: {{magnetic: MODEL, date: "…"}}`, '
    "`north: {{grid: NAME, convergence: 1.2 deg}}` or `north: {{wander: …}}`",
)
_add("not-carried", "a level frame must say whether it travels", "add `carried: along` or `carried: fixed at a point`")
_add(
    "unlinked-frame",
    "frame '{frame}' is not linked to any other",
    "use it in a convention, mount, table or link, or delete it",
)
_add("link-form", "the link states {count} of {forms}", "give one of them")
_add("self-link", "{what} joins frame '{frame}' to itself", "name two different frames")

# --- conventions
# --------------------------------------------------------------------------------------------------

_add(
    "no-reference",
    "the angles do not say relative to which frame they are taken",
    "add `{key}: NAME`, one of: {frames}",
)
_add(
    "no-maps",
    "which way the matrix maps is not said",
    "add `maps: body to reference` (v_reference = R v_body) or `maps: reference to body`",
)
_add("bad-maps", "'{text}' does not say which way it maps", "write `{one}` or `{other}`")
_add(
    "no-sense",
    "the sense in which {angle} grows is not said, and with body axes {axes} the trade differs",
    "add `positive: by axis` (right-handed about the axis), or say it, as in `positive: {{{angle}: {example}}}`",
)
_add("bad-sense", "'{text}' is not a sense", "say which body axis moves which way, as in `bow up`, or `by axis`")
_add(
    "sense-still",
    "when {angle} grows from zero, {axis} does not move {direction}: it moves {moves}",
    "say it of an axis that does, or `by axis`",
)
_add(
    "not-a-sequence",
    "'{text}' is not a sequence of three axes",
    "write three axis digits, first turn first, as in 3-2-1",
)
_add(
    "equal-neighbours",
    "sequence '{text}' turns twice in a row about one axis, which leaves two free angles",
    "neighbouring axes must differ, as in 3-2-1 or 3-1-3",
)
_add(
    "repeated-angle",
    "two angles are both called '{name}'",
    "give each of the three its own name, in their order",
)
_add("range-impossible", "these ranges are impossible: {why}", "{remedy}")
_add("empty-range", "{angle} could take the value {text} only", "give two ends, or leave the range out")
_add(
    "other-frames",
    "convention '{convention}' takes {has}, and {wanted} is needed here",
    "name a convention between these two frames, or write `sequence` and `about`",
)
_add(
    "incomplete-convention",
    "the convention does not say {what}",
    "add `{example}`, or `as: STANDARD` ({standards}) to take it from a standard",
)
_add(
    "standard-contradicted",
    "{standard} fixes {what} as {fixed}, and {given} is written here",
    "delete this line, or delete `as`",
)
_add(
    "standard-axes",
    "{standard} speaks of axes {axes}, and frame '{frame}' has {given}",
    "use a frame with those axes, or delete `as` and state the convention",
)

# --- rotations
# ----------------------------------------------------------------------------------------------------

_add(
    "zero-side",
    "the zero attitude is not the identity, and its side is not said. {readings}",
    "add `side: reference` or `side: body`",
)
_add("side-twice", "the constant on the {side} side is stated twice", "keep `{one}` or `{other}`")
_add("not-a-rotation", "{what} is not a rotation: {why}", "correct an entry, or print more digits of it")
_add("mirror", "{what} is a mirror image (determinant {det}), not a rotation", "{hint}")
_add("axis-map-incomplete", "one axis alone leaves the turn about it open", "say where a second axis points")
_add("axis-map-parallel", "two axes are put along one line ({one} and {two})", "give each axis its own line")
_add(
    "axis-ambiguous",
    "'{word}' is one axis of '{one}' and another of '{other}'",
    "write the turn with three numbers, or say where two axes lie instead",
)
_add("zero-vector", "the direction has no length", "write an axis name or three numbers that are not all zero")

# --- envelopes and tables
# -----------------------------------------------------------------------------------------

_add("frames-open", "it is not said in which frames '{word}' is meant", "add `body: NAME` and `reference: NAME`")
_add("cone-size", "the cone needs its size once", "give `half angle` or `between: [nearest, farthest]`, not both")
_add("table-form", "the columns give {count} kinds of attitude", "give one of `quaternion`, `matrix` and `angles`")
_add("table-needs", "{because}, and '{name}' is not said", "add `{example}`")
_add("table-excess", "'{name}' is said, and {because}", "delete it")
_add("refused", "{why}", "{remedy}")
_add("empty-list", "no {what} are listed", "list at least one")
_add("same-axis", "'{name}' lies along the same axis as '{other}'", "give each axis one limit")
_add("roll-zero", "roll zero '{word}' lies along the cone's own axis", "name another body axis")
_add("repeated-column", "the column '{name}' is named twice", "each number has its own column")
_add(
    "between-rate",
    "motion between the samples is bounded by a rate, and none is stated",
    "add `max body rate: 120 deg/s` with its true value",
)

# --- mounts
# -------------------------------------------------------------------------------------------------------

_add("other-host", "mount '{mount}' sits on '{host}', and the link is to '{frame}'", "name the mount's host under `in`")
_add("not-a-table", "envelope '{name}' is no record against time", "name an envelope that is a `table`")
_add("few-sightings", "{count} sightings leave the mount open", "list two or more, well apart from each other")
_add("budget-axes", "{count} values are given for {axes} axes", "give one value for each axis of the budget")
_add("too-small", "a step of {text} is shorter than {limit}", "give at least {limit}")
_add("no-sensor-axis", "the sensor has no axis '{word}'", "{hint}")
_add(
    "accelerometer-silent",
    "what the accelerometer reports at rest is not said",
    "add `accelerometer: specific force` (an axis that points up reads +1 g) or `gravity` "
    "(it reads -1 g); or list `instruments` without it",
)
_add(
    "left-handed-stand-in",
    "[{words}] is left-handed, so x, y, z cannot stand in for them",
    "change the sign of one of them",
)
_add(
    "clinometer-silent",
    "how the clinometer forms its two tilts is not said",
    "add `clinometer: sine` or `clinometer: tangent`",
)

# --- requirements, decisions, calculations
# ------------------------------------------------------------------------

_add("one-limit", "a requirement has one limit, and this one has {count}", "give `at least` or `at most`")
_add("not-a-candidate", "'{name}' is chosen and is not among the candidates", "{hint}, or add it to `over`")
_add("shows-nothing", "calculation '{id}' shows nothing called '{name}'", "{hint}")
_add("same-revision", "revision {revision} cannot supersede itself", "name the revision before it")
_add("unconfirmed", "the assumption is confirmed by nobody", "add `confirmed by: NAME`, or leave its status open")

# --- trial values
# -------------------------------------------------------------------------------------------------

_add("no-such-path", "the workbook has no '{path}'", "{hint}")
