"""An independent validator on the same pages: Apache PDFBox Preflight 2.0.27, which knows PDF/A-1b only.

It judges syntax, fonts, colours, metadata and output intent of the document exported as A-1b, without attachments
(that standard forbids them). It cannot judge A-3a or UA-1, nor bookmarks: it does not resolve destinations stored as
references to arrays (ISO 32000-1, 12.3.2.2 allows them), and that is the one complaint let pass. No validator for A-3
or UA-1 could be had from the package registries.
Debian: default-jre-headless libpdfbox2-java libfontbox2-java libcommons-logging-java libactivation-java
libjaxb-api-java libjaxb-java.
"""

from __future__ import annotations

import re
import subprocess
from pathlib import Path

import pytest

from trunnion.binding import pdf as writer
from trunnion.binding.compose import compose
from trunnion.binding.house import House

JAVA = Path("/usr/share/java")
JARS = ("preflight", "pdfbox2", "fontbox2", "xmpbox", "commons-logging", "activation", "jaxb-api", "jaxb-runtime")
MORE_JARS = ("jaxb-impl", "jaxb-core", "istack-commons-runtime", "javax.activation")


@pytest.mark.full
@pytest.mark.needs("java")
def test_preflight_finds_nothing_but_the_bookmarks_it_cannot_read(material, tmp_path, monkeypatch):
    if not (JAVA / "preflight.jar").exists():
        pytest.skip("needs libpdfbox2-java, not installed here")
    monkeypatch.setattr(writer, "STANDARDS", ["a-1b"])
    document, _ = compose(material.package(), House())
    document.attachments.clear()
    content, pages, _ = writer.write_pdf(document, House())
    path = tmp_path / "package.pdf"
    path.write_bytes(content)
    jars = ":".join(str(JAVA / f"{name}.jar") for name in (*JARS, *MORE_JARS))
    command = ["java", "-cp", jars, "org.apache.pdfbox.preflight.Validator_A1b", str(path)]
    said = subprocess.run(command, capture_output=True, text=True, timeout=120).stdout
    complaints = re.findall(r"^(\d[\d.]*\s*:.*)$", said, re.MULTILINE)
    assert pages > 10
    assert "A-1b" in said
    assert [line for line in complaints if "can't convert to Destination" not in line] == []
