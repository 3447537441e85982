"""The quick reader of record files against the standard library's."""

import io
import zipfile

import numpy as np
import pytest
from scission.records.fileformat import pack
from scission.records.stored_zip import verified_members


def archive(method=zipfile.ZIP_STORED, comment=b""):
    """A zip archive as the standard library writes it."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", method) as made:
        made.comment = comment
        for name in ("a", "b.npy", "empty"):
            made.writestr(name, name.encode() * (0 if name == "empty" else 40))
    return buffer.getvalue()


def test_it_reads_what_the_standard_library_reads():
    """Same names, same bytes, for records and for archives of others."""
    packed = pack({"key": "k"}, {"positions": np.arange(6.0).reshape(2, 3), "dipole": np.ones(3)})
    for data in (packed, archive()):
        with zipfile.ZipFile(io.BytesIO(data)) as known:
            expected = {name: known.read(name) for name in known.namelist()}

        assert {name: bytes(body) for name, body in verified_members(data).items()} == expected


@pytest.mark.parametrize("data", [archive(zipfile.ZIP_DEFLATED), archive(comment=b"!"), b"", b"PK\5\6" * 9])
def test_it_leaves_everything_unusual_to_the_standard_library(data):
    """Compressed members, comments and what is no archive at all are not its business."""
    assert verified_members(data) is None


def test_it_gives_nothing_of_an_archive_with_any_wrong_byte_in_a_member():
    """Every byte of every member counts: its checksum is verified."""
    data = archive()
    body = data.index(b"b.npyb.npy")
    for place in range(body, body + 40):
        wrong = bytearray(data)
        wrong[place] ^= 4

        assert verified_members(bytes(wrong)) is None
