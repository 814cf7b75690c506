"""The ribbon: well-formed, in the namespace of Office 2010, pictures and limits as Office has them (from memory)."""

from __future__ import annotations

from lxml import etree

from sheetfuncs.hosts.excel.ribbon import BUTTONS, NAMESPACE, ribbon_xml

# Names of Office's built-in pictures, from memory; another name would leave a button without a picture.
KNOWN_IMAGES = {"ErrorChecking", "Refresh", "FormulaEvaluate", "Help"}
ALLOWED = {  # [MS-CUSTOMUI2], from memory, as far as it is used here
    "customUI": ({"ribbon"}, set()),
    "ribbon": ({"tabs"}, set()),
    "tabs": ({"tab"}, set()),
    "tab": ({"group"}, {"id", "label", "keytip"}),
    "group": ({"button"}, {"id", "label"}),
    "button": (set(), {"id", "label", "imageMso", "size", "onAction", "keytip", "screentip", "supertip"}),
}


def elements():
    return list(etree.fromstring(ribbon_xml().encode()).iter())


def test_only_known_elements_and_attributes_stand_where_they_may():
    for element in elements():
        name = etree.QName(element)
        assert name.namespace == NAMESPACE == "http://schemas.microsoft.com/office/2009/07/customui"
        children, attributes = ALLOWED[name.localname]
        assert {etree.QName(child).localname for child in element} <= children
        assert set(element.attrib) <= attributes


def test_ids_keys_and_labels_are_each_there_once():
    for attribute in ("id", "keytip", "label", "onAction"):
        found = [element.get(attribute) for element in elements() if element.get(attribute)]
        assert len(set(found)) == len(found)
        assert attribute != "keytip" or all(key.isalnum() and key.isupper() and len(key) <= 3 for key in found)


def test_the_four_buttons_say_what_they_do():
    assert [button.label for button in BUTTONS] == ["Check the selection", "Check again", "Why this value?", "Health"]
    assert all(len(text) <= 1_024 for button in BUTTONS for text in (button.label, button.tip))


def test_pictures_are_offices_own():
    assert {button.image for button in BUTTONS} <= KNOWN_IMAGES
