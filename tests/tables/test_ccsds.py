"""Attitude messages against the standard's own numbers (CCSDS 504.0-B-2) and a public test file of another program."""

from __future__ import annotations

import contextlib
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import matrix_from_quaternion, quaternion_angle
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import TableError
from trunnion.tables import read_table, statement_from_plain
from trunnion.tables.ccsds_message import parse_message
from trunnion.tables.ccsds_write import MessageHead, aem_text, apm_text
from trunnion.tables.epochs import LEAP_DAYS, epoch_text, nanoseconds

DATA = Path(__file__).parent / "data"
PRINTED_12 = 3e-12  # rad; the messages print 12 decimals of a quaternion
HALF_FOURTH_DIGIT = 5.1e-5  # annex F5.4 prints four decimals

#: Expected for data/constant-rate.aem: a turn at (0.02, -0.03, 0.05) deg/s in B from ZYX (30, -10, 5) deg, by scipy.
RATE_DEG = np.array([0.02, -0.03, 0.05])
START = Rotation.from_euler("ZYX", [30.0, -10.0, 5.0], degrees=True)

#: CS-SI/Orekit AEMExample14.txt, quaternion segment: t s, Q1 Q2 Q3 QC as printed there (6 decimals).
OREKIT = """\
0 0.17101 -0.030154 0.336824 0.925417
30 0.397131 0.144544 0.309976 0.851651
60 0.413176 0.492404 0.262003 0.719846
90 0.142244 0.806707 0.196175 0.538986
120 -0.32139 0.883022 0.116978 0.321394
150 -0.763129 0.640342 0.029809 0.0819
180 -0.969846 0.17101 -0.059391 -0.163176
210 -0.851651 -0.309976 -0.144544 -0.397131
300 0.116978 -0.321394 -0.321394 -0.883022"""


def statement(name, **changes):
    plain = {"table": name, "reference": "EME2000", "body": "SC_BODY_1", "between samples": "slerp"}
    plain.update({key.replace("_", " "): value for key, value in changes.items()})
    return statement_from_plain({key: value for key, value in plain.items() if value is not None})


def aem(kind: str, rows: list[str], sequence: str | None = None, extra: str = "", edition: str = "2.0") -> str:
    """A small AEM with one segment."""
    lines = [
        f"CCSDS_AEM_VERS = {edition}", "CREATION_DATE = 2031-05-01T10:00:00", "ORIGINATOR = EXAMPLE", "META_START",
        "OBJECT_NAME = DEMOSAT 1", "OBJECT_ID = 2031-001A", "REF_FRAME_A = EME2000", "REF_FRAME_B = SC_BODY_1",
        "TIME_SYSTEM = UTC", "START_TIME = 2031-05-01T00:00:00", "STOP_TIME = 2031-05-01T00:30:00",
        f"ATTITUDE_TYPE = {kind}", *([f"EULER_ROT_SEQ = {sequence}"] if sequence else []),
        *([extra] if extra else []), "META_STOP", "DATA_START", *rows, "DATA_STOP",
    ]  # fmt: skip
    return "\n".join(lines) + "\n"


def read_text(tmp_path, text, **changes):
    (tmp_path / "message.aem").write_text(text)
    return read_table(statement("message.aem", **changes), tmp_path)


def one_row(tmp_path, kind, values, sequence=None, extra="", edition="2.0", **changes):
    row = "2031-05-01T00:00:00 " + " ".join(str(value) for value in values)
    return read_text(tmp_path, aem(kind, [row], sequence, extra, edition), **changes)


@pytest.mark.parametrize("segment", [1, 2])
def test_quaternion_and_angle_segments_are_one_motion_at_constant_rate(segment):
    table = read_table(statement("constant-rate.aem", segment=segment), DATA)
    expected = START * Rotation.from_rotvec(np.radians(RATE_DEG) * table.times[:, None])
    gap = quaternion_angle(table.quaternions, np.roll(expected.as_quat(), 1, axis=1))
    assert np.max(gap) < PRINTED_12
    np.testing.assert_allclose(table.times, [0.0, 60.0, 120.0, 180.0], rtol=0, atol=1e-9)
    np.testing.assert_allclose(np.degrees(table.body_rates), np.tile(RATE_DEG, (4, 1)), rtol=0, atol=1e-12)


def test_pole_rows_are_the_attitudes_the_outer_angles_make_together():
    """Rows 1 and 2 have the same difference of outer angles at +90 deg, rows 3 and 4 the same sum at -90 deg."""
    q = read_table(statement("constant-rate.aem", segment=3), DATA).quaternions
    assert quaternion_angle(q[0], q[1]) < 1e-12
    assert quaternion_angle(q[2], q[3]) < 1e-12
    assert quaternion_angle(q[0], q[2]) > 1.0


def test_the_apm_says_one_attitude_in_two_ways():
    table = read_table(statement("constant-rate.apm"), DATA)
    assert quaternion_angle(table.quaternions[0], np.roll(START.as_quat(), 1)) < PRINTED_12
    np.testing.assert_allclose(np.degrees(table.body_rates[0]), RATE_DEG, rtol=0, atol=1e-12)


def test_several_segments_are_asked_for_and_frames_must_be_the_files_own():
    with pytest.raises(TableError, match=r"which of the message's parts.*\n.*3 = segment 3 \(EULER_ANGLE, DEMOSAT 1\)"):
        read_table(statement("constant-rate.aem"), DATA)
    with pytest.raises(TableError, match="the message's frames are EME2000 and SC_BODY_1"):
        read_table(statement("constant-rate.aem", segment=1, body="SC_BODY_2"), DATA)
    with pytest.raises(TableError, match="which of the file's two frames is the body"):
        read_table(statement("constant-rate.aem", segment=1, body=None, reference=None), DATA)
    swapped = read_table(statement("constant-rate.aem", segment=1, body="EME2000", reference="SC_BODY_1"), DATA)
    direct = read_table(statement("constant-rate.aem", segment=1), DATA)
    np.testing.assert_allclose(swapped.quaternions, direct.quaternions * [1, -1, -1, -1], rtol=0, atol=1e-15)


def test_annex_f2_2_quarter_turn_about_z(tmp_path):
    """504.0-B-2 annex F2.2: Q = (0, 0, r, r), r = sqrt(1/2): MBA = [0 1 0; -1 0 0; 0 0 1], XA = (1,0,0) to (0,-1,0)."""
    r = repr(float(np.sqrt(0.5)))
    M_ab = matrix_from_quaternion(one_row(tmp_path, "QUATERNION", ["0.0", "0.0", r, r]).quaternions[0])
    np.testing.assert_allclose(M_ab.T, [[0, 1, 0], [-1, 0, 0], [0, 0, 1]], rtol=0, atol=1e-15)
    np.testing.assert_allclose(M_ab.T @ [1, 0, 0], [0, -1, 0], rtol=0, atol=1e-15)


def test_annex_f5_4_spin_at_epoch(tmp_path):
    """504.0-B-2 annex F5.4: alpha 0, delta 80, angle 45 deg; Q and spin axis as printed to four decimals."""
    q = one_row(tmp_path, "SPIN", ["0.0", "80.0", "45.0", "1.0"]).quaternions[0]
    np.testing.assert_allclose(np.roll(q, -1), [0.0805, 0.0334, 0.9204, 0.3812], rtol=0, atol=HALF_FOURTH_DIGIT)
    axis_in_a = matrix_from_quaternion(q)[:, 2]
    np.testing.assert_allclose(axis_in_a, [0.1736, 0.0, 0.9848], rtol=0, atol=HALF_FOURTH_DIGIT)


def test_annex_f5_4_spin_momentum_row_gives_the_attitude_at_its_epoch(tmp_path):
    row = ["0.0", "80.0", "45.0", "1.0", "0.0", "70.0", "0.01"]
    q = one_row(tmp_path, "SPIN/NUTATION_MOM", row).quaternions[0]
    np.testing.assert_allclose(np.roll(q, -1), [0.0805, 0.0334, 0.9204, 0.3812], rtol=0, atol=HALF_FOURTH_DIGIT)


def test_figure_g_2_angles_against_the_first_quaternion_of_figure_g_3(tmp_path):
    """The angles of figure G-2 and the quaternion of figure G-3 are one rotation to the five digits printed there."""
    table = one_row(tmp_path, "EULER_ANGLE", ["-26.78", "46.26", "144.10"], "YXY")
    np.testing.assert_allclose(
        np.roll(table.quaternions[0], -1), [0.03123, 0.78543, 0.39158, 0.47832], rtol=0, atol=2e-5
    )


def test_orekit_example_rows_and_their_zxz_angles_are_one_motion(tmp_path):
    """Signs change along the file and the middle angle runs past 180 deg: nothing may be clipped or mirrored."""
    seconds, *_ = numbers = np.array([line.split() for line in OREKIT.splitlines()], dtype=float).T
    stamps = [epoch_text(nanoseconds("2031-05-01T00:00:00") + round(t * 1e9)) for t in seconds]
    rows = [
        f"{stamp} " + " ".join(f"{x:.6f}" for x in q) for stamp, q in zip(stamps, np.array(numbers[1:]).T, strict=True)
    ]
    from_quaternions = read_text(tmp_path, aem("QUATERNION", [row.replace("-0.000000", "0.000000") for row in rows]))
    angles = np.stack([10 + seconds, 20 + seconds, 30 - seconds], axis=-1)
    rows = [f"{stamp} " + " ".join(f"{x:.1f}" for x in a) for stamp, a in zip(stamps, angles, strict=True)]
    from_angles = read_text(tmp_path, aem("EULER_ANGLE", [row.replace("-0.0", "0.0") for row in rows], "ZXZ"))
    # the row at 120 s has -0.321390 where -0.321394 is exact: 4e-6 in a component, 8e-6 rad of rotation
    assert np.max(quaternion_angle(from_quaternions.quaternions, from_angles.quaternions)) < 9e-6
    assert np.max(np.abs(from_quaternions.times - seconds)) < 1e-9


@pytest.mark.parametrize("sequence", list(Sequence))
def test_every_sequence_against_cspice(tmp_path, sequence):
    """MBA = eul2m(third, second, first) of CSPICE for the axes in reverse."""
    spiceypy = pytest.importorskip("spiceypy")
    angles = (-131.0, 23.0, 77.0)
    M_ab = matrix_from_quaternion(one_row(tmp_path, "EULER_ANGLE", angles, sequence.name).quaternions[0])
    i, j, k = (axis + 1 for axis in sequence.axes)
    one, two, three = np.radians(angles)
    np.testing.assert_allclose(M_ab.T, spiceypy.eul2m(three, two, one, k, j, i), rtol=0, atol=1e-14)


def test_edition_1_keywords_for_direction_and_scalar_place(tmp_path):
    """Annex J of 504.0-B-2: edition 1 has ATTITUDE_DIR and QUATERNION_TYPE; both are obeyed and neither is guessed."""
    last = ["0.1", "0.2", "0.3", "0.9273618495495703"]
    first = [last[3], *last[:3]]
    expected = one_row(tmp_path, "QUATERNION", last).quaternions[0]
    there = one_row(tmp_path, "QUATERNION", last, extra="ATTITUDE_DIR = A2B\nQUATERNION_TYPE = LAST", edition="1.0")
    assert quaternion_angle(there.quaternions[0], expected) < 1e-15
    back = one_row(tmp_path, "QUATERNION", first, extra="ATTITUDE_DIR = B2A\nQUATERNION_TYPE = FIRST", edition="1.0")
    assert quaternion_angle(back.quaternions[0], expected * [1, -1, -1, -1]) < 1e-15
    with pytest.raises(TableError, match="ATTITUDE_DIR"):
        one_row(tmp_path, "QUATERNION", last, edition="1.0")
    with pytest.raises(TableError, match="QUATERNION_TYPE"):
        one_row(tmp_path, "QUATERNION", last, extra="ATTITUDE_DIR = A2B", edition="1.0")


def test_edition_1_example_row_read_as_z_x_y(tmp_path):
    """Row of 504.0-B-1 as excerpted: sequence 312, angles -26.78 46.26 144.10; quaternion by scipy."""
    values = ["-26.78", "46.26", "144.10", "0.1045", "0.03214", "0.02156"]
    extra = "ATTITUDE_DIR = A2B\nRATE_FRAME = REF_FRAME_A"
    table = one_row(tmp_path, "EULER_ANGLE/RATE", values, "312", extra, "1.0")
    expected = Rotation.from_euler("ZXY", [-26.78, 46.26, 144.10], degrees=True).as_quat()
    assert quaternion_angle(table.quaternions[0], np.roll(expected, 1)) < 1e-14


def test_edition_1_parameter_message_has_no_delimiters(tmp_path):
    text = """\
CCSDS_APM_VERS = 1.0
CREATION_DATE = 2031-05-01T10:00:00
ORIGINATOR = EXAMPLE
OBJECT_NAME = DEMOSAT 1
OBJECT_ID = 2031-001A
TIME_SYSTEM = UTC
EPOCH = 2031-05-01T00:00:00
Q_FRAME_A = SC_BODY_1
Q_FRAME_B = EME2000
Q_DIR = A2B
Q1 = 0.1
Q2 = 0.2
Q3 = 0.3
QC = 0.9273618495495703
"""
    (tmp_path / "old.apm").write_text(text)
    q = read_table(statement("old.apm"), tmp_path).quaternions[0]
    np.testing.assert_allclose(q, [0.9273618495495703, -0.1, -0.2, -0.3], rtol=0, atol=1e-15)


def test_a_rate_that_does_not_belong_to_its_quaternion_is_noted(tmp_path):
    """Format sample of a public package's documentation: q . q' = 0.0045 1/s where it must be zero."""
    row = ["0.00005", "0.87543", "0.40949", "0.25678", "0.002", "0.003", "0.004", "0.001"]
    notes = one_row(tmp_path, "QUATERNION/DERIVATIVE", row).notes
    assert any("0.00452 1/s instead of 0" in note for note in notes)


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("REF_FRAME_A = EME2000\n", "", "REF_FRAME_A is missing"),
        ("ATTITUDE_TYPE = QUATERNION/ANGVEL", "ATTITUDE_TYPE = QUATERNIONS", "is not known"),
        ("OBJECT_ID = 2031-001A\n", "OBJECT_ID = 2031-001A\nOBJECT_NAMES = X\n", "OBJECT_NAMES is not a key"),
        ("0.960350390724 0.02", "0.960350390724 9.0 0.02", "8 values where this type has 7"),
        ("0.960350390724", "NaN", "not a finite number"),
        ("T00:01:00.000 0.0767", "T00:00:00.000 0.0767", "is not after the one before"),
        ("T00:01:00.000 0.0767", "T00:61:00.000 0.0767", "is no time of day"),
        ("EULER_ROT_SEQ = ZYX\nANGVEL", "ANGVEL", "needs EULER_ROT_SEQ"),
        ("EULER_ROT_SEQ = ZYX\nANGVEL", "EULER_ROT_SEQ = ZZX\nANGVEL", "same axis"),
        ("ANGVEL_FRAME = SC_BODY_1\n", "", "ANGVEL_FRAME goes with"),
        ("CCSDS_AEM_VERS = 2.0", "CCSDS_AEM_VERS = 3.0", "edition '3.0'"),
        ("CCSDS_AEM_VERS = 2.0", "CCSDS_OEM_VERS = 2.0", "no attitude message"),
        ("MESSAGE_ID = DEMO-0001", "MESSAGE_ID DEMO-0001", "not of the form KEY = value"),
    ],
)
def test_broken_messages_name_line_and_rule(tmp_path, old, new, words):
    text = (DATA / "constant-rate.aem").read_text()
    assert old in text
    with pytest.raises(TableError, match=words):
        read_text(tmp_path, text.replace(old, new, 1), segment=1)


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("0.064508859953", "+6.4508859953e-002", None),  # three-digit exponents as in figure G-5
        ("0.064508859953", "0.06450885995300000", "more than 16 digits"),
        ("0.064508859953", "6450.8859953E-05", "not a fixed-point or floating-point number"),
        ("0.064508859953", "-0.000000", "negative zero"),
        ("METHOD = LINEAR", "METHOD = Linear", "mixes upper and lower case"),
        ("METHOD = LINEAR", "METHOD =\tLINEAR", "holds a TAB"),
        ("COMMENT Invented", "COMMENT " + "x" * 250, "at most 254"),
        (
            "OBJECT_NAME = DEMOSAT 1\nOBJECT_ID = 2031-001A",
            "OBJECT_ID = 2031-001A\nOBJECT_NAME = DEMOSAT 1",
            "fixed order",
        ),
        ("STOP_TIME = 2031-05-01T00:03", "STOP_TIME = 2031-05-01T00:02", "reach beyond START_TIME"),
    ],
)
def test_breaches_of_form_are_seen_without_stopping(old, new, words):
    text = (DATA / "constant-rate.aem").read_text()
    assert old in text
    breaches = parse_message(text.replace(old, new, 1).encode(), "message").breaches
    if words is None:
        assert breaches == []
    else:
        (breach,) = breaches
        assert words in breach.words
        assert not breach.hard


@pytest.mark.parametrize("name", ["constant-rate.aem", "constant-rate.apm"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r", "\n\r"])
def test_the_conforming_messages_break_no_rule_with_any_line_end(name, end):
    text = (DATA / name).read_text().replace("\n", end)
    assert parse_message(text.encode(), name).breaches == []


HEAD = MessageHead(
    originator="EXAMPLE",
    creation_date="2031-05-01T10:00:00",
    object_name="DEMOSAT 1",
    object_id="2031-001A",
    reference_frame="EME2000",
    body_frame="SC_BODY_1",
    time_system="UTC",
    epoch="2016-12-31T23:59:58.5",
    comments=("Invented values",),
)
ZXZ = Convention(
    "zxz",
    Frame("EME2000", ("x", "y", "z")),
    Frame("SC_BODY_1", ("x", "y", "z")),
    Sequence.ZXZ,
    Sense.MOVING,
    ("a", "b", "c"),
)


@pytest.mark.parametrize("convention", [None, ZXZ])
def test_a_written_message_reads_back_across_a_leap_second(tmp_path, csv_statement, write_rows, turns, convention):
    root = write_rows("t,w,x,y,z", np.column_stack([np.arange(400) * 0.25, turns]).tolist())
    table = read_table(csv_statement(), root)
    text = aem_text(table, HEAD, convention)
    assert "2016-12-31T23:59:60.500000000" in text
    assert parse_message(text.encode(), "written").breaches == []
    again = read_text(tmp_path, text)
    assert np.max(quaternion_angle(again.quaternions, table.quaternions)) < 1e-13
    np.testing.assert_allclose(again.times - again.times[0], table.times, rtol=0, atol=1e-9)


def test_a_written_parameter_message_reads_back(tmp_path, turns):
    text = apm_text(turns[7], HEAD, ZXZ)
    (tmp_path / "one.apm").write_text(text)
    q = read_table(statement("one.apm", segment=None), tmp_path).quaternions[0]
    assert quaternion_angle(q, turns[7]) < 1e-14


def test_what_the_standard_can_not_carry_is_refused(tmp_path, csv_statement, write_rows):
    root = write_rows("t,w,x,y,z", [(0, 1, 0, 0, 0)])
    table = read_table(csv_statement(), root)
    fixed = Convention("fixed", ZXZ.reference, ZXZ.body, Sequence.ZYX, Sense.FIXED, ("a", "b", "c"))
    with pytest.raises(TableError, match="moving axes only"):
        aem_text(table, HEAD, fixed)
    with pytest.raises(TableError, match="at the lock of 'zxz'"):
        aem_text(table, HEAD, ZXZ)
    with pytest.raises(TableError, match="not printable ASCII"):
        apm_text(
            np.array([1.0, 0, 0, 0]), MessageHead(**{**HEAD.__dict__, "comments": ("attitude of 5\N{DEGREE SIGN}",)})
        )


def test_leap_seconds_against_erfa():
    """Every leap second of the IERS series as ERFA holds it."""
    erfa = pytest.importorskip("erfa")
    steps = [(int(row["year"]), int(row["month"])) for row in erfa.leap_seconds.get() if row["year"] >= 1972][1:]
    days = [(day.year, 7) if day.month == 6 else (day.year + 1, 1) for day in LEAP_DAYS]
    assert days == [step for step in steps if step[0] < 2018]


@given(st.integers(-(10**18), 10**18), st.sampled_from(["UTC", "TAI"]))
def test_every_instant_prints_as_a_time_that_reads_back(count, system):
    assert nanoseconds(epoch_text(count, system), system) == count


@settings(max_examples=100)
@given(st.binary(max_size=400) | st.text(max_size=200).map(str.encode))
def test_any_bytes_end_in_a_message_or_one_error(data):
    for start in (b"", b"CCSDS_AEM_VERS = 2.0\n", b"CCSDS_APM_VERS = 2.0\n", b"CCSDS_AEM_VERS = 1.0\nMETA_START\n"):
        with contextlib.suppress(TableError):
            parse_message(start + data, "fuzzed").require_readable("fuzzed")


XML = """<?xml version="1.0" encoding="UTF-8"?>
<aem id="CCSDS_AEM_VERS" version="2.0"><header><CREATION_DATE>2031-05-01T10:00:00</CREATION_DATE>
<ORIGINATOR>EXAMPLE</ORIGINATOR></header><body><segment><metadata><OBJECT_NAME>DEMOSAT 1</OBJECT_NAME>
<OBJECT_ID>2031-001A</OBJECT_ID><REF_FRAME_A>EME2000</REF_FRAME_A><REF_FRAME_B>SC_BODY_1</REF_FRAME_B>
<TIME_SYSTEM>UTC</TIME_SYSTEM><START_TIME>2031-05-01T00:00:00</START_TIME><STOP_TIME>2031-05-01T00:03:00</STOP_TIME>
<ATTITUDE_TYPE>QUATERNION</ATTITUDE_TYPE></metadata><data><attitudeState><quaternionEphemeris>
<EPOCH>2031-05-01T00:00:00.000</EPOCH><quaternion><Q1>0.064508859953</Q1><Q2>-0.072859288305</Q2>
<Q3>0.261260900503</Q3><QC>0.960350390724</QC></quaternion></quaternionEphemeris></attitudeState></data></segment></body>
</aem>"""


def test_xml_holds_the_same_keys(tmp_path):
    q = read_text(tmp_path, XML).quaternions[0]
    assert quaternion_angle(q, np.roll(START.as_quat(), 1)) < PRINTED_12


@pytest.mark.parametrize(
    ("prologue", "words"),
    [
        ('<!DOCTYPE aem [<!ENTITY a "aaaa">]>', "declares a DTD or entities"),
        ('<!DOCTYPE aem SYSTEM "file:///etc/passwd">', "declares a DTD or entities"),
        ("<x>" * 30, "nests too deep"),
        ("<aem", "the XML is broken"),
        ('<oem version="2.0"/>', "no attitude message"),
    ],
)
def test_hostile_and_broken_xml_is_refused(tmp_path, prologue, words):
    head, body = XML.split("?>", 1)
    with pytest.raises(TableError, match=words):
        read_text(tmp_path, f"{head}?>{prologue}" + (body if prologue.startswith("<!") else ""))
