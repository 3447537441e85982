"""A run that goes on first looks whether what its finished jobs have done is still there."""

import hashlib
import os

import pytest
from scission.execution.layout import Layout, write_json
from scission.execution.recheck import recheck, seal
from scission.records.store import Record, Store

KEYS = {"job-a": ("aa01", "aa02"), "job-b": ("bb01", "bb02")}


@pytest.fixture
def layout(tmp_path):
    """Two finished jobs of two points each, and a sealed campaign.h5."""
    layout, store = Layout(tmp_path), Store(tmp_path)
    write_json(layout.plan / "plan.json", {"jobs": [{"job": job} for job in KEYS]})
    for job, keys in KEYS.items():
        for key in keys:
            store.write(Record(key, "point", "converged", scalars={"energy": -1.0}))
        items = [{"kind": "correlate", "key": key} for key in keys]
        write_json(layout.job_plan(job), {"stage": "correlate", "points": items})
        write_json(layout.job_done(job), {"job": job})
    layout.gathered.write_bytes(b"numbers")
    seal(layout.gathered)
    return layout


def freed(layout):
    """Jobs without a summary."""
    return [job for job in KEYS if not layout.job_done(job).exists()]


def later(path, content):
    """Change a file some time after everything else."""
    path.write_bytes(content)
    os.utime(path, (path.stat().st_mtime + 60.0,) * 2)


def test_a_campaign_that_is_whole_is_left_alone(layout):
    """Nothing is found, no summary is removed."""
    found = recheck(layout)

    assert (found, freed(layout)) == ([], [])


def test_a_record_that_is_gone_frees_its_job_alone(layout):
    """The other job keeps its summary."""
    Store(layout.folder).path("point", "aa02").unlink()
    found = recheck(layout)

    assert freed(layout) == ["job-a"]
    assert "records of 1 finished jobs are missing or damaged" in found[0]


@pytest.mark.parametrize("share", [0.0, 0.5, 0.99])
def test_a_record_that_was_cut_short_is_set_aside_and_frees_its_job(layout, share):
    """What cannot be read counts as missing."""
    path = Store(layout.folder).path("point", "bb01")
    later(path, path.read_bytes()[: int(share * path.stat().st_size)])
    recheck(layout)

    assert freed(layout) == ["job-b"]
    assert (layout.folder / "damaged" / "records-bb01.npz").exists()


def test_a_younger_record_that_is_sound_costs_nothing(layout):
    """A clock that jumped makes the program look, not compute."""
    path = Store(layout.folder).path("point", "bb01")
    later(path, path.read_bytes())

    assert (recheck(layout), freed(layout)) == ([], [])


def test_a_changed_gathered_file_is_set_aside(layout):
    """The engine then makes it again from the records."""
    layout.gathered.write_bytes(b"numbxrs")
    found = recheck(layout)

    assert not layout.gathered.exists()
    assert (layout.folder / "damaged" / "campaign.h5").read_bytes() == b"numbxrs"
    assert "damaged" in found[0]


def test_the_seal_is_what_sha256sum_reads(layout):
    """Digest, two blanks, name."""
    words = (layout.folder / "campaign.h5.sha256").read_text()

    assert words == f"{hashlib.sha256(b'numbers').hexdigest()}  campaign.h5\n"
