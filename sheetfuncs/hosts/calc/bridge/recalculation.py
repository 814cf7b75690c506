"""What formulas of one recalculation share: ranges read once, and a trouble that none of them needs to wait for again.

A range that was packed is used again until (1) a cell in it changes, of which the range's own listeners tell; (2)
LibreOffice comes back to its main loop, that is when the recalculation is over; or (3) no function was called for a
moment, in case something reached the cells without either.

Cells that are calculated themselves need more care. Where formulas depend on each other some hundred deep, LibreOffice
calls a function before its data are ready, drops the value, and calls again; neither call says which it is. So a range
with formulas is read again (a) for a call that was made on it before, which may be such a second call, and (b) until
two different calls have read the same.
"""

from __future__ import annotations

import time
from contextlib import contextmanager, suppress

import unohelper
from com.sun.star.awt import XCallback
from com.sun.star.uno import Exception as UnoException
from com.sun.star.util import XModifyListener
from sheetfuncs_bridge import protocol
from sheetfuncs_bridge.client import Packed
from sheetfuncs_bridge.ranges import common_last_row, cut_to_row, has_formulas, read_block
from sheetfuncs_bridge.troubles import hide_trouble, show_trouble

PAUSE_SECONDS = 0.05


class Recalculation(unohelper.Base, XCallback):
    """The ranges and the trouble of the recalculation that runs now."""

    def __init__(self, context):
        self._context = context
        self._kept = {}
        self._listeners = []
        self._forgotten = 0  # how often everything was forgotten
        self._depth = 0
        self._posted = False
        self._last_call = 0.0
        self._trouble = None
        self._shown = False

    @property
    def trouble(self):
        """The sentence of what already failed in this recalculation, or None."""
        return self._trouble

    @trouble.setter
    def trouble(self, sentence):
        self._trouble = sentence
        self._post()

    @contextmanager
    def call(self):
        """Surrounds each call; reading a range may call further functions within it."""
        if self._depth == 0 and time.monotonic() - self._last_call > PAUSE_SECONDS:
            self._forget_ranges()
        self._depth += 1
        try:
            yield
        finally:
            self._depth -= 1
            self._last_call = time.monotonic()

    def packed(self, document, ranges, call) -> list:
        """A Packed block for each range of one call. Whole columns are cut to the used part, all at the same row.

        call: what tells this call from others on the same ranges, hashable.
        """
        addresses = [cells.getRangeAddress() for cells in ranges]
        last_row = common_last_row(ranges, addresses)
        owner = document.getPropertyValue("RuntimeUID")
        keys = [
            (owner, one.Sheet, one.StartColumn, one.StartRow, one.EndColumn, one.EndRow, last_row) for one in addresses
        ]
        call = (call, tuple(keys))
        return [self._one(cells, key, call) for cells, key in zip(ranges, keys)]  # noqa: B905 (Python 3.8)

    def notify(self, data) -> None:
        """Called from the main loop: the recalculation that posted this is over."""
        self._posted = False
        trouble, self._trouble = self._trouble, None
        self._forget_ranges()
        if trouble is not None:
            show_trouble(self._context, trouble)
        elif self._shown:
            hide_trouble(self._context)
        self._shown = trouble is not None

    def _one(self, cells, key, call) -> Packed:
        kept = self._kept.get(key)
        if kept is not None and kept.serves(call):
            return kept.packed
        if kept is None:
            self._listen(cells, key)
        forgotten = self._forgotten
        fresh = _read(cells, key[-1])
        if kept is not None and kept.agrees(fresh, call):
            return kept.packed
        if self._forgotten == forgotten:  # else nobody listens any more
            self._kept[key] = fresh
            fresh.calls.add(call)
            self._post()
        return fresh.packed

    def _forget_ranges(self) -> None:
        self._forgotten += 1
        self._kept.clear()
        listeners, self._listeners = self._listeners, []
        for cells, listener in listeners:
            with suppress(UnoException):  # a range that was deleted meanwhile
                cells.removeModifyListener(listener)

    def _listen(self, cells, key) -> None:
        listener = _Forget(self._kept, key)
        cells.addModifyListener(listener)
        self._listeners.append((cells, listener))

    def _post(self) -> None:
        if self._posted:
            return
        self._posted = True
        manager = self._context.getServiceManager()
        manager.createInstanceWithContext("com.sun.star.awt.AsyncCallback", self._context).addCallback(self, None)


class _Kept:
    """A packed range, whether formulas are in it, and the calls that used it."""

    def __init__(self, packed: Packed, calculated: bool):
        self.packed, self._sure, self._calculated = packed, not calculated, calculated
        self.calls: set = set()

    def serves(self, call) -> bool:
        """Whether the call may use it without reading the range again."""
        if not self._sure or (self._calculated and call in self.calls):
            return False
        self.calls.add(call)
        return True

    def agrees(self, fresh: _Kept, call) -> bool:
        """Whether another call than before has now read the same, which then can be relied on."""
        if call in self.calls or fresh.packed.digest != self.packed.digest:
            return False
        self._sure = True
        self.calls.add(call)
        return True


def _read(cells, last_row) -> _Kept:
    part = cells if last_row is None else cut_to_row(cells, last_row)
    calculated = has_formulas(part)
    return _Kept(Packed(protocol.pack(read_block(part))), calculated)


class _Forget(unohelper.Base, XModifyListener):
    """Drops one packed range as soon as a cell in it changes."""

    def __init__(self, kept: dict, key):
        self._kept, self._key = kept, key

    def modified(self, event) -> None:
        self._kept.pop(self._key, None)

    def disposing(self, event) -> None:
        self._kept.pop(self._key, None)
