"""Readers that stand on third-party libraries for binary formats.

Each module has `read_…(path, options) -> (arrays, meta)` and is imported in the confined child process only
(see `trunnion.tables.confine`): arrays are plain numpy arrays, meta is plain JSON.
"""
