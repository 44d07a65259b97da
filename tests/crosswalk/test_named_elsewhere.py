"""Conventions that others named, each fed as unknown; and public mix-ups that identification must see through."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.frames import Frame
from trunnion.crosswalk.disagreement import agreements
from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.identify import (
    Answer,
    identify_angles,
    identify_attitudes,
    matrix_readings,
    quaternion_readings,
)
from trunnion.crosswalk.known_attitudes import from_pose
from trunnion.crosswalk.study import Evidence, study
from trunnion.errors import AttitudeError

LETTERS = ("XYZ", "XZY", "YXZ", "YZX", "ZXY", "ZYX", "XYX", "XZX", "YXY", "YZY", "ZXZ", "ZYZ")
NAMES = ("first", "second", "third")


def digits(letters: str) -> str:
    """`ZYX` as `3-2-1`."""
    return "-".join(str("XYZ".index(letter) + 1) for letter in letters.upper())


def generic(seed: int, count: int = 4) -> np.ndarray:
    """Angles (deg) over most of their range."""
    return np.random.default_rng(seed).uniform(-70, 70, size=(count, 3))


def names_of(found) -> tuple[str, ...]:
    """All names of the one function found."""
    assert found.answer is Answer.IDENTIFIED
    return found.fits[0].reading.names


@pytest.mark.parametrize("letters", [*LETTERS, *(letters.lower() for letters in LETTERS)])
def test_scipy_sequences_are_found(letters: str) -> None:
    # Documentation of scipy.spatial.transform.Rotation.from_euler: capitals for moving, small for fixed axes.
    numbers = generic(1)
    found = identify_angles(numbers, Rotation.from_euler(letters, numbers, degrees=True).as_matrix(), names=NAMES)
    sense = "moving axes" if letters.isupper() else "fixed axes"
    wanted = f"{digits(letters)} about {sense}; turns: first, second, third; deg; the matrix maps body to reference"
    assert wanted in names_of(found)


@pytest.mark.parametrize("letters", LETTERS)
def test_cspice_angles_are_found(letters: str) -> None:
    """NAIF-ROTATION: eul2m(angle3, angle2, angle1, a3, a2, a1) is [angle3]a3 [angle2]a2 [angle1]a1, and [w]i turns the
    coordinate system: as a map of vectors it is the turn by -w."""
    spice = pytest.importorskip("spiceypy")
    numbers = np.radians(generic(2))
    axes = ["XYZ".index(letter) + 1 for letter in letters]
    truth = np.array([spice.eul2m(*row, *axes) for row in numbers])
    found = identify_angles(numbers, truth, names=NAMES)
    assert (
        f"{digits(letters)} about moving axes; turns: −first, −second, −third; rad; the matrix maps body to reference"
        in (names_of(found))
    )
    assert any(
        "matrix maps reference to body" in name and "turns: third, second, first" in name for name in names_of(found)
    )


@pytest.mark.parametrize("letters", LETTERS)
def test_ccsds_angles_are_found(letters: str) -> None:
    """CCSDS-504.0-B-2, annex on rotations: EULER_ROT_SEQ names turns about moving axes that take frame A onto frame B;
    the direction cosine matrix it prints maps A to B: M = [third][second][first], each a turn of the coordinates."""
    numbers = generic(3)
    turned = Rotation.from_euler(letters, numbers, degrees=True)
    found = identify_angles(numbers, turned.inv().as_matrix(), names=NAMES)
    wanted = f"{digits(letters)} about moving axes; turns: first, second, third; deg; the matrix maps reference to body"
    assert wanted in names_of(found)


def test_the_ccsds_quaternion_has_its_scalar_last() -> None:
    # CCSDS-504.0-B-2: Q1 Q2 Q3 QC.
    turned = Rotation.random(4, random_state=5)
    found = identify_attitudes(quaternion_readings(turned.as_quat()), turned.as_matrix())
    assert [finding.reading.words for finding in found.fits] == ["scalar last, maps body to reference"]


def test_the_setpoint_of_a_flight_log_has_the_documented_convention() -> None:
    # PX4 user guide, message vehicle_attitude_setpoint (value from memory): roll_body, pitch_body, yaw_body are
    # heading-pitch-roll 3-2-1 in rad, north-east-down; q_d has its scalar first. Single precision as in the log.
    turned = Rotation.from_euler("ZYX", np.radians(generic(6, 60) / 2))
    angles = turned.as_euler("ZYX")[:, ::-1].astype(np.float32).astype(float)
    quaternion = turned.as_quat()[:, [3, 0, 1, 2]].astype(np.float32).astype(float)
    names = ("roll_body", "pitch_body", "yaw_body")
    made = study(Evidence(numbers=angles, quaternion=quaternion, names=names), agree=True)
    assert made.answer is Answer.IDENTIFIED
    best = made.agreements[0]
    assert best.words["quaternion"] == "scalar first, maps body to reference"
    assert "3-2-1 about moving axes; turns: yaw_body, pitch_body, roll_body; rad" in best.words["angles"]


# Public reports. Numbers are those the reports print; where they print none they are chosen here and said so.


def test_fixed_for_moving_axes_in_an_arms_manual() -> None:
    # Kinovarobotics/Kinova-kortex2_Gen3_G3L issue 101 (2022): quaternion (x, y, z, w) and both triples as printed.
    truth = Rotation.from_quat([-0.0372638, -0.0326999, 0.773564, 0.631776]).as_matrix()[None]
    for triple, sense in (
        ((-0.09784475, 0.01633457, 1.77110065), "1-2-3 about fixed axes; turns: first, second, third; rad"),
        ((0.00352349, -0.09913217, 1.77207522), "1-2-3 about moving axes; turns: first, second, third; rad"),
    ):
        assert any(sense in name for name in names_of(identify_angles([triple], truth, names=NAMES, noise=1e-6)))


def test_fixed_axes_of_a_model_file() -> None:
    # gazebosim/sdformat PR 698: roll, pitch, yaw (1, 2, 3) rad and the matrix of fixed axes as printed there.
    matrix = [
        [0.41198225, -0.83373765, -0.36763046],
        [-0.05872664, -0.42691762, 0.90238159],
        [-0.90929743, -0.35017549, -0.2248451],
    ]
    truth = Rotation.from_matrix(matrix).as_matrix()[None]
    found = identify_angles([[1.0, 2.0, 3.0]], truth, names=NAMES, noise=1e-7)
    assert any("1-2-3 about fixed axes; turns: first, second, third; rad" in name for name in names_of(found))


def test_a_mount_whose_triple_was_read_on_the_wrong_axes_is_ambiguous_by_itself() -> None:
    # ntu-aris/ntu_viral_dataset issue 2 (2021): matrix and triple as printed. At right angles many readings agree, so
    # one mount can't tell; that the failing triple on moving axes is among them is the point.
    truth = np.array([[[-1.0, 0, 0], [0, 0, 1], [0, 1, 0]]])
    found = identify_angles([[1.57, 3.14, 0.0]], truth, names=NAMES, noise=np.radians(0.1))
    assert found.answer is Answer.AMBIGUOUS
    assert any(
        "1-2-3 about moving axes; turns: first, second, third; rad; the matrix maps body" in name
        for finding in found.fits
        for name in finding.reading.names
    )


def test_only_the_world_frame_relabelled() -> None:
    # naval-group/LOTUSim issue 32 (2026): east-north-up yaw 30 must become a north-east-down heading of 60. Level
    # samples can't show which side was missed; general ones can (attitudes chosen here).
    yaw = np.array([[30.0, 0, 0], [90, 0, 0], [-120, 0, 0]])
    level = Rotation.from_euler("ZYX", [[60, 0, 0], [0, 0, 0], [-150, 0, 0]], degrees=True).as_matrix()
    assert identify_angles(yaw, level, constants=Constants.RELABELLED).answer is Answer.AMBIGUOUS
    change, body = np.array([[0, 1, 0], [1, 0, 0], [0, 0, -1.0]]), np.diag([1.0, -1, -1])
    numbers = generic(7, 6)
    truth = change @ Rotation.from_euler("ZYX", numbers, degrees=True).as_matrix() @ body
    found = identify_angles(numbers, truth, constants=Constants.RELABELLED, names=NAMES)
    assert found.answer is Answer.IDENTIFIED
    # The answer is one of 96 names; whatever its constants are, it gives the true attitudes.
    predicted = found.fits[0].left @ found.fits[0].reading.chain.matrix(numbers) @ found.fits[0].right
    np.testing.assert_allclose(predicted, truth, rtol=0, atol=1e-12)


def test_scalar_first_or_last_by_a_known_direction() -> None:
    # iory/scikit-robot PR 800, scipy issue 19649: (0, 0, 0.3826834, 0.9238795) sends x to (0.707, 0.707, 0) or to
    # (-1, 0, 0); known in words, the pose settles it.
    pose = from_pose(
        "nose level, wings level, heading 45 deg",
        reference=Frame("local", ("north", "east", "down")), body=Frame("body", ("forward", "starboard", "down")),
    )  # fmt: skip
    found = identify_attitudes(quaternion_readings([[0, 0, 0.3826834, 0.9238795]]), pose[None], noise=1e-6)
    assert [finding.reading.words for finding in found.fits] == ["scalar last, maps body to reference"]


def test_a_nearly_aligned_mount_hides_its_direction_from_a_loose_tolerance_only() -> None:
    # HKUST-Aerial-Robotics/VINS-Mono issue 436 (2018): both matrices as printed; the mount is 0.70 deg.
    one = [0.99994418, -0.00621841, 0.00854216, 0.00616542, 0.99996168, 0.00621569, -0.00858049, -0.00616268, 0.9999442]
    truth = Rotation.from_matrix(np.reshape(one, (3, 3))).as_matrix()[None]
    sharp = identify_attitudes(matrix_readings([one]), truth, noise=1e-6)
    assert [finding.reading.words for finding in sharp.fits] == ["entries by rows, maps body to reference"]
    loose = identify_attitudes(matrix_readings([one]), truth, noise=np.radians(1.0))
    assert loose.answer is Answer.AMBIGUOUS


def test_active_or_passive_by_a_worked_vector() -> None:
    # BlueQuartzSoftware/DREAM3D PR 468 (2015): 120 deg about (1, 1, 1) takes x to y (active) or to z (passive).
    truth = np.array([[[0.0, 0, 1], [1, 0, 0], [0, 1, 0]]])
    found = identify_attitudes(quaternion_readings([[0.5, 0.5, 0.5, 0.5]]), truth, noise=1e-9)
    assert [finding.reading.words.partition("maps ")[2] for finding in found.fits] == ["body to reference"] * 2
    back = identify_attitudes(quaternion_readings([[0.5, 0.5, 0.5, 0.5]]), truth.transpose(0, 2, 1), noise=1e-9)
    assert [finding.reading.words.partition("maps ")[2] for finding in back.fits] == ["reference to body"] * 2


def test_three_angles_of_single_axes_that_fit_nothing_are_said_to_miss_by_so_much() -> None:
    # strasdat/Sophus issue 519 (2023), as printed there: no reading gives the matrix; the best misses by 0.745 deg.
    rows = np.array([[0.9775347709655762, 0.09823847562074661, -0.18648047745227814],
                     [-0.11292145401239395, 0.9911494255065918, -0.06979621201753616]])  # fmt: skip
    truth = Rotation.from_matrix(np.vstack([rows, np.cross(*rows)])).as_matrix()[None]
    numbers = np.array([[0.08053162693977356, -0.18407464027404785, -0.10685093700885773]])
    made = study(Evidence(numbers=numbers, truth=truth), noise=1e-6)
    assert made.answer is Answer.NONE_FITS
    assert np.degrees(made.found.next_best.miss) == pytest.approx(0.74545, abs=1e-4)
    assert "tilt pairs and rotation vectors were tried as well" in made.remarks


def test_a_format_sample_whose_quaternion_order_alone_settles_nothing() -> None:
    # duncaneddy/brahe PR 338 (2026), sample quaternion as printed: read scalar first or last it is 124.7494 deg apart.
    q = np.array([[5e-05, 0.87543, 0.40949, 0.25678]])
    first, last = (Rotation.from_quat(row / np.linalg.norm(row)) for row in (q[0, [1, 2, 3, 0]], q[0]))
    assert np.degrees((first.inv() * last).magnitude()) == pytest.approx(124.7494, abs=1e-3)
    found = agreements(quaternion=q, matrix=last.as_matrix().reshape(1, 9))
    assert [entry.words["quaternion"] for entry in found if entry.agrees] == ["scalar last, maps body to reference"]


def test_a_photo_straight_down_with_roll_180_is_one_camera() -> None:
    # OpenDroneMap/ODM PR 1970, leftfield-geospatial/orthority 34 (2026): roll 180, pitch -90, yaw 30 is roll 0 with yaw
    # 210 (yaw chosen here): at the pole the samples can't tell, and the answer says so.
    triple = np.array([[30.0, -90.0, 180.0]])
    truth = Rotation.from_euler("ZYX", [[210.0, -90.0, 0.0]], degrees=True).as_matrix()
    found = identify_angles(triple, truth, names=("yaw", "pitch", "roll"), noise=1e-6)
    assert found.answer is Answer.AMBIGUOUS
    names = [name for finding in found.fits for name in finding.reading.names]
    assert any("3-2-1 about moving axes; turns: yaw, pitch, roll; deg; the matrix maps body" in name for name in names)


@pytest.mark.parametrize("axis", range(3))
@pytest.mark.parametrize("side", ["reference", "body"])
def test_a_mirrored_axis_is_named_where_the_attitude_is_known(axis: int, side: str) -> None:
    # Handedness mix-ups of survey packages and simulators (no numbers printed; attitudes by scipy).
    truth = Rotation.random(5, random_state=4).as_matrix()
    flip = np.diag([-1.0 if n == axis else 1.0 for n in range(3)])
    written = flip @ truth if side == "reference" else truth @ flip
    made = study(Evidence(matrix=written.reshape(5, 9), truth=truth))
    assert [finding.reading.words for finding in made.found.fits] == [
        f"entries by rows, the {side} frame left-handed: its {'xyz'[axis]} reversed"
    ]
    half = np.concatenate([written[:2], truth[2:]]).reshape(5, 9)
    with pytest.raises(AttitudeError, match="some of the matrices are reflections"):
        study(Evidence(matrix=half, truth=truth))


def test_a_quaternion_between_relabelled_frames() -> None:
    # mavlink/mavros and others: north-east-down, forward-starboard-down against east-north-up, forward-port-up.
    truth = Rotation.random(6, random_state=8)
    change = Rotation.from_matrix([[0, 1, 0], [1, 0, 0], [0, 0, -1.0]])
    written = (change * truth * Rotation.from_matrix(np.diag([1.0, -1, -1]))).as_quat()
    made = study(Evidence(quaternion=written, truth=truth.as_matrix()), constants=Constants.RELABELLED)
    (finding,) = made.found.fits
    assert "scalar last, maps body to reference" in finding.reading.words
    predicted = finding.left @ quaternion_readings(written, two_sided=True)[1][1] @ finding.right
    np.testing.assert_allclose(predicted, truth.as_matrix(), rtol=0, atol=1e-12)
    assert identify_attitudes(quaternion_readings(written), truth.as_matrix()).answer is Answer.NONE_FITS


def test_wrapped_angles_and_samples_near_lock_are_read_like_others() -> None:
    # Every third sample within a degree of lock, whole turns added here and there, 0.1 deg of noise, a tenth false.
    generator = np.random.default_rng(12)
    numbers = generator.uniform(-170, 170, size=(40, 3))
    numbers[:, 1] = np.where(np.arange(40) % 3 == 0, 90.0 - generator.uniform(0, 1, 40), numbers[:, 1] / 2)
    noise = Rotation.from_rotvec(generator.normal(scale=np.radians(0.1), size=(40, 3)))
    truth = (Rotation.from_euler("ZYX", numbers, degrees=True) * noise).as_matrix()
    truth[[4, 11, 23, 38]] = Rotation.random(4, random_state=6).as_matrix()
    written = numbers + 360.0 * generator.integers(-1, 2, size=(40, 3))
    found = identify_angles(written, truth, noise=np.radians(0.1), names=NAMES)
    wanted = "3-2-1 about moving axes; turns: first, second, third; deg; the matrix maps body to reference"
    assert wanted in names_of(found)
    assert found.outliers == (5, 12, 24, 39)


def test_direction_and_roll_is_found_among_relabelled_chains() -> None:
    # Azimuth clockwise from north, elevation, roll about the boresight; east-north-up, boresight z, mark x. It is built
    # from its directions alone (geometry of azimuth and elevation; no source).
    azimuth, elevation, roll = np.radians(
        np.random.default_rng(14).uniform([-170, -70, -170], [170, 70, 170], (9, 3))
    ).T
    boresight = np.stack(
        [np.cos(elevation) * np.sin(azimuth), np.cos(elevation) * np.cos(azimuth), np.sin(elevation)], axis=-1
    )
    mark = np.stack(
        [-np.sin(elevation) * np.sin(azimuth), -np.sin(elevation) * np.cos(azimuth), np.cos(elevation)], axis=-1
    )
    mark = Rotation.from_rotvec(boresight * roll[:, None]).apply(mark)
    truth = np.stack([mark, np.cross(boresight, mark), boresight], axis=-1)
    numbers = np.degrees(np.stack([azimuth, elevation, roll], axis=-1))
    made = study(Evidence(numbers=numbers, truth=truth))
    assert made.answer is Answer.NONE_FITS
    assert "would fit with" in made.mistakes[0]
    made = study(Evidence(numbers=numbers, truth=truth), constants=Constants.RELABELLED)
    assert made.answer is Answer.IDENTIFIED
    assert made.found.fits[0].miss < 1e-12
