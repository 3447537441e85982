"""The state of a campaign from names of files: counts, pace, time left; for large campaigns at once."""

import json
import os
import time

import pytest
from scission.cli import main
from scission.cli.snapshot import Watcher, slowest
from scission.cli.status import status_text
from scission.execution.layout import Layout, write_json
from scission.execution.markers import claim, mark_running

N_POINTS = 6


def key(number, kind="p"):
    """A key as long as real ones, spread over the folders as digests are."""
    return f"{number * 37 % 256:02x}{kind}{number:017d}"


def plan(folder, levels=("hf", "cc"), points=N_POINTS):
    """A plan of one scan in which all levels share their references."""
    (folder / "plan").mkdir(parents=True)
    (folder / "plan" / "plan.json").write_text("{}")
    rows = ["scan,level,point,coordinate_angstrom,key,reference_key"]
    for i, level in enumerate(levels):
        rows += [f"bond,{level},{n + 1},1.0,{key(i * points + n)},{key(n, 'r')}" for n in range(points)]
    (folder / "plan" / "points.csv").write_text("\n".join(rows) + "\n")
    return Layout(folder)


def record(layout, name, which="records"):
    """A record as far as status looks at it: by its name."""
    path = layout.folder / which / name[:2] / f"{name}.npz"
    path.parent.mkdir(parents=True, exist_ok=True)
    path.touch()
    return path


@pytest.fixture
def layout(tmp_path):
    """Level hf is done; of level cc two points are done, one of them not good."""
    made = plan(tmp_path / "made-up")
    for n in range(N_POINTS):
        record(made, key(n, "r"), "references")
        record(made, key(n))
    for n in (6, 7):
        record(made, key(n))
    write_json(made.job_done("correlate.a"), {"job": "correlate.a", "not_good": {key(7): "unconverged"}})
    return made


def numbers(snapshot, level):
    """(planned, good, running, not good, left) of a level."""
    count = snapshot.groups["bond", level]
    return count.total, count.good, count.running, count.failed, count.left


def test_points_are_good_failed_or_left(layout):
    """By name of record, and by what jobs say of those that are not good."""
    snapshot = Watcher(layout).look()

    assert numbers(snapshot, "hf") == (6, 6, 0, 0, 0)
    assert numbers(snapshot, "cc") == (6, 1, 0, 1, 4)
    assert snapshot.references.good == N_POINTS
    assert snapshot.jobs == []


def test_a_point_counts_as_running_as_long_as_its_worker_lives(layout):
    """A marker that a dead worker left behind does not."""
    with claim(layout, "correlate.b"):
        mark_running(layout, key(8), 1, "correlate.b")
        alive = Watcher(layout).look()
    dead = Watcher(layout).look()

    assert numbers(alive, "cc") == (6, 1, 1, 1, 3)
    assert [item.what for item in alive.at_work] == ["bond cc 3"]
    assert numbers(dead, "cc") == (6, 1, 0, 1, 4)


def test_pace_and_time_left_follow_from_the_times_of_records(layout):
    """Fourteen records in 140 s are one in ten seconds; four points and no reference are left: 40 s."""
    paths = sorted(layout.folder.glob("re*/*/*.npz"))
    for i, path in enumerate(paths):
        age = 140.0 * (i % 7 + 1) / 7
        os.utime(path, (time.time() - age, time.time() - age))
    with claim(layout, "correlate.b"):
        snapshot = Watcher(layout).look()

    assert len(paths) == 14
    assert snapshot.per_second == pytest.approx(0.1, rel=0.05)
    assert snapshot.seconds_left == pytest.approx(40.0, rel=0.05)


def test_a_retry_that_heals_a_point_is_seen_by_a_watcher(layout):
    """Files of jobs are read again when they change."""
    watcher = Watcher(layout)
    before = numbers(watcher.look(), "cc")
    path = layout.job_done("correlate.a")
    write_json(path, {"job": "correlate.a", "not_good": {}})
    os.utime(path, ns=(1, 1))

    assert (before[3], numbers(watcher.look(), "cc")[3]) == (1, 0)


def test_status_writes_nothing(layout, capsys):
    """Not a file appears, changes or vanishes."""
    before = {p: p.stat().st_mtime_ns for p in layout.folder.rglob("*")}

    assert main(["status", str(layout.folder)]) == 0
    assert {p: p.stat().st_mtime_ns for p in layout.folder.rglob("*")} == before
    assert "bond  cc          6     1         1     4" in capsys.readouterr().out


def test_watching_ends_when_all_is_done(layout, capsys):
    """It shows the last state once and returns."""
    for n in range(6, 12):
        record(layout, key(n))

    assert main(["status", str(layout.folder), "--watch", "0.1"]) == 0
    assert capsys.readouterr().out.count("references:") == 1


def test_the_slowest_points_come_from_the_table_of_points(tmp_path):
    """In the order of their time; a point without one, and a table cut short, do no harm."""
    path = tmp_path / "points.csv"
    path.write_text("scan,level,point,wall_s\nb,cc,1,2.5\nb,cc,2,\nb,cas,1,30\nb,cc,3,4\n")

    assert slowest(path, 2) == [("b cas 1", 30.0), ("b cc 3", 4.0)]
    path.write_text("scan,lev")
    assert slowest(path, 2) == []


def test_the_slowest_points_are_told_while_others_run(layout):
    """Of all jobs, finished or at work, from their small files; no record is opened, they are all empty here."""
    write_json(layout.job_done("correlate.a"), {"not_good": {}, "slowest": [[key(6), 80.0], [key(7), 2.0]]})
    write_json(layout.job_done("reference.b"), {"not_good": {}, "slowest": [[key(2, "r"), 30.0]]})
    with claim(layout, "correlate.c") as mine:
        mine.tell({"slowest": [[key(8), 3600.0]]})
        text = status_text(Watcher(layout).look(), layout)

    assert (
        "slowest points: bond cc 3 (60 min); bond cc 1 (80 s); reference of bond hf 3 (30 s); bond cc 2"
        in text
    )


def test_many_scans_are_summed_by_level_unless_all_are_asked_for(tmp_path):
    """A hundred levels are listed only on request; the sum is the same."""
    made = plan(tmp_path / "wide", levels=[f"l{i}" for i in range(100)], points=1)
    snapshot = Watcher(made).look()

    assert "(1 scans)" in status_text(snapshot, made)
    assert status_text(snapshot, made, every_scan=True).count("bond") == 100


def test_damaged_job_files_are_passed_over(layout):
    """A file that is not whole says nothing of its points."""
    layout.job_done("correlate.a").write_text('{"not_good": {"a')

    assert numbers(Watcher(layout).look(), "cc")[3] == 0
    assert json.loads((layout.plan / "plan.json").read_text()) == {}
