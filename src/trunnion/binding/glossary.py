"""Terms and signs every package explains, and the map to the usual contents of a controlled calculation."""

from __future__ import annotations

_TERMS: dict[str, tuple[tuple[str, str], ...]] = {
    "en": (
        ("attitude", "the orientation of one frame relative to another; here always with both frames named"),
        ("convention", "how three angles state an attitude: frames, sequence, moving or fixed axes, zero, senses"),
        ("sequence", "the three axes turned about, in order, by number: 3-2-1 is axis 3, then 2, then 1"),
        ("moving axes", "each turn is about an axis of the body as the turns before have left it"),
        ("fixed axes", "each turn is about an axis of the reference frame"),
        ("lock, singular attitude", "where the outer two turns of a sequence act about the same line"),
        ("lock margin", "the rotation angle to the nearest singular attitude of a convention"),
        ("envelope", "the set of attitudes something may take: boxes, cones, phases, trajectories, poses"),
        ("witness", "the attitude at which a printed extreme is reached"),
        ("exact", "shown with symbols or whole numbers, without rounding"),
        ("certified bound", "proven, rounding included"),
        ("sampled", "found on a grid or by chance; no proof between the samples"),
        ("measured", "from recorded data; satisfies only a requirement that asks for it"),
        ("meets", "the bound lies inside the limit, on a sufficient basis"),
        ("does not meet", "an attitude was reached that breaks the limit"),
        ("not shown", "neither of the two: the evidence is not enough, or there is none"),
        ("deviation", "an accepted departure; the verdict stays as computed, the acceptance stands beside it"),
        ("R_rb", "the matrix that takes body components to reference components: v_r = R_rb v_b"),
        ("c, s before a subscript", "short for cosine and sine of the angle named by the subscript"),
    ),
    "de": (
        ("Lage", "die Orientierung eines Achsensystems gegen ein anderes; hier stets mit beiden genannt"),
        ("Vereinbarung", "wie drei Winkel eine Lage angeben: Systeme, Folge, mitbewegte oder feste Achsen, Nulllage"),
        ("Folge", "die drei Drehachsen in ihrer Reihenfolge: 3-2-1 heißt Achse 3, dann 2, dann 1"),
        ("mitbewegte Achsen", "jede Drehung geht um eine Körperachse, wie die vorigen sie hinterlassen haben"),
        ("feste Achsen", "jede Drehung geht um eine Achse des Bezugssystems"),
        ("singuläre Lage", "wo die beiden äußeren Drehungen um dieselbe Gerade gehen"),
        ("Abstand zur singulären Lage", "der Drehwinkel bis zur nächsten singulären Lage einer Vereinbarung"),
        ("Hülle", "die Menge der Lagen, die etwas annehmen darf"),
        ("Zeuge", "die Lage, in der ein gedruckter Extremwert erreicht wird"),
        ("exact", "mit Symbolen oder ganzen Zahlen gezeigt, ohne Rundung"),
        ("certified bound", "bewiesen, Rundung eingeschlossen"),
        ("sampled", "auf einem Gitter oder zufällig gefunden; dazwischen ohne Beweis"),
        ("measured", "aus Messdaten; genügt nur einer Anforderung, die danach fragt"),
        ("erfüllt", "die Schranke liegt innerhalb der Grenze, auf ausreichender Grundlage"),
        ("nicht erfüllt", "eine Lage wurde erreicht, die die Grenze verletzt"),
        ("nicht gezeigt", "keines von beiden: der Nachweis reicht nicht oder fehlt"),
        ("Abweichung", "eine zugelassene Ausnahme; das Urteil bleibt, wie es berechnet wurde"),
        ("R_rb", "die Matrix, die Körperkomponenten in Bezugskomponenten überführt: v_r = R_rb v_b"),
        ("c, s vor einem Index", "kurz für Kosinus und Sinus des im Index genannten Winkels"),
    ),
}

_CONTENTS: dict[str, tuple[tuple[str, str], ...]] = {
    "en": (
        ("purpose of the calculation", "each calculation, its first section"),
        ("design inputs and their sources", "each calculation, inputs; appendix “Inputs as read”"),
        ("assumptions, and those to be confirmed", "part “Assumptions, findings and deviations”; each calculation"),
        ("method and references", "each calculation, method"),
        ("calculation", "each calculation; program code in the appendix"),
        ("computer programs and versions", "appendix “Environment and versions”"),
        ("check by another route", "each calculation, independent check"),
        ("results and conclusions", "summary, requirement matrix, decisions; each calculation, results"),
        ("limits of validity", "each calculation, last section; caution on the cover"),
        ("preparer, checker, approver", "cover and the end of each calculation"),
        ("revisions and their reasons", "revision history; change report"),
    ),
    "de": (
        ("Zweck der Berechnung", "jede Berechnung, erster Abschnitt"),
        ("Eingaben und ihre Quellen", "jede Berechnung, Eingaben; Anhang „Eingaben wie gelesen“"),
        ("Annahmen, auch unbestätigte", "Teil „Annahmen, Befunde und Abweichungen“; jede Berechnung"),
        ("Verfahren und Quellen", "jede Berechnung, Verfahren"),
        ("Berechnung", "jede Berechnung; Programmcode im Anhang"),
        ("Programme und Versionen", "Anhang „Umgebung und Versionen“"),
        ("Nachrechnung auf anderem Weg", "jede Berechnung, unabhängige Nachrechnung"),
        ("Ergebnisse und Schlüsse", "Zusammenfassung, Anforderungsmatrix, Entscheidungen; jede Berechnung"),
        ("Grenzen der Gültigkeit", "jede Berechnung, letzter Abschnitt; Achtung auf dem Deckblatt"),
        ("Ersteller, Prüfer, Freigebender", "Deckblatt und Ende jeder Berechnung"),
        ("Änderungen und Gründe", "Änderungsverlauf; Änderungen"),
    ),
}

# The list of contents follows the usual reading of ASME NQA-1, Requirement 3 (design analyses); from memory.
CONTENTS_NOTE = {
    "en": "After the usual reading of ASME NQA-1, Requirement 3, on design analyses (from memory, not quoted).",
    "de": "Nach üblicher Lesart von ASME NQA-1, Requirement 3, zu Berechnungen (aus dem Gedächtnis).",
}


def terms(language: str) -> tuple[tuple[str, str], ...]:
    """Term and meaning, in the language of the fixed words."""
    return _TERMS[language]


def usual_contents(language: str) -> tuple[tuple[str, str], ...]:
    """What a controlled calculation usually contains, and where this package has it."""
    return _CONTENTS[language]
