"""Flight logs: damage anywhere is reported, and undamaged logs are believed."""

from __future__ import annotations

import random
import struct

import numpy as np
import pytest

from trunnion.attitude.rotations import quaternion_angle
from trunnion.errors import TableError
from trunnion.tables import read_table
from trunnion.tables.ulog_health import examine

FLOAT32 = 1e-6  # rad; the log stores 32-bit floats


@pytest.fixture(scope="module")
def whole(log_writer, turns):
    return log_writer(turns)


@pytest.fixture
def log(tmp_path, whole):
    (tmp_path / "flight.ulg").write_bytes(whole)
    return tmp_path / "flight.ulg"


def test_a_whole_log_gives_its_attitudes(log_statement, log, turns):
    table = read_table(log_statement(), log.parent)
    assert len(table) == len(turns)
    assert np.max(quaternion_angle(table.quaternions, turns)) < FLOAT32
    np.testing.assert_allclose(table.times, 5.0 + 0.01 * np.arange(len(turns)), rtol=0, atol=1e-12)
    assert table.dropped == ()
    assert any("no closing record" in note for note in table.notes)


def test_twenty_cut_copies_are_all_reported(log_statement, log, whole):
    places = random.Random(20).sample(range(1, len(whole)), 20)
    for place in places:
        log.write_bytes(whole[:place])
        with pytest.raises(TableError, match=r"incomplete|no ULog file|ends inside its header|no samples"):
            read_table(log_statement(), log.parent)


def test_twenty_copies_with_a_thousand_zeroed_bytes_are_all_reported(log_statement, log, whole):
    for place in random.Random(21).sample(range(len(whole) - 1000), 20):
        log.write_bytes(whole[:place] + bytes(1000) + whole[place + 1000 :])
        with pytest.raises(TableError, match=r"can't be read as messages|no ULog file"):
            read_table(log_statement(), log.parent)


@pytest.mark.full
def test_many_damaged_copies_are_all_reported_but_cuts_between_messages(log_statement, log, whole):
    borders = message_borders(whole)
    generator = random.Random(22)
    for _ in range(400):
        place = generator.randrange(1, len(whole))
        log.write_bytes(whole[:place])
        if place not in borders:
            with pytest.raises(TableError):
                read_table(log_statement(), log.parent)
        place = generator.randrange(len(whole) - 1000)
        log.write_bytes(whole[:place] + bytes(1000) + whole[place + 1000 :])
        with pytest.raises(TableError):
            read_table(log_statement(), log.parent)


def message_borders(whole: bytes) -> set[int]:
    """Offsets between messages, by the lengths alone."""
    borders, at = set(), 16
    while at < len(whole):
        borders.add(at)
        at += 3 + int.from_bytes(whole[at : at + 2], "little")
    return borders


def test_a_cut_exactly_between_messages_shows_only_against_a_stated_digest(log_statement, log, whole):
    """The format has no closing record, so what can't be seen is said in a note, and a digest closes the gap."""
    border = sorted(message_borders(whole))[-5]
    digest = read_table(log_statement(), log.parent).sha256
    log.write_bytes(whole[:border])
    assert len(read_table(log_statement(), log.parent)) > 0
    with pytest.raises(TableError, match="SHA-256"):
        read_table(log_statement(sha256=digest), log.parent)


def test_dropouts_are_counted_and_stop_the_reading_unless_accepted(log_statement, log, log_writer, log_message, turns):
    drops = log_message("O", struct.pack("<H", 31)) + log_message("O", struct.pack("<H", 12))
    log.write_bytes(log_writer(turns, extra=drops))
    with pytest.raises(TableError, match="2 dropouts, 43 ms in all, the longest 31 ms"):
        read_table(log_statement(), log.parent)
    table = read_table(log_statement(accept_damaged="two short dropouts before take-off"), log.parent)
    assert len(table) == len(turns)
    assert [trouble.kind for trouble in table.dropped] == ["dropouts"]


def test_gaps_above_the_stated_one_stop_a_log(log_statement, log, whole):
    with pytest.raises(TableError, match=r"more than 0\.005 s without an attitude"):
        read_table(log_statement(max_gap="5 ms"), log.parent)
    assert len(read_table(log_statement(max_gap="50 ms"), log.parent)) == 400


def test_accepted_damage_leaves_out_what_is_lost_and_says_how_much(log_statement, log, whole):
    place = len(whole) // 2
    log.write_bytes(whole[:place] + bytes(1000) + whole[place + 1000 :])
    table = read_table(log_statement(accept_damaged="bad sector on the card"), log.parent)
    assert 330 < len(table) < 400
    assert any("can't be read as messages" in str(trouble) for trouble in table.dropped)


def test_a_missing_topic_and_a_missing_field_name_the_nearest(log_statement, log):
    with pytest.raises(TableError, match="did you mean 'vehicle_attitude'"):
        read_table(log_statement(topic="vehicle_atitude"), log.parent)
    columns = {"time": {"column": "timestamp", "unit": "us"}, "quaternion": ["q[0]", "q[1]", "q[2]", "q[4]"]}
    with pytest.raises(TableError, match=r"has no field 'q\[4\]'"):
        read_table(log_statement(columns=columns), log.parent)


@pytest.mark.parametrize(
    ("kind", "payload", "words"),
    [
        ("D", struct.pack("<HQ", 77, 1), "never announced"),
        ("D", struct.pack("<HQ", 0, 1), "wrong size for their topic"),
        ("F", b"loop:loop inner;", None),
        ("F", b"broken:float", "definition that can't be read"),
        ("A", struct.pack("<BH", 0, 9) + b"nobody", "has no format"),
        ("A", struct.pack("<BH", 0, 0) + b"noise", "given to two topics"),
        ("S", bytes(8), "synchronization message"),
        ("I", bytes([200]) + b"short", "key that runs past"),
        ("P", bytes([12]) + bytes(16), "key that is no text"),
        ("M", b"\0" + bytes([12]) + b"char[64] why" + bytes(64), "text full of zeros"),
        ("L", bytes(20), "logged text without its level"),
        ("B", bytes(8) + b"\x04" + bytes(31), "newer reader"),
        ("x", b"something", "no known type"),
    ],
)
def test_content_that_contradicts_the_log_is_named(log, log_writer, log_message, turns, kind, payload, words):
    log.write_bytes(log_writer(turns, extra=log_message(kind, payload)))
    troubles = [str(trouble) for trouble in examine(log).troubles()]
    if words is None:
        assert troubles == []  # a format that nests itself harms only who subscribes to it
    else:
        assert len(troubles) == 1
        assert words in troubles[0]


def test_a_topic_whose_format_nests_itself_is_refused(log, log_writer, log_message, turns):
    loop = log_message("F", b"loop:uint64_t timestamp;loop inner;")
    loop += log_message("A", struct.pack("<BH", 0, 9) + b"loop")
    log.write_bytes(log_writer(turns, extra=loop))
    (trouble,) = examine(log).troubles()
    assert "nests without end" in str(trouble)


@pytest.mark.parametrize("filler", [b"D", b"\0", b"\x01\0A", b"F\0F"])
def test_millions_of_bytes_that_are_no_message_end_in_one_report(log, whole, filler):
    log.write_bytes(whole + filler * ((4 << 20) // len(filler)))
    troubles = examine(log).troubles()
    assert troubles
    assert {trouble.kind for trouble in troubles} == {"damaged log"}


def test_definitions_that_multiply_are_refused(log, log_writer, log_message, turns):
    """Sixty short formats of 20,000 fields each would make over a million fields."""
    extra = b"".join(
        log_message("F", f"wide{place}:uint64_t timestamp;uint8_t[19990] x;".encode())
        + log_message("A", struct.pack("<BH", 0, 100 + place) + f"wide{place}".encode())
        for place in range(60)
    )
    log.write_bytes(log_writer(turns, extra=extra))
    assert any("fields in all" in str(trouble) for trouble in examine(log).troubles())


def test_zeroed_quaternions_between_whole_messages_are_refused_by_row(log_statement, log, whole):
    start = whole.index(struct.pack("<HQ", 0, 5_000_000 + 100 * 10_000)) + 10
    log.write_bytes(whole[:start] + bytes(16) + whole[start + 16 :])
    with pytest.raises(TableError, match="row 101: the quaternion's length is off 1"):
        read_table(log_statement(), log.parent)


def test_a_cut_inside_a_round_of_the_logger_is_a_finding(log_statement, log, log_writer, turns):
    """Without the sparse topics every round ends with the rates; a log that ends with the attitude is doubtful."""
    whole = log_writer(turns)
    borders = sorted(message_borders(whole))
    rounds = b"".join(
        whole[start:end]
        for start, end in zip(borders, [*borders[1:], len(whole)], strict=True)
        if whole[start + 2 : start + 3] != b"D" or whole[start + 3] in (0, 1)
    )
    log.write_bytes(whole[:16] + rounds)
    assert read_table(log_statement(), log.parent).findings == ()
    last = max(message_borders(log.read_bytes()))
    log.write_bytes(log.read_bytes()[:last])
    (doubt,) = read_table(log_statement(), log.parent).findings
    assert "399 of 399 rounds of its logger end with topic 'body_rates', the last one with 'vehicle_attitude'" in str(
        doubt
    )
