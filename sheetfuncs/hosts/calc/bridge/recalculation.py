"""What formulas of one recalculation share: ranges read once, and a trouble that none of them needs to wait for again.

A range that was packed is used again until (1) a cell in it changes, formula cells included, of which the range's own
listeners tell; (2) LibreOffice comes back to its main loop, that is when the recalculation is over; or (3) no
function was called for a moment, in case something reached the cells without either.
"""

from __future__ import annotations

import time

import unohelper
from com.sun.star.awt import XCallback
from com.sun.star.util import XModifyListener
from sheetfuncs_bridge import protocol
from sheetfuncs_bridge.client import Packed
from sheetfuncs_bridge.ranges import common_last_row, cut_to_row, read_block
from sheetfuncs_bridge.troubles import hide_trouble, show_trouble

PAUSE_SECONDS = 0.05


class Recalculation(unohelper.Base, XCallback):
    """The ranges and the trouble of the recalculation that runs now."""

    def __init__(self, context):
        self._context = context
        self._kept = {}
        self._listeners = []
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

    def begin_call(self) -> None:
        """A function is called now."""
        if time.monotonic() - self._last_call > PAUSE_SECONDS:
            self._forget_ranges()

    def end_call(self) -> None:
        """The function has its value."""
        self._last_call = time.monotonic()

    def packed(self, document, ranges) -> list:
        """A Packed block for each range of one call. Whole columns are cut to the used part, all at the same row."""
        addresses = [cells.getRangeAddress() for cells in ranges]
        last_row = common_last_row(ranges, addresses)
        owner = document.getPropertyValue("RuntimeUID")
        return [
            self._one(owner, cells, address, last_row) for cells, address in zip(ranges, addresses)  # noqa: B905
        ]

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

    def _forget_ranges(self) -> None:
        self._kept.clear()
        listeners, self._listeners = self._listeners, []
        for cells, listener in listeners:
            cells.removeModifyListener(listener)

    def _one(self, owner: str, cells, address, last_row) -> Packed:
        key = (
            owner, address.Sheet, address.StartColumn, address.StartRow, address.EndColumn, address.EndRow, last_row
        )
        kept = self._kept.get(key)
        if kept is None:
            self._listen(cells, key)
            part = cells if last_row is None else cut_to_row(cells, last_row)
            kept = self._kept[key] = Packed(protocol.pack(read_block(part)))
            self._post()
        return kept

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


class _Forget(unohelper.Base, XModifyListener):
    """Drops one packed range as soon as a cell in it changes."""

    def __init__(self, kept: dict, key):
        self._kept, self._key = kept, key

    def modified(self, event) -> None:
        self._kept.pop(self._key, None)

    def disposing(self, event) -> None:
        self._kept.pop(self._key, None)
