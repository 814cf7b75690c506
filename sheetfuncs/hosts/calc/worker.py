"""The worker process: answers requests of the bridge on its standard input until that ends.

Started by the bridge as a child of LibreOffice; it listens nowhere and writes to its pipes alone. The loop runs in
the main thread; another thread reads ahead, so that the end of LibreOffice ends the worker even within a long job.
"""

from __future__ import annotations

import os
import queue
import sys
import threading
from collections import OrderedDict
from collections.abc import Callable
from importlib import import_module
from typing import Any, BinaryIO

from sheetfuncs import __version__
from sheetfuncs.cells.block import Block
from sheetfuncs.errors import SheetfuncsError
from sheetfuncs.hosts.calc import protocol
from sheetfuncs.hosts.calc.blocks import to_block

MOST_BYTES = 400_000_000

Head = dict[str, Any]
Progress = Callable[[str], None]
Handler = Callable[[Head, list[Block], Progress], tuple[Head, bytes | None]]


class RecentBlocks:
    """Blocks received lately, by the digest of their bytes, bounded in bytes."""

    def __init__(self, most_bytes: int = MOST_BYTES):
        self._most = most_bytes
        self._size = 0
        self._blocks: OrderedDict[str, tuple[Block, int]] = OrderedDict()

    def get(self, digest: str) -> Block | None:
        """The block, which then counts as the latest used."""
        if digest not in self._blocks:
            return None
        self._blocks.move_to_end(digest)
        return self._blocks[digest][0]

    def put(self, data: bytes) -> Block:
        """Keep these bytes as a block; the oldest go where room is needed, never the one just put."""
        digest = protocol.digest(data)
        kept = self.get(digest)
        if kept is not None:
            return kept
        block = to_block(protocol.unpack(data))
        self._blocks[digest] = block, 2 * len(data)
        self._size += 2 * len(data)
        while self._size > self._most and len(self._blocks) > 1:
            self._size -= self._blocks.popitem(last=False)[1][1]
        return block


def hello(head: Head, blocks: list[Block], progress: Progress) -> tuple[Head, bytes | None]:
    """Versions, for the health check."""
    return {"sheetfuncs": __version__, "protocol": protocol.VERSION, "python": sys.version.split()[0]}, None


def evaluate(head: Head, blocks: list[Block], progress: Progress) -> tuple[Head, bytes | None]:
    """One worksheet function: head has its name and arguments, an argument being {"block": i} or {"value": v}.

    A scalar comes back in the head, rows of cells as a packed block.
    """
    from sheetfuncs.functions.evaluate import evaluate as compute

    result = compute(head["name"], *arguments(head, blocks))
    if isinstance(result, list):
        return {"rows": True}, protocol.pack(protocol.block_of_rows(result))
    return {"rows": False, "value": result}, None


def arguments(head: Head, blocks: list[Block]) -> list[object]:
    """The arguments of a call: its blocks and its plain values, None for one that was omitted."""
    return [blocks[given["block"]] if "block" in given else given.get("value") for given in head["arguments"]]


def _late(module: str, function: str) -> Handler:
    """A handler that is imported at its first use."""

    def handle(head: Head, blocks: list[Block], progress: Progress) -> tuple[Head, bytes | None]:
        handler: Handler = getattr(import_module(f"{__package__}.{module}"), function)
        return handler(head, blocks, progress)

    return handle


HANDLERS: dict[str, Handler] = {
    "hello": hello,
    "evaluate": evaluate,
    "explain": _late("explain_job", "explain"),
    "check": _late("check_job", "check"),
    "rename": _late("rename_job", "rename"),
}


def serve(source: BinaryIO, sink: BinaryIO) -> None:
    """Answer every request from source on sink, one after the other, until source ends."""
    recent = RecentBlocks()
    for head, parts in _requests(source):
        status, answer, part = _answer(head, parts, recent, sink)
        protocol.write_message(sink, protocol.ANSWER, {"status": status, "head": answer}, [part] if part else [])


def _requests(source: BinaryIO) -> Any:
    while (message := protocol.read_message(source)) is not None:
        kind, head, parts = message
        if kind != protocol.REQUEST:
            raise protocol.ProtocolError("The worker got something else than a request.")
        yield head, parts


def _answer(head: Head, parts: list[bytes], recent: RecentBlocks, sink: BinaryIO) -> tuple[str, Head, bytes | None]:
    """(status, head, part); status: "ok"; "send": blocks are not here any more; "refused"; "defect"."""

    def progress(text: str) -> None:
        protocol.write_message(sink, protocol.PROGRESS, {"text": text})

    try:
        received = [recent.put(part) for part in parts]
        blocks = []
        for name in head.get("blocks", ()):  # a place among the parts, or the digest of a block sent before
            block = received[name] if isinstance(name, int) else recent.get(name)
            if block is None:
                return "send", {}, None
            blocks.append(block)
        handler = HANDLERS.get(head.get("kind", ""))
        if handler is None:
            return "defect", {"sentence": f"The worker has no job called {str(head.get('kind'))[:40]}."}, None
        return "ok", *handler(head.get("head", {}), blocks, progress)
    except SheetfuncsError as refusal:
        return "refused", {"sentence": str(refusal), "cell_error": refusal.cell_error}, None
    except MemoryError:
        return "refused", {"sentence": "There is not enough memory for this range: choose fewer columns or rows.",
                           "cell_error": "#NUM!"}, None
    except Exception as defect:  # the next request must still get its answer
        sentence = f"sheetfuncs made a mistake ({type(defect).__name__}: {str(defect)[:200]})."
        return "defect", {"sentence": sentence}, None


class ReadAhead:
    """The bytes of a pipe, read by a thread of its own; at the pipe's end the whole process ends at once."""

    def __init__(self, pipe: BinaryIO):
        self._pipe = pipe
        self._chunks: queue.Queue[bytes] = queue.Queue(maxsize=64)
        self._rest = memoryview(b"")
        threading.Thread(target=self._fill, daemon=True).start()

    def _fill(self) -> None:
        while chunk := os.read(self._pipe.fileno(), 1 << 20):
            self._chunks.put(chunk)
        os._exit(0)  # LibreOffice is gone, and nobody reads what a running job would answer

    def read(self, size: int) -> bytes:
        """Exactly size bytes, however long that takes."""
        if len(self._rest) >= size:
            data, self._rest = bytes(self._rest[:size]), self._rest[size:]
            return data
        pieces, length = [self._rest], len(self._rest)
        while length < size:
            chunk = memoryview(self._chunks.get())
            pieces.append(chunk)
            length += len(chunk)
        surplus = length - size
        if surplus:
            last = pieces[-1]
            pieces[-1], self._rest = last[: len(last) - surplus], last[len(last) - surplus:]
        else:
            self._rest = memoryview(b"")
        return b"".join(pieces)


def main() -> None:
    """Serve the process's own pipes; whatever a library prints goes to standard error, never between the messages."""
    source = os.fdopen(os.dup(0), "rb", buffering=0)
    sink = os.fdopen(os.dup(1), "wb", buffering=1 << 16)
    os.dup2(os.open(os.devnull, os.O_RDONLY), 0)
    os.dup2(2, 1)
    if sys.platform == "win32":
        import msvcrt

        for stream in (source, sink):
            msvcrt.setmode(stream.fileno(), os.O_BINARY)
    try:
        serve(ReadAhead(source), sink)  # type: ignore[arg-type]
    except protocol.ProtocolError as trouble:
        print(f"sheetfuncs worker: {trouble}", file=sys.stderr)
        sys.exit(1)
    except BrokenPipeError:
        sys.exit(0)


if __name__ == "__main__":
    main()
