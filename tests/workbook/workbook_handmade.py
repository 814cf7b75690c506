"""Workbooks written out part by part, for features that no library writes. All names and numbers are invented."""

from __future__ import annotations

from collections.abc import Callable

from workbook_build import DECLARATION, MAIN, RELATIONSHIPS, SHEET_ML, Parts, zipped

MC = "http://schemas.openxmlformats.org/markup-compatibility/2006"
MICROSOFT = "http://schemas.microsoft.com/office"
VERSIONS = (
    f'xmlns:mc="{MC}" mc:Ignorable="x14ac x15 xr xr6" xmlns:x14ac="{MICROSOFT}/spreadsheetml/2009/9/ac" '
    f'xmlns:x15="{MICROSOFT}/spreadsheetml/2010/11/main" xmlns:xr="{MICROSOFT}/spreadsheetml/2014/revision" '
    f'xmlns:xr6="{MICROSOFT}/spreadsheetml/2016/revision6"'
)
STYLES = (
    f'{DECLARATION}<styleSheet xmlns="{MAIN}">'
    '<fonts count="1"><font><sz val="11"/><name val="Calibri"/></font></fonts>'
    '<fills count="2"><fill><patternFill patternType="none"/></fill><fill><patternFill patternType="gray125"/></fill>'
    '</fills><borders count="1"><border><left/><right/><top/><bottom/><diagonal/></border></borders>'
    '<cellStyleXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0"/></cellStyleXfs>'
    '<cellXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0" xfId="0"/></cellXfs></styleSheet>'
)


def sheet(inside: str = "", *, after: str = "", head: str = "") -> str:
    rows = "".join(
        f'<row r="{r}"><c r="A{r}"><v>{r * 1.5}</v></c><c r="B{r}"><v>{r}</v></c></row>' for r in range(1, 5)
    )
    return (
        f'{DECLARATION}<worksheet xmlns="{MAIN}" xmlns:r="{RELATIONSHIPS}">{head}<sheetData>{rows}{inside}</sheetData>'
        f"{after}</worksheet>"
    )


def workbook(sheets: list[tuple[str, str]], *, before: str = "", after: str = "", spaces: str = "") -> str:
    """The main part for sheets given as (name, relationship id)."""
    lines = "".join(f'<sheet name="{name}" sheetId="{i * 3}" r:id="{id_}"/>' for i, (name, id_) in enumerate(sheets, 1))
    return (
        f'{DECLARATION}<workbook xmlns="{MAIN}" xmlns:r="{RELATIONSHIPS}" {spaces}>{before}<sheets>{lines}</sheets>'
        f"{after}</workbook>"
    )


def base(*, styles: str | None = STYLES, before: str = "", after: str = "", spaces: str = "") -> Parts:
    """Two sheets, Data and Notes; `before` and `after` stand around the list of sheets."""
    parts = Parts()
    parts.relate("", "officeDocument", "xl/workbook.xml")
    ids = [parts.relate("xl/workbook.xml", "worksheet", f"worksheets/sheet{n}.xml") for n in (1, 2)]
    for number in (1, 2):
        parts.add(f"xl/worksheets/sheet{number}.xml", sheet(), SHEET_ML + "worksheet+xml")
    parts.add("xl/workbook.xml", workbook([("Data", ids[0]), ("Notes", ids[1])], before=before, after=after,
                                          spaces=spaces), SHEET_ML + "sheet.main+xml")  # fmt: skip
    if styles is not None:
        parts.relate("xl/workbook.xml", "styles", "styles.xml")
        parts.add("xl/styles.xml", styles, SHEET_ML + "styles+xml")
    return parts


def bare() -> Parts:
    """No styles, no shared strings, no document properties, no windows."""
    return base(styles=None)


def scant_styles() -> Parts:
    return base(styles=f'{DECLARATION}<styleSheet xmlns="{MAIN}"/>')


def one_fill() -> Parts:
    second = '<fill><patternFill patternType="gray125"/></fill>'
    return base(styles=STYLES.replace('<fills count="2">', '<fills count="1">').replace(second, ""))


def prefixed() -> Parts:
    """Every element under a prefix, as some libraries write, and the relationship namespace on each sheet."""
    parts = base()
    ids = ("rId1", "rId2")
    lines = "".join(
        f'<x:sheet name="{n}" sheetId="{i}" q:id="{id_}" xmlns:q="{RELATIONSHIPS}"/>'
        for i, (n, id_) in enumerate(zip(("Data", "Notes"), ids, strict=True), 1)
    )
    parts.add("xl/workbook.xml", f'<x:workbook xmlns:x="{MAIN}">\n  <x:sheets>{lines}</x:sheets>\n</x:workbook>')
    parts.add("xl/styles.xml", STYLES.replace("xmlns=", "xmlns:x=").replace("</", "</x:").replace("<", "<x:")
              .replace("<x:/x:", "</x:").replace("<x:?", "<?"))  # fmt: skip
    return parts


def absolute_targets() -> Parts:
    parts = base()
    for source, arrows in parts.arrows.items():
        root = "" if source == "" else "/xl/"
        parts.arrows[source] = [(i, t, root + target if root else "/" + target, out) for i, t, target, out in arrows]
    return parts


def unusual_places() -> Parts:
    """Parts in folders of other names."""
    return _placed(
        "core/book.xml", ("a/b/first.xml", "core/second.xml"), ("/a/b/first.xml", "./second.xml"), "xl/styles.xml"
    )


def odd_spelling() -> Parts:
    """The main part beside the root, and targets that differ by case or an escaped space (ISO/IEC 29500-2)."""
    return _placed(
        "book.xml", ("a/b/first.xml", "second%20sheet.xml"), ("A/b/First.XML", "second%20sheet.xml"), "look/deep.xml"
    )


def _placed(book: str, names: tuple[str, str], targets: tuple[str, str], styles: str) -> Parts:
    parts = Parts()
    parts.relate("", "officeDocument", book)
    ids = [parts.relate(book, "worksheet", target) for target in targets]
    for name in names:
        parts.add(name, sheet(), SHEET_ML + "worksheet+xml")
    parts.relate(book, "styles", f"/{styles}")
    parts.add(styles, STYLES, SHEET_ML + "styles+xml")
    parts.add(book, workbook([("Data", ids[0]), ("Notes", ids[1])]), SHEET_ML + "sheet.main+xml")
    return parts


def default_type_is_sheet() -> Parts:
    """The extension itself declares worksheets; everything else is overridden."""
    parts = base()
    parts.defaults["xml"] = SHEET_ML + "worksheet+xml"
    for part in [part for part in parts.types if "worksheets" in part]:
        del parts.types[part]
    return parts


def newest_program() -> Parts:
    """Markup compatibility, revision ids and extension lists as the newest versions write them."""
    before = (
        '<fileVersion appName="xl" lastEdited="7" lowestEdited="4" rupBuild="27000"/><workbookPr/>'
        f'<mc:AlternateContent xmlns:mc="{MC}"><mc:Choice Requires="x15"><x15ac:absPath url="C:\\data\\" '
        f'xmlns:x15ac="{MICROSOFT}/spreadsheetml/2010/11/ac"/></mc:Choice></mc:AlternateContent>'
        '<xr:revisionPtr revIDLastSave="0" documentId="13_ncr:1_{0A1B2C3D-0000-4000-8000-000000000001}" '
        'xr6:coauthVersionLast="47" xr6:coauthVersionMax="47"/>'
        '<bookViews><workbookView xWindow="-110" yWindow="-110" windowWidth="19420" windowHeight="10300" '
        'activeTab="1"/></bookViews>'
    )
    after = (
        '<calcPr calcId="191029"/><extLst><ext uri="{140A7094-0E35-4892-8432-C4D2E57EDEB5}">'
        '<x15:workbookPr chartTrackingRefBase="1"/></ext></extLst>'
    )
    fonts = '<fonts count="1" x14ac:knownFonts="1">'
    styles = STYLES.replace(f'xmlns="{MAIN}">', f'xmlns="{MAIN}" {VERSIONS}>').replace('<fonts count="1">', fonts)
    styles = styles.replace(
        "</styleSheet>",
        '<cellStyles count="1"><cellStyle name="Standard" xfId="0" builtinId="0"/></cellStyles><dxfs count="1"><dxf>'
        '<numFmt numFmtId="164" formatCode="0.00"/></dxf></dxfs><!-- kept --><extLst>'
        '<ext uri="{EB79DEF2-80B8-43e5-95BD-54CBDDF9020C}" xmlns:x14="' + MICROSOFT + '/spreadsheetml/2009/9/main">'
        '<x14:slicerStyles defaultSlicerStyle="SlicerStyleLight1"/></ext></extLst></styleSheet>',
    )
    return base(styles=styles, before=before, after=after, spaces=VERSIONS)


def calculation_chain() -> Parts:
    parts = base()
    parts.add("xl/worksheets/sheet2.xml", sheet('<row r="9"><c r="A9"><f>A1+A2</f><v>4.5</v></c></row>'))
    parts.relate("xl/workbook.xml", "calcChain", "calcChain.xml")
    chain = f'{DECLARATION}<calcChain xmlns="{MAIN}"><c r="A9" i="6"/></calcChain>'
    parts.add("xl/calcChain.xml", chain, SHEET_ML + "calcChain+xml")
    return parts


def pivot_and_slicer() -> Parts:
    extension = (
        '<extLst><ext uri="{BBE1A952-AA13-448e-AADC-164F8A28A991}" '
        f'xmlns:x14="{MICROSOFT}/spreadsheetml/2009/9/main"><x14:slicerCaches><x14:slicerCache r:id="rId5"/>'
        "</x14:slicerCaches></ext></extLst>"
    )
    parts = base(after='<pivotCaches><pivotCache cacheId="1" r:id="rId4"/></pivotCaches>' + extension)
    cache, records, table = (
        "pivotCache/pivotCacheDefinition1.xml",
        "pivotCacheRecords1.xml",
        "pivotTables/pivotTable1.xml",
    )
    assert parts.relate("xl/workbook.xml", "pivotCacheDefinition", cache) == "rId4"
    slicer_cache = "http://schemas.microsoft.com/office/2007/relationships/slicerCache"
    assert parts.relate("xl/workbook.xml", slicer_cache, "slicerCaches/slicerCache1.xml") == "rId5"
    parts.relate(f"xl/{cache}", "pivotCacheRecords", records)
    parts.relate("xl/worksheets/sheet2.xml", "pivotTable", f"../{table}")
    parts.relate(f"xl/{table}", "pivotCacheDefinition", f"../{cache}")
    fields = "".join(
        f'<cacheField name="{n}" numFmtId="0"><sharedItems containsSemiMixedTypes="0" containsString="0" '
        'containsNumber="1" minValue="1" maxValue="6"/></cacheField>'
        for n in ("load", "hours")
    )
    parts.add(
        f"xl/{cache}",
        f'{DECLARATION}<pivotCacheDefinition xmlns="{MAIN}" xmlns:r="{RELATIONSHIPS}" r:id="rId1" recordCount="1">'
        '<cacheSource type="worksheet"><worksheetSource ref="A1:B4" sheet="Data"/></cacheSource>'
        f'<cacheFields count="2">{fields}</cacheFields></pivotCacheDefinition>',
        SHEET_ML + "pivotCacheDefinition+xml",
    )
    parts.add(
        "xl/pivotCache/pivotCacheRecords1.xml",
        f'{DECLARATION}<pivotCacheRecords xmlns="{MAIN}" count="1"><r><n v="3"/><n v="2"/></r></pivotCacheRecords>',
        SHEET_ML + "pivotCacheRecords+xml",
    )
    parts.add(
        f"xl/{table}",
        f'{DECLARATION}<pivotTableDefinition xmlns="{MAIN}" name="P1" cacheId="1" dataCaption="Values">'
        '<location ref="D1:E3" firstHeaderRow="1" firstDataRow="1" firstDataCol="0"/><pivotFields count="2">'
        '<pivotField showAll="0"/><pivotField dataField="1" showAll="0"/></pivotFields>'
        '<rowItems count="1"><i/></rowItems>'
        '<colItems count="1"><i/></colItems><dataFields count="1"><dataField name="Sum" fld="1"/></dataFields>'
        "</pivotTableDefinition>",
        SHEET_ML + "pivotTable+xml",
    )
    parts.add(
        "xl/slicerCaches/slicerCache1.xml",
        f'{DECLARATION}<slicerCacheDefinition xmlns="{MICROSOFT}/spreadsheetml/2009/9/main" name="Slicer_load" '
        'sourceName="load"><pivotTables><pivotTable tabId="6" name="P1"/></pivotTables></slicerCacheDefinition>',
        "application/vnd.ms-excel.slicerCache+xml",
    )
    return parts


def threaded_comments() -> Parts:
    parts = base()
    office = "http://schemas.microsoft.com/office/2017/10/relationships"
    space = f"{MICROSOFT}/spreadsheetml/2018/threadedcomments"
    person = "{11111111-2222-4333-8444-555555555555}"
    parts.relate("xl/workbook.xml", f"{office}/person", "persons/person.xml")
    parts.relate("xl/worksheets/sheet1.xml", f"{office}/threadedComment", "../threadedComments/threadedComment1.xml")
    parts.add(
        "xl/persons/person.xml",
        f'{DECLARATION}<personList xmlns="{space}"><person displayName="Invented Person" id="{person}" userId="x" '
        'providerId="None"/></personList>',
        "application/vnd.ms-excel.person+xml",
    )
    parts.add(
        "xl/threadedComments/threadedComment1.xml",
        f'{DECLARATION}<ThreadedComments xmlns="{space}"><threadedComment ref="A1" dT="2024-01-02T03:04:05.00" '
        f'personId="{person}" id="{{66666666-7777-4888-8999-AAAAAAAAAAAA}}"><text>ok?</text></threadedComment>'
        "</ThreadedComments>",
        "application/vnd.ms-excel.threadedcomments+xml",
    )
    return parts


def external_link() -> Parts:
    parts = base(after='<externalReferences><externalReference r:id="rId4"/></externalReferences>')
    assert parts.relate("xl/workbook.xml", "externalLink", "externalLinks/externalLink1.xml") == "rId4"
    parts.relate("xl/externalLinks/externalLink1.xml", "externalLinkPath", "other%20book.xlsx", outside=True)
    parts.add(
        "xl/externalLinks/externalLink1.xml",
        f'{DECLARATION}<externalLink xmlns="{MAIN}"><externalBook xmlns:r="{RELATIONSHIPS}" r:id="rId1"><sheetNames>'
        '<sheetName val="Rates"/></sheetNames></externalBook></externalLink>',
        SHEET_ML + "externalLink+xml",
    )
    return parts


def custom_xml_and_printer() -> Parts:
    parts = base()
    parts.defaults["bin"] = SHEET_ML + "printerSettings"
    parts.relate("xl/workbook.xml", "customXml", "../customXml/item1.xml")
    parts.add("customXml/item1.xml", '<job xmlns="urn:invented:job"><line>7</line></job>')
    parts.relate("xl/worksheets/sheet1.xml", "printerSettings", "../printerSettings/printerSettings1.bin")
    parts.add("xl/printerSettings/printerSettings1.bin", bytes(range(256)) * 4)
    parts.add("xl/worksheets/sheet1.xml", sheet(after='<pageSetup orientation="landscape" r:id="rId1"/>'))
    return parts


def signed() -> Parts:
    parts = base()
    signature = f"{RELATIONSHIPS.replace('officeDocument', 'package')}/digital-signature"
    parts.defaults["sigs"] = "application/vnd.openxmlformats-package.digital-signature-origin"
    parts.relate("", f"{signature}/origin", "_xmlsignatures/origin.sigs")
    parts.relate("_xmlsignatures/origin.sigs", f"{signature}/signature", "sig1.xml")
    parts.add("_xmlsignatures/origin.sigs", b"")
    kind = "application/vnd.openxmlformats-package.digital-signature-xmlsignature+xml"
    parts.add("_xmlsignatures/sig1.xml", '<Signature xmlns="http://www.w3.org/2000/09/xmldsig#"/>', kind)
    return parts


def old_macro_sheets() -> Parts:
    """A dialog sheet and a macro sheet between the worksheets, as workbooks from before 1997 carry along."""
    parts = base()
    macro = "http://schemas.microsoft.com/office/2006/relationships/xlMacrosheet"
    ids = [parts.relate("xl/workbook.xml", "dialogsheet", "dialogsheets/sheet1.xml")]
    ids.append(parts.relate("xl/workbook.xml", macro, "macrosheets/sheet1.xml"))
    parts.add("xl/dialogsheets/sheet1.xml", f'{DECLARATION}<dialogsheet xmlns="{MAIN}"/>', SHEET_ML + "dialogsheet+xml")
    parts.add(
        "xl/macrosheets/sheet1.xml",
        f'{DECLARATION}<xm:macrosheet xmlns="{MAIN}" xmlns:xm="{MICROSOFT}/excel/2006/main"><sheetData/>'
        "</xm:macrosheet>",
        "application/vnd.ms-excel.macrosheet+xml",
    )
    sheets = [("Data", "rId1"), ("Dialog1", ids[0]), ("Macro1", ids[1]), ("Notes", "rId2")]
    views = '<bookViews><workbookView activeTab="3" firstSheet="2"/></bookViews>'
    names = '<definedNames><definedName name="start" localSheetId="3">Notes!$A$1</definedName></definedNames>'
    parts.add("xl/workbook.xml", workbook(sheets, before=views, after=names))
    return parts


def two_windows() -> Parts:
    """Two windows, a custom view, protection, function groups: everything that may surround the list of sheets."""
    before = (
        '<fileSharing readOnlyRecommended="1"/><workbookPr codeName="Book" filterPrivacy="1"/>'
        '<workbookProtection lockStructure="1"/><bookViews><workbookView activeTab="0"/>'
        '<workbookView activeTab="1" firstSheet="1"/></bookViews>'
    )
    after = (
        '<functionGroups><functionGroup name="own"/></functionGroups><definedNames><definedName name="a" '
        'localSheetId="0">Data!$A$1</definedName><definedName name="a" localSheetId="1" hidden="1">Notes!$A$1'
        '</definedName></definedNames><calcPr calcMode="manual"/><oleSize ref="A1:B2"/><customWorkbookViews>'
        '<customWorkbookView name="mine" guid="{12345678-1234-4234-8234-123456789ABC}" windowWidth="800" '
        'windowHeight="600" activeSheetId="6"/></customWorkbookViews><fileRecoveryPr repairLoad="0"/>'
    )
    return base(before=before, after=after)


def shared_workbook() -> Parts:
    parts = base()
    parts.relate("xl/workbook.xml", "revisionHeaders", "revisions/revisionHeaders.xml")
    guid = "{ABCDEF01-2345-4678-89AB-CDEF01234567}"
    parts.add(
        "xl/revisions/revisionHeaders.xml",
        f'{DECLARATION}<headers xmlns="{MAIN}" xmlns:r="{RELATIONSHIPS}" guid="{guid}"><header guid="{guid}" '
        'dateTime="2024-01-01T00:00:00Z" maxSheetId="7" userName="invented" r:id="rId1"><sheetIdMap count="2">'
        '<sheetId val="3"/><sheetId val="6"/></sheetIdMap></header></headers>',
        SHEET_ML + "revisionHeaders+xml",
    )
    parts.relate("xl/revisions/revisionHeaders.xml", "revisionLog", "revisionLog1.xml")
    parts.add(
        "xl/revisions/revisionLog1.xml", f'{DECLARATION}<revisions xmlns="{MAIN}"/>', SHEET_ML + "revisionLog+xml"
    )
    return parts


def numbered_oddly() -> Parts:
    """Part numbers and relationship ids that the obvious next number would collide with."""
    parts = base()
    arrows = parts.arrows["xl/workbook.xml"]
    parts.arrows["xl/workbook.xml"] = [(id_.replace("rId3", "rId7"), *rest) for id_, *rest in arrows]
    parts.add("xl/worksheets/SHEET3.xml", sheet(), SHEET_ML + "worksheet+xml")
    parts.add("xl/charts/Chart1.xml", b"<left-over/>")
    parts.add("xl/drawings/drawing1.xml/", b"")
    return parts


def own_styles_with_gaps() -> Parts:
    """Number-format ids far apart, the Normal style in second place, unknown attributes on the lists."""
    styles = STYLES.replace("<fonts", '<numFmts count="1"><numFmt numFmtId="900" formatCode="0.0%"/></numFmts><fonts')
    xf = '<xf numFmtId="0" fontId="0" fillId="0" borderId="0"/>'
    styles = styles.replace('<cellStyleXfs count="1">' + xf, f'<cellStyleXfs count="2">{xf}{xf}')
    styles = styles.replace(
        "</styleSheet>",
        '<cellStyles count="2"><cellStyle name="Own" xfId="0"/><cellStyle name="Normal" xfId="1" builtinId="0"/>'
        '</cellStyles><tableStyles count="0"/><colors><mruColors><color rgb="FF112233"/></mruColors></colors>'
        "</styleSheet>",
    )
    return base(styles=styles)


_BUILDERS: list[Callable[[], Parts]] = [
    bare, scant_styles, one_fill, prefixed, absolute_targets, unusual_places, odd_spelling, default_type_is_sheet,
    newest_program, calculation_chain, pivot_and_slicer, threaded_comments, external_link, custom_xml_and_printer,
    signed, old_macro_sheets, two_windows, shared_workbook, numbered_oddly, own_styles_with_gaps,
]  # fmt: skip

BY_HAND: dict[str, Callable[[], bytes]] = {
    build.__name__.replace("_", " "): lambda build=build: zipped(build().files()) for build in _BUILDERS
}
