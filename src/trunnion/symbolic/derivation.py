"""derive(convention): every formula of one convention, derived and proved for exactly that convention."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
import sympy
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.conventions import Convention
from trunnion.errors import AttitudeError
from trunnion.symbolic.expansions import near_lock, small_angles
from trunnion.symbolic.extraction import Formulas, extraction, second_middle
from trunnion.symbolic.product import elementary_turns, product
from trunnion.symbolic.quaternions import inverse, quaternion
from trunnion.symbolic.rates import Rates, condition_table, rates
from trunnion.symbolic.setting import Setting
from trunnion.symbolic.shape import Shape, shape
from trunnion.symbolic.singular import Locked, singular
from trunnion.symbolic.steps import Book, Step

Array = NDArray[np.float64]
_KEPT = 64  # derivations kept in the process; one holds about a megabyte
_CACHE: OrderedDict[tuple[object, ...], Derivation] = OrderedDict()


@dataclass(frozen=True)
class Derivation:
    """The ordered steps of one convention with their proofs, and the expressions behind them.

    `steps`: in order of argument; `notation`: rows (LaTeX, meaning); `conditions`: rows (margin deg, |det|, largest
    outer rate for a unit rate, condition number); `expressions`: SymPy matrices by name, in the plain symbols c1, s1 …
    (cosine and sine of the stated angles), g1, h1 … (of the halves), M11 … (stated matrix), E11 … (chain).
    """

    convention: Convention
    steps: tuple[Step, ...]
    notation: tuple[tuple[str, str], ...]
    conditions: tuple[tuple[float, float, float, float], ...]
    expressions: Mapping[str, sympy.MatrixBase]
    setting: Setting = field(repr=False)
    shape: Shape = field(repr=False)
    formulas: Formulas = field(repr=False)
    locked: tuple[Locked, Locked] = field(repr=False)
    rates: Rates = field(repr=False)

    def step(self, id: str) -> Step:
        """The step with this id; AttitudeError names the ids there are."""
        for step in self.steps:
            if step.id == id:
                return step
        known = ", ".join(step.id for step in self.steps)
        raise AttitudeError(f"this derivation has no step '{id}'", remedy=f"its steps are {known}")

    def sections(self) -> list[tuple[str, list[Step]]]:
        """Steps grouped by section, in order."""
        found: dict[str, list[Step]] = {}
        for step in self.steps:
            found.setdefault(step.section, []).append(step)
        return list(found.items())

    def value(self, name: str, angles: ArrayLike) -> Array:
        """A named expression in doubles at stated angles (3,) rad.

        Names: `matrix` (3, 3) as stated, `quaternion` (4,) scalar first, of R_rb, `body rates` and `reference rates`
        (3, 3) taking angle rates to angular velocity, `body rates inverse`, `reference rates inverse`, `determinant`.
        """
        return _evaluate(self.expressions[name], self._numbers(angles))

    def angles(self, matrix: ArrayLike) -> Array:
        """Stated angles (3,) rad of a stated matrix (3, 3) by the derived formulas, residual form; not at lock."""
        numbers = self._matrix_numbers(matrix)
        outer, middle, inner = self.setting.order
        found = {}
        found[outer.place] = float(_evaluate(self.expressions["outer"], numbers)[0, 0])
        found[middle.place] = float(_evaluate(self.expressions["middle"], numbers)[0, 0])
        y = found[outer.place]
        numbers |= {outer.c.name: np.cos(y), outer.s.name: np.sin(y)}
        sine, cosine = _evaluate(self.expressions["inner"], numbers)[0]
        found[inner.place] = float(np.arctan2(sine, cosine))
        return np.array([found[n] + (float(t.offset) if t.shifted else 0.0) for n, t in enumerate(self.setting.turns)])

    def other_angles(self, angles: ArrayLike) -> Array:
        """The second triple (3,) rad of the same attitude, not wrapped."""
        first, middle, last = np.asarray(angles, float)
        offset = float(self.setting.turns[1].offset) if self.setting.turns[1].shifted else 0.0
        constant = float(second_middle(self.setting)[0])
        return np.array([first + np.pi, constant - (middle - offset) + offset, last + np.pi])

    def combination(self, number: int, matrix: ArrayLike) -> float:
        """δ rad, modulo a turn, at singular value 0 or 1 from a stated matrix there: y1 + r·y3 of the formulas' angles.

        y is the stated angle, less its offset where that is no multiple of 90° (`setting.turns[n].shifted`).
        """
        sine, cosine = _evaluate(self.expressions[f"combination {number}"], self._matrix_numbers(matrix))[0]
        return float(np.arctan2(sine, cosine))

    def _numbers(self, angles: ArrayLike) -> dict[str, float]:
        values = {"w": float(np.sqrt(2.0))} | self._constants()
        for turn, angle in zip(self.setting.turns, np.asarray(angles, float), strict=True):
            n, less = turn.place + 1, float(angle) - float(turn.offset)
            y = less if turn.shifted else float(angle)
            values |= {f"c{n}": float(np.cos(y)), f"s{n}": float(np.sin(y))}
            values |= {f"g{n}": float(np.cos(less / 2)), f"h{n}": float(np.sin(less / 2))}
        return values

    def _constants(self) -> dict[str, float]:
        values: dict[str, float] = {}
        for item in (self.setting.L, self.setting.B):
            values |= {name: float(number) for name, number in item.values().items()}
            values |= {f"{item.letter}{i + 1}{j + 1}": float(item.numbers[i, j]) for i in range(3) for j in range(3)}
        return values

    def _matrix_numbers(self, matrix: ArrayLike) -> dict[str, float]:
        M = np.asarray(matrix, float)
        R = M if self.convention.maps_body_to_reference else M.T
        E = self.convention.left.T @ R @ self.convention.right.T
        named = {"M": M, "E": E}
        values = {f"{n}{i + 1}{j + 1}": float(m[i, j]) for n, m in named.items() for i in range(3) for j in range(3)}
        return values | self._constants()


def _evaluate(expression: sympy.MatrixBase, numbers: Mapping[str, float]) -> Array:
    names = sorted(expression.free_symbols, key=lambda symbol: symbol.name)
    function = sympy.lambdify(names, expression, modules="numpy")
    return np.asarray(function(*(numbers[symbol.name] for symbol in names)), dtype=float)


def derive(convention: Convention) -> Derivation:
    """Derive everything for one convention; ProofError if an identity fails. Cached within the process.

    About one second on one core. Source: none; each formula is proved where it is shown.
    """
    key = _key(convention)
    if key in _CACHE:
        _CACHE.move_to_end(key)
        return _CACHE[key]
    found = _derive(convention)
    _CACHE[key] = found
    while len(_CACHE) > _KEPT:
        _CACHE.popitem(last=False)
    return found


def _key(convention: Convention) -> tuple[object, ...]:
    """All that a derivation shows or uses: conventions of equal key have the same derivation."""
    frames = tuple((frame.name, frame.axes) for frame in (convention.reference, convention.body))
    constants = tuple(np.asarray(m, float).tobytes() for m in (convention.left, convention.right))
    ranges = None if convention.ranges is None else tuple(map(tuple, convention.ranges))
    return (
        convention.name,
        frames,
        convention.sequence,
        convention.sense,
        tuple(convention.angle_names),
        tuple(convention.signs),
        tuple(convention.offsets),
        constants,
        ranges,
        convention.maps_body_to_reference,
    )


def _derive(convention: Convention) -> Derivation:
    setting = Setting(convention)
    book = Book(setting)
    elementary_turns(book)
    product(book)
    form = shape(setting)
    formulas = extraction(book, form)
    locked = singular(book, form)
    found = rates(book, form, locked)
    near_lock(book, found, locked)
    small_angles(book)
    four = quaternion(book, form, locked)
    inverse(book)
    return Derivation(
        convention=convention,
        steps=tuple(book.steps),
        notation=tuple(setting.notation()),
        conditions=tuple(condition_table()),
        expressions=_expressions(setting, formulas, locked, found, four),
        setting=setting,
        shape=form,
        formulas=formulas,
        locked=locked,
        rates=found,
    )


def _expressions(
    setting: Setting, formulas: Formulas, locked: tuple[Locked, Locked], found: Rates, four: tuple[sympy.Expr, ...]
) -> dict[str, sympy.MatrixBase]:
    """What is evaluated, checked and turned into source: constants multiplied in."""
    L, B = setting.L.matrix, setting.B.matrix
    row = sympy.ImmutableMatrix
    expressions: dict[str, sympy.MatrixBase] = {
        "chain": setting.E,
        "matrix": setting.stated,
        "quaternion": row([four]),
        "outer": row([[formulas.outer]]),
        "middle": row([[formulas.middle]]),
        "inner": row([[formulas.residual_sine, formulas.residual_cosine]]),
        "body rates": row(B.T * found.body),
        "reference rates": row(L * found.reference),
        "body rates inverse": row(found.adjugate_body * B / found.determinant),
        "reference rates inverse": row(found.adjugate_reference * L.T / found.determinant),
        "determinant": row([[found.determinant]]),
    }
    for number, case in enumerate(locked):
        expressions[f"combination {number}"] = row([[case.sine, case.cosine]])
    return expressions
