"""What reaches standard output: strict JSON, readable tables."""

import json

import numpy as np

from planner.cli.output import number, plain, print_json, seconds, table


def test_json_has_no_nan_and_nothing_else(capsys):
    print_json({"t_s": np.array([0.5, np.nan, np.inf]), "n": np.int64(3), "flag": np.bool_(True)})
    out, err = capsys.readouterr()
    assert json.loads(out) == {"t_s": [0.5, None, None], "n": 3, "flag": True}
    assert out.count("\n") == 1
    assert err == ""


def test_plain_keeps_text_and_order():
    assert plain({125: ("a", None)}) == {"125": ["a", None]}


def test_missing_values_are_dashes():
    assert seconds(float("nan")) == "–"
    assert seconds(None) == "–"
    assert seconds(float("inf")) == "∞"
    assert seconds(0.349) == "0.35"
    assert number(float("nan")) == "–"


def test_a_table_prints_what_a_person_typed_literally(capsys):
    table(["name", "T (s)"], [["[bold]x[/bold]", "0.35"]])
    out = capsys.readouterr().out
    assert "[bold]x[/bold]" in out
    assert "0.35" in out
