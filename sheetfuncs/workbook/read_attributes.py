"""What the attributes of a cell say about its value, for many cells at once."""

from __future__ import annotations

import re

import numpy as np

NUMBER, SHARED, BOOLEAN, TEXT, INLINE, ERROR, OTHER = range(7)
_TYPES = {b"n": NUMBER, b"s": SHARED, b"b": BOOLEAN, b"str": TEXT, b"inlineStr": INLINE, b"e": ERROR}
_LONGEST = 24
_BUCKETS = 12
_ATTRIBUTES = re.compile(rb"(?:\s+[A-Za-z:]+=\"[^\"&<]*\")*\s*")
_ATTRIBUTE = re.compile(rb"\s([A-Za-z:]+)=\"([^\"]*)\"")
_MASKS = np.array([(1 << 8 * size) - 1 for size in range(9)], np.uint64)


class CellAttributes:
    """What the attributes behind a cell's reference say: kind of value, and whether the format shows a date.

    Few different ones occur in a sheet, so each is looked into once.
    """

    def __init__(self, date_formats: list[bool]):
        self.date_formats = date_formats
        self.known: dict[bytes, tuple[int, bool]] = {}

    def classify(
        self, data: bytes, words: np.ndarray, starts: np.ndarray, lengths: np.ndarray
    ) -> tuple[np.ndarray, np.ndarray]:
        """Kind and is_date of cells whose attributes begin at starts; a length that is no length gives OTHER."""
        kinds, dates = np.full(len(starts), OTHER, np.uint8), np.zeros(len(starts), bool)
        left = np.flatnonzero((lengths >= 0) & (lengths <= _LONGEST))
        for _ in range(8):
            if not len(left):
                break
            keys = self._keys(words, starts[left], lengths[left])
            bucket = (keys[0] * np.uint64(0x9E3779B97F4A7C15)) ^ (keys[1] * np.uint64(0xC2B2AE3D27D4EB4F)) ^ keys[2]
            bucket = (bucket * np.uint64(0xFF51AFD7ED558CCD)) >> np.uint64(64 - _BUCKETS)
            chosen = np.full(1 << _BUCKETS, -1)
            chosen[bucket] = np.arange(len(left))
            same = np.logical_and.reduce([key == key[chosen[bucket]] for key in keys])
            kind_of, date_of = np.zeros(1 << _BUCKETS, np.uint8), np.zeros(1 << _BUCKETS, bool)
            for place in np.flatnonzero(chosen >= 0).tolist():
                cell = left[chosen[place]]
                kind_of[place], date_of[place] = self._look(data[starts[cell] : starts[cell] + lengths[cell]])
            kinds[left[same]], dates[left[same]] = kind_of[bucket[same]], date_of[bucket[same]]
            left = left[~same]
        return kinds, dates

    @staticmethod
    def _keys(words: np.ndarray, starts: np.ndarray, lengths: np.ndarray) -> list[np.ndarray]:
        """The attributes' bytes as three numbers; those of different lengths differ, as none holds a zero byte."""
        longest = int(lengths.max())
        return [
            words[starts + begin] & _MASKS[np.clip(lengths - begin, 0, 8)]
            if longest > begin
            else np.zeros(len(starts), np.uint64)
            for begin in (0, 8, 16)
        ]

    def _look(self, tail: bytes) -> tuple[int, bool]:
        if tail not in self.known:
            self.known[tail] = self._read(tail)
        return self.known[tail]

    def _read(self, tail: bytes) -> tuple[int, bool]:
        if _ATTRIBUTES.fullmatch(tail) is None:
            return OTHER, False
        found = dict(_ATTRIBUTE.findall(tail))
        style = found.get(b"s", b"0")
        if not style.isdigit() or len(style) > 9:
            return OTHER, False
        number = int(style)
        is_date = number < len(self.date_formats) and self.date_formats[number]
        return _TYPES.get(found.get(b"t", b"n"), OTHER), is_date
