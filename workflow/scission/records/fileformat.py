"""Bytes of a record: a zip archive of ``record.json`` and one ``<array>.npy`` per array.

The members are stored without compression, so that ``numpy.load`` reads the arrays and the
archive's CRC-32 of each member tells a damaged file from a good one.
"""

from __future__ import annotations

import ast
import io
import json
import math
import zipfile
from collections.abc import Mapping
from functools import lru_cache
from typing import IO, Any

import numpy as np

from scission.records.stored_zip import verified_members

HEAD = "record.json"
ARRAY_LIST = "arrays"
_EPOCH = (1980, 1, 1, 0, 0, 0)  # the same record gives the same bytes at any time
_EINVAL = 22
_SMALL = 1 << 18
"""Files up to so many bytes are read in one go."""
_NPY = b"\x93NUMPY\x01\x00"
_MALFORMED = (ValueError, KeyError, TypeError, EOFError, RuntimeError, SyntaxError)


class DamagedRecordError(Exception):
    """The bytes are not a record that was written whole; the message says what is wrong."""


def pack(head: Mapping[str, Any], arrays: Mapping[str, np.ndarray]) -> bytes:
    """Archive of a JSON head, which gains the list of the arrays, and of the arrays.

    Raises:
        ValueError: an array of Python objects, or a head JSON cannot hold.
    """
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_STORED) as archive:
        full = {**head, ARRAY_LIST: sorted(arrays)}
        text = json.dumps(full, ensure_ascii=True, allow_nan=False, separators=(",", ":"))
        archive.writestr(zipfile.ZipInfo(HEAD, _EPOCH), text)
        for name, array in arrays.items():
            member = io.BytesIO()
            np.lib.format.write_array(member, np.asarray(array), version=(1, 0), allow_pickle=False)
            archive.writestr(zipfile.ZipInfo(f"{name}.npy", _EPOCH), member.getvalue())
    return buffer.getvalue()


def unpack(
    handle: IO[bytes], arrays: bool | tuple[str, ...] = True
) -> tuple[dict[str, Any], dict[str, np.ndarray]]:
    """Head and arrays of an open record file; only the named arrays, or none, if ``arrays`` says so.

    The checksum of every member that is read is verified.

    Raises:
        DamagedRecordError: not a zip archive, a checksum that does not match, or bad JSON.
        OSError: the file system fails; that is no statement about the record.
    """
    try:
        fast = _from_memory(handle, arrays)
        if fast is not None:
            return fast
        with zipfile.ZipFile(handle) as archive:
            head = json.loads(_member(archive, HEAD))
            if not isinstance(head, dict):
                raise DamagedRecordError(f"{HEAD} does not hold an object")
            return head, {name: _array(archive, name) for name in _wanted(archive.namelist(), head, arrays)}
    except OSError as error:
        if error.errno not in (None, _EINVAL):  # a broken directory makes zipfile seek to nowhere
            raise
        raise DamagedRecordError(str(error)) from error
    except (zipfile.BadZipFile, *_MALFORMED) as error:
        raise DamagedRecordError(f"{type(error).__name__}: {error}") from error


def _from_memory(
    handle: IO[bytes], arrays: bool | tuple[str, ...]
) -> tuple[dict[str, Any], dict[str, np.ndarray]] | None:
    """Do the same from one read of the file; None for a large one and for anything unusual, which zipfile judges."""
    data = handle.read(_SMALL + 1)
    members = verified_members(data) if len(data) <= _SMALL else None
    if members is None or HEAD not in members:
        handle.seek(0)
        return None
    head = json.loads(bytes(members[HEAD]))
    if not isinstance(head, dict):
        raise DamagedRecordError(f"{HEAD} does not hold an object")
    names = _wanted(list(members), head, arrays)
    return head, {name: _array_of(members[f"{name}.npy"], name) for name in names}


def _wanted(held: list[str], head: Mapping[str, Any], arrays: bool | tuple[str, ...]) -> list[str]:
    # The archive's directory has no checksum of its own: a flipped bit there can hide a member.
    names = sorted(head[ARRAY_LIST])
    if sorted(held) != sorted([HEAD, *(f"{name}.npy" for name in names)]):
        raise DamagedRecordError(f"holds {held}, its head lists {names}")
    if arrays is True:
        return names
    return [name for name in names if name in arrays] if arrays else []


def _member(archive: zipfile.ZipFile, name: str) -> bytes:
    info = archive.getinfo(name)
    # A stored member is never larger than its archive: no archive bomb gets past this.
    if info.compress_type != zipfile.ZIP_STORED or info.compress_size != info.file_size:
        raise DamagedRecordError(f"{name} is compressed, records never are")
    return archive.read(info)


def _array(archive: zipfile.ZipFile, name: str) -> np.ndarray:
    return _array_of(memoryview(_member(archive, f"{name}.npy")), name)


def _array_of(data: memoryview, name: str) -> np.ndarray:
    if data[: len(_NPY)] != _NPY:
        raise DamagedRecordError(f"{name}.npy is no array or of an unknown format version")
    start = len(_NPY) + 2
    body_at = start + int.from_bytes(data[len(_NPY) : start], "little")
    dtype, shape, fortran_order = _claim(bytes(data[start:body_at]))
    body = data[body_at:]
    if dtype.hasobject or math.prod(shape) * dtype.itemsize != len(body):
        raise DamagedRecordError(f"{name}.npy claims {shape} of {dtype} but holds {len(body)} bytes")
    flat = np.frombuffer(body, dtype=dtype)
    return np.array(flat.reshape(shape[::-1]).T if fortran_order else flat.reshape(shape), order="C")


@lru_cache(maxsize=512)  # most arrays of a campaign share a few headers
def _claim(header: bytes) -> tuple[np.dtype, tuple[int, ...], bool]:
    """What an npy header says; by hand, because numpy would allocate whatever size it claims."""
    claim = ast.literal_eval(header.decode("latin1"))
    return np.dtype(claim["descr"]), tuple(int(size) for size in claim["shape"]), bool(claim["fortran_order"])
