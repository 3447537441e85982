"""Around a run: plan, engine command, run file, progress, requests to try again."""

import subprocess
import sys
import textwrap
from types import SimpleNamespace

import pytest
from scission.execution import engine, planning
from scission.execution.layout import Layout, read_json, write_json
from scission.execution.ledger import merge
from scission.execution.orphans import Settling
from scission.execution.processes import identity, is_alive
from scission.execution.progress import Progress
from scission.execution.remedies import LADDERS, REMEDIES, factors, next_remedy
from scission.execution.retries import request_points
from scission.execution.runfile import AlreadyRunningError, hold
from scission.records.schema import REASONS
from scission.records.store import Record, Store

H2 = """
campaign: h2-plan
molecules:
  h2: {charge: 0, multiplicity: 1, xyz: h2.xyz}
levels:
  hf: {reference: RHF, correlation: none, basis: sto-3g}
  cc: {reference: RHF, correlation: CCSD, basis: sto-3g}
scans:
  bond:
    molecule: h2
    levels: [hf, cc]
    stretch: {bond: [H1, H2], lengths: [0.6, 0.7, 0.8, 1.0, 1.5]}
"""


@pytest.fixture
def planned(tmp_path):
    """A campaign file with its xyz file, planned; gives (file, layout, index)."""
    path = tmp_path / "h2.yaml"
    path.write_text(H2)
    (tmp_path / "h2.xyz").write_text("2\nhydrogen\nH 0 0 0\nH 0 0 0.74\n")
    return (path, *refresh(path))


def refresh(path, **options):
    """Make or read the plan as a run does."""
    return planning.refresh(planning.read_config(path), path, path.parent / "results", options)


def test_an_unchanged_campaign_is_not_planned_again(planned):
    """Not even its files are touched, so the engine sees nothing new."""
    path, layout, index = planned
    before = {p: p.stat().st_mtime_ns for p in layout.plan.rglob("*")}

    assert refresh(path) == (layout, index)
    assert {p: p.stat().st_mtime_ns for p in layout.plan.rglob("*")} == before


@pytest.mark.parametrize("name", ["h2.yaml", "h2.xyz"])
def test_a_changed_file_makes_the_plan_anew(planned, name):
    """The campaign file and the xyz files it names both count."""
    path, _, index = planned
    target = path.parent / name
    target.write_text(target.read_text().replace("0.7", "0.75"))

    assert refresh(path)[1]["digest"] != index["digest"]


def test_a_job_never_writes_the_plan(planned):
    """Inside a job of the engine the plan is taken as it is, or its absence told."""
    path, _, index = planned
    path.write_text(H2.replace("0.6, ", ""))
    config = planning.read_config(path)

    assert planning.refresh(config, path, path.parent / "results", {}, may_write=False)[1] == index
    with pytest.raises(planning.PlanMissingError):
        planning.refresh(config, path, path.parent / "elsewhere", {}, may_write=False)


def test_reading_an_up_to_date_plan_imports_neither_types_nor_chemistry(planned):
    """What the engine does at each start stays light."""
    path, *_ = planned
    code = f"""
        import sys
        from pathlib import Path
        from scission.execution import planning
        path = Path({str(path)!r})
        planning.refresh(planning.read_config(path), path, path.parent / "results", {{}})
        sys.exit(any(name in sys.modules for name in ("pydantic", "pyscf", "pandas", "scipy")))
    """

    assert subprocess.run([sys.executable, "-c", textwrap.dedent(code)], check=False).returncode == 0


@pytest.mark.parametrize("value", ["0", "-1", "soon", "nan", "inf"])
def test_a_block_size_that_is_none_is_an_error(value):
    """The value is in the message."""
    with pytest.raises(ValueError, match=value):
        planning.plan_options({"block_seconds": value})


def test_settings_of_profile_and_person_are_merged_into_one_option(tmp_path):
    """The engine would take only the last --config it meets."""
    command = engine.Command(
        tmp_path / "a.yaml", tmp_path, "slurm", extra=("--config", "block_seconds=5", "-n")
    )
    words = command.words()

    assert words.count("--config") == 1
    assert "block_seconds=5" in words
    assert f"results={tmp_path}" in words
    assert words[-1] == "-n"


def test_a_second_run_of_the_same_campaign_is_told(tmp_path):
    """Who runs it is in the message; afterwards it is free."""
    layout = Layout(tmp_path)
    code = f"""
        from pathlib import Path
        from scission.execution.runfile import hold
        from scission.execution.layout import Layout
        with hold(Layout(Path({str(tmp_path)!r}))):
            print("held", flush=True)
            input()
    """
    other = subprocess.Popen(
        [sys.executable, "-c", textwrap.dedent(code)],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        text=True,
    )
    other.stdout.readline()
    with pytest.raises(AlreadyRunningError, match=f"process {other.pid} on"), hold(layout):
        pass
    other.communicate("\n")
    with hold(layout) as run:
        assert run.left == {}


def _die_in_a_run(layout):
    try:
        with hold(layout) as run:
            run.note(engine={"host": "here", "pid": 1, "born": 0.0})
            raise RuntimeError("killed")
    except RuntimeError:
        return


def test_a_killed_run_leaves_its_story_and_no_lock(tmp_path):
    """The next run learns who the engine was, and the engine's lock files go."""
    layout = Layout(tmp_path)
    _die_in_a_run(layout)
    lock = tmp_path / ".snakemake" / "locks" / "0.input.lock"
    lock.parent.mkdir(parents=True)
    lock.touch()
    with hold(layout) as run:
        left = dict(run.left)
        Settling(layout, left, print).settle()

    assert left["engine"]["pid"] == 1
    assert not lock.exists()


def test_workers_of_a_killed_run_are_waited_for(tmp_path):
    """The run goes on only when the process that holds a claim has ended."""
    layout, said = Layout(tmp_path), []
    worker = subprocess.Popen([sys.executable, "-c", "import time; time.sleep(1.5)"])
    who = identity(worker.pid)
    write_json(layout.worker("correlate.a.b.c"), who)
    Settling(layout, {}, said.append, worker.poll).settle()

    assert not is_alive(who)
    assert "correlate.a.b.c" in said[0]


def test_progress_counts_good_bad_and_left_points(planned):
    """Names of records say what is done, summaries of jobs what is not good."""
    _, layout, _ = planned
    keys = [row["key"] for row in planning.read_points(layout) if row["level"] == "cc"]
    for key in keys[:3]:
        Store(layout.folder).write(Record(key, "point", "converged", scalars={"energy": -1.0}))
    write_json(layout.job_done("correlate.x"), {"not_good": {keys[2]: "failed"}})
    count = Progress.of(layout).by_group()["bond", "cc"]

    assert (count.total, count.good, count.failed, count.left) == (5, 2, 1, 2)


def listed(point, remedy="", level="cc"):
    """A row of a failure list."""
    return SimpleNamespace(line=2, scan="bond", level=level, point=point, remedy=remedy)


def lay_records(layout, reference_status="converged", reason="not-converged"):
    """A failed record of each correlated point, and references."""
    store = Store(layout.folder)
    for row in planning.read_points(layout):
        store.write(Record(row["reference_key"], "reference", reference_status, stage="reference", stamp="s"))
        if row["level"] == "cc":
            store.write(Record(row["key"], "point", "failed", reason, stage="correlate"))
    for entry in read_json(layout.plan / "plan.json")["jobs"]:
        write_json(layout.job_done(entry["job"]), {"job": entry["job"]})


def test_a_retry_asks_for_the_listed_points_only(planned):
    """One request, with the ladder's first remedy; only the job that makes the point runs again."""
    _, layout, index = planned
    lay_records(layout)
    request_points(layout, [listed(2)])
    key = next(r["key"] for r in planning.read_points(layout) if (r["level"], r["point"]) == ("cc", "2"))
    gone = [e["stage"] for e in index["jobs"] if not layout.job_done(e["job"]).exists()]

    assert [p.stem for p in layout.request("x").parent.glob("*.json") if p.stem != "grants"] == [key]
    assert read_json(layout.request(key))["remedy"] == "damping"
    assert gone == ["correlate"]


def test_asking_twice_is_one_request(planned):
    """The request is named after the attempt it follows."""
    _, layout, _ = planned
    lay_records(layout)
    request_points(layout, [listed(2)])
    path = next(p for p in layout.request("x").parent.glob("*.json") if p.stem != "grants")
    first = read_json(path)["id"]
    request_points(layout, [listed(2)])

    assert read_json(path)["id"] == first


def test_a_point_without_reference_asks_for_the_reference(planned):
    """Both jobs run again: the one of the reference and the one of the point."""
    _, layout, index = planned
    lay_records(layout, reference_status="unconverged")
    request_points(layout, [listed(2, remedy="level-shift")])
    row = next(r for r in planning.read_points(layout) if (r["level"], r["point"]) == ("cc", "2"))

    assert read_json(layout.request(row["reference_key"]))["remedy"] == "level-shift"
    assert not layout.request(row["key"]).exists()
    concerned = [e["job"] for e in index["jobs"] if e["stage"] != "fragments"]
    assert not any(layout.job_done(job).exists() for job in concerned)


def test_more_time_goes_into_the_grants_of_the_job(planned):
    """A point that ran out of time gets four times as much."""
    _, layout, index = planned
    lay_records(layout, reason="time-limit")
    request_points(layout, [listed(1)])
    job = next(e["job"] for e in index["jobs"] if e["stage"] == "correlate")

    assert read_json(layout.grants) == {job: [4.0, 1.0]}


@pytest.mark.parametrize(
    ("row", "words"), [(listed(99), "no point 99"), (listed(1, remedy="prayer"), "'prayer' is not one of")]
)
def test_a_row_that_cannot_be_done_stops_the_retry_with_its_line(planned, row, words):
    """Nothing was requested then."""
    _, layout, _ = planned
    lay_records(layout)
    with pytest.raises(ValueError, match=f"line 2.*{words}"):
        request_points(layout, [listed(2), row])

    assert not layout.request("x").parent.exists()


def test_the_ladder_is_climbed_rung_by_rung():
    """Each remedy comes once; at the end only a plain repetition is left."""
    record = Record("aa", "point", "unconverged", "not-converged", stage="correlate")
    climbed = []
    for _ in range(4):
        record.remedy = next_remedy(record)
        climbed.append(record.remedy)
        record.history.append({"remedy": record.remedy})

    assert climbed == [*LADDERS["correlate", "not-converged"], "again"]


def test_ladders_hold_known_remedies_and_reasons():
    """Whatever is suggested can be asked for."""
    assert {reason for _, reason in LADDERS} <= set(REASONS)
    assert {remedy for ladder in LADDERS.values() for remedy in ladder} <= set(REMEDIES)


def test_grants_grow_with_each_try_up_to_a_limit():
    """Twice the memory, then four times; never more than 64 times."""
    record = Record("aa", "point", "failed", "memory-limit", remedy="more-memory")
    record.history = [{"remedy": "more-memory", "request": str(i)} for i in range(20)]

    assert factors("more-memory", None).memory == 2.0
    assert factors("more-memory", record).memory == 64.0


def test_an_attempt_written_twice_is_one_attempt():
    """The good end of an attempt counts, also if a failure was noted after it."""
    good = Record("aa", "point", "converged", attempts=2, scalars={"energy": -1.0})
    bad = Record("aa", "point", "failed", "killed", attempts=2)

    assert merge(good, bad) is good
    assert merge(bad, good).history == []


@pytest.mark.parametrize(
    ("extra", "executor"),
    [
        ((), "local"),
        (("--cores", "2"), "local"),
        (("--executor", "dryrun"), "dryrun"),
        (("-e=slurm",), "slurm"),
    ],
)
def test_the_executor_is_told_with_and_without_options_for_the_engine(tmp_path, extra, executor):
    """A person's option goes before the profile's; no option at all is the usual case."""
    assert engine.Command(tmp_path / "c.yaml", tmp_path, extra=extra).executor() == executor
