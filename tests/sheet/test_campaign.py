"""Campaigns through their sheet: published positions as runs, whoever does the work, and rows that are no rows."""

from __future__ import annotations

import pickle
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from scipy.spatial.transform import Rotation

from trunnion.envelope import campaign as reductions
from trunnion.errors import CalculationError, Fault, RegionError, TableError
from trunnion.sheet import campaign as campaign_sheet
from trunnion.sheet import sharing
from trunnion.sheet.campaign import CampaignSweep
from trunnion.sheet.campaign_runs import runs_of

LOCAL = {"name": "local", "axes": ["north", "east", "down"], "north": "true", "carried": "along"}
BODY = {"name": "body", "axes": ["forward", "starboard", "down"]}
HALF_LAST_DIGIT = 0.5e-5 + 1e-9  # deg; printed with five decimals


def stated(name: str, sequence: str) -> dict[str, Any]:
    return {
        "name": name,
        "reference": LOCAL,
        "body": BODY,
        "sequence": sequence,
        "about": "moving axes",
        "angles": ["first", "second", "third"],
        "maps": "body to reference",
    }


def write_run(path: Path, attitudes: Rotation, step: float = 1.0) -> None:
    q = np.roll(attitudes.as_quat(), 1, axis=1)
    columns = [np.arange(len(q)) * step, *q.T]
    if path.suffix == ".parquet":
        pq.write_table(pa.table(columns, names=list("twxyz")), path, row_group_size=50)
    else:
        np.savetxt(path, np.stack(columns, axis=1), delimiter=",", header="t,w,x,y,z", comments="", fmt="%.17g")


@pytest.fixture
def campaign(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[..., dict[str, Any]]:
    """`campaign({"a.parquet": attitudes, …}, …)`: the plain envelope of runs written to inputs/."""
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr(sharing, "usable_processors", lambda: 1)
    (tmp_path / "inputs").mkdir()

    def made(runs: dict[str, Rotation], **changes: Any) -> dict[str, Any]:
        for name, attitudes in runs.items():
            write_run(tmp_path / "inputs" / name, attitudes)
        return {
            "name": "logs",
            "campaign": "runs/*",
            "columns": {"time": {"column": "t", "unit": "s"}, "quaternion": ["w", "x", "y", "z"]},
            "scalar": "first",
            "maps": "body to local",
            "reference": "local",
            "body": "body",
            "between samples": "slerp",
            "files": list(runs),
            **changes,
        }

    return made


def tumble(seed: int, rows: int = 300) -> Rotation:
    generator = np.random.default_rng(seed)
    rates = np.cumsum(generator.normal(size=(rows, 3)) * 0.004, axis=0)
    return Rotation.from_rotvec(rates) * Rotation.random(random_state=seed)


SWEPT = {"ordinary": stated("ordinary", "3-2-1"), "wing-last": stated("wing-last", "3-1-2")}


def results(shown: list[dict[str, Any]], quantity: str = "lock margin") -> dict[str, dict[str, Any]]:
    return {item["of"]: item for item in shown if item["kind"] == "result" and item["quantity"] == quantity}


def test_published_check_of_campaign_sweep(shown: list, campaign: Callable[..., dict[str, Any]]) -> None:
    """published check of campaign-sweep

    Vallado, Crawford, Hujsak, Kelso: Revisiting Spacetrack Report #3 (AIAA 2006-6753), verification positions and
    velocities bundled with the sgp4 package (tcppver.out), inclinations printed with five decimals. The body points z
    down and y against the orbit normal; 3-1-2 locks where body y lies along inertial z, so that its margin at a row is
    the published inclination of that row, folded to 0 … 90 deg. Each satellite's rows are a run.
    """
    orbits = published_attitudes()
    swept = {"3-1-2": stated("3-1-2", "3-1-2")}
    runs = {f"{name}.csv": attitudes for name, (attitudes, _) in orbits.items()}
    work = CampaignSweep(conventions=swept, campaign=campaign(runs, **{"between samples": "samples"}))
    work.show_margins()
    work.show_checks()
    margins = {run.run.removesuffix(".csv"): run.margins["3-1-2"].least.lo for run in work.campaign.runs}
    for name, (_, least_deg) in orbits.items():
        assert abs(np.degrees(margins[name]) - least_deg) <= HALF_LAST_DIGIT, name
    assert [item["id"] for item in shown if item["kind"] == "check" and not item["agrees"]] == []
    assert results(shown)["3-1-2"]["lo"] == pytest.approx(np.degrees(min(margins.values())), abs=1e-9)


def published_attitudes() -> dict[str, tuple[Rotation, float]]:
    """By satellite: attitudes at the published rows, and the least published inclination (folded, deg)."""
    sgp4 = pytest.importorskip("sgp4")
    rows: dict[str, list[list[float]]] = {}
    for line in (Path(sgp4.__file__).parent / "tcppver.out").read_text().splitlines():
        words = line.split()
        if words[-1] == "xx":
            rows[words[0]] = []
        elif len(words) > 10:
            list(rows.values())[-1].append([float(word) for word in words[:10]])
    found = {}
    for name, listed in rows.items():
        table = np.array(listed).reshape(-1, 10)
        times = table[:, 0]
        if len(table) > 4 and (np.diff(times) > 0.0).all():
            folded = np.minimum(table[:, 9], 180.0 - table[:, 9])
            found[name] = (pointing(table[:, 1:7]), float(folded.min()))
    assert len(found) > 20
    return found


def pointing(states: np.ndarray) -> Rotation:
    down = -states[:, :3] / np.linalg.norm(states[:, :3], axis=1, keepdims=True)
    normal = np.cross(states[:, :3], states[:, 3:])
    y = -normal / np.linalg.norm(normal, axis=1, keepdims=True)
    return Rotation.from_matrix(np.stack([np.cross(y, down), y, down], axis=-1))


def test_everything_shown_can_be_shown(shown: list, campaign: Callable[..., dict[str, Any]], disagreeing: Any) -> None:
    runs = {"a.parquet": tumble(1), "b.parquet": tumble(2), "c.csv": tumble(3)}
    work = CampaignSweep(conventions=SWEPT, campaign=campaign(runs, **{"attitude error": "0.5 deg"}))
    for name in ("inputs", "assumptions", "margins", "ranking", "runs", "histogram", "oddities", "checks", "results"):
        getattr(work, f"show_{name}")()
    assert disagreeing() == []
    assert len([item for item in shown if item["kind"] == "check"]) == 7
    assert {item["basis"] for item in shown if item["kind"] == "result"} == {"certified bound"}
    whole = CampaignSweep(conventions=SWEPT, campaign=campaign(runs)).margins["ordinary"].least
    assert results(shown)["ordinary"]["lo"] == pytest.approx(max(0.0, np.degrees(whole.lo) - 0.5), abs=1e-9)


def test_processes_give_the_same_answer_as_one(
    campaign: Callable[..., dict[str, Any]], monkeypatch: pytest.MonkeyPatch
) -> None:
    stated_campaign = campaign({"a.parquet": tumble(4), "b.csv": tumble(5)})
    alone = CampaignSweep(conventions=SWEPT, campaign=stated_campaign).campaign
    monkeypatch.setattr(sharing, "usable_processors", lambda: 2)
    told = Path("told")
    monkeypatch.setenv(sharing.PROGRESS_VARIABLE, str(told))
    together = CampaignSweep(conventions=SWEPT, campaign=stated_campaign).campaign
    assert same(alone, together)
    assert told.read_text() == "2 of 2 runs"


def same(one: Any, other: Any) -> bool:
    ends = [
        [(m.least.lo, m.least.hi, m.largest.lo, m.largest.hi, m.least.governing) for m in found.margins.values()]
        for found in (one, other)
    ]
    return ends[0] == ends[1] and bool((one.histogram == other.histogram).all()) and one.rows == other.rows


def test_a_cluster_that_loses_a_worker_gives_the_same_answer(
    campaign: Callable[..., dict[str, Any]], monkeypatch: pytest.MonkeyPatch
) -> None:
    """Two workers, one killed while runs are being read; the cluster does its work again."""
    distributed = pytest.importorskip("distributed")
    stated_campaign = campaign({f"run{n}.parquet": tumble(n, 2000) for n in range(6)})
    alone = CampaignSweep(conventions=SWEPT, campaign=stated_campaign).campaign
    with distributed.LocalCluster(
        n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None, protocol="tcp"
    ) as cluster:
        monkeypatch.setenv(sharing.SCHEDULER_VARIABLE, cluster.scheduler_address)
        killed: list[int] = []

        def kill_one(done: int, of: int, what: str) -> None:
            if done == 2 and not killed:
                process = next(iter(cluster.workers.values())).process.process
                killed.append(process.pid)
                process.kill()

        monkeypatch.setattr(sharing, "tell_progress", kill_one)
        together = CampaignSweep(conventions=SWEPT, campaign=stated_campaign).campaign
    assert len(killed) == 1
    assert same(alone, together)


def test_no_scheduler_at_the_address(campaign: Callable[..., dict[str, Any]], monkeypatch: pytest.MonkeyPatch) -> None:
    pytest.importorskip("distributed")
    monkeypatch.setenv(sharing.SCHEDULER_VARIABLE, "tcp://127.0.0.1:9")
    monkeypatch.setattr(sharing, "_PATIENCE", 1.0)
    work = CampaignSweep(conventions=SWEPT, campaign=campaign({"a.parquet": tumble(1)}))
    with pytest.raises(CalculationError, match=r"no scheduler answers at 'tcp://127\.0\.0\.1:9'"):
        _ = work.campaign


def test_the_library_of_clusters_is_named_with_its_extra(
    campaign: Callable[..., dict[str, Any]], monkeypatch: pytest.MonkeyPatch
) -> None:
    def missing(name: str) -> Any:
        raise ImportError(name)

    monkeypatch.setenv(sharing.SCHEDULER_VARIABLE, "tcp://127.0.0.1:9")
    work = CampaignSweep(conventions=SWEPT, campaign=campaign({"a.parquet": tumble(1)}))
    monkeypatch.setattr(sharing.importlib, "import_module", missing)
    with pytest.raises(CalculationError, match=r"pip install 'trunnion\[cluster\]'"):
        _ = work.campaign


def test_a_worker_with_another_program_refuses() -> None:
    with pytest.raises(CalculationError, match="another version of Trunnion"):
        sharing._checked(1, function=abs, program="other")


def test_errors_travel_whole_between_processes() -> None:
    """A worker's error arrives with every fault, cause and remedy."""
    for error in (
        TableError([Fault("one", "mend it"), Fault("two")]),
        RegionError("cause", remedy="remedy"),
    ):
        again = pickle.loads(pickle.dumps(error))
        assert (str(again), again.fault, type(again)) == (str(error), error.fault, type(error))
        assert getattr(again, "faults", None) == getattr(error, "faults", None)


def test_gaps_and_half_turns_are_findings(shown: list, campaign: Callable[..., dict[str, Any]]) -> None:
    turns = np.array([0.0, 10.0, 20.0, 195.0, 200.0])
    runs = {"a.csv": Rotation.from_rotvec(np.outer(turns, [0, 0, 1]), degrees=True)}
    work = CampaignSweep(conventions=SWEPT, campaign=campaign(runs, **{"max gap": "1.5 s"}))
    work.show_oddities()
    assert [item["id"] for item in shown if item["kind"] == "finding"] == ["half-turn:a.csv"]
    write_run(Path("inputs/a.csv"), Rotation.from_rotvec(np.outer(turns / 10, [0, 0, 1]), degrees=True), step=2.0)
    CampaignSweep(conventions=SWEPT, campaign=campaign({}, files=["a.csv"], **{"max gap": "1.5 s"})).show_oddities()
    assert [item["text"] for item in shown if item["id"] == "gap:a.csv"] == [
        "4 gaps longer than stated, the longest 2 s: not joined"
    ]


def test_a_rate_that_the_rows_contradict_names_run_and_rows(campaign: Callable[..., dict[str, Any]]) -> None:
    runs = {"a.csv": Rotation.from_rotvec(np.outer([0.0, 10.0, 30.0], [0, 0, 1]), degrees=True)}
    stated_campaign = campaign(runs, **{"between samples": "rate limited", "max body rate": "15 deg/s"})
    work = CampaignSweep(conventions=SWEPT, campaign=stated_campaign)
    with pytest.raises(RegionError, match=r"run 'a\.csv'.*between rows 2 and 3 the body turns faster"):
        _ = work.campaign


def test_no_campaign_and_no_files(campaign: Callable[..., dict[str, Any]]) -> None:
    with pytest.raises(CalculationError, match="its pattern matches no file"):
        runs_of(campaign({}))
    with pytest.raises(CalculationError, match="is no campaign"):
        runs_of({"name": "hover", "cone": {}})


# --- spoiled on purpose: its own checks must report it ---


def test_a_run_left_out_is_reported(
    campaign: Callable[..., dict[str, Any]], disagreeing: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    work = CampaignSweep(conventions=SWEPT, campaign=campaign({"a.csv": tumble(1), "b.csv": tumble(9)}))
    worst = min(work.campaign.runs, key=lambda run: run.margins["ordinary"].least.lo).run
    sound = reductions.gathered

    def forgetful(runs: dict[str, Any], plan: Any) -> Any:
        return sound({name: found for name, found in runs.items() if name != worst}, plan)

    monkeypatch.setattr(reductions, "gathered", forgetful)
    CampaignSweep(conventions=SWEPT, campaign=campaign({}, files=["a.csv", "b.csv"])).show_checks()
    assert {"check:ordinary:rows", "check:rows"} <= set(disagreeing())


def test_a_transposed_map_is_reported(
    campaign: Callable[..., dict[str, Any]], disagreeing: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    sound = campaign_sheet.read_run

    def inverted(run: Any) -> Any:
        for times, q in sound(run):
            yield times, q * np.array([1.0, -1.0, -1.0, -1.0])

    monkeypatch.setattr(campaign_sheet, "read_run", inverted)
    CampaignSweep(conventions=SWEPT, campaign=campaign({"a.csv": tumble(1), "b.csv": tumble(9)})).show_checks()
    assert "check:wing-last:followed" in disagreeing()


def test_other_axes_are_reported(campaign: Callable[..., dict[str, Any]], disagreeing: Any) -> None:
    work = CampaignSweep(conventions=SWEPT, campaign=campaign({"a.csv": tumble(1)}))
    work.plan.u[:, 0], work.plan.v[:, 0] = work.plan.v[:, 0].copy(), work.plan.u[:, 0].copy()
    work.show_checks()
    assert "check:ordinary:witness" in disagreeing() or "check:ordinary:followed" in disagreeing()
