"""docProps/app.xml lists the sheets by name; a new one is added there if the list is plainly the list of sheets."""

from __future__ import annotations

from copy import deepcopy

from lxml import etree

from sheetfuncs.workbook.package import Package

_PROPERTIES = "http://schemas.openxmlformats.org/officeDocument/2006/extended-properties"
_VARIANTS = "http://schemas.openxmlformats.org/officeDocument/2006/docPropsVTypes"


def list_sheet(package: Package, names: list[str], index: int) -> None:
    """Add the sheet at `index` of `names` to the list of titles; a list of any other shape is left alone."""
    part = next((arrow.part for arrow in package.relationships("") if arrow.kind == "extended-properties"), None)
    if part is None or package.find(part) is None:
        return
    root = package.document(part).root
    titles = _vector(root, "TitlesOfParts")
    pairs = _vector(root, "HeadingPairs")
    if titles is None or pairs is None:
        return
    counts = pairs.findall(f"{{{_VARIANTS}}}variant/{{{_VARIANTS}}}i4")
    others = names[:index] + names[index + 1 :]
    listed = [title.text or "" for title in titles]
    # With chart sheets the list has a second group and another order; then it is not simple, and nobody needs it.
    if not counts or (counts[0].text or "") != str(len(others)) or listed[: len(others)] != others:
        return
    made = deepcopy(titles[0])
    made.text = names[index]
    titles.insert(index, made)
    titles.set("size", str(len(titles)))
    counts[0].text = str(len(names))
    package.mark_changed(part)


def _vector(root: etree._Element, tag: str) -> etree._Element | None:
    return root.find(f"{{{_PROPERTIES}}}{tag}/{{{_VARIANTS}}}vector")
