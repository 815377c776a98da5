"""What the README shows is what the commands print."""

import importlib.util
import re
import shlex
import sys
from pathlib import Path

import pytest

spec = importlib.util.spec_from_file_location("readme", Path(__file__).with_name("readme.py"))
readme = importlib.util.module_from_spec(spec)
sys.modules["readme"] = readme
spec.loader.exec_module(readme)

NUMBER = re.compile(r"[-+]?\d+(?:\.\d+)?")


@pytest.fixture
def folder(demo_project):
    return demo_project.parent


def lines(text):
    """Lines without the suggested items: of many lists of nearly equal cost the solver may find another."""
    kept, skipping = [], False
    for line in text.strip().splitlines():
        if line == "Treatment":
            skipping = True
        if skipping and not line.strip():
            skipping = False
        if not skipping:
            kept.append(re.sub(r"[─\s]+", " ", line))
    return kept


@pytest.mark.parametrize(("command", "shown"), readme.blocks(), ids=[c for c, _ in readme.blocks()])
def test_output_blocks_are_real(folder, command, shown):
    """Words equal, numbers within 0.03 or 5 %: ray tracing differs in its last digits between machines."""
    with readme.inside(folder):
        printed = lines(readme.output_of(command))
    expected = lines(shown)
    assert [NUMBER.sub("#", line) for line in printed] == [
        NUMBER.sub("#", line) for line in expected
    ]
    for one, other in zip(printed, expected, strict=True):
        numbers = [float(x) for x in NUMBER.findall(one)]
        if "cheapest" in one or "ms" in one:
            numbers = numbers[:1]  # how far the proof got depends on the machine's speed
        shown_numbers = [float(x) for x in NUMBER.findall(other)][: len(numbers)]
        for mine, theirs in zip(numbers, shown_numbers, strict=True):
            # Percentages and z are differences of near-equal numbers: half of one more is rounding.
            assert mine == pytest.approx(
                theirs, rel=0.05, abs=3.0 if "%" in one or abs(theirs) > 5 else 0.15
            )


def test_every_command_of_the_readme_exists():
    """Each `planner word` in the text is a command of the program."""
    from planner.cli.main import app

    commands = {(info.name or info.callback.__name__) for info in app.registered_commands}
    text = readme.README.read_text(encoding="utf-8")
    used = set(re.findall(r"`planner ([a-z]+)", text))
    assert used
    assert used <= commands
    assert {"check", "demo", "report", "app"} <= commands


def test_the_python_example_runs(folder, capsys):
    text = readme.README.read_text(encoding="utf-8")
    code = re.search(r"```python\n(.*?)```", text, re.DOTALL)[1]
    with readme.inside(folder):
        exec(compile(code, "README.md", "exec"), {})
    assert "[" in capsys.readouterr().out


def test_the_two_commands_are_marked_for_continuous_integration():
    text = readme.README.read_text(encoding="utf-8")
    for name in ("start", "test"):
        block = re.search(rf"<!-- command: {name} -->\n```sh\n(.*?)\n```", text, re.DOTALL)
        assert block
        assert shlex.split(block[1])
