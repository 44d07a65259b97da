"""What the error-budget template calls: terms on named axes, summed by three rules, against a limit."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np

from trunnion.attitude.words import degrees_text
from trunnion.figures import charts
from trunnion.hardware.budgets import Budget, BudgetTotal, directional_total, rayleigh_factor
from trunnion.sheet import display, hardware_parts, independent
from trunnion.sheet.rounding import ceiling_text
from trunnion.units import parse_quantity

_ARCSEC = 3600.0


class ErrorBudget:
    """One pointing budget; each `show_…` displays one part and records what it finds.

    limit: largest allowed error, one text for all axes or one an axis. index: the error index whose terms are summed.
    """

    def __init__(
        self, *, budget: Mapping[str, Any], limit: Any = "", index: str = "APE", confidence: float = 2.0
    ) -> None:
        self._plain = dict(budget)
        self.budget: Budget = hardware_parts.budget(budget)
        texts = [limit] if isinstance(limit, str) else list(limit)
        self._limits = [parse_quantity(text, kind="angle").value for text in texts if text]
        self._limit_texts = [text for text in texts if text]
        self.index, self.confidence = index, float(confidence)

    @cached_property
    def total(self) -> BudgetTotal:
        """The sums of the terms that count in the index."""
        limit = None if not self._limits else self._limits[0] if len(self._limits) == 1 else self._limits
        return self.budget.total(self.index, n_sigma=self.confidence, limit=limit)

    @property
    def name(self) -> str:
        """The budget's name."""
        return str(self._plain.get("name", "budget"))

    def show_inputs(self) -> None:
        """Every term with its source, as the injected parameters state it."""
        rows = []
        for term in self._plain["terms"]:
            stated = {key: value for key, value in term.items() if key not in ("name", "source")}
            rows.append(hardware_parts.row("term", term["name"], {**stated, "source": term["source"]}))
        rows.append({"input": "limit", "stated": ", ".join(self._limit_texts) or "none", "source": "requirement"})
        display.inputs(rows)

    def show_assumptions(self) -> None:
        """What the sums take for granted."""
        marked = sorted({term.correlated for term in self.budget.terms if term.correlated})
        display.statement(
            "assumptions",
            [
                "Terms without a mark are independent of each other; terms that bear the same mark are fully "
                "correlated " + (f"({', '.join(marked)})." if marked else "(none is marked here)."),
                "A term known only by its bound counts as equally likely between its ends in the squares and with the "
                "whole bound in the plain sum.",
            ],
        )

    def show_terms(self) -> None:
        """Mean, standard deviation and largest value of each term on each axis, in arc seconds."""
        rows = [
            [
                term.name,
                term.kind,
                ", ".join(term.counts_in),
                *(
                    f"{_arcsec(s.mean)} / {_arcsec(s.sigma)} / {_arcsec(s.largest(self.confidence))}"
                    for s in term.spreads
                ),
                term.source,
            ]
            for term in self.budget.terms
        ]
        display.table(
            "tbl:terms",
            ["term", "kind", "counts in", *self.budget.axes, "source"],
            rows,
            caption="Terms: mean / standard deviation / largest value counted, arc seconds",
            align="lll" + "r" * len(self.budget.axes) + "l",
        )

    def show_sums(self) -> None:
        """The sums an axis, recorded: plain sum, and mean plus the stated multiple of the standard deviation."""
        total, rows = self.total, []
        for k, axis in enumerate(total.axes):
            plain, squares = float(np.degrees(total.arithmetic[k])), float(np.degrees(total.total[k]))
            self._record("pointing error, plain sum", axis, plain)
            self._record(f"pointing error at {self.confidence:g} sigma", axis, squares)
            limit = "none" if total.limit is None else f"{_arcsec(total.limit[k])}"
            verdict = "" if total.within is None else "within" if total.within[k] else "beyond"
            cells = (total.mean[k], total.sigma[k], total.total[k], total.arithmetic[k])
            rows.append([axis, *(_arcsec(value) for value in cells), limit, verdict])
        display.table(
            "tbl:sums",
            [
                "axis",
                "mean",
                "sigma",
                f"|mean| + {self.confidence:g} sigma",
                "plain sum",
                "limit",
                f"{self.confidence:g} sigma against the limit",
            ],
            rows,
            caption=f"Sums of the terms that count in {self.index}, arc seconds",
            align="lrrrrrl",
        )

    def show_directional(self) -> None:
        """The error of a line square to the first two axes, with the factor of a circular distribution beside it."""
        axes = self.total.axes
        if len(axes) < 2:
            display.statement("directional", "One axis only: no line across two axes is judged.")
            return
        found = directional_total(self.total, axes[0], axes[1])
        cautious = self.confidence * np.sqrt(2.0)
        display.statement(
            "directional",
            [
                f"A line square to {axes[0]} and {axes[1]} is off by at most {_arcsec(found)} arc seconds at the "
                "factor "
                f"{self.confidence:g}: root sum square of the two means plus the factor times that of the two sigmas.",
                f"Were both axes equal and normal, the factor on one axis's sigma would be {rayleigh_factor(0.95):.3f} "
                f"for 95 % and {rayleigh_factor(0.9973):.3f} for 99.73 %; the cautious factor here is {cautious:.3f}.",
            ],
        )

    def show_bars(self) -> None:
        """One bar chart an axis: what each term contributes at the stated confidence, the total and the limit."""
        for k, axis in enumerate(self.total.axes):
            counted = [term for term in self.budget.terms if self.index in term.counts_in]
            bars = {
                term.name: _ARCSEC
                * float(np.degrees(abs(term.spreads[k].mean) + self.confidence * term.spreads[k].sigma))
                for term in counted
            }
            whole = _ARCSEC * float(np.degrees(self.total.total[k]))
            limit = None if self.total.limit is None else _ARCSEC * float(np.degrees(self.total.limit[k]))
            display.figure(
                f"fig:budget-{k + 1}",
                charts.budget_bars(bars, total=whole, limit=limit, unit=f"error about {axis}, arc seconds"),
                caption=f"Budget about {axis}: each term at {self.confidence:g} sigma, and all combined",
                alt="; ".join(f"{name} {value:.3g}" for name, value in {**bars, "combined": whole}.items()),
            )

    def show_shares(self) -> None:
        """Each independent term's share of the summed variance: where an improvement pays."""
        shares = self.budget.shares(self.index)
        display.table(
            "tbl:shares",
            ["term", *self.budget.axes],
            [[name, *(f"{100.0 * float(share):.1f} %" for share in row)] for name, row in shares.items()],
            caption="Shares of the summed variance",
            align="l" + "r" * len(self.budget.axes),
        )

    def show_checks(self) -> None:
        """The totals again from the plain words of the terms, by scipy's distributions."""
        for k, axis in enumerate(self.total.axes):
            theirs = _scipy_total(self._plain["terms"], k, self.index, self.confidence)
            if theirs is not None:
                display.check(
                    f"check:{self.name}:{axis}",
                    f"error about {axis} at {self.confidence:g} sigma",
                    ours=float(np.degrees(self.total.total[k])),
                    theirs=theirs,
                    tolerance=1e-9,
                    unit="deg",
                    library="scipy.stats",
                )
        _check_factor()

    def show_results(self) -> None:
        """The results in one table."""
        rows = []
        for k, axis in enumerate(self.total.axes):
            value = f"{ceiling_text(float(np.degrees(self.total.total[k])), 4)}°"
            rows.append([f"pointing error at {self.confidence:g} sigma", axis, value, "exact"])
            plain = degrees_text(float(self.total.arithmetic[k]), 4)
            rows.append(["pointing error, plain sum", axis, plain, "exact"])
        display.table(
            "tbl:results",
            ["quantity", "axis", "value", "basis"],
            rows,
            caption="Results of this calculation",
            align="llrl",
        )

    def _record(self, quantity: str, over: str, value: float) -> None:
        note = f"sum of the stated terms that count in {self.index}"
        display.record(
            quantity=quantity,
            of=self.name,
            over=over,
            lo=0.0,
            hi=value,
            unit="deg",
            basis="exact",
            attained=None,
            note=note,
        )


def _arcsec(angle: float) -> str:
    text = f"{_ARCSEC * float(np.degrees(angle)):.2f}"
    return ("0.00" if text == "-0.00" else text).replace("-", "−")


def _scipy_total(terms: list[dict[str, Any]], axis: int, index: str, confidence: float) -> float | None:
    """|mean| + n sigma (deg) on one axis from the words, marked groups adding; None with a mount among them."""
    groups: dict[str, float] = {}
    mean = 0.0
    for number, term in enumerate(terms):
        if index not in term.get("counts in", ["APE"]):
            continue
        found = _scipy_spread(term, axis)
        if found is None:
            return None
        mean += found[0]
        mark = term.get("correlated") or f"alone {number}"
        groups[mark] = groups.get(mark, 0.0) + found[1]
    return float(abs(mean) + confidence * np.linalg.norm(list(groups.values())))


def _scipy_spread(term: dict[str, Any], axis: int) -> tuple[float, float] | None:
    """Mean and standard deviation (deg) of one term on one axis by scipy's distributions."""
    from scipy import stats

    deg = independent.degrees
    if "gaussian" in term:
        return (deg(term["mean"][axis]) if "mean" in term else 0.0), deg(term["gaussian"][axis])
    if "uniform" in term:
        low, high = (deg(word) for word in term["uniform"][axis])
        return float(stats.uniform(low, high - low).mean()), float(stats.uniform(low, high - low).std())
    if "bounded" in term:
        bound = deg(term["bounded"][axis])
        return 0.0, float(stats.uniform(-bound, 2.0 * bound).std())
    if "sinusoid" in term:
        amplitude = deg(term["sinusoid"][axis])
        return 0.0, float(stats.arcsine(-amplitude, 2.0 * amplitude).std())
    if "timing" in term:
        rate, late = term["timing"]["relative rate"][axis], term["timing"]["time error"]
        bound = np.degrees(parse_quantity(rate, kind="angular rate").value) * parse_quantity(late).value
        return 0.0, float(stats.uniform(-bound, 2.0 * bound).std()) if bound > 0.0 else 0.0
    return None


def _check_factor() -> None:
    """The factor of a circular normal distribution against scipy's Rayleigh distribution."""
    from scipy import stats

    display.check(
        "check:rayleigh",
        "factor of a circular normal distribution at 95 %",
        ours=rayleigh_factor(0.95),
        theirs=float(stats.rayleigh.ppf(0.95)),
        tolerance=1e-12,
        unit="",
        library="scipy.stats",
    )
