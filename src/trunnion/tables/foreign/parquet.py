"""Parquet through pyarrow."""

from __future__ import annotations

from typing import Any

import numpy as np

from trunnion.tables.nearest import nearest_hint
from trunnion.tables.refusals import Refused


def read_columns(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """Named columns as arrays "0", "1", … and the key-value texts of the file's schema."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    with pa.OSFile(path, "rb") as handle:
        file = pq.ParquetFile(handle, pre_buffer=False)
        names = file.schema_arrow.names
        for name in options["columns"]:
            if name not in names:
                raise Refused(f"there is no column '{name}'", nearest_hint(name, names))
            if names.count(name) > 1:
                raise Refused(f"there are {names.count(name)} columns '{name}'", "rename one of them")
        table = file.read(columns=options["columns"], use_threads=False)
        arrays = {str(place): _numbers(table, name) for place, name in enumerate(options["columns"])}
        return arrays, {"rows": table.num_rows}


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


def describe(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """Names and types of all columns, and the least and largest value of each numeric one."""
    import pyarrow.parquet as pq

    file = pq.ParquetFile(path)
    columns = [[field.name, str(field.type)] for field in file.schema_arrow]
    return {}, {"rows": file.metadata.num_rows, "columns": columns}
