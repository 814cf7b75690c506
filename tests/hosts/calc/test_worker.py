"""The worker process and the bridge's client, without an office."""

from __future__ import annotations

import importlib
import io
import json
import os
import signal
import subprocess
import sys
import zipfile
from typing import Any

import pytest
from office import wait_for

import sheetfuncs
from sheetfuncs.hosts.calc import protocol
from sheetfuncs.hosts.calc.build import build_extension
from sheetfuncs.hosts.calc.install import settings
from sheetfuncs.hosts.calc.worker import HANDLERS, RecentBlocks, serve

RESPONSE = [["hours"], [1.0], [2.5], [2.0], [4.5], [None], [6.0]]
PREDICTORS = [["load"], [1.0], [2.0], [3.0], [4.0], [5.0], [6.0]]
BLOCKS = [protocol.pack(protocol.block_of_rows(rows)) for rows in (RESPONSE, PREDICTORS)]
ON_BOTH = [{"block": 0}, {"block": 1}]


@pytest.fixture
def worker():
    """A worker process of its own, as the bridge starts it."""
    child = subprocess.Popen(
        protocol.worker_command(settings()), stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.PIPE
    )
    yield child
    child.kill()
    child.communicate()


def ask(child, kind: str, head: dict[str, Any] | None = None, blocks=(), parts=()) -> dict[str, Any]:
    request = {"kind": kind, "head": head or {}, "blocks": list(blocks)}
    protocol.write_message(child.stdin, protocol.REQUEST, request, parts)
    message = protocol.read_message(child.stdout)
    assert message is not None
    return {**message[1], "parts": message[2]}


def test_says_its_versions(worker):
    head = ask(worker, "hello")["head"]
    assert (head["sheetfuncs"], head["protocol"]) == (sheetfuncs.__version__, protocol.VERSION)


def test_evaluates_on_blocks_sent_once(worker):
    call = {"name": "FIT_DURBIN_WATSON", "arguments": ON_BOTH}
    expected = sheetfuncs.evaluate("FIT_DURBIN_WATSON", RESPONSE, PREDICTORS)
    assert ask(worker, "evaluate", call, [0, 1], BLOCKS)["head"] == {"rows": False, "value": expected}
    names = [protocol.digest(data) for data in BLOCKS]
    assert ask(worker, "evaluate", call, names)["head"] == {"rows": False, "value": expected}
    assert ask(worker, "evaluate", call, ["unknown", names[1]])["status"] == "send"


def test_rows_of_cells_come_as_a_block(worker):
    answer = ask(worker, "evaluate", {"name": "FIT_RESIDUALS", "arguments": ON_BOTH}, [0, 1], BLOCKS)
    rows = protocol.rows_of_block(protocol.unpack(answer["parts"][0]))
    assert rows == sheetfuncs.evaluate("FIT_RESIDUALS", RESPONSE, PREDICTORS)
    assert rows[5] == ["#N/A"]


def test_options_and_omitted_arguments(worker):
    arguments = [*ON_BOTH, {"value": None}, {"value": 0.0}]
    answer = ask(worker, "evaluate", {"name": "FIT_DURBIN_WATSON_P", "arguments": arguments}, [0, 1], BLOCKS)
    assert answer["head"]["value"] == sheetfuncs.evaluate("FIT_DURBIN_WATSON_P", RESPONSE, PREDICTORS, None, False)


def test_a_defect_leaves_the_worker_alive(worker):
    assert ask(worker, "evaluate", {"name": "FIT_VIF", "arguments": [{"block": 7}]})["status"] == "defect"
    assert ask(worker, "no such job")["status"] == "defect"
    assert ask(worker, "evaluate", {}, [0], [b"no block"])["status"] == "defect"
    assert ask(worker, "hello")["status"] == "ok"


def test_what_is_printed_never_comes_between_the_messages():
    program = (
        "import os, sys\nfrom sheetfuncs.hosts.calc import worker\n"
        "def noisy(head, blocks, progress):\n"
        "    print('printed'); os.write(1, b'written'); progress('half'); os.system('echo from a program')\n"
        "    return {'done': True, 'input': sys.stdin.read()}, b'part'\n"
        "worker.HANDLERS['noisy'] = noisy\nworker.main()\n"
    )
    child = subprocess.Popen([sys.executable, "-c", program], stdin=subprocess.PIPE, stdout=subprocess.PIPE,
                             stderr=subprocess.PIPE)
    protocol.write_message(child.stdin, protocol.REQUEST, {"kind": "noisy"})
    assert protocol.read_message(child.stdout) == (protocol.PROGRESS, {"text": "half"}, [])
    kind, answer, parts = protocol.read_message(child.stdout)
    assert (kind, answer["head"], parts) == (protocol.ANSWER, {"done": True, "input": ""}, [b"part"])
    rest, errors = child.communicate()
    assert rest == b""
    assert b"printed" in errors
    assert child.returncode == 0


def test_ends_with_its_input_also_within_a_job():
    program = (
        "import time\nfrom sheetfuncs.hosts.calc import worker\n"
        "def slow(head, blocks, progress):\n    progress('begun')\n    time.sleep(600)\n"
        "worker.HANDLERS['slow'] = slow\nworker.main()\n"
    )
    child = subprocess.Popen([sys.executable, "-c", program], stdin=subprocess.PIPE, stdout=subprocess.PIPE)
    protocol.write_message(child.stdin, protocol.REQUEST, {"kind": "slow"})
    assert protocol.read_message(child.stdout) == (protocol.PROGRESS, {"text": "begun"}, [])
    child.stdin.close()
    try:
        assert child.wait(20) == 0
    finally:
        child.kill()
        child.stdout.close()


def test_bytes_that_are_no_message_end_it(worker):
    worker.stdin.write(b"GET / HTTP/1.1\r\n\r\n")
    worker.stdin.flush()
    assert worker.wait(20) == 1
    assert b"no message" in worker.stderr.read()


def test_every_job_can_be_imported():
    assert set(HANDLERS) >= {"hello", "evaluate"}
    sink, source = io.BytesIO(), io.BytesIO()
    protocol.write_message(source, protocol.REQUEST, {"kind": "hello"})
    source.seek(0)
    serve(source, sink)
    sink.seek(0)
    assert protocol.read_message(sink)[1]["status"] == "ok"


def test_the_store_of_blocks_is_bounded():
    data = [protocol.pack(protocol.block_of_rows([[float(value)] * 100])) for value in range(10)]
    recent = RecentBlocks(most_bytes=5_000)
    blocks = [recent.put(one) for one in data]
    kept = [recent.get(protocol.digest(one)) is not None for one in data]
    assert kept == [False] * 7 + [True] * 3
    assert recent.put(data[9]) is blocks[9]


@pytest.fixture(scope="module")
def client(tmp_path_factory):
    """The client module as it is inside an unpacked extension."""
    folder = tmp_path_factory.mktemp("extension")
    with zipfile.ZipFile(io.BytesIO(build_extension(settings(20)))) as package:
        package.extractall(folder)
    sys.path.insert(0, str(folder / "pythonpath"))
    try:
        module: Any = importlib.import_module("sheetfuncs_bridge.client")
        yield module
        module.close_workers()
    finally:
        sys.path.remove(str(folder / "pythonpath"))


@pytest.fixture
def one(client):
    worker = client.Worker("test")
    yield worker
    worker.close()


@pytest.fixture
def changed(client):
    """Change the extension's settings for a test."""
    path = client.EXTENSION / "settings.json"
    before = path.read_text("utf-8")
    yield lambda **values: path.write_text(json.dumps({**json.loads(before), **values}), "utf-8")
    path.write_text(before, "utf-8")


CALL = {"name": "FIT_DURBIN_WATSON", "arguments": ON_BOTH}


def value(client, worker, **options) -> float:
    answer = worker.request("evaluate", CALL, [client.Packed(data) for data in BLOCKS], **options)
    assert answer.status == "ok"
    return answer.head["value"]


def test_client_starts_sends_once_and_restarts(client, one):
    expected = sheetfuncs.evaluate("FIT_DURBIN_WATSON", RESPONSE, PREDICTORS)
    assert one.pid is None
    assert value(client, one) == value(client, one) == expected
    first = one.pid
    os.kill(first, signal.SIGKILL)
    assert value(client, one) == expected
    assert one.pid not in (None, first)


def test_client_ends_a_worker_that_hangs(client, one):
    value(client, one)
    hung = one.pid
    os.kill(hung, signal.SIGSTOP)
    with pytest.raises(client.WorkerTrouble, match=r"longer than the limit of 0\.5 seconds"):
        value(client, one, seconds=0.5)
    assert one.pid is None
    assert value(client, one) == sheetfuncs.evaluate("FIT_DURBIN_WATSON", RESPONSE, PREDICTORS)


def test_client_does_not_wait_for_a_full_pipe(client, one):
    """A worker that hangs does not read either; what is sent is more than a pipe holds."""
    value(client, one)
    os.kill(one.pid, signal.SIGSTOP)
    much = client.Packed(protocol.pack(protocol.block_of_rows([[float(row)] for row in range(200_000)])))
    with pytest.raises(client.WorkerTrouble, match="longer"):
        one.request("evaluate", CALL, [much, much], seconds=0.5)


def test_client_ends_a_worker_that_nobody_asks(client, one, monkeypatch):
    monkeypatch.setattr(client, "IDLE_SECONDS", 0.05)
    expected = value(client, one)
    wait_for(lambda: one.pid is None, "the idle worker is ended")
    assert value(client, one) == expected


def test_client_gives_progress_and_a_heartbeat(client, one):
    value(client, one)
    os.kill(one.pid, signal.SIGSTOP)
    heard = []

    def progress(text):
        heard.append(text)
        os.kill(one.pid, signal.SIGCONT)

    assert value(client, one, progress=progress) > 0
    assert heard[0] is None


def test_client_says_what_the_worker_said_last(client, one, changed):
    """An interpreter that ends at once with a message, as one without the package does."""
    program = client.EXTENSION / "ends-at-once"
    program.write_text("#!/bin/sh\necho 'ModuleNotFoundError: No module named sheetfuncs' >&2\nexit 1\n")
    program.chmod(0o755)
    changed(interpreter=str(program))
    with pytest.raises(client.WorkerTrouble, match=r"twice .*No module named sheetfuncs"):
        one.request("hello", {})


def test_client_names_an_interpreter_that_is_gone(client, one, changed):
    changed(interpreter="/nowhere/python")
    with pytest.raises(client.WorkerTrouble, match=r"/nowhere/python.*cannot be started.*calc install"):
        one.request("hello", {})


def test_client_refuses_a_second_request_meanwhile(client, one):
    value(client, one)
    os.kill(one.pid, signal.SIGSTOP)
    refused = []

    def progress(text):
        with pytest.raises(client.WorkerTrouble, match="still running") as trouble:
            one.request("hello", {})
        refused.append(trouble)
        os.kill(one.pid, signal.SIGCONT)

    value(client, one, progress=progress)
    assert refused


def test_client_takes_no_module_from_the_current_folder(client, one, tmp_path, monkeypatch):
    (tmp_path / "sheetfuncs.py").write_text("raise SystemExit('taken from the folder of a workbook')")
    (tmp_path / "numpy.py").write_text("raise SystemExit('taken from the folder of a workbook')")
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("PYTHONPATH", str(tmp_path))
    assert one.request("hello", {}).status == "ok"
    assert value(client, one) > 0


def test_functions_are_answered_while_a_job_runs(client, one):
    """Jobs have a worker of their own."""
    value(client, client.JOBS)
    os.kill(client.JOBS.pid, signal.SIGSTOP)
    assert value(client, client.CELLS) == value(client, one)
    assert len({client.JOBS.pid, client.CELLS.pid, one.pid}) == 3
