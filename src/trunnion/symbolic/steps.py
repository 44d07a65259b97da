"""A step of a derivation, and the book in which the sections write their steps."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import mpmath
import sympy

from trunnion.symbolic.proofs import WORKING_DIGITS, Identity, Proof, Sample, prove
from trunnion.symbolic.setting import Setting


@dataclass(frozen=True)
class Step:
    """One step: section, id, title, prose (plain text with $…$ mathematics), both sides in LaTeX, the proof.

    A step without a formula has empty sides and no proof.
    """

    id: str
    section: str
    title: str
    prose: str
    lhs: str = ""
    rhs: str = ""
    proof: Proof | None = None

    @property
    def latex(self) -> str:
        """The displayed identity."""
        return f"{self.lhs} = {self.rhs}" if self.rhs else self.lhs


class Book:
    """Collects steps; every formula added is proved on the spot or ProofError stops the derivation."""

    def __init__(self, setting: Setting) -> None:
        self.setting = setting
        self.steps: list[Step] = []
        self.section = ""

    def open(self, section: str) -> None:
        """Start a section."""
        self.section = section

    def say(self, id: str, title: str, prose: str) -> None:
        """A step of words only."""
        self.steps.append(Step(id, self.section, title, prose))

    def show(
        self,
        id: str,
        title: str,
        prose: str,
        lhs: str,
        rhs: str,
        claim: Identity,
        *,
        samples: Sequence[Sample],
        replacements: dict[sympy.Symbol, sympy.Expr] | None = None,
    ) -> None:
        """A step with a formula, proved by `claim` at `samples` with `replacements` made in the exact half."""
        made = self.setting.replacements if replacements is None else replacements
        proof = prove(f"{self.section}, {title}", claim, made, samples)
        self.steps.append(Step(id, self.section, title, prose, lhs, rhs, proof))


def extended(samples: Sequence[Sample], **more: sympy.Expr) -> list[Sample]:
    """The samples with further symbols, each given by an expression in the symbols already there."""
    found: list[Sample] = []
    with mpmath.workdps(WORKING_DIGITS):
        for sample in samples:
            values = dict(sample)
            for name, expression in more.items():
                names = sorted(expression.free_symbols, key=lambda symbol: symbol.name)
                function = sympy.lambdify(names, expression, "mpmath")
                values[name] = mpmath.mpf(function(*(values[symbol.name] for symbol in names)))
            found.append(values)
    return found


def aligned(rows: Sequence[tuple[str, str]]) -> str:
    """Several identities under one another, aligned at the equals sign."""
    return r"\begin{aligned} " + r" \\ ".join(f"{lhs} &= {rhs}" for lhs, rhs in rows) + r" \end{aligned}"
