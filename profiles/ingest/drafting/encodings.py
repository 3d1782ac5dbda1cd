"""In which encoding a text file is, told from its bytes."""

from __future__ import annotations

import codecs
import re
from dataclasses import dataclass, field

#: Byte order marks by what a layout calls the encoding; the longer marks first, as one begins with another.
_MARKS = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)
_NUL_SHARE = 0.2  # of the bytes at every second place; Latin text in UTF-16 has nearly all there (ours)
_FOREIGN = re.compile(rb"[\x80-\xff]")
_MULTIBYTE = re.compile(rb"[\xc2-\xdf][\x80-\xbf]|[\xe0-\xef][\x80-\xbf]{2}|[\xf0-\xf4][\x80-\xbf]{3}")
#: The degree sign before C, F or K, by encodings of one byte a character.
_DEGREES = ((b"\xb0", "latin-1"), (b"\xf8", "cp850"), (b"\xa1", "mac-roman"))
_UNITS = rb"[ ]?[CFK]\b"
_NOT_LATIN = re.compile(rb"[\x80-\x9f]")  # control codes in Latin-1, letters and signs in Windows-1252


def marked(head: bytes) -> str | None:
    """Return the encoding that a byte order mark or the places of the NUL bytes tell, or None."""
    for mark, name in _MARKS:
        if head.startswith(mark):
            return name
    even, odd = head[0::2], head[1::2]
    if odd.count(0) > _NUL_SHARE * len(head) and even.count(0) < odd.count(0) / 10:
        return "utf-16-le"
    if even.count(0) > _NUL_SHARE * len(head) and odd.count(0) < even.count(0) / 10:
        return "utf-16-be"
    return None


@dataclass
class Bytes:
    """Bytes beyond ASCII met so far: how many make characters of UTF-8, how many do not, and some of them."""

    characters: int = 0
    strays: int = 0
    met: list[bytes] = field(default_factory=list)

    def add(self, block: bytes) -> None:
        """Look over one block of whole lines."""
        if block.isascii():
            return
        found = _MULTIBYTE.findall(block)
        self.characters += len(found)
        self.strays += len(_FOREIGN.findall(block)) - sum(map(len, found))
        if len(self.met) < 16:
            self.met += [line for line in block.splitlines() if not line.isascii()][:64]

    def encoding(self) -> tuple[str, str | None]:
        """Return the encoding, and why one could be unsure of it, or None."""
        if self.strays <= self.characters:
            return "utf-8", f"{self.strays} bytes are not UTF-8" if self.strays else None
        met = b"\n".join(self.met)
        for sign, name in _DEGREES:
            if re.search(re.escape(sign) + _UNITS, met):
                return ("cp1252" if name == "latin-1" and _NOT_LATIN.search(met) else name), (
                    "it has no mark of its encoding; told by the degree sign"
                )
        return ("cp1252" if _NOT_LATIN.search(met) else "latin-1"), ("it has no mark of its encoding, and is not UTF-8")
