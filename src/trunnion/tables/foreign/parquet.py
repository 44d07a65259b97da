"""Parquet through pyarrow."""

from __future__ import annotations

from typing import Any

import numpy as np

from trunnion.tables.nearest import nearest_hint
from trunnion.tables.refusals import Refused


def read_columns(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """Named columns as arrays "0", "1", …, in the order named."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    with pa.OSFile(path, "rb") as handle:
        file = pq.ParquetFile(handle, pre_buffer=False)
        _require_names(file.schema_arrow.names, options["columns"])
        table = file.read(columns=options["columns"], use_threads=False)
        return _arrays(table, options["columns"]), {"rows": table.num_rows}


def row_groups(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """The number of rows of each row group."""
    import pyarrow.parquet as pq

    metadata = pq.ParquetFile(path).metadata
    return {}, {"rows": [metadata.row_group(place).num_rows for place in range(metadata.num_row_groups)]}


def read_row_groups(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """As `read_columns`, of the row groups numbered in `groups` only."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    with pa.OSFile(path, "rb") as handle:
        file = pq.ParquetFile(handle, pre_buffer=False)
        _require_names(file.schema_arrow.names, options["columns"])
        table = file.read_row_groups(options["groups"], columns=options["columns"], use_threads=False)
        return _arrays(table, options["columns"]), {"rows": table.num_rows}


def _require_names(names: list[str], wanted: list[str]) -> None:
    for name in wanted:
        if name not in names:
            raise Refused(f"there is no column '{name}'", nearest_hint(name, names))
        if names.count(name) > 1:
            raise Refused(f"there are {names.count(name)} columns '{name}'", "rename one of them")


def _arrays(table: Any, wanted: list[str]) -> dict[str, np.ndarray]:
    return {str(place): _numbers(table, name) for place, name in enumerate(wanted)}


def _numbers(table: Any, name: str) -> np.ndarray:
    import pyarrow as pa

    column = table.column(name)
    kind = column.type
    if not (pa.types.is_integer(kind) or pa.types.is_floating(kind) or pa.types.is_timestamp(kind)):
        raise Refused(f"column '{name}' holds {kind}, not numbers")
    values = column.to_numpy()
    if values.dtype.kind == "M":
        values = values.astype("datetime64[ns]")
    return values


def sample(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """The first rows of every numeric column, the number of rows, and the statements in the schema's metadata."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    with pa.OSFile(path, "rb") as handle:
        file = pq.ParquetFile(handle, pre_buffer=False)
        numeric = [
            part.name
            for part in file.schema_arrow
            if pa.types.is_integer(part.type) or pa.types.is_floating(part.type) or pa.types.is_timestamp(part.type)
        ]
        batch = next(file.iter_batches(options["rows"], columns=numeric, use_threads=False), None)
        table = pa.Table.from_batches([batch]) if batch is not None else file.schema_arrow.empty_table()
        arrays = {name: _numbers(table, name) for name in numeric}
        metadata = file.schema_arrow.metadata or {}
        statements = [value.decode("utf-8", "replace") for key, value in metadata.items() if b"statement" in key]
        return arrays, {"rows": file.metadata.num_rows, "statements": statements}
