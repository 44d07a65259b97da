"""Mathematics: a strict reader of a LaTeX subset, and writers for MathML and typst.

A formula is typeset rightly or refused by name. Unknown commands, unbalanced braces and constructs that would
need guessing raise `FormulaError`; nothing is passed through, nothing is dropped. Library routes were compared
on the formula collection of tests/binding: a LaTeX-to-MathML library accepted all but one of its entries and
printed `&` as a letter in `aligned`, lost the starred operator, drew `\\triangleq`-like accents with wrong
characters, kept unknown commands as text and set alphabets by attributes that browsers no longer read.
"""

from trunnion.binding.maths.parse import Formula, FormulaError, read_formula

__all__ = ["Formula", "FormulaError", "read_formula"]
