"""Whether all parts of the installation are in place: what was found, and for each trouble a cure in one sentence."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path

from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.excel.addin import addin_versions
from sheetfuncs.hosts.excel.addin_file import built_addin, is_ours, is_signed, says_the_same, versions_here
from sheetfuncs.hosts.excel.applescript import script_text
from sheetfuncs.hosts.excel.configuration import interpreter_key, interpreter_text, parsed_configuration
from sheetfuncs.hosts.excel.folders import Place, find_place
from sheetfuncs.hosts.excel.install import waiting_files
from sheetfuncs.hosts.excel.marks import is_marked
from sheetfuncs.hosts.excel.record import Record, read_record
from sheetfuncs.hosts.findings import Finding, finding_lines

INSTALL = "close Excel and run `sheetfuncs excel install`"
NOW = f"C{INSTALL[1:]}."
BESIDE = {"Windows": ("pywin32",), "macOS": ("appscript", "psutil")}
"""What xlwings itself needs on each system (its metadata)."""


def health(place: Place) -> list[Finding]:
    """Look at every part of the installation for this user. Nothing is changed, and Excel is not asked."""
    record, listed = _record(place)
    return [
        _python(place), _packages(place), _addin(place), _addin_version(place, record), _configuration(place),
        _connection(place), _download_mark(place, record), _left_overs(place), listed,
    ]


def health_text() -> str:
    """All findings for this user as lines, troubles first. Raises InstallError where there can be no installation."""
    findings = health(find_place())
    return "\n".join([headline(findings), "", *finding_lines(findings)])


def headline(findings: list[Finding]) -> str:
    """One sentence on all findings."""
    troubles = sum(not finding.ok for finding in findings)
    if not troubles:
        return "Everything that can be seen from outside Excel is in place."
    return f"{troubles} of {len(findings)} parts {'needs' if troubles == 1 else 'need'} attention."


def _record(place: Place) -> tuple[Record | None, Finding]:
    what = "The list of installed files"
    try:
        record = read_record(place)
    except InstallError as refusal:
        return None, Finding(what, False, f"{place.record} is damaged.", str(refusal))
    if record is None:
        return None, Finding(
            what, False, f"{place.record} is not there.",
            f"Without it nothing can be removed again: {INSTALL}, which writes it.",
        )
    return record, Finding(what, True, f"{place.record} names {len(record.files)} files.")


def _python(place: Place) -> Finding:
    configured = _configured(place).get(interpreter_key(place), "") or place.interpreter
    if Path(configured).is_file():
        return Finding("Python", True, f"Excel is to start {configured}.")
    return Finding(
        "Python", False, f"Excel is to start {configured}, which is not there.",
        f"From an environment that is there, {INSTALL}.",
    )


def _packages(place: Place) -> Finding:
    environment = place.environment
    required = [*environment.requirements(), *BESIDE[place.system]]
    versions: dict[str, str | None] = {"sheetfuncs": environment.package_version("sheetfuncs")}
    poor = [] if versions["sheetfuncs"] else ["sheetfuncs"]
    for line in required:
        name, least = _name_and_least(line)
        versions[name] = environment.package_version(name)
        if versions[name] is None or _numbers(versions[name] or "") < _numbers(least):
            poor.append(line)
    said = ", ".join(f"{name} {found or '(missing)'}" for name, found in versions.items())
    if not poor:
        return Finding("Packages", True, f"{said}.")
    wanted = " ".join(f'"{one}"' for one in poor)
    return Finding("Packages", False, f"{said}.", f'Run "{place.interpreter}" -m pip install --upgrade {wanted}')


def _name_and_least(requirement: str) -> tuple[str, str]:
    name, _, rest = re.split(r"[;\[ ]", requirement, maxsplit=1)[0].partition(">=")
    return name, rest.split(",")[0]


def _numbers(version: str) -> tuple[int, ...]:
    return tuple(int(number) for number in [*re.findall(r"\d+", version), 0, 0][:3])


def _addin(place: Place) -> Finding:
    if is_ours(place.addin):
        return Finding("The add-in", True, f"{place.addin} is there.")
    if place.addin.exists():
        return Finding(
            "The add-in", False, f"{place.addin} is not ours.", f"Move it to another folder; then {INSTALL}."
        )
    return Finding("The add-in", False, f"{place.addin} is not there.", NOW)


def _addin_version(place: Place, record: Record | None) -> Finding:
    what, here = "The add-in's version", versions_here()
    if not is_ours(place.addin):
        return Finding(what, False, "There is no add-in.", NOW)
    built_for = {name: addin_versions(place.addin).get(name, "unknown") for name in here}
    given = is_signed(place.addin) or (record is not None and record.given)
    again = f"{INSTALL} with `--xlam` and a copy signed for this version" if given else INSTALL
    if built_for != here:
        found = f"It is for {_listed(built_for)}; {_listed(here)} are here."
        return Finding(what, False, found, f"To renew it, {again}.")
    content = place.addin.read_bytes()
    if content == (fresh := built_addin().content):
        return Finding(what, True, f"It is what this version builds ({_listed(here)}).")
    if given and says_the_same(content, fresh):
        return Finding(what, True, f"It is a copy that was given, with the macros of this version ({_listed(here)}).")
    return Finding(what, False, "It is not what this version builds.", f"To renew it, {again}.")


def _listed(versions: dict[str, str]) -> str:
    return " and ".join(f"{name} {number}" for name, number in versions.items())


def _configuration(place: Place) -> Finding:
    what, path, found = "The configuration", place.configuration, _configured(place)
    if not path.exists():
        return Finding(what, False, f"{path} is not there.", NOW)
    named = found.get(interpreter_key(place), "")
    if not named:
        return Finding(what, False, f"{path} does not say which Python.", f"Delete it; then {INSTALL}.")
    if not _same_path(place, named, interpreter_text(place)):
        return Finding(
            what, False, f"{path} names {named}; this is {place.interpreter}.",
            f"If Excel is to start this one, {INSTALL}; if that refuses because the file was changed, delete it first.",
        )
    return Finding(what, True, f"{path} names this Python.")


def _configured(place: Place) -> dict[str, str]:
    if not place.configuration.is_file():
        return {}
    with open(place.configuration, "rb") as file:
        return parsed_configuration(file.read(100_000), place.environment.code_page)


def _same_path(place: Place, one: str, other: str) -> bool:
    return one.casefold() == other.casefold() if place.windows else one == other


def _connection(place: Place) -> Finding:
    return _libraries(place) if place.script is None else _script(place, place.script)


def _libraries(place: Place) -> Finding:
    what = "The connection from Excel to Python"
    folder = Path(place.interpreter).parent
    names = [f"xlwings{bits}-{versions_here()['xlwings']}.dll" for bits in (64, 32)]
    missing = [name for name in names if not any((one / name).is_file() for one in (folder, folder.parent))]
    if not missing:
        return Finding(what, True, f"{' and '.join(names)} stand beside Python.")
    return Finding(
        what, False, f"{' and '.join(missing)} stand neither in {folder} nor above it.",
        "Install sheetfuncs in an environment made with `python -m venv`, where pip puts these files beside Python, "
        "and run `sheetfuncs excel install` from there.",
    )


def _script(place: Place, script: Path) -> Finding:
    what = "The connection from Excel to Python"
    if not script.is_file():
        return Finding(what, False, f"{script} is not there.", NOW)
    if script.read_bytes() != script_text(place.interpreter, place.log).encode("ascii"):
        return Finding(
            what, False, f"{script} is not the script of this version and this Python.",
            f"To renew it, {INSTALL}; if that refuses because the file was changed, delete it first.",
        )
    return Finding(what, True, f"{script} starts this Python.")


def _download_mark(place: Place, record: Record | None) -> Finding:
    what = "The mark of a download"
    if not place.addin.exists() or not is_marked(place, place.addin):
        return Finding(what, True, "The add-in does not carry it.")
    given = " with `--xlam` and your copy" if record is not None and record.given else ""
    return Finding(
        what, False, f"{place.addin} carries it, so Excel blocks its macros.",
        f"If you trust the file, {INSTALL}{given}, which writes it without the mark.",
    )


def _left_overs(place: Place) -> Finding:
    what = "Left-over files"
    if others := list(_other_addins(place)):
        names = " and ".join(map(str, others))
        return Finding(
            what, False, f"{names}: with a second add-in of ours, Excel loads everything twice.",
            f"Close Excel and delete {names}.",
        )
    if waiting := waiting_files(place):
        found = f"{' and '.join(map(str, waiting))}, from an installation that was cut off."
        return Finding(what, False, found, f"To clear them away, {INSTALL}.")
    return Finding(what, True, "There are none.")


def _other_addins(place: Place) -> Iterator[Path]:
    """Add-ins of ours under another name or in another folder: with them Excel would load everything twice."""
    for folder in (place.addin.parent, place.also_loaded):
        if folder.is_dir():
            yield from (path for path in sorted(folder.glob("*.xlam")) if path != place.addin and is_ours(path))
