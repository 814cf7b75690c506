"""After a save: who is asked to write plain names, what is said where that fails, and what is tried again."""

from __future__ import annotations

import ast
import importlib
import io
import os
import sys
import threading
import zipfile
from pathlib import Path
from types import SimpleNamespace

import formula_books as books
import pytest
from office import load_uno

from sheetfuncs.functions import spellings
from sheetfuncs.hosts.calc.build import build_extension
from sheetfuncs.hosts.calc.rename_job import rename
from sheetfuncs.workbook.formula_names import write_plain_names


@pytest.fixture
def bridge(tmp_path, monkeypatch):
    """The bridge's modules as they are inside an unpacked extension, by name."""
    load_uno()
    with zipfile.ZipFile(io.BytesIO(build_extension())) as package:
        package.extractall(tmp_path / "extension")
    monkeypatch.syspath_prepend(tmp_path / "extension" / "pythonpath")
    for name in [name for name in sys.modules if name.split(".")[0] == "sheetfuncs_bridge"]:
        monkeypatch.delitem(sys.modules, name)
    names = ("client", "messages", "saved_names", "external_links", "spellings")
    yield SimpleNamespace(**{name: importlib.import_module(f"sheetfuncs_bridge.{name}") for name in names})
    for name in [name for name in sys.modules if name.split(".")[0] == "sheetfuncs_bridge"]:
        del sys.modules[name]


@pytest.fixture
def said(bridge, monkeypatch):
    """What is shown in the status bar."""
    texts: list[str] = []
    monkeypatch.setattr(bridge.messages, "show_status", lambda frame, text: texts.append(text))
    return texts


@pytest.fixture
def answers(bridge, monkeypatch):
    """The worker's answers to come, an exception being raised; .asked: the files that it was asked for."""
    waiting = SimpleNamespace(coming=[], asked=[])

    def request(kind, head, blocks=(), *, seconds=None, progress=None):
        assert kind == "rename"
        waiting.asked.append(Path(head["path"]))
        answer = waiting.coming.pop(0)
        if isinstance(answer, Exception):
            raise answer
        return bridge.client.Answer(*answer, None)

    monkeypatch.setattr(bridge.client.CELLS, "request", request)
    return waiting


def saved_by_calc(path: Path) -> Path:
    """A workbook with the names that Calc saves."""
    book = books.write_book(path, "plain")
    with zipfile.ZipFile(book) as package:
        parts = {name: package.read(name) for name in package.namelist()}
    with zipfile.ZipFile(book, "w") as package:
        for name, data in parts.items():
            package.writestr(name, data.replace(b"FIT_VIF", b"ORG.SHEETFUNCS.CALC.FUNCTIONS.FITVIF"))
    return book


def model_of(path: Path) -> SimpleNamespace:
    return SimpleNamespace(getURL=path.as_uri, getCurrentController=lambda: None)


DONE = ("ok", {"names": 3, "busy": None})
HELD = ("ok", {"names": 0, "busy": "held by another program"})


def test_only_files_with_other_names_are_handed_to_the_worker(bridge, said, answers, tmp_path):
    answers.coming = [DONE]
    paths = [saved_by_calc(tmp_path / "named.xlsx"), books.write_book(tmp_path / "plain.xlsx", "plain"),
             saved_by_calc(tmp_path / "other.ods")]  # fmt: skip
    for path in paths:
        bridge.saved_names.write_plain_names(model_of(path))
    bridge.saved_names.write_plain_names(SimpleNamespace(getURL=lambda: "https://example.org/book.xlsx"))
    bridge.saved_names.write_plain_names(SimpleNamespace(getURL=lambda: ""))
    assert answers.asked == paths[:1]
    assert said == []


def test_trouble_is_said_and_the_file_stays(bridge, said, answers, tmp_path):
    path = saved_by_calc(tmp_path / "book.xlsx")
    before = path.read_bytes()
    answers.coming = [bridge.client.WorkerTrouble("It cannot be started."), ("refused", {"sentence": "It is damaged."})]
    for _ in range(2):
        bridge.saved_names.write_plain_names(model_of(path))
    assert [text.partition(" yet: ")[2] for text in said] == ["It cannot be started.", "It is damaged."]
    assert said[0].startswith("Saved, but other programs will not find the FIT_ functions in this file")
    assert path.read_bytes() == before


def test_a_held_file_is_tried_again_when_a_document_is_closed(bridge, said, answers, tmp_path, monkeypatch):
    monkeypatch.setattr(bridge.saved_names, "PAUSES", (0.0, 0.0, 0.0))
    path = saved_by_calc(tmp_path / "book.xlsx")
    answers.coming = [HELD, HELD, DONE]
    bridge.saved_names.write_plain_names(model_of(path))
    assert "tried again when the document is closed" in said[0]
    before = set(threading.enumerate())
    bridge.saved_names.try_again()
    for thread in set(threading.enumerate()) - before:
        thread.join(20)
    assert answers.asked == [path] * 3
    bridge.saved_names.try_again()  # nothing waits any more
    assert answers.asked == [path] * 3


def test_a_file_under_a_password_is_said_where_it_names_ours(bridge, said, answers, tmp_path, monkeypatch):
    path = tmp_path / "book.xlsx"
    path.write_bytes(b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(600))
    for ours in (False, True):
        monkeypatch.setattr(bridge.saved_names, "names_ours", lambda model, ours=ours: ours)
        bridge.saved_names.write_plain_names(model_of(path))
    assert [text.partition(" yet: ")[2] for text in said] == ["names cannot be changed under a password."]


def test_the_worker_writes_plain_names_and_keeps_the_time(tmp_path):
    path = saved_by_calc(tmp_path / "book.xlsx")
    os.utime(path, ns=(10**18, 10**18))
    assert rename({"path": str(path)}, [], lambda text: None) == ({"names": 2, "busy": None}, None)
    assert os.stat(path).st_mtime_ns == 10**18
    assert write_plain_names(path) == 0


def test_the_worker_says_that_a_file_is_held(tmp_path, monkeypatch):
    path = saved_by_calc(tmp_path / "book.xlsx")

    def held(*_):
        raise PermissionError(13, "held")

    monkeypatch.setattr(os, "replace", held)
    answer, _ = rename({"path": str(path)}, [], lambda text: None)
    assert answer["names"] == 0
    assert "another program holds it open" in answer["busy"]


def test_links_are_read_from_the_file(bridge, tmp_path):
    path = books.write_book(tmp_path / "book.xlsx", "linked")
    assert bridge.external_links.linked_files(path) == [[books.ADDIN]]


@pytest.mark.parametrize("damage", [b"", b"no zip", b"<!DOCTYPE x>", b"<a", b"\xff\xfe<\0"])
def test_links_of_a_damaged_file_are_none(bridge, tmp_path, damage):
    path = books.write_book(tmp_path / "book.xlsx", "linked")
    if damage.startswith((b"<", b"\xff")):
        with zipfile.ZipFile(path) as package:
            parts = {name: package.read(name) for name in package.namelist()}
        with zipfile.ZipFile(path, "w") as package:
            for name, data in parts.items():
                package.writestr(name, damage if name == "xl/workbook.xml" else data)
    else:
        path.write_bytes(damage)
    assert bridge.external_links.linked_files(path) == []
    assert bridge.external_links.linked_files(tmp_path / "absent.xlsx") == []


def test_the_extension_carries_the_spellings_for_an_old_python(bridge):
    source = Path(spellings.__file__).read_text("utf-8")
    assert Path(bridge.spellings.__file__).read_text("utf-8") == source
    ast.parse(source, feature_version=(3, 8))
