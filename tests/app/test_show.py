"""Charts on the screen: what changes with a room is their data alone."""

import copy

import pyarrow as pa

from planner.app.show import apart

SPEC = {
    "description": "x",
    "layer": [
        {"data": {"values": [{"hz": 63, "t": 0.4, "low": None, "assumed": True}]}, "mark": "bar"},
        {"layer": [{"data": {"values": []}, "mark": "rule"}]},
        {"data": {"values": [{"hz": 125, "t": 0.5}, {"hz": 250, "t": 0.6}]}, "mark": "point"},
    ],
    "encoding": {"x": {"axis": {"values": [63, 125]}}},
}


def test_data_move_beside_the_chart_and_nothing_else_changes():
    before = copy.deepcopy(SPEC)
    found = apart(SPEC)
    assert before == SPEC  # charts are kept between runs of the page
    assert [layer.get("data") for layer in found["layer"]] == [
        {"name": "table-0"},
        None,
        {"name": "table-1"},
    ]
    assert found["layer"][1] == SPEC["layer"][1]
    assert found["encoding"] == SPEC["encoding"]
    assert found["datasets"]["table-1"].to_pydict() == {"hz": [125.0, 250.0], "t": [0.5, 0.6]}


def test_kinds_of_values_that_the_browser_takes():
    """Whole numbers as floats, truth as truth, what is missing as missing."""
    table = apart(SPEC)["datasets"]["table-0"]
    assert table.schema.field("hz").type == pa.float64()
    assert table["assumed"].to_pylist() == [True]
    assert table["low"].to_pylist() == [None]


def test_rows_of_different_fields():
    """A field that only later rows have is not lost."""
    found = apart({"data": {"values": [{"a": 1}, {"a": 2.5, "b": "x"}]}})
    assert found["datasets"]["table-0"].to_pydict() == {"a": [1.0, 2.5], "b": [None, "x"]}


def test_other_data_leave_the_chart_as_it_is():
    other = copy.deepcopy(SPEC)
    other["layer"][0]["data"]["values"][0]["t"] = 0.7
    one, two = apart(SPEC), apart(other)
    del one["datasets"], two["datasets"]
    assert one == two
