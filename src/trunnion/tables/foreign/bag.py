"""ROS 2 bags through rosbags, MCAP files through mcap; the message types come from the library, never from the file.

A bag may carry its own type definitions; they are not used, so nothing of the file is turned into code and a cyclic
definition harms nobody.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np

from trunnion.tables.nearest import nearest_hint
from trunnion.tables.refusals import Refused, missing_library

Attitude = tuple[Any, Any, str, str]  # quaternion, stamp, reference frame, body frame


def _header(message: Any) -> tuple[Any, str]:
    return message.header.stamp, message.header.frame_id


def _pose_like(path: str, child: str = "") -> Callable[[Any], Iterator[Attitude]]:
    def take(message: Any) -> Iterator[Attitude]:
        quaternion = message
        for part in path.split("."):
            quaternion = getattr(quaternion, part)
        stamp, frame = _header(message)
        yield quaternion, stamp, frame, getattr(message, child) if child else ""

    return take


def _bare(path: str) -> Callable[[Any], Iterator[Attitude]]:
    def take(message: Any) -> Iterator[Attitude]:
        yield (getattr(message, path) if path else message), None, "", ""

    return take


def _transforms(message: Any) -> Iterator[Attitude]:
    for part in message.transforms:
        stamp, frame = _header(part)
        yield part.transform.rotation, stamp, frame, part.child_frame_id


def _imu(message: Any) -> Iterator[Attitude]:
    if message.orientation_covariance[0] == -1.0:
        raise Refused("the messages say that they hold no orientation (first covariance entry is -1)")
    yield message.orientation, *_header(message), ""


TYPES: dict[str, Callable[[Any], Iterator[Attitude]]] = {
    "geometry_msgs/msg/QuaternionStamped": _pose_like("quaternion"),
    "geometry_msgs/msg/PoseStamped": _pose_like("pose.orientation"),
    "geometry_msgs/msg/PoseWithCovarianceStamped": _pose_like("pose.pose.orientation"),
    "geometry_msgs/msg/TransformStamped": _pose_like("transform.rotation", "child_frame_id"),
    "nav_msgs/msg/Odometry": _pose_like("pose.pose.orientation", "child_frame_id"),
    "sensor_msgs/msg/Imu": _imu,
    "geometry_msgs/msg/Quaternion": _bare(""),
    "geometry_msgs/msg/Pose": _bare("orientation"),
    "tf2_msgs/msg/TFMessage": _transforms,
}


def list_topics(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """Every topic with its type, number of messages, and whether its type holds attitudes."""
    with _open(Path(path)) as bag:
        topics = [
            {"name": name, "type": kind, "count": count, "attitude": kind in TYPES}
            for name, kind, count in bag.topics()
        ]
    return {}, {"topics": topics}


def read_topic(path: str, options: dict[str, Any]) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """Times (ns) and quaternions (N, 4) x y z w of one topic, and the frames its headers name."""
    with _open(Path(path)) as bag:
        topics = {name: kind for name, kind, _ in bag.topics()}
        topic = options["topic"]
        if topic not in topics:
            raise Refused(f"there is no topic '{topic}'", nearest_hint(topic, topics))
        kind = topics[topic]
        if kind not in TYPES:
            raise Refused(
                f"topic '{topic}' is of type {kind}, which holds no attitude known here", nearest_hint(kind, TYPES)
            )
        rows, frames, stamped = _collect(bag.messages(topic), TYPES[kind], options)
    times = np.array([row[0] for row in rows], dtype=np.int64)
    xyzw = np.array([row[1:] for row in rows], dtype=float).reshape(-1, 4)
    clock = "times are the header stamps" if stamped else "times are those of the recording"
    facts = {"frames": "named in the headers"} if all(one and other for one, other in frames) else {}
    meta = {"type": kind, "frames": sorted(map(list, frames)), "clock": clock, "facts": facts}
    return {"time": times, "xyzw": xyzw}, meta


def _collect(
    messages: Iterator[tuple[int, Any]], take: Callable[[Any], Iterator[Attitude]], options: dict[str, Any]
) -> tuple[list[tuple[Any, ...]], set[tuple[str, str]], bool]:
    """Rows (time, x, y, z, w); of transform lists only those between the stated frames."""
    rows: list[tuple[Any, ...]] = []
    frames: set[tuple[str, str]] = set()
    stamped = True
    for recorded, message in messages:
        for q, stamp, reference, body in take(message):
            if take is _transforms and (reference, body) != (options["reference"], options["body"]):
                continue
            usable = stamp is not None and (stamp.sec or stamp.nanosec)
            stamped = stamped and bool(usable)
            time = stamp.sec * 10**9 + stamp.nanosec if usable else recorded
            rows.append((time, q.x, q.y, q.z, q.w))
            frames.add((reference, body))
    if not rows:
        raise Refused(
            "the topic holds no attitude between the stated frames", "state the frames as the headers name them"
        )
    return rows, frames, stamped


def _open(path: Path) -> Any:
    return _McapFile(path) if path.is_file() else _RosBag(path)


def _typestore() -> Any:
    try:
        from rosbags.typesys import Stores, get_typestore
    except ImportError as err:
        raise missing_library("rosbags", "bags") from err
    return get_typestore(Stores.ROS2_HUMBLE)


class _RosBag:
    """A rosbag2 folder."""

    def __init__(self, path: Path) -> None:
        self.store = _typestore()
        from rosbags.rosbag2 import Reader

        self.reader = Reader(path)

    def __enter__(self) -> _RosBag:
        self.reader.open()
        return self

    def __exit__(self, *_: object) -> None:
        self.reader.close()

    def topics(self) -> list[tuple[str, str, int]]:
        """(name, type, number of messages) of each topic."""
        return [(found.topic, found.msgtype, found.msgcount) for found in self.reader.connections]

    def messages(self, topic: str) -> Iterator[tuple[int, Any]]:
        """(recording time ns, message) of one topic."""
        wanted = [found for found in self.reader.connections if found.topic == topic]
        for connection, time, data in self.reader.messages(connections=wanted):
            yield time, self.store.deserialize_cdr(data, connection.msgtype)


class _McapFile:
    """An MCAP file with messages in CDR or JSON."""

    def __init__(self, path: Path) -> None:
        try:
            from mcap.reader import make_reader
        except ImportError as err:
            raise missing_library("mcap", "bags") from err
        self.handle = path.open("rb")
        if self.handle.read(8) != b"\x89MCAP0\r\n":
            self.handle.close()
            raise Refused("this is no MCAP file: its first bytes are wrong")
        self.handle.seek(0)
        self.reader = make_reader(self.handle, validate_crcs=True)

    def __enter__(self) -> _McapFile:
        return self

    def __exit__(self, *_: object) -> None:
        self.handle.close()

    def topics(self) -> list[tuple[str, str, int]]:
        """(name, type, number of messages) of each channel; a file without its summary is damaged."""
        summary = self.reader.get_summary()
        if summary is None or summary.statistics is None:
            raise Refused("the MCAP file has no summary at its end", "it was cut or never closed; recover it first")
        counts = summary.statistics.channel_message_counts
        return [
            (channel.topic, summary.schemas[channel.schema_id].name if channel.schema_id else "", counts.get(number, 0))
            for number, channel in summary.channels.items()
        ]

    def messages(self, topic: str) -> Iterator[tuple[int, Any]]:
        """(recording time ns, message) of one topic."""
        store = None
        for schema, channel, message in self.reader.iter_messages(topics=[topic]):
            if channel.message_encoding == "json":
                yield message.log_time, json.loads(message.data, object_hook=_Record)
            elif channel.message_encoding == "cdr" and schema is not None:
                store = store or _typestore()
                yield message.log_time, store.deserialize_cdr(message.data, schema.name)
            else:
                raise Refused(f"messages in encoding '{channel.message_encoding}' are not read", "cdr and json are")


class _Record:
    """A JSON object with its keys as attributes."""

    def __init__(self, values: dict[str, Any]) -> None:
        self.__dict__.update(values)
