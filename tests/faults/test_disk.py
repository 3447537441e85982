"""A disk that takes nothing says nothing about a calculation: one plain line, no record, no traceback."""

import subprocess

import pytest
from scission.cli import main
from scission.execution import storage
from scission.execution.guard import Guard
from scission.execution.layout import Layout
from scission.records.atomic import UnwritableError
from scission.records.store import Store
from small_campaign import H2


@pytest.fixture
def small_disk(tmp_path):
    """A file system of 64 kB."""
    folder = tmp_path / "disk"
    folder.mkdir()
    try:
        made = subprocess.run(
            ["mount", "-t", "tmpfs", "-o", "size=64k", "none", str(folder)], capture_output=True, check=False
        )
    except FileNotFoundError:
        made = None
    if made is None or made.returncode:
        pytest.skip("no file system can be mounted here")
    yield folder
    subprocess.run(["umount", "--lazy", str(folder)], check=True)


def test_a_record_that_cannot_be_written_is_no_failed_calculation(tmp_path):
    """The guard passes the trouble on; the point stays open, its marker says that it was started."""
    (tmp_path / "records").symlink_to("/nowhere/to/be/found")
    task = {"kind": "correlate", "key": "k1", "attempt": 1, "reference_stamp": "s", "memory_mb": 2000.0}
    with Guard(tmp_path, "job", "drill") as guard, pytest.raises(UnwritableError, match="cannot write"):
        guard.run(task)

    assert Store(tmp_path).keys("point") == set()
    assert Layout(tmp_path).running("k1").exists()


def test_a_disk_with_room_is_no_trouble(tmp_path):
    """Nothing is left behind by the look, in a folder that is there or not."""
    assert storage.trouble(tmp_path / "not" / "yet") == ""
    assert list(tmp_path.iterdir()) == []


def test_a_full_disk_is_told_with_folder_and_remedy(small_disk, tmp_path, capsys):
    """The run is refused with status 1 and one line; with room again, there is no trouble."""
    (tmp_path / "c.yaml").write_text(H2)
    (small_disk / "filler").write_bytes(bytes(60_000))
    status = main(["run", str(tmp_path / "c.yaml"), "--results", str(small_disk)])
    told = capsys.readouterr().err
    (small_disk / "filler").unlink()

    assert status == 1
    assert told.count("\n") == 1
    assert f"{small_disk / 'h2-small'}: the disk is full" in told
    assert "make room" in told
    assert storage.trouble(small_disk, 30_000) == ""


def test_a_read_only_folder_is_told_with_folder_and_remedy(small_disk, tmp_path, capsys):
    """The same for a file system that takes nothing at all."""
    (tmp_path / "c.yaml").write_text(H2)
    subprocess.run(["mount", "-o", "remount,ro", str(small_disk)], check=True)
    status = main(["run", str(tmp_path / "c.yaml"), "--results", str(small_disk)])

    assert status == 1
    assert "cannot be written (read-only file system); make it writable" in capsys.readouterr().err
