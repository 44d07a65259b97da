"""Exit codes: what a script may rely on."""

from __future__ import annotations

import enum


class ExitCode(enum.IntEnum):
    """0: done, and every requirement that counts is met or deviated. 1: one is not. 2: it could not be done.

    3 to 5 are an audit's: signers not vouched for, withdrawn, not verified for want of ssh-keygen.
    """

    OK = 0
    NOT_MET = 1
    FAILED = 2
    NOT_VOUCHED = 3
    WITHDRAWN = 4
    UNVERIFIED = 5
    INTERRUPTED = 130
