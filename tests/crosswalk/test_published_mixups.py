"""Public reports of mix-ups, with their numbers: the reference attitudes would have shown each of them up.

This is the published check of reference-attitudes. Sources are public issue trackers, named case by case; the numbers
are those the reports print, recomputed with scipy where they print none.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.crosswalk.answers import AnswerKind, all_rows, judge
from trunnion.crosswalk.reference import CAUGHT, ReferenceSet, reference_set
from trunnion.errors import AttitudeError

NAMES = ("first", "second", "third")


def convention(sequence: Sequence, sense: Sense = Sense.MOVING) -> Convention:
    """A plain convention of that sequence, zero along the axes."""
    return Convention(
        "theirs", Frame("local", ("north", "east", "down")), Frame("body", ("forward", "starboard", "down")), sequence,
        sense, NAMES,
    )  # fmt: skip


def at_pole(reference: ReferenceSet, sign: float) -> list[int]:
    """Indices of the rows exactly at one singular value of the middle angle (sign +1: the larger value)."""
    rows = all_rows(reference)
    start = len(reference.regular.angles)
    exact = [start + n for n, words in enumerate(reference.extra_words) if words.startswith("at lock")]
    values = rows.angles[exact, 1]
    wanted = values.max() if sign > 0 else values.min()
    return [row for row, value in zip(exact, values, strict=True) if value == wanted]


def spoiled_at_pole(sequence: Sequence, sign: float, wrong: Callable[[np.ndarray], np.ndarray]) -> tuple:
    """Answers in angles that are right but for one singular value, where `wrong` replaces the triple."""
    reference = reference_set(convention(sequence))
    angles = all_rows(reference).angles.copy()
    rows = at_pole(reference, sign)
    for row in rows:
        angles[row] = wrong(angles[row])
    return judge(reference, AnswerKind.ANGLES, angles), rows


# (report, sequence, pole, what its branch returns for a triple (a, pole, c), least miss in degrees)
POLE_REPORTS = [
    # google-deepmind/dm_control PR 555: half a turn off at -90 deg
    ("dm_control 555", Sequence.ZYX, -1, lambda t: np.array([0.0, t[1], np.pi + t[0] + t[2]]), 179.0),
    # dimforge/nalgebra 1482: yaw 45 deg comes back as -45 deg at pitch -90 deg
    ("nalgebra 1482", Sequence.ZYX, -1, lambda t: np.array([-(t[0] + t[2]), t[1], 0.0]), 60.0),
    # Hipparchus-Math/hipparchus 304: atan2(0, 0) makes both outer angles zero
    ("hipparchus 304", Sequence.ZYX, 1, lambda t: np.array([0.0, t[1], 0.0]), 60.0),
    # bulletphysics/bullet3 1805: the other pole's triple, 180 deg off
    ("bullet3 1805", Sequence.ZYX, -1, lambda t: np.array([t[0], -t[1], t[2]]), 100.0),
    # IlyaKuprov/Spinach PR 427: (pi/4, pi, -pi/4) for (-pi/4, pi, pi/4)
    ("Spinach 427", Sequence.ZYZ, 1, lambda t: np.array([t[2], t[1], t[0]]), 100.0),
]


@pytest.mark.parametrize(
    ("report", "sequence", "pole", "wrong", "least"), POLE_REPORTS, ids=lambda value: str(value)[:20]
)
def test_a_wrong_branch_at_the_pole_fails_the_rows_at_lock(report, sequence, pole, wrong, least) -> None:
    judgement, rows = spoiled_at_pole(sequence, pole, wrong)
    assert not judgement.passed, report
    assert all(np.degrees(judgement.misses[row]) > least for row in rows)


def test_the_reported_triple_of_dm_control_is_half_a_turn_off() -> None:
    ours = convention(Sequence.ZYX)
    right = ours.matrix([0.3, -np.pi / 2, -0.7])
    reported = Rotation.from_euler("ZYX", [0.0, -np.pi / 2, 2.741592653589793]).as_matrix()
    assert np.degrees((Rotation.from_matrix(right).inv() * Rotation.from_matrix(reported)).magnitude()) > 179.999


def test_nan_from_an_arcsine_beyond_one_is_refused() -> None:
    # PX4/PX4-Autopilot 19933 and facebookresearch/momentum 1630: asin of 1 + rounding gives NaN.
    reference = reference_set(convention(Sequence.ZYX))
    matrices = all_rows(reference).matrices.copy()
    matrices[-1, 0, 0] = np.nan
    with pytest.raises(AttitudeError):
        judge(reference, AnswerKind.MATRIX, matrices)


def test_another_triple_of_the_same_attitude_is_no_error() -> None:
    # rustgd/cgmath 563, g-truc/glm 737: (180, -88.766, 180) and a turn of -91.234 deg about y are one attitude.
    one = convention(Sequence.XYZ).matrix(np.radians([180.0, -88.766, 180.0]))
    other = Rotation.from_euler("y", -91.234, degrees=True).as_matrix()
    assert np.allclose(one, other, rtol=0, atol=1e-12)
    reference = reference_set(convention(Sequence.XYZ))
    angles = all_rows(reference).angles
    second = np.column_stack([angles[:, 0] + np.pi, np.pi - angles[:, 1], angles[:, 2] + np.pi])
    assert judge(reference, AnswerKind.ANGLES, second).passed


# (report, our sequence, how they make their matrix from our angles, words the explanation must hold)
ORDER_REPORTS = [
    # moveit/moveit_calibration 49, Kinova-kortex2 101: fixed axes for moving axes
    (
        "fixed for moving axes",
        Sequence.XYZ,
        lambda a: Rotation.from_euler("xyz", a).as_matrix(),
        "1-2-3 about fixed axes",
    ),
    # EricGuo5513/HumanML3D 150: one order of the product for the other
    ("order reversed", Sequence.ZYX, lambda a: Rotation.from_euler("XYZ", a[:, ::-1]).as_matrix(), "about moving axes"),
    # matthew-brett/transforms3d 17: the same triple about fixed axes taken for the inverse
    ("inverse by habit", Sequence.ZXZ, lambda a: Rotation.from_euler("zxz", a).as_matrix(), "3-1-3"),
    # CIDCO-dev/Poseidon 168, rosflight/rosflight_firmware 148: degrees where radians were meant
    ("degrees for radians", Sequence.ZYX, lambda a: Rotation.from_euler("ZYX", np.degrees(a)).as_matrix(), "; rad;"),
    # BlueQuartzSoftware/DREAM3D 468, PX4 17347: the transposed map
    ("transposed", Sequence.ZYX, lambda a: Rotation.from_euler("ZYX", a).inv().as_matrix(), "transposed"),
    # naval-group/LOTUSim 32: only the world frame relabelled (north-east-down taken for east-north-up)
    (
        "half a frame map",
        Sequence.ZYX,
        lambda a: np.array([[0.0, 1, 0], [1, 0, 0], [0, 0, -1]]) @ Rotation.from_euler("ZYX", a).as_matrix(),
        "relabelled",
    ),
    # paparazzi/paparazzi 2915, adafruit/Adafruit_BNO055 123: first and last angle exchanged
    (
        "columns exchanged",
        Sequence.ZYX,
        lambda a: Rotation.from_euler("ZYX", a[:, ::-1]).as_matrix(),
        "turns: third, second, first",
    ),
]


@pytest.mark.parametrize(("report", "sequence", "theirs", "words"), ORDER_REPORTS, ids=lambda value: str(value)[:24])
def test_a_wrong_order_direction_or_unit_is_named(report, sequence, theirs, words) -> None:
    reference = reference_set(convention(sequence))
    judgement = judge(reference, AnswerKind.MATRIX, theirs(all_rows(reference).angles))
    assert not judgement.passed, report
    assert judgement.misses[: len(reference.regular.angles)].max() > CAUGHT
    assert any(words in name for name in judgement.explanations) or any(
        words in other for other in _other_names(judgement.explanations, sequence)
    )


def _other_names(explanations: tuple[str, ...], sequence: Sequence) -> list[str]:
    """Every name of the functions named, since an explanation gives the first of four."""
    from trunnion.crosswalk.readings import all_chains

    found = []
    for chain in all_chains():
        names = [reading.words(NAMES) for reading in chain.readings()]
        if any(name in explanations for name in names):
            found += names
    return found


@pytest.mark.parametrize(
    ("order", "words"),
    [
        (
            (1, 2, 3, 0),
            "scalar last",
        ),  # iory/scikit-robot 800, scipy 19649: (0, 0, 0.3826834, 0.9238795) misread by 138.6 deg
    ],
)
def test_a_quaternion_in_the_other_order_is_named(order: tuple, words: str) -> None:
    one = Rotation.from_quat([0, 0, 0.3826834, 0.9238795])
    other = Rotation.from_quat([0, 0.3826834, 0.9238795, 0])
    assert np.degrees((one.inv() * other).magnitude()) == pytest.approx(138.5904, abs=1e-3)
    reference = reference_set(convention(Sequence.ZYX))
    judgement = judge(reference, AnswerKind.QUATERNION, all_rows(reference).quaternions[:, order])
    assert any(words in name for name in judgement.explanations)


def test_a_direction_mixed_up_on_a_nearly_aligned_mount_is_still_seen() -> None:
    # HKUST-Aerial-Robotics/VINS-Mono 436: a mount of 0.70 deg hides its own inverse at 1.40 deg; the rows do not.
    reference = reference_set(convention(Sequence.ZYX))
    rows = all_rows(reference)
    judgement = judge(reference, AnswerKind.MATRIX, rows.matrices.transpose(0, 2, 1))
    assert np.degrees(judgement.misses.max()) > 10.0


def _turned(letters: str, angles: np.ndarray) -> np.ndarray:
    return Rotation.from_euler(letters, angles).as_matrix()


_NED_TO_ENU = np.array([[0.0, 1.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, -1.0]])
_FORWARD_LEFT_UP = np.diag([1.0, -1.0, -1.0])
_HALF_TURN = np.diag([-1.0, -1.0, 1.0])

# Further public reports: what they are, our sequence, and the attitudes their reading makes of our angles (N, 3) rad.
FURTHER_REPORTS = [
    # ArduPilot/ardupilot_wiki 3753: "pitch 180 then yaw 90" about fixed or own axes, half a turn apart
    ("label of two turns", Sequence.YZX, lambda a: _turned("yzx", a)),
    # PX4/PX4-Autopilot 10514: ROLL_270_YAW_180 carried out on the other kind of axes
    ("label roll yaw", Sequence.XZY, lambda a: _turned("xzy", a)),
    # IlyaKuprov/Spinach PR 395: (82, 180, 19) degrees read as radians, 71.655 deg between the x axes
    ("degrees in ZYZ", Sequence.ZYZ, lambda a: _turned("ZYZ", np.degrees(a))),
    # TauLabs/TauLabs PR 632: the three angles negated for the inverse
    ("negated for the inverse", Sequence.ZYX, lambda a: _turned("ZYX", -a)),
    # NASASpaceFlight forum topic 17437: pitch, yaw, roll (40, -10, 60) negated in the same sequence, 40.95 deg off
    ("negated in the same sequence", Sequence.YZX, lambda a: _turned("YZX", -a).transpose(0, 2, 1)),
    # mavlink/mavros 216 and successors: heading zero turned by half a turn (heading -> -heading - 90)
    ("heading zero half a turn off", Sequence.ZYX, lambda a: _HALF_TURN @ _turned("ZYX", a)),
    # DISCOWER/px4-mpc PR 33: only the body frame relabelled
    ("body frame only", Sequence.ZYX, lambda a: _turned("ZYX", a) @ _FORWARD_LEFT_UP),
    # SBG-Systems drivers: world components exchanged without the body turn
    ("world frame only", Sequence.ZYX, lambda a: _NED_TO_ENU @ _turned("ZYX", a)),
    # moveit/moveit_calibration 132, RigidBodyDynamics.jl 429, sdformat PR 698: roll-pitch-yaw about moving axes
    ("moving for fixed axes", Sequence.XYZ, lambda a: _turned("xyz", a)),
    # OpenSimulationInterface PR 158: the label ZYX read as the order of the product of fixed turns
    ("label read as product order", Sequence.ZYX, lambda a: _turned("zyx", a)),
    # lasp/xmera 358, ArduPilot 17662: active for passive, twice the rotation angle off
    ("active for passive", Sequence.ZXZ, lambda a: _turned("ZXZ", a).transpose(0, 2, 1)),
    # leftfield-geospatial/orthority 34: 90 deg added to pitch and roll kept
    ("pitch offset only", Sequence.ZYX, lambda a: _turned("ZYX", a + np.array([0.0, np.pi / 2, 0.0]))),
    # survey packages, vessel frame pages: pitch and roll of the opposite sign
    ("signs of pitch and roll", Sequence.ZYX, lambda a: _turned("ZYX", a * np.array([1, -1, -1]))),
    # carla-simulator/carla 6780: yaw left-handed
    ("yaw left-handed", Sequence.ZYX, lambda a: _turned("ZYX", a * np.array([-1, 1, 1]))),
    # adafruit/Adafruit_BNO055 PR 123: x and z angles exchanged
    ("x and z exchanged", Sequence.XYZ, lambda a: _turned("XYZ", a[:, ::-1])),
]


@pytest.mark.parametrize(("report", "sequence", "theirs"), FURTHER_REPORTS, ids=[row[0] for row in FURTHER_REPORTS])
def test_every_reported_misreading_fails_a_regular_row(report, sequence, theirs) -> None:
    reference = reference_set(convention(sequence))
    rows = all_rows(reference)
    misses = judge(reference, AnswerKind.MATRIX, theirs(rows.angles)).misses
    assert misses[: len(reference.regular.angles)].max() > CAUGHT, report


# Further reports of the pole: what their branch returns for a triple (a, pole, c).
FURTHER_POLES = [
    # ros/geometry 47: yaw and roll with the wrong sign at the pole
    ("ros geometry 47", Sequence.ZYX, 1, lambda t: np.array([-(t[0] - t[2]), t[1], 0.0])),
    # ros/urdfdom_headers 18: (0, -pi/2, 0) read half a turn off
    ("urdfdom 18", Sequence.ZYX, -1, lambda t: np.array([t[0], t[1], t[2] + np.pi])),
    # wpilibsuite/allwpilib PR 5437: yaw from an entry that is zero at the pole: 90 deg for 30 deg
    ("allwpilib 5437", Sequence.ZYX, 1, lambda t: np.array([np.pi / 2, t[1], 0.0])),
    # ros2/geometry2 796: roll 45 deg printed where it is 0
    ("geometry2 796", Sequence.ZYX, -1, lambda t: np.array([t[0], t[1], t[2] + np.pi / 4])),
]


@pytest.mark.parametrize(("report", "sequence", "pole", "wrong"), FURTHER_POLES, ids=[row[0] for row in FURTHER_POLES])
def test_every_reported_wrong_branch_fails_a_row_at_lock(report, sequence, pole, wrong) -> None:
    judgement, rows = spoiled_at_pole(sequence, pole, wrong)
    assert all(judgement.misses[row] > CAUGHT for row in rows), report


def test_an_inverse_star_tracker_quaternion_is_named() -> None:
    # nasa/nos3 351, 431: a mount quaternion and its inverse were tried without agreement; they are 125.3436 deg apart.
    q = np.array([-0.5510871, -0.4059919, -0.5108982, 0.5200544])
    apart = (Rotation.from_quat(q) * Rotation.from_quat(q)).magnitude()
    assert np.degrees(apart) == pytest.approx(125.3436, abs=1e-3)
    reference = reference_set(convention(Sequence.YXZ))
    conjugate = all_rows(reference).quaternions * np.array([1, -1, -1, -1])
    judgement = judge(reference, AnswerKind.QUATERNION, conjugate)
    assert any("conjugated" in words or "transposed" in words for words in judgement.explanations)
