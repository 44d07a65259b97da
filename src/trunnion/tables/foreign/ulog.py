"""ULog through pyulog."""

from __future__ import annotations

from typing import Any

import numpy as np

from trunnion.tables.refusals import Refused


def read_topic(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """Fields of one topic as arrays "0", "1", …, its time stamps, the corruption flag and the dropouts (ms)."""
    from pyulog import ULog

    log = ULog(path, [options["topic"]])
    found = [data for data in log.data_list if data.multi_id == options["instance"]]
    if not found:
        raise Refused(f"the log reader finds no samples of topic '{options['topic']}'")
    fields = max(found, key=lambda data: len(data.data["timestamp"])).data
    arrays = {str(place): np.asarray(fields[name]) for place, name in enumerate(options["columns"])}
    arrays["stamps"] = np.asarray(fields["timestamp"])
    meta = {"corrupt": bool(log.file_corruption), "dropouts": [int(drop.duration) for drop in log.dropouts]}
    return arrays, meta
