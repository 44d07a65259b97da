"""The published JSON Schema, judged by another library: right files pass, misshapen ones do not."""

from __future__ import annotations

from pathlib import Path

import pytest
from jsonschema import Draft202012Validator

from trunnion.spec import json_schema
from trunnion.spec.meaning.envelopes import STATEMENT_KEYS
from trunnion.spec.parts import Table
from trunnion.spec.parts.base import key_of
from trunnion.spec.tree import read_tree
from trunnion.tables import statements

HERE = Path(__file__).parent


def plain(file: Path):
    tree, _, faults = read_tree(file.read_bytes(), file.name)
    assert not faults
    return tree.plain()


def test_the_schema_is_a_schema():
    Draft202012Validator.check_schema(json_schema())


ROOT = HERE.parents[1]
SHIPPED = [*sorted(ROOT.glob("workbooks/*/workbook.yaml")), ROOT / "src/trunnion/calculations/starter/workbook.yaml"]


@pytest.mark.parametrize(
    "file", [HERE / "example.yaml", HERE / "full.yaml", *SHIPPED], ids=lambda f: str(f.relative_to(ROOT))
)
def test_right_files_pass(file):
    """As an editor judges them: the plain values of the file, `"true"` quoted or not."""
    errors = list(Draft202012Validator(json_schema()).iter_errors(plain(file)))
    assert errors == []


@pytest.mark.parametrize(
    "stem",
    [
        "unknown-key", "unknown-key-inside", "unknown-key-top", "inner-name", "inner-files", "missing-key",
        "missing-key-between", "wrong-type", "wrong-type-mapping", "wrong-type-truth", "not-one-of",
        "not-one-of-role", "no-form", "two-forms", "wrong-count", "title-too-long", "bad-id", "no-unit-angle",
        "not-a-quantity", "no-reference", "no-maps", "not-a-list",
    ],
)  # fmt: skip
def test_files_of_the_wrong_shape_fail(stem):
    (file,) = (HERE / "mistakes").glob(f"[0-9][0-9][0-9]-{stem}.yaml")
    assert list(Draft202012Validator(json_schema()).iter_errors(plain(file)))


def test_every_key_of_the_schema_is_met_by_the_full_example():
    """The example of every form leaves out no key the schema offers (its names are found in the file's text)."""
    text = (HERE / "full.yaml").read_text() + (HERE / "example.yaml").read_text()
    schema = json_schema()
    keys = {key for part in [schema, *schema["$defs"].values()] for key in part.get("properties", {})}
    missing = {key for key in keys if f"{key}:" not in text}
    assert missing <= {"house", "format", "segment", "separator", "answers", "sha256", "reader memory", "reader time"}


def test_a_table_says_what_the_table_readers_read():
    """A table's statement has the keys its readers know (`max rate` is their other name for `max body rate`)."""
    assert set(STATEMENT_KEYS) == set(statements._KEYS) - {"max rate"}
    assert {key_of(name) for name in Table.model_fields} >= set(STATEMENT_KEYS)
