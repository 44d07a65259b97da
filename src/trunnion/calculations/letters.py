"""Revision letters as drawing practice has them: A, B, C … without I, O, Q, S, X, Z; after Y comes AA."""

from __future__ import annotations

from trunnion.errors import TrunnionError

LETTERS = "ABCDEFGHJKLMNPRTUVWY"


def next_letter(revision: str) -> str:
    """The revision after `revision`: B after A, J after H, AA after Y; numbers are counted on.

    TrunnionError for a revision that is neither letters of the series nor a number.
    """
    if revision.isdecimal():
        return str(int(revision) + 1)
    if not revision or any(sign not in LETTERS for sign in revision):
        raise TrunnionError(
            f"nothing is known to follow revision '{revision}'",
            remedy=f"use letters of the series {LETTERS}, or whole numbers, or state the next one with --revision",
        )
    signs = list(revision)
    for place in range(len(signs) - 1, -1, -1):
        index = LETTERS.index(signs[place]) + 1
        if index < len(LETTERS):
            signs[place] = LETTERS[index]
            return "".join(signs)
        signs[place] = LETTERS[0]
    return LETTERS[0] + "".join(signs)
