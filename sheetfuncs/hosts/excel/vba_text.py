"""Pieces of VBA source: texts and lists as expressions that any system's editor reads alike.

The limits are Microsoft's, from memory: a line of at most 1,023 characters, at most 24 continuations of one statement,
a compiled procedure below 64 KB, help texts and each argument's description at most 255 characters.
"""

from __future__ import annotations

from collections.abc import Iterable

LONGEST_LINE = 1_023
MOST_CONTINUATIONS = 24
LONGEST_HELP = 255
# Words of the language that can name nothing else ([MS-VBAL] 3.3.5.2, from memory), in lower case.
_RESERVED_WORDS = """
abs addressof and any array as attribute boolean byref byte byval call case cbool cbyte ccur cdate cdbl cdec
cint circle clng clnglng clngptr close const csng cstr currency cvar cverr date debug decimal declare defbool
defbyte defcur defdate defdbl defint deflng defobj defsng defstr defvar dim do doevents double each else elseif
empty end enum eqv erase event exit false fix for friend function get global gosub goto if imp implements in
input inputb int integer is lbound len lenb let like line lock long longlong longptr loop lset me mid midb mod
new next not nothing null object on open option optional or paramarray preserve print private pset public put
raiseevent redim rem resume return rset scale seek select set sgn shared single spc static step stop string sub
tab then to true type typeof ubound unlock until variant wend while with withevents write xor
"""
RESERVED = frozenset(_RESERVED_WORDS.split())


def literal(text: str) -> str:
    """A text as an expression in plain letters only: `"n " & ChrW(8805) & " 2"`.

    The editor reads a source by the code page of the system that it runs on, so other letters would change there.
    """
    parts, plain = [], ""
    for letter in text:
        if " " <= letter <= "~":
            plain += '""' if letter == '"' else letter
        else:
            parts += [f'"{plain}"', f"ChrW({ord(letter)})"] if plain else [f"ChrW({ord(letter)})"]
            plain = ""
    return " & ".join([*parts, f'"{plain}"'] if plain or not parts else parts)


def identifier(name: str) -> str:
    """A name for an argument: itself, or "which_" before a word that the language keeps for itself."""
    return f"which_{name}" if name.lower() in RESERVED else name


def in_lines(opening: str, pieces: Iterable[str], closing: str) -> str:
    """One statement with each piece on a line of its own: `opening`, the pieces with commas between, `closing`."""
    return f"{opening} _\n        " + ", _\n        ".join(pieces) + closing
