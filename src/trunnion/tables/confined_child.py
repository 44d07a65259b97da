"""The child side of `trunnion.tables.confine`: set the limits, import the reader, write arrays."""

from __future__ import annotations

import importlib
import json
import math
import os
import sys
from pathlib import Path
from typing import Any

from trunnion.tables.refusals import Refused


def main() -> int:
    """Read the job from standard input, run it, write result or refusal; the exit code is 0 in both cases."""
    job = json.loads(sys.stdin.buffer.read())
    _set_limits(job)
    os.dup2(2, 1)  # whatever a library prints goes where error text goes
    try:
        arrays, meta = _call(job)
        _write(job["result"], arrays, meta)
    except MemoryError:
        _refuse(job, "memory", "")
    except Refused as err:
        _refuse(job, err.kind, str(err), err.remedy)
    except RecursionError:
        _refuse(job, "refused", "the file nests its own definitions without end")
    except Exception as err:
        if _is_memory(err):
            _refuse(job, "memory", "")
        else:
            _refuse(job, "refused", f"the reader refuses the file: {type(err).__name__}: {str(err)[:300]}")
    return 0


def _set_limits(job: dict[str, Any]) -> None:
    """Limits on address space, processor time, core files and written bytes, where the system has them."""
    try:
        import resource
    except ImportError:  # not a Unix: the parent's wall time is the only limit there
        return
    space = int(job["address_space"])
    cpu = max(1, math.ceil(job["cpu_seconds"]))
    resource.setrlimit(resource.RLIMIT_AS, (space, space))
    resource.setrlimit(resource.RLIMIT_CPU, (cpu, cpu + 1))
    resource.setrlimit(resource.RLIMIT_CORE, (0, 0))
    resource.setrlimit(resource.RLIMIT_FSIZE, (space, space))


def _call(job: dict[str, Any]) -> tuple[dict[str, Any], dict[str, Any]]:
    module_name, function_name = job["reader"].split(":")
    function = getattr(importlib.import_module(module_name), function_name)
    arrays, meta = function(job["path"], job["options"])
    return arrays, meta


def _write(result: str, arrays: dict[str, Any], meta: dict[str, Any]) -> None:
    import numpy as np

    from trunnion.tables.confine import META

    plain = {name: np.ascontiguousarray(values) for name, values in arrays.items()}
    for name, values in plain.items():
        if values.dtype.hasobject:
            raise Refused(f"the reader gave objects instead of numbers for '{name}'")
    plain[META] = np.frombuffer(json.dumps(meta).encode(), dtype=np.uint8)
    np.savez(result, **plain)  # type: ignore[arg-type]


def _refuse(job: dict[str, Any], kind: str, words: str, remedy: str = "") -> None:
    text = json.dumps({"kind": kind, "words": words, "remedy": remedy})
    Path(job["refusal"]).write_text(text, encoding="utf-8")


def _is_memory(err: BaseException) -> bool:
    """Libraries wrap a failed allocation in errors of their own; their names and texts give it away."""
    words = f"{type(err).__name__} {err}".lower()
    return any(mark in words for mark in ("bad_alloc", "memoryerror", "out of memory", "malloc of size", "realloc of"))


if __name__ == "__main__":
    sys.exit(main())
