"""The worker process as seen from inside LibreOffice: started when needed, one request at a time, never waited for
without a limit.

Two workers: CELLS answers functions in cells, JOBS does what takes longer, so that a check never holds up the cells.
Which program runs is said by settings.json of the extension, which its installer wrote, and by nothing else.
"""

from __future__ import annotations

import json
import os
import queue
import subprocess
import sys
import tempfile
import threading
import time
from contextlib import suppress
from pathlib import Path

from sheetfuncs_bridge import protocol

EXTENSION = Path(__file__).resolve().parents[2]
START_SECONDS = 30.0  # for loading the worker's libraries, on top of a request's own limit
HEARTBEAT_SECONDS = 0.2
MOST_REMEMBERED = 10_000  # digests of blocks that were sent; the worker itself keeps fewer
IDLE_SECONDS = 900.0  # after which a worker that nobody asks is ended; the next request starts another


class WorkerTrouble(Exception):
    """No answer could be had; str(trouble) is one sentence for the person at the sheet."""


class Packed:
    """A packed block and the digest that stands for it once it was sent."""

    def __init__(self, data: bytes):
        self.data, self.digest = data, protocol.digest(data)


class Answer:
    """status: "ok", "refused" (head: sentence, cell_error) or "defect" (head: sentence). part: bytes or None."""

    def __init__(self, status: str, head: dict, part):
        self.status, self.head, self.part = status, head, part


def read_settings() -> dict:
    """What the installer wrote: interpreter, package_folder, version, seconds. Raises WorkerTrouble without it."""
    try:
        return json.loads((EXTENSION / "settings.json").read_text("utf-8"))
    except (OSError, ValueError) as trouble:
        raise WorkerTrouble(
            f"The extension's settings cannot be read ({trouble}); run `sheetfuncs calc install` again."
        ) from None


class Worker:
    """One worker process and the requests to it; restarted when it is gone, closed with LibreOffice."""

    def __init__(self, purpose: str):
        self.purpose = purpose
        self._process: _Process | None = None
        self._turn = threading.Lock()
        self._owner: int | None = None

    @property
    def pid(self):
        """The process id, or None while none runs."""
        return None if self._process is None or not self._process.alive else self._process.pid

    def request(self, kind: str, head: dict, blocks=(), *, seconds=None, progress=None) -> Answer:
        """Ask the worker for a job and return its Answer.

        blocks: Packed blocks. seconds: the longest wait (None: the installer's limit). progress(text): called in this
        thread with each progress message, and with None about every HEARTBEAT_SECONDS, so that a long job can keep
        the window alive. A worker that dies is restarted and asked once more. Raises WorkerTrouble where no answer
        comes, among others when the limit is over (the worker is ended then) or another job of this worker runs.
        """
        settings = read_settings()
        seconds = float(settings.get("seconds", 20)) if seconds is None else seconds
        if self._owner == threading.get_ident() or not self._turn.acquire(timeout=seconds):
            raise WorkerTrouble("Another job of sheetfuncs is still running; try again when it is done.")
        self._owner = threading.get_ident()
        try:
            return self._ask_twice(settings, (kind, head, blocks), seconds, progress)
        finally:
            self._owner = None
            self._turn.release()

    def close(self) -> None:
        """End the process, if one runs; the next request starts another."""
        process, self._process = self._process, None
        if process is not None:
            process.end()

    def _ask_twice(self, settings: dict, job, seconds: float, progress) -> Answer:
        for last in (False, True):
            process = self._running(settings)
            try:
                return process.ask(*job, seconds, progress)
            except TimeoutError:
                self.close()
                raise WorkerTrouble(
                    f"sheetfuncs took longer than the limit of {seconds:g} seconds and was stopped; recalculate "
                    "(Ctrl+Shift+F9) to try again, or use fewer rows."
                ) from None
            except (OSError, EOFError, protocol.ProtocolError) as trouble:
                said = process.last_words() or str(trouble)
                self.close()
                if last:
                    raise WorkerTrouble(
                        f"The worker process of sheetfuncs ended without an answer, twice ({said}); run "
                        "`sheetfuncs calc health`."
                    ) from None
            except BaseException:  # what the caller's progress raised: the answer would come to the wrong request
                self.close()
                raise
        raise AssertionError

    def _running(self, settings: dict):
        if self._process is None or not self._process.alive:
            self.close()
            self._process = _Process(settings)
        return self._process


class _Process:
    """A running worker. Writing and reading happen in a thread, so that no full or silent pipe can hold up a caller."""

    def __init__(self, settings: dict):
        self._errors = tempfile.TemporaryFile()  # noqa: SIM115 (closed in end)
        try:
            self._child = _start(settings, self._errors)
        except WorkerTrouble:
            self._errors.close()
            raise
        except OSError as trouble:
            self._errors.close()
            raise WorkerTrouble(
                f"The Python of sheetfuncs ({settings.get('interpreter')}) cannot be started ({trouble.strerror}); run "
                "`sheetfuncs calc install` from where sheetfuncs is installed now."
            ) from None
        self.pid = self._child.pid
        self._sent: set = set()
        self._fresh = True
        self._retired = False
        self._handing_over = threading.Lock()
        self._requests: queue.Queue = queue.Queue()
        self._outcomes: queue.Queue = queue.Queue()
        threading.Thread(target=self._exchange, daemon=True).start()

    @property
    def alive(self) -> bool:
        return not self._retired and self._child.poll() is None

    def ask(self, kind, head, blocks, seconds, progress) -> Answer:
        """The answer; raises TimeoutError, OSError, EOFError or ProtocolError."""
        until = time.monotonic() + seconds + (START_SECONDS if self._fresh else 0.0)
        answer = self._send(kind, head, blocks, [one.digest not in self._sent for one in blocks], until, progress)
        if answer.status == "send":
            answer = self._send(kind, head, blocks, [True] * len(blocks), until, progress)
        self._fresh = False
        return answer

    def end(self) -> None:
        """Kill the process; it holds nothing that could be lost."""
        self._requests.put(None)
        self._child.kill()
        self._child.wait()
        for pipe in (self._child.stdout, self._errors):
            _close(pipe)

    def last_words(self) -> str:
        """The last line that the process wrote to standard error before it ended."""
        try:
            self._child.wait(1.0)
            self._errors.seek(0)
            lines = self._errors.read().decode("utf-8", "replace").strip().splitlines()
        except (OSError, ValueError, subprocess.TimeoutExpired):
            return ""
        return lines[-1][:200] if lines else ""

    def _send(self, kind, head, blocks, whole, until, progress) -> Answer:
        parts = [one.data for one, send in zip(blocks, whole) if send]  # noqa: B905 (Python 3.8)
        places = iter(range(len(parts)))
        names = [next(places) if send else one.digest for one, send in zip(blocks, whole)]  # noqa: B905
        with self._handing_over:
            if self._retired:
                raise EOFError("it ended meanwhile")
            self._requests.put(({"kind": kind, "head": head, "blocks": names}, parts))
        answer = self._outcome(until, progress)
        if len(self._sent) > MOST_REMEMBERED:
            self._sent.clear()
        self._sent.update(one.digest for one in blocks)
        return answer

    def _outcome(self, until: float, progress) -> Answer:
        while True:
            wait = until - time.monotonic()
            if wait <= 0:
                raise TimeoutError
            try:
                outcome = self._outcomes.get(timeout=wait if progress is None else min(wait, HEARTBEAT_SECONDS))
            except queue.Empty:
                if progress is not None:
                    progress(None)
                continue
            if isinstance(outcome, BaseException):
                raise outcome
            kind, head, parts = outcome
            if kind == protocol.ANSWER:
                return Answer(head.get("status", "defect"), head.get("head", {}), parts[0] if parts else None)
            if progress is not None:
                progress(str(head.get("text", "")))

    def _next_request(self):
        """The next request, or None where the process is to end: told so, or not asked for a long time."""
        while True:
            try:
                return self._requests.get(timeout=IDLE_SECONDS)
            except queue.Empty:
                with self._handing_over:
                    self._retired = self._requests.empty()
                    if self._retired:
                        return None

    def _exchange(self) -> None:
        """Write each request and hand over what comes back, until the process is gone."""
        try:
            while True:
                request = self._next_request()
                if request is None:
                    break
                protocol.write_message(self._child.stdin, protocol.REQUEST, *request)
                kind = None
                while kind != protocol.ANSWER:
                    message = protocol.read_message(self._child.stdout)
                    if message is None:
                        raise EOFError("it ended")
                    kind = message[0]
                    self._outcomes.put(message)
        except Exception as trouble:
            self._outcomes.put(trouble if isinstance(trouble, (OSError, protocol.ProtocolError)) else EOFError(trouble))
        finally:
            _close(self._child.stdin)


def _start(settings: dict, errors) -> subprocess.Popen:
    """Start the worker: without a shell, and without the settings for LibreOffice's own Python and libraries."""
    try:
        command = protocol.worker_command(settings)
    except KeyError:
        raise WorkerTrouble("The extension does not know its Python; run `sheetfuncs calc install` again.") from None
    unwanted = ("PYTHON", "LD_LIBRARY_PATH", "DYLD_", "URE_", "UNO_")
    return subprocess.Popen(
        command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=errors, cwd=str(EXTENSION),
        env={name: value for name, value in os.environ.items() if not name.startswith(unwanted)},
        creationflags=getattr(subprocess, "CREATE_NO_WINDOW", 0) if sys.platform == "win32" else 0,
    )


def _close(stream) -> None:
    with suppress(OSError, ValueError):  # its other end may be gone already
        stream.close()


CELLS = Worker("cells")
JOBS = Worker("jobs")


def close_workers() -> None:
    """End both workers; called when LibreOffice ends."""
    CELLS.close()
    JOBS.close()
