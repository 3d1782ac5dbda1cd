"""What text files have in common."""

from __future__ import annotations

import codecs
from typing import Annotated, Literal, Self

from pydantic import AfterValidator, Field, model_validator

from profiles.config import Count, Settings
from profiles.ingest.layout.parts import WHITESPACE
from profiles.ingest.layout.time import TimeSettings

Place = tuple[Count, Count]


def _known_encoding(name: str) -> str:
    try:
        "".encode(name)  # tells encodings of text from others, such as hex
        return "utf-8-sig" if codecs.lookup(name).name == "utf-8" else codecs.lookup(name).name
    except (LookupError, UnicodeError):
        raise ValueError(f"no such encoding: {name!r}; expected for example utf-8 or latin-1") from None


class TextLayout(Settings):
    """How lines are cut into cells, and what is no data."""

    delimiter: str = Field(",", description='one character, or "whitespace" for any run of blanks')
    fixed: dict[str, Place] = Field(
        default_factory=dict, description="or the first and last character of each column by its name, from 1"
    )
    comment: str = Field("", description="lines that begin with this are no data; empty for none")
    header_rows: Annotated[int, Field(strict=True, ge=0)] = Field(
        1, description="lines before the first data row, comment and blank lines not counted"
    )
    names_row: Count = Field(1, description="which of them holds the column names")
    names: tuple[str, ...] = Field((), description="column names where the file has none")
    encoding: Annotated[str, AfterValidator(_known_encoding)] = Field("utf-8", validate_default=True)
    member: str = Field("*", description="which file of a zip archive, as a pattern; one must fit")
    decimal: Literal[".", ","] = "."
    quoted: bool = Field(
        False, strict=True, description="numbers stand in quotes, so that delimiter and decimal may be the same"
    )
    missing: tuple[str, ...] = Field(("",), description="cells without a reading, compared as text and as number")
    ends_with_delimiter: bool = Field(False, strict=True, description="rows, not names, end with one delimiter more")
    trimmed: bool = Field(False, strict=True, description="fixed rows may end early, their last blanks cut away")
    time: TimeSettings

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        if self.delimiter != WHITESPACE and (len(self.delimiter) != 1 or self.delimiter in '"\r\n\x00'):
            raise ValueError(f'delimiter: expected one character or "{WHITESPACE}", found {self.delimiter!r}')
        if not self.delimiter.isascii():
            raise ValueError(f"delimiter: expected an ASCII character, found {self.delimiter!r}")
        if self.delimiter == self.decimal and not (self.fixed or self.quoted):
            raise ValueError(f"delimiter and decimal are the same: {self.decimal!r}")
        self._check_names()
        self._check_texts()
        return self

    def _check_texts(self) -> None:
        quality = getattr(self, "quality", None)
        headers = [getattr(self, key) for key in ("block", "record") if hasattr(self, key)]
        for text in [
            self.comment,
            *self.missing,
            *(header.begins for header in headers),
            *(quality.flags if quality else ()),
        ]:
            try:
                text.encode(self.encoding)
            except UnicodeError:
                raise ValueError(f"{text!r} cannot stand in a file that is written in {self.encoding}") from None

    def _check_names(self) -> None:
        for name, (first, last) in self.fixed.items():
            if first > last:
                raise ValueError(f"fixed: the column {name!r} ends before it begins: [{first}, {last}]")
        if self.fixed and self.names:
            raise ValueError("expected either fixed or names: fixed names the columns itself")
        if not (self.names or self.fixed) and self.needs_names_row and self.names_row > self.header_rows:
            raise ValueError("expected names_row among the header_rows, or the column names in names")

    @property
    def needs_names_row(self) -> bool:
        """Tell whether the column names stand in the header of the file."""
        return True
