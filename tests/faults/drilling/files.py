"""Faults of files: damaged records, numbers that are none, times that jump."""

import io
import json
import os
import socket
import time
import zipfile

from scission.execution.layout import read_json, write_json
from scission.execution.planning import read_points

from drilling.campaign import GOOD, StuckError
from drilling.processes import stop_in_the_middle

DAMAGED = 8
DAY_S = 86400.0


def finish(campaign):
    """Run the campaign to its good end, without any fault."""
    done = campaign.run()
    if done.returncode != GOOD:
        raise StuckError(f"exit status {done.returncode}: {done.stderr[-300:]}")


def damaged_records(campaign):
    """After a good end: records cut short or with a flipped bit, references among them, and campaign.h5."""
    finish(campaign)
    for kind in ("records", "references", "fragments"):
        paths = sorted((campaign.layout.folder / kind).rglob("*.npz"))
        for path in campaign.random.sample(paths, DAMAGED // 2):
            damage(path, campaign.random)
            _expect(campaign, path.stem)
    damage(campaign.layout.folder / "campaign.h5", campaign.random)
    campaign.settle()
    aside = [p for p in (campaign.layout.folder / "damaged").iterdir() if p.suffix != ".txt"]
    return f"{len(aside)} of {3 * (DAMAGED // 2) + 1} damaged files set aside"


def missing_records(campaign):
    """After a good end: records and references that somebody deleted."""
    finish(campaign)
    for kind in ("records", "references"):
        paths = sorted((campaign.layout.folder / kind).rglob("*.npz"))
        for path in campaign.random.sample(paths, 3):
            path.unlink()
            _expect(campaign, path.stem)
    return "6 files deleted"


def damage(path, random):
    """Cut the file short, or flip one bit of it."""
    data = bytearray(path.read_bytes())
    if random.random() < 0.5:
        data = data[: random.randrange(len(data))]
    else:
        data[random.randrange(len(data))] ^= 1 << random.randrange(8)
    path.write_bytes(data)


def no_number(campaign):
    """After a good end: three records that call an energy converged which is no number."""
    finish(campaign)
    paths = sorted((campaign.layout.folder / "records").rglob("*.npz"))
    for path in campaign.random.sample(paths, 3):
        without_energy(path)
        _expect(campaign, path.stem)
    done = campaign.run()
    rows = [row for row in campaign.rows() if row["status"] == "converged" and not row["energy_hartree"]]
    if rows:
        raise StuckError(f"{len(rows)} converged points without an energy; exit status {done.returncode}")
    return f"exit status {done.returncode}"


def without_energy(path):
    """Rewrite a record so that its energy is NaN; all checksums are right."""
    with zipfile.ZipFile(path) as archive:
        members = {name: archive.read(name) for name in archive.namelist()}
    head = json.loads(members["record.json"])
    head["scalars"]["energy"] = None  # how records hold what is not finite
    members["record.json"] = json.dumps(head).encode()
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w") as archive:
        for name, content in members.items():
            archive.writestr(name, content)
    path.write_bytes(buffer.getvalue())


def clock_jumps(campaign):
    """Between runs: times of claims, markers, records and summaries a day ahead or years back."""
    for shift in (DAY_S, -3000 * DAY_S):
        stop_in_the_middle(campaign)
        _shift(campaign, shift)
        _claims_from_elsewhere(campaign, shift)
    return "a day ahead, then eight years back"


def _shift(campaign, seconds):
    for name in ("records", "references", "fragments", "jobs", "running", "workers", "plan"):
        for path in sorted((campaign.layout.folder / name).rglob("*.*")):
            if path.is_file() and campaign.random.random() < 0.5:
                os.utime(path, (time.time() + seconds,) * 2)


def _claims_from_elsewhere(campaign, seconds):
    """Make the claims and the run file look as if a machine with another clock had left them."""
    paths = [*campaign.layout.worker("x").parent.glob("[!.]*.json"), campaign.layout.run_file]
    for path in paths:
        content = read_json(path)
        if content:
            write_json(path, content | {"host": f"not-{socket.gethostname()}"})
            os.utime(path, (time.time() + seconds,) * 2)


def _expect(campaign, key):
    """Expect the calculation to be done again, and what is built on it."""
    campaign.expected.add(key)
    for row in read_points(campaign.layout):
        if key in (row["key"], row["reference_key"]):
            campaign.expected |= {row["key"], row["reference_key"]}
