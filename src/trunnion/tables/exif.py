"""The few EXIF tags of a photo that bear on attitude: image direction, its north, and the date.

Layout of TIFF 6.0 and CIPA DC-008 (EXIF 2.3), values from memory; checked against Pillow in the tests.
"""

from __future__ import annotations

import struct

_MAX_ENTRIES = 1000
_SIZES = {1: 1, 2: 1, 3: 2, 4: 4, 5: 8, 7: 1, 9: 4, 10: 8}
_EXIF_POINTER, _GPS_POINTER = 0x8769, 0x8825
_TAGS = {
    (_EXIF_POINTER, 0x9003): "exif:DateTimeOriginal",
    (_GPS_POINTER, 0x0010): "exif:GPSImgDirectionRef",
    (_GPS_POINTER, 0x0011): "exif:GPSImgDirection",
}


def exif_tags(data: bytes) -> dict[str, str]:
    """Texts of the known tags in the first bytes of a JPEG or TIFF; empty where there are none or they are broken.

    GPSImgDirectionRef is T (true north) or M (magnetic north).
    """
    start = data.find(b"Exif\0\0")
    tiff = data[start + 6 :] if start >= 0 else data
    order = {b"II*\0": "<", b"MM\0*": ">"}.get(tiff[:4])
    if order is None:
        return {}
    try:
        first = struct.unpack_from(order + "I", tiff, 4)[0]
        pointers = _directory(tiff, first, order, (_EXIF_POINTER, _GPS_POINTER))
        tags: dict[str, str] = {}
        for pointer, place in pointers.items():
            wanted = {number: name for (group, number), name in _TAGS.items() if group == pointer}
            found = _directory(tiff, int(place), order, tuple(wanted))
            tags.update({wanted[number]: text for number, text in found.items()})
        return tags
    except (struct.error, UnicodeDecodeError, ValueError, ZeroDivisionError):
        return {}


def _directory(tiff: bytes, place: int, order: str, wanted: tuple[int, ...]) -> dict[int, str]:
    """Values of the wanted tags in one directory; only two directories are ever followed, so nothing can circle."""
    (count,) = struct.unpack_from(order + "H", tiff, place)
    found = {}
    for entry in range(min(count, _MAX_ENTRIES)):
        at = place + 2 + 12 * entry
        number, kind, length = struct.unpack_from(order + "HHI", tiff, at)
        if number in wanted and kind in _SIZES:
            size = _SIZES[kind] * length
            value_at = at + 8 if size <= 4 else struct.unpack_from(order + "I", tiff, at + 8)[0]
            found[number] = _value(tiff[value_at : value_at + min(size, 256)], kind, order)
    return found


def _value(data: bytes, kind: int, order: str) -> str:
    if kind == 2:
        return data.rstrip(b"\0").decode("ascii")
    if kind in (5, 10):
        above, below = struct.unpack_from(order + ("II" if kind == 5 else "ii"), data)
        return repr(above / below)
    letter = {1: "B", 3: "H", 4: "I", 7: "B", 9: "i"}[kind]
    return str(struct.unpack_from(order + letter, data)[0])
