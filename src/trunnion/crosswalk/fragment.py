"""The reading that was found as lines of a workbook, ready to be put under `conventions:`."""

from __future__ import annotations

import json
import re

import numpy as np
from numpy.typing import NDArray

from trunnion.crosswalk.identify import Finding
from trunnion.crosswalk.readings import Chain
from trunnion.crosswalk.readings import Reading as Name
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

_NOTHING = 1e-9  # entries of a constant this near to the identity's are rounding
_PLAIN_WORD = re.compile(r"[A-Za-z][A-Za-z0-9_ -]*")
_WORDS_OF_YAML = {"yes", "no", "on", "off", "true", "false", "null", "y", "n"}


def usual_name(chain: Chain) -> Name:
    """Of the four names of a chain the one to write down: about moving axes, body to reference."""
    return chain.readings()[0]


def fragment(
    finding: Finding,
    columns: tuple[str, str, str],
    *,
    name: str = "found",
    reference: str = "reference",
    body: str = "body",
    offsets: tuple[float, float, float] = (0.0, 0.0, 0.0),
) -> list[str]:
    """Lines for a workbook: a convention that gives the attitudes of the finding, its angles in the order of the turns.

    columns: what the three numbers are called in the file. offsets (rad) are those added to the columns.
    Constants of the fit become `reference turned by` and `body turned by`. The file's unit and column order stand in a
    comment, where a table's statement takes them from. Raises AttitudeError for a finding that is no chain of turns.
    """
    chain = finding.reading.chain
    if chain is None:
        raise AttitudeError("this reading is no chain of three turns", remedy="state the table with its own form")
    chosen = usual_name(chain)
    angles = [columns[column] for column in chosen.columns]
    senses = ["by axis" if sign > 0 else "against axis" for sign in chosen.signs]
    lines = [
        "conventions:",
        f"  {_word(name)}:",
        f"    reference: {_word(reference)}",
        f"    body: {_word(body)}",
        f"    sequence: {chosen.sequence.value}",
        f"    about: {chosen.sense.value}",
        f"    angles: [{', '.join(map(_word, angles))}]",
        f"    positive: {{{', '.join(f'{_word(a)}: {s}' for a, s in zip(angles, senses, strict=True))}}}",
    ]
    stated = [(angles[n], -offsets[column]) for n, column in enumerate(chosen.columns) if offsets[column]]
    if stated:
        listed = ", ".join(f"{_word(angle)}: {_degrees(value)}" for angle, value in stated)
        lines.append(f"    offsets: {{{listed}}}")
    for key, constant in (("reference turned by", finding.left), ("body turned by", finding.right)):
        if np.abs(constant - np.eye(3)).max() > _NOTHING:
            lines.append(f"    {key}: {{matrix: {_rows(constant)}, maps: turned to unturned}}")
    unit = "deg" if chain.degrees else "rad"
    written = f"    # a table in this convention: columns: {{angles: [{', '.join(map(_word, angles))}], unit: {unit}}}"
    return [*lines, f"    maps: {_word(body)} to {_word(reference)}", written]


def _rows(matrix: Array) -> str:
    return "[" + ", ".join("[" + ", ".join(_number(value) for value in row) + "]" for row in matrix.tolist()) + "]"


def _number(value: float) -> str:
    nearest = round(value)
    return str(nearest) if abs(value - nearest) < _NOTHING else f"{value:.15f}"


def _degrees(angle: float) -> str:
    return f"{round(float(np.degrees(angle)), 9):.12g} deg"


def _word(text: str) -> str:
    """A name as YAML takes it: in quotes where it could mean anything else."""
    plain = _PLAIN_WORD.fullmatch(text) and text.lower() not in _WORDS_OF_YAML and text == text.strip()
    return text if plain else json.dumps(text, ensure_ascii=False)
