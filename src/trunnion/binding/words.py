"""The fixed words of a package in the languages a house may choose. English phrases are the keys."""

from __future__ import annotations

from trunnion.binding.package import SheetState, SignatureState, Verdict
from trunnion.errors import BindingError, Fault

_GERMAN = {
    # title block and signatures
    "Calculation package": "Berechnungsdokument",
    "Document": "Dokument",
    "Title": "Titel",
    "Revision": "Revision",
    "Rev.": "Rev.",
    "Date": "Datum",
    "Status": "Status",
    "Supersedes": "Ersetzt",
    "Classification": "Klassifikation",
    "Subject": "Gegenstand",
    "Organization": "Organisation",
    "Sign-off": "Freigabe",
    "Does": "Tätigkeit",
    "Name": "Name",
    "State": "Zustand",
    "Note": "Anmerkung",
    "Prepared": "Erstellt",
    "Checked": "Geprüft",
    "Approved": "Freigegeben",
    "prepared": "erstellt",
    "checked": "geprüft",
    "approved": "freigegeben",
    "not signed": "nicht signiert",
    "signed": "signiert",
    "signed, but the content has changed since": "signiert, Inhalt seither geändert",
    "signature does not verify": "Signatur nicht gültig",
    "partly signed": "teilweise signiert",
    "draft": "Entwurf",
    "issued": "herausgegeben",
    "superseded": "ersetzt",
    "withdrawn": "zurückgezogen",
    "confirmed": "bestätigt",
    "closed": "erledigt",
    "answered": "beantwortet",
    # verdicts
    "meets": "erfüllt",
    "does not meet": "nicht erfüllt",
    "not shown": "nicht gezeigt",
    "Overall": "Gesamt",
    "all requirements that count are met": "alle zählenden Anforderungen sind erfüllt",
    "no requirements are stated": "keine Anforderungen angegeben",
    "met": "erfüllt",
    "accepted by": "zugelassen durch",
    "Verdict": "Urteil",
    # parts
    "Caution": "Achtung",
    "Revision history": "Änderungsverlauf",
    "Contents": "Inhalt",
    "Figures": "Abbildungen",
    "Tables": "Tabellen",
    "Figures and tables": "Abbildungen und Tabellen",
    "Summary": "Zusammenfassung",
    "Question": "Frage",
    "Answer": "Antwort",
    "Verdicts": "Urteile",
    "Worst margins": "Kleinste Abstände",
    "Requirements": "Anforderungen",
    "Requirement matrix": "Anforderungsmatrix",
    "Decisions": "Entscheidungen",
    "Assumptions, findings and deviations": "Annahmen, Befunde und Abweichungen",
    "Assumptions": "Annahmen",
    "Findings": "Befunde",
    "Deviations": "Abweichungen",
    "Convention statements": "Festlegungen zum Weitergeben",
    "Changes": "Änderungen",
    "Changes against revision": "Änderungen gegenüber Revision",
    "Inputs as read": "Eingaben wie gelesen",
    "Program code": "Programmcode",
    "Environment and versions": "Umgebung und Versionen",
    "Glossary and notation": "Begriffe und Zeichen",
    "Where the usual contents of a calculation stand": ("Wo der übliche Inhalt einer geprüften Berechnung steht"),
    "Appendix": "Anhang",
    # table heads
    "Requirement": "Anforderung",
    "Asked for": "Verlangt",
    "Result": "Ergebnis",
    "Basis": "Grundlage",
    "Evidence": "Nachweis",
    "Signature": "Signatur",
    "Candidate": "Kandidat",
    "Chosen": "Gewählt",
    "chosen": "gewählt",
    "Grounds": "Gründe",
    "Because": "Begründung",
    "Rests on": "Beruht auf",
    "Id": "Kennung",
    "Text": "Text",
    "Owner": "Verantwortlich",
    "Against": "Gegen",
    "Reason": "Grund",
    "Limits": "Grenzen",
    "Expires": "Läuft ab",
    "Signed": "Signatur",
    "By": "Durch",
    "What": "Was",
    "Before": "Vorher",
    "After": "Nachher",
    "Effect": "Wirkung",
    "Input": "Eingabe",
    "Bytes": "Bytes",
    "Read as": "Gelesen als",
    "Source": "Quelle",
    "held": "liegt bei",
    "not held": "liegt nicht bei",
    "Value": "Wert",
    "Where": "Wo",
    "Quantity": "Größe",
    "Of": "Von",
    "Over": "Über",
    "Ours": "Unser Wert",
    "Independent": "Unabhängig",
    "Difference": "Unterschied",
    "Tolerance": "Toleranz",
    "agrees": "stimmt überein",
    "DOES NOT AGREE": "STIMMT NICHT ÜBEREIN",
    "Agreement": "Übereinstimmung",
    "Results": "Ergebnisse",
    "Independent check": "Unabhängige Nachrechnung",
    "Term": "Begriff",
    "Meaning": "Bedeutung",
    "Program": "Programm",
    "Version": "Version",
    "Usual content": "Üblicher Inhalt",
    "Stands in": "Steht in",
    # calculations
    "Calculation": "Berechnung",
    "Calculations": "Berechnungen",
    "Number": "Nummer",
    "Template": "Vorlage",
    "local template, not shipped with the program": "eigene Vorlage, nicht Teil des Programms",
    "Content key": "Inhaltsschlüssel",
    "Content digest": "Inhaltsprüfsumme",
    "Requirements addressed": "Behandelte Anforderungen",
    "computed": "gerechnet",
    "failed": "fehlgeschlagen",
    "missing": "fehlt",
    "Calculations without result": "Berechnungen ohne Ergebnis",
    "This calculation failed": "Diese Berechnung ist fehlgeschlagen",
    "This calculation is missing": "Diese Berechnung fehlt",
    "Project spec": "Projektangaben",
    "Cell": "Zelle",
    "Code of cell": "Code der Zelle",
    "Sheet": "Blatt",
    "of": "von",
    "Figure": "Abbildung",
    "Table": "Tabelle",
    "Eq.": "Gl.",
    "repeated from": "wiederholt aus",
    "p.": "S.",
    "open": "offen",
    "open findings": "offene Befunde",
    "open assumptions": "offene Annahmen",
    "none": "keine",
    "None.": "Keine.",
    "Failed": "Fehlgeschlagen",
    "Picture of cell": "Bild aus Zelle",
    "Inputs": "Eingaben",
    "Finding": "Befund",
    "against": "gegen",
    "Assumption": "Annahme",
    "Missing characters": "Fehlende Zeichen",
    "Attached to this file": "Dieser Datei beigefügt",
    # daily view
    "Skip to the content": "Zum Inhalt springen",
    "Skip to the requirements": "Zu den Anforderungen springen",
    "Show": "Zeigen",
    "only rows that count": "nur zählende Zeilen",
    "Switch light and dark": "Hell und dunkel tauschen",
    "back": "zurück",
    "Enlarge": "Vergrößern",
    "Back to the page": "Zurück zur Seite",
    "supports": "stützt",
}

_CAUTION = {
    "en": (
        "This package states what was computed from the inputs it lists, on the assumptions it lists. It is no "
        "design release and no clearance for use; a competent person checks and approves it before anything "
        "rests on it. Verdicts are computed by rule and compare with a slack of {slack}; a least value is "
        "printed rounded down, a largest one up. A margin from recorded data is that of the recorded estimate."
    ),
    "de": (
        "Dieses Dokument gibt wieder, was aus den aufgeführten Eingaben unter den aufgeführten Annahmen "
        "berechnet wurde. Es ist keine Freigabe eines Entwurfs und keine Erlaubnis zum Betrieb; eine fachkundige "
        "Person prüft und genehmigt es, bevor etwas darauf gestützt wird. Urteile folgen einer Regel und "
        "vergleichen mit einem Spielraum von {slack}; kleinste Werte sind ab-, größte aufgerundet. Ein Abstand "
        "aus Messdaten ist der des aufgezeichneten Schätzwertes."
    ),
}


class Words:
    """Fixed words in one language; asking for a phrase that has no translation is a programming error."""

    def __init__(self, language: str = "en") -> None:
        if language not in LANGUAGES:
            fault = Fault(f"no fixed words in {language!r}", f"use one of {', '.join(LANGUAGES)}")
            raise BindingError([fault])
        self.language = language

    def __call__(self, phrase: str) -> str:
        return phrase if self.language == "en" else _GERMAN[phrase]

    def known(self, phrase: str) -> str:
        """`phrase` in this language where it is one of the fixed words, else as it stands."""
        return phrase if self.language == "en" else _GERMAN.get(phrase, phrase)

    def verdict(self, verdict: Verdict) -> str:
        return self(verdict.value)

    def state(self, state: SignatureState | SheetState) -> str:
        return self(state.value)

    def caution(self, slack: str) -> str:
        return _CAUTION[self.language].format(slack=slack)


LANGUAGES = ("en", "de")
