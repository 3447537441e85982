"""What every field of the record schema promises."""

import h5py
import numpy as np
import pytest
from scission.records import Record, Store, schema
from scission.records.gather import gather
from scission.verdict import judge
from synthetic_campaign import points

FIELDS = schema.SCALARS + schema.ARRAYS + schema.POINT_TEXTS
UNITS = {"1", "hartree", "bohr", "s", "MB", "e*bohr"}


@pytest.mark.parametrize("field", FIELDS, ids=lambda field: field.name)
def test_a_field_states_type_unit_shape_and_meaning(field):
    """A name for Python and HDF5, a known unit, named axes, one line of meaning."""
    assert field.name.isidentifier()
    assert field.dtype in ("f8", "i8", "str")
    assert field.unit in UNITS
    assert all(axis.isidentifier() for axis in field.shape)
    assert len(field.meaning) > 10
    assert "\n" not in field.meaning


def test_no_two_fields_share_a_name():
    """Scalars, arrays and words stand side by side in campaign.h5."""
    names = [field.name for field in FIELDS]

    assert len(names) == len(set(names))


@pytest.mark.parametrize("field", schema.SCALARS, ids=lambda field: field.name)
def test_every_scalar_survives_record_and_gather(tmp_path, field):
    """Written to a record, a scalar arrives in campaign.h5 with its value and unit."""
    store, point = Store(tmp_path), points()[0]
    value = 7 if field.dtype == "i8" else -1.0 / 3.0
    store.write(Record(point.key, "point", "converged", scalars={"energy": -1.0} | {field.name: value}))
    gather([point], store, tmp_path / "c.h5", {})

    with h5py.File(tmp_path / "c.h5") as file:
        dataset = file["scans/h-f"][field.name]
        assert dataset[0, 0] == value
        assert dataset.attrs["units"] == field.unit


@pytest.mark.parametrize("field", schema.ARRAYS, ids=lambda field: field.name)
def test_every_array_survives_the_record(tmp_path, field):
    """An array of the stated type and number of axes comes back bit by bit."""
    store = Store(tmp_path)
    array = np.arange(2 ** len(field.shape), dtype=field.dtype).reshape((2,) * len(field.shape))
    store.write(Record("ab", "reference", "converged", arrays={field.name: array}))
    back = store.read("reference", "ab").arrays[field.name]

    assert back.dtype == array.dtype
    assert np.array_equal(back, array)


def test_every_reason_is_explained():
    """Reasons are short words for tables, with a sentence each."""
    for reason, meaning in schema.REASONS.items():
        assert reason == reason.lower().replace(" ", "-")
        assert meaning


def test_the_verdict_uses_the_flags_that_the_schema_lists():
    """A point about which nothing is known has a flag as well."""
    assert judge({}, {}).label == "undetermined"
    assert "undetermined" in schema.FLAGS
