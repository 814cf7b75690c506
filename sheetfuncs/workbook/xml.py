"""XML of a workbook's parts: parsed without entities, DTD or network, written back with what surrounded it.

Only parts that must change pass through here. Declaration, byte order mark, encoding, namespaces, prefixes, comments
and unknown elements come back as they were.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from lxml import etree

from sheetfuncs.errors import WorkbookFormatError, WorkbookUnsafeError

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
OFFICE_RELATIONSHIPS = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE_RELATIONSHIPS = "http://schemas.openxmlformats.org/package/2006/relationships"
CONTENT_TYPES = "http://schemas.openxmlformats.org/package/2006/content-types"

_HEAD = re.compile(r"\s*<\?xml\s(?P<rest>[^>]*)\?>\s*")
_DECLARED = re.compile(r"""encoding\s*=\s*["']([^"']+)["']""")


@dataclass
class Document:
    """One parsed part: its root, the text before the root's first markup, and how the bytes were encoded."""

    root: etree._Element
    head: str
    encoding: str

    def to_bytes(self) -> bytes:
        body = etree.tostring(self.root.getroottree(), encoding="unicode")
        return (self.head + body).encode(self.encoding)


def parse(data: bytes, where: str) -> Document:
    """Parse one part; `where` names it in a refusal. A DOCTYPE, and with it every entity, is refused."""
    text, encoding = _decode(data, where)
    match = _HEAD.match(text)
    head = match.group() if match else ""
    declared = _DECLARED.search(match["rest"]) if match else None
    if declared and declared[1].lower().replace("_", "-") not in ("utf-8", "utf-16", "us-ascii", "ascii"):
        raise WorkbookFormatError(f"{where} is encoded as {declared[1]!r}; workbook parts are UTF-8 or UTF-16.")
    body = text[len(head) :]
    if "<!DOCTYPE" in body:
        raise WorkbookUnsafeError(f"{where} holds a DOCTYPE, which no workbook part may and which could pull in files.")
    parser = etree.XMLParser(
        encoding="utf-8", resolve_entities=False, no_network=True, load_dtd=False, dtd_validation=False,
        huge_tree=False, strip_cdata=False,
    )  # fmt: skip
    try:
        root = etree.fromstring(body.encode("utf-8"), parser)
    except etree.XMLSyntaxError as error:
        raise WorkbookFormatError(f"{where} is damaged: {error.msg}. Let the spreadsheet program repair it.") from error
    return Document(root, head, encoding)


def _decode(data: bytes, where: str) -> tuple[str, str]:
    wide = data[:2] in (b"\xff\xfe", b"\xfe\xff")
    encoding = "utf-16" if wide else "utf-8-sig" if data[:3] == b"\xef\xbb\xbf" else "utf-8"
    try:
        return data.decode(encoding), encoding
    except UnicodeDecodeError as error:
        raise WorkbookFormatError(f"{where} is damaged: it is neither UTF-8 nor UTF-16.") from error


def main(tag: str) -> str:
    """A tag of SpreadsheetML in lxml's notation."""
    return f"{{{MAIN}}}{tag}"


def integer(element: etree._Element, attribute: str, default: int = 0) -> int:
    """The whole number in an attribute; anything else there is damage."""
    text = element.get(attribute, str(default))
    try:
        return int(text)
    except ValueError:
        tag = etree.QName(element).localname
        raise WorkbookFormatError(
            f"The workbook is damaged: {attribute}={text[:40]!r} of a {tag} is no whole number. Let the spreadsheet "
            f"program repair it."
        ) from None


def child(parent: etree._Element, tag: str) -> etree._Element | None:
    """The first SpreadsheetML child of that name."""
    return parent.find(main(tag))


def children(parent: etree._Element | None, tag: str) -> list[etree._Element]:
    """The children of that name in the main namespace; none where there is no parent."""
    return [] if parent is None else parent.findall(main(tag))


def ensure_child(parent: etree._Element, tag: str, order: tuple[str, ...]) -> etree._Element:
    """The child of that name, made where the schema's order wants it if it is not there yet."""
    found = child(parent, tag)
    if found is not None:
        return found
    earlier = {main(name) for name in order[: order.index(tag)]}
    at = max((index for index, other in enumerate(parent, start=1) if other.tag in earlier), default=0)
    made = etree.SubElement(parent, main(tag))
    parent.insert(at, made)
    return made


def graft(parent: etree._Element, element: etree._Element) -> etree._Element:
    """A copy of an element under another parent, written with the prefixes in force there."""
    made = etree.SubElement(parent, element.tag)
    _fill(made, element)
    return made


def copied(element: etree._Element) -> etree._Element:
    """A copy of an element that stands alone, without what follows it."""
    made = etree.Element(element.tag)
    _fill(made, element)
    return made


def _fill(made: etree._Element, element: etree._Element) -> None:
    for name, value in element.attrib.items():
        made.set(name, value)
    made.text = element.text
    for inner in element:
        if isinstance(inner.tag, str):
            graft(made, inner).tail = inner.tail


def same_key(element: etree._Element) -> tuple:
    """Equal for elements that mean the same: attribute order, white space and comments do not count."""
    inner = tuple(same_key(child) for child in element if isinstance(child.tag, str))
    return element.tag, tuple(sorted(element.attrib.items())), (element.text or "").strip(), inner
