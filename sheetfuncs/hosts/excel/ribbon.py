"""The ribbon tab: its buttons, what they say, and which VBA sub each one calls."""

from __future__ import annotations

from dataclasses import dataclass
from xml.sax.saxutils import quoteattr

NAMESPACE = "http://schemas.microsoft.com/office/2009/07/customui"
TAB_LABEL = "sheetfuncs"
GROUP_LABEL = "Regression in this workbook"


@dataclass(frozen=True)
class Button:
    """One button. image: the name of one of Office's own pictures (from memory); action: a sub of RibbonActions."""

    label: str
    image: str
    action: str
    key: str
    tip: str

    def xml(self) -> str:
        attributes = {
            "id": f"sheetfuncs{self.action}", "label": self.label, "imageMso": self.image, "size": "large",
            "onAction": self.action, "keytip": self.key, "screentip": self.label, "supertip": self.tip,
        }
        return f"<button {' '.join(f'{name}={quoteattr(text)}' for name, text in attributes.items())}/>"


BUTTONS = (
    Button(
        "Check the selection", "ErrorChecking", "OnCheckSelection", "C",
        "Tests what the regression on the selected columns rests on (the response first, then the predictors), and "
        "writes a diagnostics sheet right after this one. With one cell selected, the block around it is taken.",
    ),
    Button(
        "Check again", "Refresh", "OnCheckAgain", "A",
        "On a diagnostics sheet: makes its check again with the settings that stand there. Your decision record stays.",
    ),
    Button(
        "Why this value?", "FormulaEvaluate", "OnWhyThisValue", "W",
        "Says in a sentence why the selected cell with one of our functions shows an error, and which rows were left "
        "out.",
    ),
    Button(
        "Health", "Help", "OnHealth", "H",
        "Shows which Python and which versions are at work here, and what is wrong with them, if anything.",
    ),
)  # fmt: skip


def ribbon_xml() -> str:
    """The ribbon part of the add-in, for Office 2010 and newer ([MS-CUSTOMUI2])."""
    buttons = "\n          ".join(button.xml() for button in BUTTONS)
    return f"""<?xml version="1.0" encoding="UTF-8" standalone="yes"?>
<customUI xmlns="{NAMESPACE}">
  <ribbon>
    <tabs>
      <tab id="sheetfuncsTab" label={quoteattr(TAB_LABEL)} keytip="ZF">
        <group id="sheetfuncsGroup" label={quoteattr(GROUP_LABEL)}>
          {buttons}
        </group>
      </tab>
    </tabs>
  </ribbon>
</customUI>
"""
