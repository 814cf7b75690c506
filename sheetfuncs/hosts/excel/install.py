"""Put the add-in where Excel finds it, bring an older one up to date, and take it out again. Excel is never started."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Collection, Iterator
from dataclasses import dataclass
from pathlib import Path

from sheetfuncs.errors import InstallError, WorkbookBusyError
from sheetfuncs.hosts.excel.addin_file import Addin, built_addin, given_addin, is_ours, is_signed, says_the_same
from sheetfuncs.hosts.excel.applescript import script_text
from sheetfuncs.hosts.excel.configuration import configuration_bytes
from sheetfuncs.hosts.excel.folders import Place, refused_by_macos
from sheetfuncs.hosts.excel.record import Record, digest, own_files, read_record
from sheetfuncs.hosts.excel.swapping import WAITING, make_folder, replace_together


@dataclass(frozen=True)
class Installed:
    """What an installation did. earlier: the versions it replaced, None where there were none; notes: sentences."""

    written: tuple[Path, ...]
    earlier: dict[str, str] | None
    notes: tuple[str, ...]


@dataclass(frozen=True)
class Removed:
    """What was taken out. notes: a sentence for each file that was left and why."""

    files: tuple[Path, ...]
    notes: tuple[str, ...]


def install(place: Place, *, xlam: Path | None = None) -> Installed:
    """Write add-in, configuration, on macOS the script, and the list of all that: everything, or nothing.

    xlam: a copy of the add-in to install as it is, one that a firm has signed; otherwise it is built here. An older
    installation is replaced. Raises InstallError where a file that is not ours is in the way, where the copy does not
    fit, or where a folder cannot be written to; WorkbookBusyError where Excel has the add-in open.
    """
    earlier = read_record(place)
    addin = built_addin() if xlam is None else given_addin(xlam)
    contents = file_contents(place, addin)
    with _refusals(place):
        for path, content in contents.items():
            _require_ours(place, path, content, earlier)
        _keep_signature(place, addin)
    with _refusals(place), _made_folders(contents) as made:
        known = earlier.folders if earlier else []
        folders = [*known, *(str(folder) for folder in made if str(folder) not in known)]
        files = {str(path): digest(content) for path, content in contents.items()}
        record = Record(place.interpreter, addin.given, addin.versions, files, folders)
        replace_together({**contents, place.record: record.to_bytes()}, place.staging)
    left = _clear_left_overs(place, earlier, contents.keys())
    notes = (*_notes(place, addin, earlier), *left)
    return Installed((*contents, place.record), earlier.versions if earlier else None, notes)


def remove(place: Place) -> Removed:
    """Take out what `install` wrote, and nothing else. A file that was changed since stays, and a note says so.

    Raises InstallError where nothing is recorded, and WorkbookBusyError where Excel has the add-in open; then
    everything is left as it was, and the command can be run again.
    """
    record = read_record(place)
    if record is None:
        there = " An add-in of ours that stands there was put there by other means." if is_ours(place.addin) else ""
        raise InstallError(
            f"No installation by `sheetfuncs excel install` is recorded for this user, so nothing is removed.{there}"
        )
    ours: list[Path] = []
    notes: list[str] = []
    with _refusals(place):
        for path in filter(Path.is_file, map(Path, record.files)):
            if record.wrote(path) or (path == place.addin and is_ours(path)):
                ours.append(path)
            else:
                notes.append(f"{path} was changed since it was installed, so it is left: delete it if nobody needs it.")
        for path in sorted(ours, key=lambda path: path != place.addin):  # the one that Excel may hold open comes first
            path.unlink()
        place.record.unlink()
    _clear_waiting(place)
    place.log.unlink(missing_ok=True)
    for folder in reversed(record.folders):
        with contextlib.suppress(OSError):  # something else stands in it by now
            os.rmdir(folder)
    return Removed((*ours, place.record), tuple(notes))


def file_contents(place: Place, addin: Addin) -> dict[Path, bytes]:
    """What has to stand where, but for the record; the add-in, which Excel may hold open, comes first."""
    contents = {place.addin: addin.content}
    if place.script:
        contents[place.script] = script_text(place.interpreter, place.log).encode("ascii")
    contents[place.configuration] = configuration_bytes(place)
    return contents


def _require_ours(place: Place, path: Path, content: bytes, earlier: Record | None) -> None:
    if not os.path.lexists(path):
        return
    if path.is_file() and not path.is_symlink():
        there = path.read_bytes()  # a file that Excel keeps to itself fails here, and is not taken for a foreign one
        if there == content or (earlier and earlier.wrote(path)) or (path == place.addin and is_ours(path)):
            return
    changed = earlier is not None and str(path) in earlier.files
    raise InstallError(
        f"{path} {'was changed since it was installed' if changed else 'is there already and is not ours'}, so it is "
        "left alone: move it to another folder, and run the command again."
    )


def _keep_signature(place: Place, addin: Addin) -> None:
    if place.addin.is_file() and is_signed(place.addin) and not addin.signed:
        raise InstallError(
            f"The add-in in {place.addin.parent} carries a signature and the new one does not: give the signed copy of "
            "this version with --xlam FILE, or run `sheetfuncs excel remove` first."
        )


def _notes(place: Place, addin: Addin, earlier: Record | None) -> Iterator[str]:
    if addin.given and not addin.signed:
        yield "The copy that was given carries no signature; Excel treats it like any other file."
    if addin.given and not says_the_same(addin.content, built_addin().content):
        yield "The macros in the copy that was given are not those that this version builds: ask who made it why."
    if earlier and earlier.interpreter != place.interpreter:
        yield f"Excel now starts {place.interpreter}, where it was {earlier.interpreter} before."


@contextlib.contextmanager
def _made_folders(contents: dict[Path, bytes]) -> Iterator[list[Path]]:
    """The folders that the files need, made where missing; gone again when the installation fails."""
    made: list[Path] = []
    try:
        for path in contents:
            made += make_folder(path.parent)
        yield made
    except BaseException:
        for folder in reversed(made):
            with contextlib.suppress(OSError):
                folder.rmdir()
        raise


@contextlib.contextmanager
def _refusals(place: Place) -> Iterator[None]:
    """Say in one sentence why a file could not be written or taken away, and what to do."""
    try:
        yield
    except OSError as trouble:
        path = trouble.filename2 or trouble.filename  # the second is the one that was to be replaced
        denied = isinstance(trouble, PermissionError)
        if denied and str(path) == str(place.addin) and place.addin.exists():
            raise WorkbookBusyError(
                f"{place.addin} cannot be replaced or removed, most likely because Excel has it open: close every "
                "Excel window and run the command again; nothing was changed."
            ) from trouble
        if denied and not place.windows:
            raise refused_by_macos(path) from trouble
        raise InstallError(
            f"{path} could not be written or removed ({trouble.strerror or trouble}): see that you may "
            "write to its folder and that the disk has room, and run the command again."
        ) from trouble


def _clear_left_overs(place: Place, earlier: Record | None, current: Collection[Path]) -> list[str]:
    """Take away what only an older version wrote, and files of an installation that was cut off."""
    _clear_waiting(place)
    notes = []
    for path in map(Path, earlier.files if earlier else ()):
        if path in current or not path.is_file():
            continue
        if earlier and earlier.wrote(path):
            with contextlib.suppress(OSError):
                path.unlink()
        else:
            notes.append(f"{path} comes from an older version and was changed since, so it is left.")
    return notes


def waiting_files(place: Place) -> list[Path]:
    """Files that an installation which was cut off left behind."""
    rooms = {place.staging(path) for path in (*own_files(place), place.record)}
    return sorted(path for room in rooms if room.is_dir() for path in room.glob(f"{WAITING}*.tmp"))


def _clear_waiting(place: Place) -> None:
    for path in waiting_files(place):
        with contextlib.suppress(OSError):
            path.unlink()
