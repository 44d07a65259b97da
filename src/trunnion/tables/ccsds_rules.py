"""The keys, orders and text rules of attitude messages in key-value notation.

Source: CCSDS-504.0-B-2 tables 3-1 to 3-3, 4-2 to 4-4 and sections 6.6 to 6.10; edition 1 from annex J of the same.
"""

from __future__ import annotations

import re

MAX_LINE = 254

#: (key, obligatory) in the order the edition demands.
HEADER = (
    ("COMMENT", False),
    ("CLASSIFICATION", False),
    ("CREATION_DATE", True),
    ("ORIGINATOR", True),
    ("MESSAGE_ID", False),
)
AEM_METADATA = (
    ("COMMENT", False),
    ("OBJECT_NAME", True),
    ("OBJECT_ID", True),
    ("CENTER_NAME", False),
    ("REF_FRAME_A", True),
    ("REF_FRAME_B", True),
    ("TIME_SYSTEM", True),
    ("START_TIME", True),
    ("USEABLE_START_TIME", False),
    ("USEABLE_STOP_TIME", False),
    ("STOP_TIME", True),
    ("ATTITUDE_TYPE", True),
    ("EULER_ROT_SEQ", False),
    ("ANGVEL_FRAME", False),
    ("INTERPOLATION_METHOD", False),
    ("INTERPOLATION_DEGREE", False),
)
APM_METADATA = (
    ("COMMENT", False),
    ("OBJECT_NAME", True),
    ("OBJECT_ID", True),
    ("CENTER_NAME", False),
    ("TIME_SYSTEM", True),
)
_FRAMES = (("COMMENT", False), ("REF_FRAME_A", True), ("REF_FRAME_B", True))
APM_BLOCKS = {
    "QUAT": (
        *_FRAMES,
        *((key, True) for key in ("Q1", "Q2", "Q3", "QC")),
        *((key, False) for key in ("Q1_DOT", "Q2_DOT", "Q3_DOT", "QC_DOT")),
    ),
    "EULER": (
        *_FRAMES,
        ("EULER_ROT_SEQ", True),
        *((key, True) for key in ("ANGLE_1", "ANGLE_2", "ANGLE_3")),
        *((key, False) for key in ("ANGLE_1_DOT", "ANGLE_2_DOT", "ANGLE_3_DOT")),
    ),
    "ANGVEL": (
        *_FRAMES,
        ("ANGVEL_FRAME", True),
        *((key, True) for key in ("ANGVEL_X", "ANGVEL_Y", "ANGVEL_Z")),
    ),
    "SPIN": None,
    "INERTIA": None,
    "MAN": None,
}

QUATERNION = ("Q1", "Q2", "Q3", "QC")
ANGLES = ("ANGLE_1", "ANGLE_2", "ANGLE_3")
SPIN = ("SPIN_ALPHA", "SPIN_DELTA", "SPIN_ANGLE", "SPIN_ANGLE_VEL")
ANGVEL = ("ANGVEL_X", "ANGVEL_Y", "ANGVEL_Z")

#: The values after the epoch for each ATTITUDE_TYPE, by edition.
ROWS_B2 = {
    "QUATERNION": QUATERNION,
    "QUATERNION/DERIVATIVE": (*QUATERNION, "Q1_DOT", "Q2_DOT", "Q3_DOT", "QC_DOT"),
    "QUATERNION/ANGVEL": (*QUATERNION, *ANGVEL),
    "EULER_ANGLE": ANGLES,
    "EULER_ANGLE/DERIVATIVE": (*ANGLES, "ANGLE_1_DOT", "ANGLE_2_DOT", "ANGLE_3_DOT"),
    "EULER_ANGLE/ANGVEL": (*ANGLES, *ANGVEL),
    "SPIN": SPIN,
    "SPIN/NUTATION": (*SPIN, "NUTATION", "NUTATION_PER", "NUTATION_PHASE"),
    "SPIN/NUTATION_MOM": (*SPIN, "MOMENTUM_ALPHA", "MOMENTUM_DELTA", "NUTATION_VEL"),
}
ROWS_B1 = {
    "QUATERNION": QUATERNION,
    "QUATERNION/DERIVATIVE": (*QUATERNION, "Q1_DOT", "Q2_DOT", "Q3_DOT", "QC_DOT"),
    "QUATERNION/RATE": (*QUATERNION, "X_RATE", "Y_RATE", "Z_RATE"),
    "EULER_ANGLE": ANGLES,
    "EULER_ANGLE/RATE": (*ANGLES, "X_RATE", "Y_RATE", "Z_RATE"),
    "SPIN": SPIN,
    "SPIN/NUTATION": (*SPIN, "NUTATION", "NUTATION_PER", "NUTATION_PHASE"),
}

KEY = re.compile(r"[A-Z0-9_]+")
UNIT = re.compile(r"(.*\S)\s+\[([^\]]*)\]")
_NUMBER = re.compile(r"[+-]?(?:\d+|\d+\.\d+|\d\.\d+[Ee][+-]?\d{1,3})")
_DIGITS_FIXED = 16


def number_fault(text: str) -> str | None:
    """What is wrong with a number's form, or None. Fixed point has at most 16 digits, a floating one a single first."""
    if _NUMBER.fullmatch(text) is None:
        return "is not a fixed-point or floating-point number of the standard's form"
    if "e" not in text.lower() and sum(mark.isdigit() for mark in text) > _DIGITS_FIXED:
        return f"has more than {_DIGITS_FIXED} digits"
    if text.startswith("-") and float(text) == 0.0:
        return "is a negative zero"
    return None


def plain_value(text: str) -> str:
    """A text value as it compares: upper case, an underscore as a blank, runs of blanks as one."""
    return " ".join(text.upper().replace("_", " ").split())


def text_value_fault(text: str) -> str | None:
    """Text values are all upper or all lower case."""
    return None if text in (text.upper(), text.lower()) else "mixes upper and lower case"
