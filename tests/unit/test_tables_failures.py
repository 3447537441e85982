"""The failure list comes back from a person's hands."""

import pytest
from scission.tables import FailureListError, frame, read_failures, write_tables

HEADER = "scan,level,point,coordinate_angstrom,remedy\n"


def listed(tmp_path, text, encoding="utf-8"):
    path = tmp_path / "failures.csv"
    path.write_bytes(text.encode(encoding) if isinstance(text, str) else text)
    return read_failures(path)


def test_what_the_program_writes_it_reads(tmp_path):
    """Message and all, with every digit of the coordinate."""
    row = {
        "scan": "one-oh",
        "level": "cc",
        "point": 7,
        "coordinate_angstrom": 0.1 + 0.2,
        "status": "failed",
        "reason": "raised",
        "message": 'said "no", twice',
        "attempts": 2,
        "key": "ab12",
    }
    write_tables({"failures": frame("failures", [row])}, tmp_path)
    (back,) = read_failures(tmp_path / "failures.csv")

    assert (back.scan, back.level, back.point, back.key) == ("one-oh", "cc", 7, "ab12")
    assert back.coordinate_angstrom == 0.1 + 0.2


def test_rows_deleted_columns_moved_and_added(tmp_path):
    """Three columns are enough, in any order, beside columns of somebody's own."""
    (row,) = listed(tmp_path, "note,point,level,scan\ncheck,3,cc,one-oh\n\n,,,\n")

    assert (row.line, row.scan, row.level, row.point) == (2, "one-oh", "cc", 3)


def test_a_spreadsheet_may_add_a_mark_and_carriage_returns(tmp_path):
    """A byte order mark and CRLF are not data."""
    (row,) = listed(tmp_path, HEADER.replace("\n", "\r\n") + "s,cc,1,0.9,damping\r\n", "utf-8-sig")

    assert (row.scan, row.coordinate_angstrom, row.remedy) == ("s", 0.9, "damping")


def test_a_list_with_no_rows_asks_for_nothing(tmp_path):
    """Somebody who deletes all rows gets an empty list, not an error."""
    assert listed(tmp_path, HEADER) == []


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (HEADER.replace(",", ";") + "s;cc;1;0,9;\n", "line 1: the columns are separated by semicolons"),
        (HEADER.replace(",", "\t"), "line 1: the columns are separated by tabs"),
        ("scan,point\ns,1\n", "line 1: no column level"),
        ("scan,level,point,scan\n", "line 1: column scan is there twice"),
        ("", "the file is empty"),
        (HEADER + "s,cc,1,0.9,\ns,cc,1.5,0.9,\n", "line 3, column point: '1.5' is not a whole number"),
        (HEADER + "s,cc,0,0.9,\n", "line 2, column point: '0'"),
        (HEADER + "s,,1,0.9,\n", "line 2, column level: is empty"),
        (HEADER + 's,cc,1,"0,9",\n', "line 2, column coordinate_angstrom: '0,9'"),
        (HEADER + "s,cc,1,inf,\n", "line 2, column coordinate_angstrom: 'inf'"),
        (HEADER + "s,cc,1,0.9,,,x\n", "line 2: 7 cells"),
        (HEADER + "s,cc,1,0.9,\ns,cc,1,0.9,\n", "line 3: point 1 of s, cc is in line 2 already"),
        (HEADER + 's,"cc,1,0.9,\n', "line 2: unexpected end of data"),
        (HEADER.encode("utf-16"), "is UTF-16 or binary"),
        (HEADER.encode() + b"s,c\xff,1,0.9,\n", "line 2: not UTF-8"),
    ],
)
def test_what_is_wrong_is_said_with_its_place(tmp_path, text, said):
    """The error names file, line and column, and what to do."""
    with pytest.raises(FailureListError) as caught:
        listed(tmp_path, text)

    assert said in str(caught.value)
    assert str(caught.value).startswith(str(tmp_path / "failures.csv"))


def test_all_problems_at_once_but_not_without_end(tmp_path):
    """A thousand bad lines are told in twenty."""
    with pytest.raises(FailureListError) as caught:
        listed(tmp_path, HEADER + "s,cc,x,0.9,\n" * 1000)

    assert str(caught.value).count("\n") == 20
    assert str(caught.value).endswith("... and 980 more")
