"""Attitude data in and out: every number with its statement, nothing guessed, nothing repaired in silence."""

from trunnion.tables.confine import Limits
from trunnion.tables.reading import read_table
from trunnion.tables.statements import Between, Form, Order, Scalar, TableStatement, statement_from_plain
from trunnion.tables.streaming import iter_chunks
from trunnion.tables.table import AttitudeTable, Trouble

__all__ = [
    "AttitudeTable",
    "Between",
    "Form",
    "Limits",
    "Order",
    "Scalar",
    "TableStatement",
    "Trouble",
    "iter_chunks",
    "read_table",
    "statement_from_plain",
]
