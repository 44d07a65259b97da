"""A study told in lines for people, and as plain data for programs."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.words import degrees_text, listed
from trunnion.crosswalk.disagreement import REVERSAL
from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.fragment import fragment
from trunnion.crosswalk.identify import Answer, Finding, Identification
from trunnion.crosswalk.near_fits import in_common
from trunnion.crosswalk.offsets import offsets_of
from trunnion.crosswalk.study import Study

SHOWN = 12
_ROUNDING_DEG = 1e-9


def lines_of(study: Study, *, reference: str = "reference", body: str = "body") -> list[str]:
    """The whole answer, top line first. reference, body: what the frames are called in the spec fragment."""
    head = [f"{study.evidence.samples} samples{f' against {study.evidence.known}' if study.evidence.known else ''}"]
    head += list(study.evidence.notes)
    if study.found is None:
        return [*head, *_agreement_lines(study)]
    lines = [*head, *answer_lines(study.found), *_common_lines(study.found, study.evidence.names)]
    lines += _finding_lines(study)
    lines += [f"note: {remark}" for remark in study.remarks]
    if study.rate_columns is not None:
        lines += ["", "rate columns: " + _rates_line(study.rate_columns)]
    if study.mistakes:
        head_line = "near-fits and the mistake that explains each:" if study.found.fits else "what would fit:"
        lines += ["", head_line, *(f"  {words}" for words in study.mistakes)]
    if study.asked is not None:
        lines += ["", "measure next: " + asked_words(study)]
    written = fragment_lines(study, reference, body)
    return [*lines, "", "spec lines:", *(f"  {line}" for line in written)] if written else lines


def answer_lines(found: Identification) -> list[str]:
    """The answer in a sentence or two, with residual, noise and gap."""
    if found.answer is Answer.NONE_FITS:
        best, second = _two_best(found)
        gap = f"; the next candidate misses by {miss_text(second)}" if second is not None else ""
        return [f"NONE FITS of {found.tried} tried: the best misses by {miss_text(best)}{gap}"]
    first = found.fits[0]
    noise = (
        f"noise {'stated' if found.noise_stated else 'found'} {np.degrees(found.noise):.3g} deg an axis"
        if found.noise_stated or found.noise > np.radians(_ROUNDING_DEG)
        else "no noise"
    )
    misses = f"miss {miss_text(first)} (root mean square), {noise}"
    if found.next_best is not None:
        misses += f"; the best that does not fit misses by {miss_text(found.next_best)}"
    if found.answer is Answer.IDENTIFIED:
        lines = [f"IDENTIFIED, one of {found.tried} functions: {misses}"]
    else:
        lines = [f"CAN'T BE TOLD APART by these data: {len(found.fits)} of {found.tried} functions fit; {misses}"]
        lines += [f"  because {reason}" for reason in found.reasons]
    if found.outliers:
        lines.append(f"  samples that do not belong: {listed([str(row) for row in found.outliers[:20]])}")
    return lines


def fragment_lines(study: Study, reference: str = "reference", body: str = "body") -> list[str]:
    """The spec fragment of an identified chain, else nothing."""
    found = study.found
    if found is None or found.answer is not Answer.IDENTIFIED or found.fits[0].reading.chain is None:
        return []
    if found.constants is Constants.BOTH:
        return []
    finding = found.fits[0]
    return fragment(finding, study.evidence.names, reference=reference, body=body, offsets=offsets_of(finding))


def asked_words(study: Study) -> str:
    """The next measurement in words."""
    asked = study.asked
    assert asked is not None
    unit = "deg" if asked.degrees else "rad"
    setting = ", ".join(
        f"{name} {float(value):.6g} {unit}" for name, value in zip(study.evidence.names, asked.numbers, strict=True)
    )
    return (
        f"{setting}: the {asked.readings} readings left then differ by at least "
        f"{degrees_text(asked.least_separation, 2)}"
    )


def plain_of(study: Study, *, reference: str = "reference", body: str = "body") -> dict[str, Any]:
    """The same as JSON values; angles in degrees."""
    made: dict[str, Any] = {
        "answer": study.answer.value,
        "samples": study.evidence.samples,
        "known": study.evidence.known,
        "constants": study.constants.value,
        "notes": [*study.evidence.notes, *study.remarks],
        "mistakes": list(study.mistakes),
        "agreements": [
            {"readings": dict(entry.words), "miss deg": float(np.degrees(entry.miss)), "agree": entry.agrees}
            for entry in study.agreements
        ],
        "spec": fragment_lines(study, reference, body),
    }
    if study.found is not None:
        found = study.found
        made |= {
            "tried": found.tried,
            "noise deg": float(np.degrees(found.noise)),
            "fits": [_plain_finding(finding) for finding in found.fits],
            "next best": _plain_finding(found.next_best) if found.next_best is not None else None,
            "because": list(found.reasons),
            "samples that do not belong": list(found.outliers),
        }
    if study.asked is not None:
        made["measure next"] = {
            "numbers": study.asked.numbers.tolist(),
            "unit": "deg" if study.asked.degrees else "rad",
            "least separation deg": float(np.degrees(study.asked.least_separation)),
        }
    return made


def constant_words(matrix: NDArray[np.float64], side: str) -> str:
    """A constant of the fit as one turn: size and axis; nothing for the identity."""
    from trunnion.attitude.rotations import rotation_vector
    from trunnion.attitude.words import vector_text

    vector = rotation_vector(matrix)
    size = float(np.linalg.norm(vector))
    if size < 1e-9:
        return ""
    return f"constant on the {side} side: {degrees_text(size, 4)} about {vector_text(vector / size)}"


def _finding_lines(study: Study) -> list[str]:
    assert study.found is not None
    found, lines = study.found, []
    alone = found.answer is Answer.IDENTIFIED
    for finding in found.fits[:SHOWN]:
        lines.append(f"  {finding.reading.words}" + ("" if alone else f"   (miss {miss_text(finding)})"))
        if alone:
            lines += [f"    or, the same function: {name}" for name in finding.reading.names[1:]]
            if found.constants is Constants.RELABELLED and finding.reading.chain is not None:
                lines.append("    and 23 times as many names with the axes of both frames renamed")
        told = [constant_words(finding.left, "reference"), constant_words(finding.right, "body")]
        lines += [f"    {words}" for words in told if words]
    more = len(found.fits) - SHOWN
    return lines + ([f"  … and {more} more"] if more > 0 else [])


def _common_lines(found: Identification, names: tuple[str, str, str]) -> list[str]:
    return [f"  all of them: {words}" for words in in_common(found, names)]


def _agreement_lines(study: Study) -> list[str]:
    agreeing = [entry for entry in study.agreements if entry.agrees]
    if not agreeing:
        head = "THE FILE CONTRADICTS ITSELF: no reading of its statements makes them agree; nearest first:"
    elif len(agreeing) == 1:
        head = "ONE WAY to read the statements makes them agree:"
    else:
        head = f"{len(agreeing)} ways to read the statements make them agree:"
    lines = [head, *(f"  {entry.line()}" for entry in agreeing or study.agreements[:4])]
    others = [entry for entry in study.agreements if not entry.agrees]
    if agreeing and others:
        lines.append(f"  the next way leaves {np.degrees(others[0].miss):.4g} deg between them")
    if agreeing and agreeing[0].angles is not None:
        best = agreeing[0].angles
        lines += ["", "the angles:", *answer_lines(best), *_common_lines(best, study.evidence.names)]
        if best.answer is Answer.IDENTIFIED:
            lines += [f"    or, the same function: {name}" for name in best.fits[0].reading.names[1:]]
    return [*lines, f"  ({REVERSAL})"]


def _rates_line(found: Identification) -> str:
    if not found.fits:
        return f"no order, sign and unit fits; the best misses by {miss_text(found.next_best)}"
    told = "; or ".join(finding.reading.words for finding in found.fits[:4])
    return f"{told} (miss {miss_text(found.fits[0])} over turns of 40 deg)"


def _two_best(found: Identification) -> tuple[Finding | None, Finding | None]:
    return found.next_best, found.second_best


def miss_text(finding: Finding | None) -> str:
    """The miss in degrees; what is below any printed digit is said to be so."""
    if finding is None:
        return "nothing"
    miss = float(np.degrees(finding.miss))
    return f"{miss:.5g} deg" if miss > _ROUNDING_DEG else f"less than {_ROUNDING_DEG:g} deg"


def _plain_finding(finding: Finding) -> dict[str, Any]:
    return {
        "reading": finding.reading.words,
        "names": list(finding.reading.names),
        "miss deg": float(np.degrees(finding.miss)),
        "constant on the reference side": finding.left.tolist(),
        "constant on the body side": finding.right.tolist(),
        "offsets deg": np.degrees(offsets_of(finding)).tolist(),
    }
