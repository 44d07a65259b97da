"""MAT files through scipy.io (version 5) and h5py (version 7.3, an HDF5 file). Numbers only; no objects, no pickles."""

from __future__ import annotations

import re
from typing import Any

import numpy as np

from trunnion.tables.nearest import nearest_hint
from trunnion.tables.refusals import Refused, missing_library

_COLUMN = re.compile(r"([A-Za-z]\w*(?:\.[A-Za-z]\w*)*)(?:\((:|\d+),(:|\d+)\))?")
_MAX_DEPTH = 6


def read_columns(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """Named columns as arrays "0", "1", …; all must have the same length."""
    held = _arrays(path)
    arrays = {str(place): _column(held, name) for place, name in enumerate(options["columns"])}
    lengths = {name: len(arrays[str(place)]) for place, name in enumerate(options["columns"])}
    if len(set(lengths.values())) > 1:
        raise Refused(f"the columns differ in length: {', '.join(f'{name} {size}' for name, size in lengths.items())}")
    return arrays, {}


def list_arrays(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """The first rows of every numeric vector, and of every column of a matrix that is longer than wide."""
    columns: dict[str, np.ndarray] = {}
    for name, values in _arrays(path).items():
        flat = values.squeeze()
        if flat.ndim == 1:
            columns[name] = flat[: options["rows"]]
        elif values.ndim == 2 and values.shape[1] <= 16:
            for place in range(values.shape[1]):
                columns[f"{name}(:,{place + 1})"] = values[: options["rows"], place]
    return columns, {}


def _column(held: dict[str, np.ndarray], text: str) -> np.ndarray:
    match = _COLUMN.fullmatch(text.replace(" ", ""))
    if match is None:
        raise Refused(f"'{text}' names no column", "write t, log.q(:,1) or R(3,:)")
    name, row, column = match.groups()
    if name not in held:
        raise Refused(f"there is no array '{name}'", nearest_hint(name, held))
    values = held[name]
    if row is None:
        flat = values.squeeze()
        if flat.ndim > 1:
            raise Refused(f"'{name}' is {' x '.join(map(str, values.shape))}", f"name one column of it: {name}(:,1)")
        return np.atleast_1d(flat)
    if values.ndim != 2 or (row == ":") == (column == ":"):
        raise Refused(f"'{text}' names no single row or column of a matrix")
    try:
        return values[:, int(column) - 1] if row == ":" else values[int(row) - 1, :]
    except IndexError as err:
        raise Refused(f"'{text}' is outside {values.shape[0]} x {values.shape[1]}") from err


def _arrays(path: str) -> dict[str, np.ndarray]:
    """Every real numeric array of the file by dotted name."""
    with open(path, "rb") as handle:
        head = handle.read(520)
    if head[:8] == b"\x89HDF\r\n\x1a\n" or head[512:520] == b"\x89HDF\r\n\x1a\n":
        return _arrays_of_hdf5(path)
    if not head.startswith(b"MATLAB 5.0"):
        raise Refused("this is no MAT file of version 5 or 7.3", "save it with -v7 or -v7.3")
    from scipy.io import loadmat

    held: dict[str, np.ndarray] = {}
    for name, value in loadmat(path, struct_as_record=True, squeeze_me=False).items():
        _add(held, name, value, 0)
    return held


def _add(held: dict[str, np.ndarray], name: str, value: Any, depth: int) -> None:
    if not isinstance(value, np.ndarray) or depth > _MAX_DEPTH:
        return
    if value.dtype.names:
        if value.size == 1:
            for key in value.dtype.names:
                _add(held, f"{name}.{key}", value.reshape(-1)[0][key], depth + 1)
    elif value.dtype.kind in "iuf":
        held[name] = value


def _arrays_of_hdf5(path: str) -> dict[str, np.ndarray]:
    try:
        import h5py
    except ImportError as err:
        raise missing_library("h5py", "mat") from err
    held: dict[str, np.ndarray] = {}
    with h5py.File(path, "r") as file:
        _walk(file, "", held, h5py, 0)
    return held


def _walk(group: Any, prefix: str, held: dict[str, np.ndarray], h5py: Any, depth: int) -> None:
    """Hard links only: soft and external links could lead in circles or out of the file."""
    if depth > _MAX_DEPTH:
        return
    for key in group:
        if not isinstance(group.get(key, getlink=True), h5py.HardLink):
            continue
        item, name = group[key], f"{prefix}{key}"
        if isinstance(item, h5py.Group):
            _walk(item, f"{name}.", held, h5py, depth + 1)
        elif isinstance(item, h5py.Dataset) and item.dtype.kind in "iuf" and not item.external and not item.is_virtual:
            held[name] = np.asarray(item[()]).T  # stored column by column, so HDF5 shows the transpose
