"""Text that reads as a number: the usual reason why a column of numbers cannot be used."""

from __future__ import annotations

import re

# Points, commas, apostrophes and the spaces that separate thousands; either convention, so 1,234.5 and 1.234,5.
_SPACES = " \t\r\n\u00a0\u2007\u2009\u202f"
_DIGITS = rf"\d+(?:[.,'’{_SPACES}]\d{{2,3}})*(?:[.,]\d*)?|[.,]\d+"
_EXPONENT = r"(?:[eE][+\-−]?\d{1,3})?"
_CURRENCY = r"[$€£¥]?"
_NUMBER = re.compile(
    rf"['’]?[{_SPACES}]*\(?[+\-−]?[{_SPACES}]*{_CURRENCY}[{_SPACES}]*[+\-−]?(?:{_DIGITS}){_EXPONENT}"
    rf"[{_SPACES}]*(?:[%‰]|{_CURRENCY})[{_SPACES}]*[-−]?\)?[{_SPACES}]*"
)


def reads_as_number(text: str) -> bool:
    """Whether people would read the text as a number: "1,234.5", "1.234,5", "12 %", " 3 ", "1e3", "(12)", "'7"."""
    return len(text) <= 60 and _NUMBER.fullmatch(text) is not None


def on_one_line(text: str) -> str:
    """The text with single spaces in place of line breaks and of anything that cannot be printed."""
    return " ".join("".join(character if character.isprintable() else " " for character in text).split())


def shown(text: str, longest: int = 40) -> str:
    """A cell's text in quotes for a sentence, on one line and not too long."""
    text = "".join(character if character.isprintable() else " " for character in text)
    return f"“{text if len(text) <= longest else text[: longest - 3] + '...'}”"
