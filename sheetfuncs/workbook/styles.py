"""Cell formats of one workbook taken over into another's styles.xml.

The host's formats keep their places. A format that is already there in equal form is used again, so that writing the
same sheet ten times adds nothing after the first.
"""

from __future__ import annotations

from collections.abc import Iterable

from lxml import etree

from sheetfuncs.errors import WorkbookFormatError
from sheetfuncs.workbook.xml import (
    Document,
    child,
    children,
    copied,
    ensure_child,
    graft,
    integer,
    main,
    parse,
    same_key,
)

_ORDER = (
    "numFmts", "fonts", "fills", "borders", "cellStyleXfs", "cellXfs", "cellStyles", "dxfs", "tableStyles", "colors",
    "extLst",
)  # fmt: skip
_FIRST_CUSTOM = 164
_MOST_FORMATS = 65_430
_MINIMAL = (
    b'<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
    b'<styleSheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
    b'<fonts count="1"><font><sz val="11"/><name val="Calibri"/><family val="2"/></font></fonts>'
    b'<fills count="2"><fill><patternFill patternType="none"/></fill><fill><patternFill patternType="gray125"/></fill>'
    b"</fills>"
    b'<borders count="1"><border><left/><right/><top/><bottom/><diagonal/></border></borders>'
    b'<cellStyleXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0"/></cellStyleXfs>'
    b'<cellXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0" xfId="0"/></cellXfs>'
    b'<cellStyles count="1"><cellStyle name="Normal" xfId="0" builtinId="0"/></cellStyles></styleSheet>'
)


def minimal_styles() -> Document:
    """The least that a styles part must hold, for a workbook without one."""
    return parse(_MINIMAL, "the minimal styles")


def default_font(root: etree._Element) -> etree._Element | None:
    """The font of the Normal style, in which column widths are counted."""
    formats = children(child(root, "cellStyleXfs"), "xf") or children(child(root, "cellXfs"), "xf")
    fonts = children(child(root, "fonts"), "font")
    place = _normal_style(root, len(formats))
    index = integer(formats[place], "fontId") if place < len(formats) else 0
    return fonts[index] if 0 <= index < len(fonts) else None


class _Shelf:
    """One list of formats in the host, with the places of those that are there."""

    def __init__(self, root: etree._Element, tag: str, defaults: int = 0):
        self.root, self.tag = root, tag
        self.container = child(root, tag)
        self.places: dict[tuple, int] = {}
        self.added = 0
        items = [] if self.container is None else [item for item in self.container if isinstance(item.tag, str)]
        for place, item in enumerate(items):
            self.places.setdefault(same_key(item), place)
        self.count = len(items)
        for item in children(child(minimal_styles().root, tag), "*")[self.count : defaults]:
            self.put(item)

    def place(self, item: etree._Element) -> int:
        """Where an equal item stands, after adding it if there is none."""
        found = self.places.get(same_key(item))
        return self.put(item) if found is None else found

    def put(self, item: etree._Element) -> int:
        if self.container is None:
            self.container = ensure_child(self.root, self.tag, _ORDER)
        self.places[same_key(item)] = self.count
        made = graft(self.container, item)
        made.tail, previous = None, made.getprevious()
        if previous is not None:
            made.tail = previous.tail
        self.count += 1
        self.added += 1
        self.container.set("count", str(self.count))
        return self.count - 1


class StyleMerge:
    """Takes formats over from a guest's styles into a host's; `cell_format` and `differential` map the places."""

    def __init__(self, host: Document, guest: Document):
        self._guest = guest.root
        self._fonts = _Shelf(host.root, "fonts", defaults=1)
        # The first two fills have a meaning of their own (none, gray125) and must be there before ours follow.
        self._fills = _Shelf(host.root, "fills", defaults=2)
        self._borders = _Shelf(host.root, "borders", defaults=1)
        self._style_xfs = _Shelf(host.root, "cellStyleXfs", defaults=1)
        self._cell_xfs = _Shelf(host.root, "cellXfs", defaults=1)
        self._dxfs = _Shelf(host.root, "dxfs")
        self._numbers = _NumberFormats(host.root)
        self._normal = _normal_style(host.root, self._style_xfs.count)
        self._host_normal = _item(child(host.root, "cellStyleXfs"), self._normal, "cell style")
        self._guest_codes = {
            number.get("numFmtId", ""): number.get("formatCode", "")
            for number in children(child(guest.root, "numFmts"), "numFmt")
        }
        self._cell_map: dict[int, int] = {0: 0}
        self._dxf_map: dict[int, int] = {}

    @property
    def changed(self) -> bool:
        """Whether anything was added to the host's styles."""
        shelves = (self._fonts, self._fills, self._borders, self._style_xfs, self._cell_xfs, self._dxfs, self._numbers)
        return any(shelf.added for shelf in shelves)

    def cell_format(self, place: int) -> int:
        """The host's place of a cell format of the guest; the default format stays the default."""
        if place not in self._cell_map:
            self._cell_map[place] = self._take_cell_format(place)
        return self._cell_map[place]

    def differential(self, place: int) -> int:
        """The host's place of a differential format (of a conditional format or a table) of the guest."""
        if place not in self._dxf_map:
            item = copied(_item(child(self._guest, "dxfs"), place, "differential format"))
            number = child(item, "numFmt")
            if number is not None:
                number.set("numFmtId", self._numbers.id_for(number.get("formatCode", ""), listed=False))
            self._dxf_map[place] = self._dxfs.place(item)
        return self._dxf_map[place]

    def _take_cell_format(self, place: int) -> int:
        xf = copied(_item(child(self._guest, "cellXfs"), place, "cell format"))
        code = self._guest_codes.get(xf.get("numFmtId", "0"))
        if code is not None:
            xf.set("numFmtId", self._numbers.id_for(code))
        for attribute, tag, shelf in (
            ("fontId", "fonts", self._fonts),
            ("fillId", "fills", self._fills),
            ("borderId", "borders", self._borders),
        ):
            item = copied(_item(child(self._guest, tag), integer(xf, attribute), tag))
            for scheme in children(item, "scheme"):
                item.remove(scheme)  # a theme font would turn into the host's, and widths were drawn for this one
            xf.set(attribute, str(shelf.place(item)))
        xf.set("xfId", str(self._normal))
        self._declare_differences(xf)
        if self._cell_xfs.count >= _MOST_FORMATS:
            raise WorkbookFormatError(
                f"The workbook already has {self._cell_xfs.count:,} cell formats, the most that are allowed; remove "
                f"unused cell styles and formats before adding a sheet."
            )
        return self._cell_xfs.place(xf)

    def _declare_differences(self, xf: etree._Element) -> None:
        """Say which parts differ from the host's Normal style, else some programs show that style instead."""
        for attribute, flag in (
            ("numFmtId", "applyNumberFormat"),
            ("fontId", "applyFont"),
            ("fillId", "applyFill"),
            ("borderId", "applyBorder"),
        ):
            if xf.get(attribute, "0") != self._host_normal.get(attribute, "0"):
                xf.set(flag, "1")


class _NumberFormats:
    """Number formats by code; an id of our own is above every id that anything in the host uses."""

    def __init__(self, root: etree._Element):
        self.root = root
        self.added = 0
        self._ids: dict[str, str] = {}
        used = {integer(element, "numFmtId") for element in root.iter(main("numFmt"), main("xf"))}
        self._next = max([_FIRST_CUSTOM - 1, *used]) + 1
        for element in children(child(root, "numFmts"), "numFmt"):
            self._ids.setdefault(element.get("formatCode", ""), element.get("numFmtId", "0"))
        self._unlisted = {
            element.get("formatCode", ""): element.get("numFmtId", "0")
            for dxf in children(child(root, "dxfs"), "dxf")
            for element in children(dxf, "numFmt")
        }

    def id_for(self, code: str, *, listed: bool = True) -> str:
        """The id of a format code; differential formats carry their code themselves and need no entry in the list."""
        known = self._ids.get(code) or (None if listed else self._unlisted.get(code))
        if known is not None:
            return known
        id_ = str(self._next)
        self._next += 1
        if not listed:
            self._unlisted[code] = id_
            return id_
        container = ensure_child(self.root, "numFmts", _ORDER)
        etree.SubElement(container, main("numFmt"), {"numFmtId": id_, "formatCode": code})
        container.set("count", str(len(children(container, "numFmt"))))
        self._ids[code] = id_
        self.added += 1
        return id_


def _normal_style(root: etree._Element, count: int) -> int:
    """The place of the style named Normal, whatever its name in the host's language."""
    for style in children(child(root, "cellStyles"), "cellStyle"):
        if style.get("builtinId") == "0" and 0 <= integer(style, "xfId") < count:
            return integer(style, "xfId")
    return 0


def _item(container: etree._Element | None, place: int, what: str) -> etree._Element:
    items: Iterable[etree._Element] = [] if container is None else container.iterchildren(tag=etree.Element)
    for index, item in enumerate(items):
        if index == place:
            return item
    raise WorkbookFormatError(f"A sheet uses {what} {place}, which its workbook does not have; the file is damaged.")
