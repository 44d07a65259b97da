"""The published check of convention-identification, through the very calls its cells make; and what else it shows.

Published numbers: quaternion and both triples of Kinovarobotics/Kinova-kortex2_Gen3_G3L issue 101 (2022); roll, pitch,
yaw (1, 2, 3) rad with the matrix of fixed axes of gazebosim/sdformat PR 698.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.errors import CalculationError, TrunnionError
from trunnion.sheet.identification import ConventionIdentification

LOCAL = {"name": "local", "axes": ["north", "east", "down"], "north": "true", "carried": "along"}
BODY = {"name": "body", "axes": ["forward", "starboard", "down"]}
SDF = (0.41198225, -0.83373765, -0.36763046, -0.05872664, -0.42691762, 0.90238159, -0.90929743, -0.35017549, -0.2248451)


def table(folder: Path, header: str, rows: Any) -> str:
    """Write inputs/samples.csv; its name."""
    (folder / "inputs").mkdir(exist_ok=True)
    lines = [header, *(",".join(map(str, row)) for row in rows)]
    (folder / "inputs" / "samples.csv").write_text("\n".join(lines) + "\n")
    return "samples.csv"


def run(shown: list, samples: dict, **options: Any) -> dict[str, Any]:
    """Every cell of the template; statements, tables and results by id or quantity."""
    work = ConventionIdentification(samples=samples, reference=LOCAL, body=BODY, **options)
    for name in (
        "inputs", "assumptions", "answer", "readings", "residuals", "near_fits", "next", "fragment", "checks", "results"
    ):  # fmt: skip
        getattr(work, f"show_{name}")()
    found = {item.get("id") or item.get("kind"): item for item in shown}
    found |= {item["quantity"]: item for item in shown if item["kind"] == "result"}
    return found


@pytest.fixture(autouse=True)
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)


def test_published_triples_are_identified(shown: list, disagreeing: Any, tmp_path: Path) -> None:
    arm = Rotation.from_quat([-0.0372638, -0.0326999, 0.773564, 0.631776]).as_matrix().ravel()
    rows = [(-0.09784475, 0.01633457, 1.77110065, *arm), (1, 2, 3, *SDF)]
    name = table(tmp_path, "r,p,y," + ",".join(f"m{n}" for n in range(9)), rows)
    samples = {"table": name, "numbers": ["r", "p", "y"], "matrix": [f"m{n}" for n in range(9)], "order": "rows",
               "maps": "body to reference", "source": "two public reports"}  # fmt: skip
    found = run(shown, samples, noise="1e-6 rad")
    assert disagreeing() == []
    assert found["readings left"]["lo"] == 1.0
    assert any("1-2-3 about fixed axes; turns: r, p, y; rad" in name for name in found["names"]["paragraphs"])
    assert found["miss of the best reading"]["hi"] < 1e-5
    assert any("sequence: 3-2-1" in line for line in found["fragment"]["paragraphs"])


def test_one_published_sample_on_the_wrong_axes_is_told(shown: list, disagreeing: Any, tmp_path: Path) -> None:
    name = table(
        tmp_path, "r,p,y,x,y_,z,w", [(0.00352349, -0.09913217, 1.77207522, -0.0372638, -0.0326999, 0.773564, 0.631776)]
    )
    samples = {"table": name, "numbers": ["r", "p", "y"], "quaternion": ["x", "y_", "z", "w"], "scalar": "last",
               "maps": "body to reference"}  # fmt: skip
    found = run(shown, samples, noise="1e-6 rad")
    assert any("1-2-3 about moving axes; turns: r, p, y; rad" in name for name in found["names"]["paragraphs"])
    assert disagreeing() == []


@pytest.mark.parametrize(
    "poses",
    [
        ("nose up 30 deg, banked 20 deg to port, heading east", "nose down 15 deg, wings level, heading 200 deg"),
        ("level, heading east", "level, heading 200 deg"),
    ],
)
def test_poses_in_words(shown: list, disagreeing: Any, tmp_path: Path, poses: tuple) -> None:
    angles = [(90, 30, -20), (200, -15, 0)] if "nose" in poses[0] else [(90, 0, 0), (200, 0, 0)]
    name = table(tmp_path, "pose,hdg,pitch,roll", [(f'"{p}"', *a) for p, a in zip(poses, angles, strict=True)])
    found = run(shown, {"table": name, "numbers": ["hdg", "pitch", "roll"], "poses": "pose"}, noise="0.1 deg")
    assert disagreeing() == []
    if "nose" in poses[0]:
        assert found["readings left"]["lo"] == 1.0
    else:
        assert found["readings left"]["lo"] > 1.0
        assert any("level" in line for line in found["answer"]["paragraphs"])
        assert "finding" in {item["kind"] for item in shown}
        assert found["next"]["paragraphs"][0].startswith("Set hdg")


def test_rates_alone(shown: list, disagreeing: Any, tmp_path: Path) -> None:
    t = np.arange(0.0, 20.0, 0.02)
    angles = np.column_stack([40 * np.sin(0.5 * t), 30 * np.sin(0.9 * t + 1), 50 * np.sin(0.7 * t + 2)])
    turned = Rotation.from_euler("ZYX", angles, degrees=True)
    between = np.degrees((turned[:-1].inv() * turned[1:]).as_rotvec()) / 0.02
    rates = np.vstack([between[:1], 0.5 * (between[1:] + between[:-1]), between[-1:]])
    name = table(tmp_path, "t,y,p,r,wx,wy,wz", np.column_stack([t, angles, rates]).tolist())
    samples = {
        "table": name,
        "numbers": ["y", "p", "r"],
        "rates": ["wx", "wy", "wz"],
        "time": {"column": "t", "unit": "s"},
    }
    found = run(shown, samples)
    assert disagreeing() == []
    assert found["readings left"]["lo"] == 1.0
    assert any("3-2-1 about moving axes; turns: y, p, r; deg" in name for name in found["names"]["paragraphs"])


def test_offsets_constants_and_forms_run_with_agreeing_checks(shown: list, disagreeing: Any, tmp_path: Path) -> None:
    generator = np.random.default_rng(4)
    numbers = generator.uniform(-50, 50, size=(20, 3))
    side = Rotation.random(random_state=2)
    made = {
        "offsets": Rotation.from_euler("ZXY", numbers + np.array([3, 90, -8]), degrees=True),
        "body side": Rotation.from_euler("ZXY", numbers, degrees=True) * side,
        "reference side": side * Rotation.from_euler("ZXY", numbers, degrees=True),
        "both sides": side * Rotation.from_euler("ZXY", numbers, degrees=True) * side,
        "vector": Rotation.from_rotvec(numbers, degrees=True),
    }
    for what, truth in made.items():
        shown.clear()
        name = table(tmp_path, "a,b,c,x,y,z,w", np.column_stack([numbers, truth.as_quat()]).tolist())
        samples = {"table": name, "numbers": ["a", "b", "c"], "quaternion": list("xyzw"), "scalar": "last",
                   "maps": "body to reference"}  # fmt: skip
        options = {"offsets": True} if what == "offsets" else {"constants": what} if "side" in what else {}
        found = run(shown, samples, **options)
        assert disagreeing() == [], what
        assert found["readings left"]["lo"] == 1.0, what


def test_what_is_missing_is_asked_for(shown: list, tmp_path: Path) -> None:
    name = table(tmp_path, "a,b,c,x,y,z,w", [(1, 2, 3, 0, 0, 0, 1)])
    with pytest.raises(CalculationError, match="constants are 'some'"):
        ConventionIdentification(samples={"table": name}, reference=LOCAL, body=BODY, constants="some")
    work = ConventionIdentification(
        samples={"table": name, "numbers": ["a", "b", "c"], "quaternion": list("xyzw")}, reference=LOCAL, body=BODY
    )
    with pytest.raises(TrunnionError, match=r"(?s)where does the scalar.*which way does the known attitude map"):
        work.show_answer()
