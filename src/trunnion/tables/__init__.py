"""Attitude data in and out: every number with its statement, nothing guessed, nothing repaired in silence."""

from trunnion.tables.ccsds_write import MessageHead, aem_text, apm_text
from trunnion.tables.confine import Limits
from trunnion.tables.converting import ConvertedTable, convert_table
from trunnion.tables.inspection import Inspection, inspect_file
from trunnion.tables.reading import read_table
from trunnion.tables.statements import Between, Form, Order, Scalar, TableStatement, statement_from_plain
from trunnion.tables.streaming import iter_chunks
from trunnion.tables.table import AttitudeTable, Trouble
from trunnion.tables.writing import write_csv, write_parquet

__all__ = [
    "AttitudeTable",
    "Between",
    "ConvertedTable",
    "Form",
    "Inspection",
    "Limits",
    "MessageHead",
    "Order",
    "Scalar",
    "TableStatement",
    "Trouble",
    "aem_text",
    "apm_text",
    "convert_table",
    "inspect_file",
    "iter_chunks",
    "read_table",
    "statement_from_plain",
    "write_csv",
    "write_parquet",
]
