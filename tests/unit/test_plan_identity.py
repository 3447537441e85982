"""What a plan's keys and job names depend on, and what they do not."""

import copy

import pytest
from campaigns import GOOD, changed, load
from scission.plan import make_plan


def plan(folder, *edits):
    """The plan of the good campaign with some edits."""
    folder.mkdir(parents=True, exist_ok=True)
    return make_plan(load(changed(*edits), folder))


def keys(made, level, which="key", scan=None):
    """Coordinate to key of a level's points."""
    return {
        p.coordinate: getattr(p, which) for p in made.points if p.level == level and scan in (None, p.scan)
    }


LENGTHS = "scans/hh/stretch/lengths"


@pytest.fixture
def made(tmp_path):
    """The plan of the good campaign as it is."""
    return plan(tmp_path / "made")


@pytest.mark.parametrize(
    "edit",
    [
        (LENGTHS, [0.5, 0.6, 0.7, 0.9, 1.3]),
        ("levels/more", {"reference": "UHF", "basis": "sto-3g"}),
        ("diagnostics/thresholds", {"T1": {"value": 0.03, "source": "a paper"}}),
        ("fit/models", ["morse"]),
        ("reference_level", "fci"),
        ("campaign", "other-name"),
    ],
    ids=lambda edit: edit[0],
)
def test_what_does_not_decide_numbers_leaves_keys_alone(made, tmp_path, edit):
    """More points, another level, thresholds, fits and names: every old point keeps its keys."""
    after = plan(tmp_path / "after", edit)

    for level in ("fci", "ucc"):
        for which in ("key", "reference_key"):
            old, new = keys(made, level, which, "hh"), keys(after, level, which, "hh")
            assert old.items() <= new.items()


@pytest.mark.parametrize(
    ("edit", "reference_too"),
    [
        (("levels/ucc/basis", "cc-pVTZ"), True),
        (("levels/ucc/reference", "ROHF"), True),
        (("levels/ucc/follow", "anchor"), True),
        (("levels/ucc/correlation", "MP2"), False),
        (("levels/ucc/frozen_core", True), False),
        (("molecules/hydroxyl/charge", -1), True),
        (("molecules/hydroxyl/multiplicity", 4), True),
    ],
    ids=lambda edit: edit[0] if isinstance(edit, tuple) else "",
)
def test_what_decides_numbers_is_in_the_key(tmp_path, edit, reference_too):
    """Another basis, reference, state, correlation, core, charge or spin: no point keeps its key."""
    edits = [edit, ("molecules/hydroxyl/multiplicity", 1)] if edit[0].endswith("charge") else [edit]
    frozen = [("levels/ucc/frozen_core", False)] if edit[0] != "levels/ucc/frozen_core" else []
    before = plan(tmp_path / "before", ("levels/ucc/frozen_core", False))
    after = plan(tmp_path / "after", *frozen, *edits)

    old, new = keys(before, "ucc", scan="radical"), keys(after, "ucc", scan="radical")
    assert not set(old.values()) & set(new.values())

    old, new = (set(keys(p, "ucc", "reference_key", "radical").values()) for p in (before, after))
    assert (old == new) != reference_too


def test_levels_with_one_reference_share_it(tmp_path):
    """MP2 and CCSD(T) on one determinant have the same reference keys and different point keys."""
    made = plan(
        tmp_path,
        ("levels/mp2", {"reference": "RHF", "correlation": "MP2", "basis": "cc-pVDZ"}),
        ("scans/one-oh/levels", ["cc", "mp2"]),
    )

    assert keys(made, "cc", "reference_key") == keys(made, "mp2", "reference_key")
    assert not set(keys(made, "cc").values()) & set(keys(made, "mp2").values())


def test_a_point_of_two_scans_is_computed_once(tmp_path):
    """Two scans of one molecule share records where their lengths agree; no point comes in two jobs."""
    twin = copy.deepcopy(GOOD["scans"]["hh"]) | {"levels": ["fci"]}
    twin["stretch"]["lengths"] = [0.7, 1.1]
    made = plan(tmp_path, ("scans/twin", twin))
    shared = keys(made, "fci", scan="hh").items() & keys(made, "fci", scan="twin").items()
    work = [item["key"] for job in made.jobs if job.stage == "correlate" for item in job.payload["points"]]

    assert len(shared) == 1
    assert len(work) == len(set(work))


def test_the_same_campaign_gives_the_same_plan(made, tmp_path):
    """Keys and job names are deterministic and safe as file names."""
    again = plan(tmp_path / "again")

    assert [j.id for j in again.jobs] == [j.id for j in made.jobs]
    assert [p.key for p in again.points] == [p.key for p in made.points]
    assert all(
        set(j.id) <= set("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789._-")
        for j in made.jobs
    )
    assert len({j.id for j in made.jobs}) == len(made.jobs)


def test_every_point_is_in_one_job(made):
    """Points of correlated levels are in one block each, the others are published by one reference job."""
    work = [
        item["key"]
        for job in made.jobs
        for item in (
            *job.payload.get("publish", ()),
            *(job.payload.get("points", ()) if job.stage == "correlate" else ()),
        )
        if "calculation" not in item
    ]

    assert sorted(work) == sorted({p.key for p in made.points})


@pytest.mark.parametrize("seconds", [0.001, 5.0, 1e9])
def test_blocks_cover_the_points_whatever_their_size(tmp_path, seconds):
    """One point a job or all in one: the same points, each once, none in an empty block."""
    made = make_plan(load(GOOD, tmp_path), block_seconds=seconds)
    blocks = [j for j in made.jobs if j.stage == "correlate"]
    work = [item["key"] for j in blocks for item in j.payload["points"]]

    assert all(j.n_points == len(j.payload["points"]) > 0 for j in blocks)
    assert len(work) == len(set(work))
    assert set(work) >= {p.key for p in made.points if p.level in ("cc", "fci", "ucc", "cas")}


def test_smaller_blocks_are_more_jobs(tmp_path):
    """The forecast's budget decides how many points a block holds."""
    few, many = (
        [j for j in make_plan(load(GOOD, tmp_path), block_seconds=s).jobs if j.stage == "correlate"]
        for s in (1e9, 0.001)
    )

    assert len(many) > len(few)
    assert all(j.n_points == 1 for j in many)


def test_blocks_wait_for_the_references_they_need(made):
    """Each block of points names the job that establishes its references; reference jobs wait for nobody."""
    owner = {key: j.id for j in made.jobs if j.stage == "reference" for key in j.payload["reference_keys"]}

    for job in made.jobs:
        if job.stage == "reference":
            assert job.needs == ()
        if job.stage == "correlate":
            assert set(job.needs) == {owner[item["reference_key"]] for item in job.payload["points"]}
