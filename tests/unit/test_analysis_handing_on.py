"""An analysis is made once; the steps after it read what it left."""

import pytest
from pandas.testing import assert_frame_equal
from scission.analysis import analyse, hand_on, take_over
from scission.records import Store
from synthetic_campaign import campaign, fill


def test_an_analysis_comes_back_as_it_was(tmp_path):
    """Every table to the last digit and type, coordinates, provenance and caution."""
    store = Store(tmp_path)
    made = analyse(fill(store), campaign(tmp_path), store, {"physics_version": 1, "digest": "abc"})
    hand_on(made, tmp_path)
    again = take_over(made.campaign, tmp_path)

    assert again.frames.keys() == made.frames.keys()
    for name, table in made.frames.items():
        assert_frame_equal(again.frames[name], table, check_exact=True, obj=name)
    assert (again.coordinates, again.provenance, again.mixed) == (
        made.coordinates,
        made.provenance,
        made.mixed,
    )
    assert again.flags == made.flags


def test_without_an_analysis_the_reader_is_told_what_to_run(tmp_path):
    """The step that comes first is named."""
    with pytest.raises(FileNotFoundError, match=r"run scripts/analyse\.py first"):
        take_over(campaign(tmp_path), tmp_path)
