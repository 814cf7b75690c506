"""README.md says what is so: the function list, the options, the commands, and the output of its examples.

`python tests/test_readme.py` writes the function list anew.
"""

from __future__ import annotations

import re
import shlex
from pathlib import Path

import click
import pytest
from click.testing import CliRunner

from sheetfuncs.cli import main
from sheetfuncs.functions.listing import functions_markdown

README = Path(__file__).parents[1] / "README.md"
NUMBER = re.compile(r"\d+\.\d+")
BEGIN, END = "<!-- functions:begin -->\n", "<!-- functions:end -->"


def marked(name: str) -> str:
    """What stands in the code block between the markers of this name."""
    pattern = rf"<!-- {name} -->\n```\w+\n(.*?)```\n<!-- end of {name} -->"
    found = re.findall(pattern, README.read_text("utf-8"), re.DOTALL)
    assert len(found) == 1, name
    return found[0].rstrip("\n")


def with_current_functions(text: str) -> str:
    before, after = text.split(BEGIN)
    return f"{before}{BEGIN}\n{functions_markdown().strip()}\n\n{END}{after.split(END)[1]}"


def examples() -> list[tuple[str, str]]:
    """(command line, output) of every example: a line that starts with $, and what follows it."""
    blocks = re.findall(r"```console\n(.*?)```", README.read_text("utf-8"), re.DOTALL)
    return [tuple(part.split("\n", 1)) for block in blocks for part in re.split(r"^\$ ", block, flags=re.MULTILINE)[1:]]


def test_function_list_is_current():
    text = README.read_text("utf-8")
    assert text == with_current_functions(text), "Refresh it: python tests/test_readme.py"


@pytest.mark.parametrize("name", ["main command", "test command", "main command on Windows"])
def test_command_is_one_line(name):
    assert "\n" not in marked(name)


def test_windows_command_does_the_same():
    command = marked("main command").replace("python3 -m", "py -m").replace(".venv/bin/", r".venv\Scripts" "\\")
    assert marked("main command on Windows") == command.replace("demo/", "demo\\")


def test_every_command_and_option_is_explained():
    text = README.read_text("utf-8")
    for command in main.commands.values():
        assert f"sheetfuncs {command.name}" in text
        for option in command.params:
            assert not isinstance(option, click.Option) or f"`{option.opts[-1]}" in text, option.opts


def test_there_are_examples():
    assert len(examples()) > 1


@pytest.mark.parametrize(("line", "output"), examples())
def test_example_gives_what_it_shows(line, output, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    assert CliRunner().invoke(main, ["demo", "demo"]).exit_code == 0
    program, *arguments = shlex.split(line)
    assert program == "sheetfuncs"
    found = CliRunner().invoke(main, arguments).output
    assert NUMBER.sub("?", found) == NUMBER.sub("?", output)
    numbers = [[float(number) for number in NUMBER.findall(text)] for text in (found, output)]
    assert numbers[0] == pytest.approx(numbers[1], rel=1e-12)  # the last digits differ from processor to processor


if __name__ == "__main__":
    README.write_text(with_current_functions(README.read_text("utf-8")), "utf-8")
