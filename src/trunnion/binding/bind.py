"""Binding: package input in, `package.html` and `package.pdf` out, with a report of what was made."""

from __future__ import annotations

import contextlib
import hashlib
import os
from collections import Counter
from pathlib import Path

from trunnion.binding.compose import compose
from trunnion.binding.house import House
from trunnion.binding.html import write_html
from trunnion.binding.package import BuildReport, PackageInput
from trunnion.errors import StoreError

HTML_NAME, PDF_NAME = "package.html", "package.pdf"


def bind(
    package: PackageInput,
    folder: Path | str,
    *,
    pdf: bool = True,
    house: House | None = None,
    strict: bool = True,
) -> BuildReport:
    """Write `package.html` (and `package.pdf`) into `folder`; nothing is left half-written.

    The same package and house give the same bytes in any folder, time zone and locale. `strict` refuses outputs
    that have no printable form; otherwise they are left out and named among the warnings. Raises `BindingError`
    naming every notebook, cell and item that cannot be shown rightly, `StoreError` for an unusable folder.
    """
    house = house or House()
    document, warnings = compose(package, house, strict=strict)
    missing: Counter[str] = Counter()
    page = write_html(document, house, missing).encode("utf-8")
    made: dict[str, bytes] = {HTML_NAME: page}
    pages: int | None = None
    scaled: tuple[tuple[str, str, float], ...] = ()
    if pdf:
        from trunnion.binding.pdf import write_pdf

        made[PDF_NAME], pages, scaled = write_pdf(document, house)
    target = Path(folder)
    for name, content in made.items():
        _write(target / name, content)
    return BuildReport(
        html=target / HTML_NAME,
        pdf=target / PDF_NAME if pdf else None,
        digests={name: hashlib.sha256(content).hexdigest() for name, content in made.items()},
        pages=pages,
        missing_glyphs=dict(sorted(missing.items())),
        scaled=scaled,
        warnings=tuple(warnings),
    )


def _write(path: Path, content: bytes) -> None:
    """Write beside and rename, so that the final name never holds half a file."""
    beside = path.with_name(path.name + ".part")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        beside.write_bytes(content)
        os.replace(beside, path)
    except OSError as error:
        with contextlib.suppress(OSError):
            beside.unlink(missing_ok=True)
        cause = f"{path} cannot be written: {error.strerror or error}"
        raise StoreError(cause, remedy="choose a folder that can be written to, with room on its disk") from error
