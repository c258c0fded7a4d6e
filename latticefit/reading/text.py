"""From a path to lines of text: what is not readable text is refused here, in words."""

from __future__ import annotations

import hashlib
import re
import stat
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from ..errors import InputError
from .spreadsheet import spreadsheet_lines
from .wording import quoted, shown_name

__all__ = ["MAX_BYTES", "MAX_LINES", "TextFile", "load_text"]

MAX_BYTES: Final = 200_000_000
"""Largest file that is read; a measured heat capacity has never come near it."""

MAX_LINES: Final = 1_000_000
MAX_LINE_LENGTH: Final = 100_000
_CONTROL: Final = bytes(set(range(32)) - {9, 10, 12, 13, 26})
_SPREADSHEET_ENDINGS: Final = frozenset({".xlsx", ".xlsm", ".xls", ".ods"})


@dataclass(frozen=True)
class TextFile:
    """A text file: the name shown in messages, its resolved path, sha256 of its bytes, encoding and lines.

    `delimiter` is that of the table where the kind of file settles it, as a spreadsheet does; else it is found.
    `worksheet` is the name of the one that was read, None where there is no other.
    """

    name: str
    path: str
    sha256: str
    encoding: str
    lines: list[str]
    notes: tuple[str, ...]
    delimiter: str | None = None
    worksheet: str | None = None

    @property
    def last_line(self) -> int:
        """The number of lines; what follows the last end of a line is none."""
        return len(self.lines) - (not self.lines[-1])


def load_text(path: Path, name: str, worksheet: str | None = None) -> TextFile:
    """Read a file of text, or the table of a spreadsheet as lines of text.

    UTF-8 with or without byte order mark and UTF-16 with one are read as they are. Other bytes are taken as the 8-bit
    code page cp1252, which holds all printing signs of latin-1 in their places; that is noted.

    Parameters
    ----------
    path : Path
        Where it is.
    name : str
        What the user called it.
    worksheet : str, optional
        Name or 1-based number of the sheet of a spreadsheet; the only one that holds a table when left out.

    Raises
    ------
    InputError
        If it is missing, a directory, too large, empty, binary or in another encoding.
    """
    shown = shown_name(name)
    data = _bytes_of(path, shown)
    if not data.strip():
        raise InputError(f"{shown}: the file is empty")
    delimiter, title = None, None
    if data.startswith(b"PK\x03\x04"):
        lines, notes, title = spreadsheet_lines(data, shown, worksheet)
        encoding, delimiter = "spreadsheet", "tab"
    elif worksheet is not None:
        raise InputError(f"{shown}: is a text file and has no worksheet {quoted(worksheet)}; leave --worksheet out")
    else:
        text, encoding, notes = _decoded(data, shown)
        lines = _lines_of(text, shown)
        if path.suffix.lower() in _SPREADSHEET_ENDINGS:
            notes = (*notes, f"read as text, which it is, although its name ends in {path.suffix!r}")
    sha256 = hashlib.sha256(data).hexdigest()
    return TextFile(name, str(path.resolve()), sha256, encoding, lines, notes, delimiter, title)


def _lines_of(text: str, shown: str) -> list[str]:
    number = max(text.count("\n"), text.count("\r"))
    if number > MAX_LINES:
        raise InputError(f"{shown}: has {number} lines, more than the {MAX_LINES} that are read; thin it out")
    lines = re.split(r"\r\n|\n|\r", text)
    longest = max(range(len(lines)), key=lambda i: len(lines[i]))
    if len(lines[longest]) > MAX_LINE_LENGTH:
        signs = f"{len(lines[longest])} characters, more than the {MAX_LINE_LENGTH} that are read"
        raise InputError(f"{shown}: line {longest + 1} has {signs}; keep the columns that are needed")
    return lines


def _decoded(data: bytes, shown: str) -> tuple[str, str, tuple[str, ...]]:
    """Return the text, the name of its encoding, and what is to be noted."""
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        try:
            text = data.decode("utf-16")
        except UnicodeDecodeError as error:
            raise InputError(
                f"{shown}: is UTF-16 text, damaged at byte {error.start + 1}; save it once more as UTF-8"
            ) from None
        _refuse_binary(text.encode("utf-8", "replace"), shown)
        if not text.strip():
            raise InputError(f"{shown}: the file is empty")
        return text, "UTF-16 with BOM", ()
    _refuse_binary(data, shown)
    bom = data.startswith(b"\xef\xbb\xbf")
    try:
        return data.decode("utf-8-sig"), "UTF-8 with BOM" if bom else "UTF-8", ()
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        byte = f"byte 0x{data[error.start]:02x}"
        # signs of several bytes before the bad one show that the rest is UTF-8 and this byte is damage
        if bom or not data[: error.start].isascii():
            raise InputError(f"{shown}: line {line}: {byte} is not UTF-8 text; save the file as UTF-8") from None
    try:
        text = data.decode("cp1252")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        byte = f"byte 0x{data[error.start]:02x}"
        raise InputError(
            f"{shown}: line {line}: {byte} is neither UTF-8 nor cp1252 text; save the file as UTF-8"
        ) from None
    signs = "".join(dict.fromkeys(sign for sign in text if not sign.isascii()))
    note = f"not UTF-8; read as the 8-bit code page cp1252, with {quoted(signs)} beyond ASCII, the first in line {line}"
    return text, "cp1252", (note,)


def _bytes_of(path: Path, shown: str) -> bytes:
    try:
        status = path.stat()
    except (OSError, ValueError) as error:
        raise _not_opened(error, shown) from None
    if stat.S_ISDIR(status.st_mode):
        raise InputError(f"{shown}: is a folder, not a file")
    if not stat.S_ISREG(status.st_mode):
        raise InputError(f"{shown}: is not a regular file; save the data to one")
    if status.st_size > MAX_BYTES:
        size = f"{status.st_size / 1e6:.0f} MB"
        raise InputError(f"{shown}: {size} is more than the {MAX_BYTES / 1e6:.0f} MB that are read; thin it out")
    try:
        with path.open("rb") as stream:
            return stream.read(MAX_BYTES)
    except OSError as error:
        raise _not_opened(error, shown) from None


def _not_opened(error: OSError | ValueError, shown: str) -> InputError:
    if isinstance(error, FileNotFoundError):
        return InputError(f"{shown}: there is no such file")
    if isinstance(error, PermissionError):
        return InputError(f"{shown}: the file may not be read; check its permissions")
    # a loop of links, a name too long, a NUL in the name
    reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
    return InputError(f"{shown}: the file cannot be opened ({reason})")


def _refuse_binary(data: bytes, shown: str) -> None:
    if data.startswith(b"\xd0\xcf\x11\xe0"):
        raise InputError(
            f"{shown}: is an old binary spreadsheet or document, or one with a password; save the table as .xlsx or CSV"
        )
    head = data[:65536]
    if b"\x00" in data or len(head) - len(head.translate(None, _CONTROL)) > len(head) // 10:
        raise InputError(f"{shown}: is a binary file, not text; save the table as CSV")
