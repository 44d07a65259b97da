"""Exit codes: what a script may rely on."""

from __future__ import annotations

import enum


class ExitCode(enum.IntEnum):
    """0: done, and every requirement that counts is met or deviated. 1: one is not. 2: it could not be done."""

    OK = 0
    NOT_MET = 1
    FAILED = 2
    INTERRUPTED = 130
