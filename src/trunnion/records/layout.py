"""Where records lie: in the workbook, in an issued revision, in an archive."""

from __future__ import annotations

from pathlib import Path

ROLES = ("prepared", "checked", "approved")
ARCHIVED = "archived"
KEYS, REVOKED = "allowed_signers", "revoked_keys"
RECORD = "record"  # the folder of an issued revision that holds what was signed


def namespace(role: str) -> str:
    """The signature namespace that grants a role: `checked@trunnion`."""
    return f"{role}@trunnion"


def records_folder(workbook: Path) -> Path:
    """Records of a workbook, under version control."""
    return workbook / "records"


def keys_file(workbook: Path) -> Path:
    """The workbook's own key list; it proves only consistency."""
    return records_folder(workbook) / KEYS


def revoked_file(workbook: Path) -> Path:
    """The workbook's own list of revoked keys."""
    return records_folder(workbook) / REVOKED


def findings_folder(workbook: Path) -> Path:
    """One file a finding."""
    return records_folder(workbook) / "findings"


def signatures_folder(workbook: Path, revision: str) -> Path:
    """Statements and signatures of the revision in work."""
    return records_folder(workbook) / "signatures" / revision


def recomputed_file(workbook: Path, revision: str) -> Path:
    """The last comparison of `recompute` for a revision, attached to the checker's signature."""
    return records_folder(workbook) / "recomputed" / f"{revision}.json"


def archive_signature_file(workbook: Path, revision: str) -> Path:
    """The signature over an archive's tag manifest, kept so that the archive can be made again byte for byte."""
    return records_folder(workbook) / "archived" / f"{revision}.sig"
