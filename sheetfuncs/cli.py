"""The command line. Exit 0: done, also when assumptions fail; 1: refused, one sentence on stderr; 2: wrong usage."""

from __future__ import annotations

import csv
import json
import os
import shlex
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import click

from sheetfuncs import __version__
from sheetfuncs.errors import ArgumentError, SheetfuncsError


class OneSentence(click.Group):
    """A group whose commands refuse with one sentence and exit code 1, never with a traceback."""

    def invoke(self, context: click.Context) -> Any:
        try:
            return super().invoke(context)
        except (click.ClickException, click.exceptions.Exit, click.Abort):
            raise
        except SheetfuncsError as refused:
            _stop(str(refused))
        except MemoryError:
            _stop("There is not enough memory for this range: choose fewer columns or rows.")
        except BrokenPipeError:
            sys.exit(0)
        except OSError as trouble:
            name = f" ({trouble.filename})" if trouble.filename else ""
            _stop(f"The file could not be read or written{name}: {trouble.strerror or trouble}.")
        except Exception as defect:
            if os.environ.get("SHEETFUNCS_TRACEBACK"):
                raise
            _stop(
                f"sheetfuncs made a mistake ({type(defect).__name__}: {str(defect)[:200]}) and wrote nothing. Please "
                "report it; with SHEETFUNCS_TRACEBACK=1 set it says where."
            )


def _stop(sentence: str) -> None:
    click.echo(sentence, err=True)
    sys.exit(1)


@click.group(cls=OneSentence, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="sheetfuncs")
def main() -> None:
    """Regression diagnostics inside the workbook: check a range, and get the diagnostics sheet beside the data."""


@main.command()
@click.argument("book", type=click.Path(path_type=Path))
@click.argument("range_", metavar="[RANGE]", required=False)
@click.option("--response", metavar="NAME", help="Column to explain: its header or letter. Default: the first column.")
@click.option("--predictors", metavar="A,B", help="Columns that explain it, by header or letter. Default: all others.")
@click.option("--order", metavar="NAME", help="Column that says the time order. Default: the rows' order.")
@click.option("--date-predictor", "date_predictors", metavar="NAME", multiple=True,
              help="Date column to use as a predictor, counted in days. May be repeated.")
@click.option("--base", "bases", metavar="NAME=LEVEL", multiple=True,
              help="Level that a category's other levels are compared with. Default: the first one that appears.")
@click.option("--no-intercept", is_flag=True, help="Fit through the origin.")
@click.option("--level", type=float, default=0.95, show_default=True, help="Level of the intervals.")
@click.option("--at", "places", metavar="NAME=VALUE,...", multiple=True,
              help="Predict there: a value for every predictor. May be repeated.")
@click.option("--out", type=click.Path(path_type=Path), help="File to write. Default: <name>-checked beside BOOK.")
@click.option("--in-place", is_flag=True, help="Write into BOOK itself; `sheetfuncs undo BOOK` takes it back.")
@click.option("--no-sheet", is_flag=True, help="Compute and say, but write no workbook.")
@click.option("--json", "json_out", metavar="FILE|-", help="Also write every figure as JSON; - is the terminal.")
def check(
    book: Path, range_: str | None, response: str | None, predictors: str | None, order: str | None,
    date_predictors: tuple[str, ...], bases: tuple[str, ...], no_intercept: bool, level: float,
    places: tuple[str, ...], out: Path | None, in_place: bool, no_sheet: bool, json_out: str | None,
) -> None:
    """Check the regression in RANGE of the workbook BOOK and write the diagnostics sheet beside the data's sheet.

    RANGE is an address ("Jobs!B3:F64"), a table's or a defined name; without it, the block around the first filled
    cell of the active sheet.
    """
    from sheetfuncs.hosts.files import Request, check_book

    if sum((out is not None, in_place, no_sheet)) > 1:
        raise click.UsageError("--out, --in-place and --no-sheet exclude each other.")
    request = Request(
        book=book, range_text=range_, response=response, predictors=_names(predictors), order=order,
        date_predictors=date_predictors, base_levels=_pairs(bases, "--base"), intercept=not no_intercept, level=level,
        places=tuple(_place(text) for text in places), out=out, in_place=in_place, write=not no_sheet,
    )
    with _steps() as step:
        done = check_book(request, step)
    if json_out:
        _write_json(done.figures(), json_out)
    if json_out != "-":
        from sheetfuncs.hosts.summary import summary_lines

        for line in summary_lines(done):
            click.echo(line)
    for warning in done.warnings:
        click.echo(warning, err=True)


@main.command()
@click.argument("formula")
@click.argument("book", type=click.Path(path_type=Path))
def cell(formula: str, book: Path) -> None:
    """Evaluate one formula of ours on a workbook: sheetfuncs cell '=FIT_VIF(Jobs!C4:F64)' BOOK."""
    from sheetfuncs.hosts.files import evaluate_cell

    result = evaluate_cell(formula, book)
    rows = result if isinstance(result, list) else [[result]]
    for row in rows:
        click.echo("\t".join(_cell_text(value) for value in row))


@main.command()
@click.argument("name", required=False)
def functions(name: str | None) -> None:
    """List the worksheet functions, or explain the one called NAME."""
    from sheetfuncs.functions.listing import functions_text

    click.echo(functions_text(name))


@main.command()
@click.argument("folder", type=click.Path(path_type=Path, file_okay=False), default="sheetfuncs-demo")
def demo(folder: Path) -> None:
    """Write invented workbooks into FOLDER, to try things on: three to check, one with every function in a cell."""
    from sheetfuncs.hosts.demo import write_demo

    paths = write_demo(folder)
    click.echo("Invented data, to try things on:")
    for path in paths:
        click.echo(f"  {path}")
    click.echo(f"Next: sheetfuncs check {shlex.quote(str(paths[0]))}")


@main.command()
@click.argument("book", type=click.Path(path_type=Path))
@click.option("--force", is_flag=True, help="Also when BOOK was changed after the check; those changes are kept aside.")
def undo(book: Path, force: bool) -> None:
    """Bring BOOK back to what it was before the latest check was written into it."""
    from sheetfuncs.hosts.files import undo_check

    click.echo(undo_check(book, force=force))


@main.group()
def excel() -> None:
    """The add-in for Excel on Windows and macOS: put it in, take it out, see whether all is in place."""


@excel.command("install")
@click.option("--xlam", type=click.Path(path_type=Path), metavar="FILE",
              help="Install this copy of the add-in, which your firm has signed, in place of one built here.")
def excel_install(xlam: Path | None) -> None:
    """Put the add-in where Excel finds it, or bring an older one up to date. Excel is not started."""
    from sheetfuncs.hosts.excel.folders import find_place
    from sheetfuncs.hosts.excel.summary import install_lines

    for line in install_lines(find_place(), xlam):
        click.echo(line)


@excel.command("remove")
def excel_remove() -> None:
    """Take out what `install` wrote, and nothing else. Workbooks stay as they are."""
    from sheetfuncs.hosts.excel.folders import find_place
    from sheetfuncs.hosts.excel.summary import remove_lines

    for line in remove_lines(find_place()):
        click.echo(line)


@excel.command("health")
def excel_health() -> None:
    """Look at every part of the installation, and say what to do where one is not in order (exit code 1)."""
    from sheetfuncs.hosts.excel.folders import find_place
    from sheetfuncs.hosts.excel.health import headline, health
    from sheetfuncs.hosts.findings import finding_lines

    findings = health(find_place())
    for line in finding_lines(findings):
        click.echo(line)
    if not all(finding.ok for finding in findings):
        _stop(headline(findings))
    click.echo(headline(findings))


@main.group()
def calc() -> None:
    """The extension for LibreOffice Calc: put it in, take it out, see whether all is in place."""


_PROFILE = click.option(
    "--profile", type=click.Path(path_type=Path, file_okay=False), metavar="DIR",
    help="Folder of another LibreOffice user profile. Default: your own.",
)


@calc.command("install")
@_PROFILE
def calc_install(profile: Path | None) -> None:
    """Put the extension into LibreOffice, or bring an older one up to date. Close LibreOffice before."""
    from sheetfuncs.hosts.calc.install import install

    click.echo(install(profile))


@calc.command("remove")
@_PROFILE
def calc_remove(profile: Path | None) -> None:
    """Take the extension out of LibreOffice. Workbooks stay as they are."""
    from sheetfuncs.hosts.calc.install import remove

    click.echo(remove(profile))


@calc.command("health")
@_PROFILE
def calc_health(profile: Path | None) -> None:
    """Look at every part of the installation, and say what to do where one is not in order (exit code 1)."""
    from sheetfuncs.hosts.calc.health import headline, health
    from sheetfuncs.hosts.findings import finding_lines

    findings = health(profile)
    for line in finding_lines(findings):
        click.echo(line)
    if not all(finding.ok for finding in findings):
        _stop(headline(findings))
    click.echo(headline(findings))


@calc.command("plain-names")
@click.argument("book", type=click.Path(path_type=Path))
def calc_plain_names(book: Path) -> None:
    """Spell our functions in the formulas of BOOK (.xlsx, .xlsm) as every program reads them.

    Calc does so by itself when it saves a workbook; a copy that it sends, exports or converts may lack it.
    """
    from sheetfuncs.hosts.files import write_names_plainly

    click.echo(write_names_plainly(book))


@contextmanager
def _steps() -> Iterator[Callable[[str], None]]:
    """Say each step on one line of a terminal that somebody watches; elsewhere stay silent."""
    if not sys.stderr.isatty():
        yield lambda text: None
        return
    width = 0

    def say(text: str) -> None:
        nonlocal width
        click.echo(f"\r{text:<{width}}", nl=False, err=True)
        width = len(text)

    try:
        yield say
    finally:
        click.echo(f"\r{'':<{width}}\r", nl=False, err=True)


def _names(text: str | None) -> tuple[str, ...] | None:
    if text is None:
        return None
    names = tuple(_parts(text))
    if not all(names):
        raise ArgumentError(f'--predictors "{text}" holds an empty name: give headers or letters, separated by commas.')
    return names


def _parts(text: str) -> list[str]:
    """Parts between commas; a name that holds a comma itself stands in double quotes."""
    return [part.strip() for part in next(csv.reader([text], skipinitialspace=True), [])]


def _pairs(texts: tuple[str, ...], option: str) -> dict[str, str]:
    pairs = {}
    for text in texts:
        name, equals, value = text.partition("=")
        if not equals or not name.strip() or not value.strip():
            raise ArgumentError(f'{option} "{text}" is not of the form NAME=VALUE.')
        pairs[name.strip()] = value.strip()
    return pairs


def _place(text: str) -> dict[str, str]:
    return _pairs(tuple(_parts(text)), "--at")


def _write_json(figures: dict[str, Any], target: str) -> None:
    text = json.dumps(figures, indent=1, ensure_ascii=False, allow_nan=False)
    if target == "-":
        click.echo(text)
        return
    from sheetfuncs.workbook.saving import written_beside

    with written_beside(target) as file:
        file.write(text.encode() + b"\n")


def _cell_text(value: object) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    return repr(value) if isinstance(value, float) else str(value)


if __name__ == "__main__":
    main()
