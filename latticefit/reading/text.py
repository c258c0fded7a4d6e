"""From a path to lines of text: what is not readable text is refused here, in words."""

from __future__ import annotations

import hashlib
import re
import stat
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from ..errors import InputError
from .wording import shown_name

__all__ = ["MAX_BYTES", "TextFile", "load_text"]

MAX_BYTES: Final = 200_000_000
"""Largest file that is read; a measured heat capacity has never come near it."""

_CONTROL: Final = bytes(set(range(32)) - {9, 10, 12, 13, 26})
_SPREADSHEET_ENDINGS: Final = frozenset({".xlsx", ".xlsm", ".xls", ".ods"})


@dataclass(frozen=True)
class TextFile:
    """A text file: the name shown in messages, its resolved path, sha256 of its bytes, encoding and lines."""

    name: str
    path: str
    sha256: str
    encoding: str
    lines: list[str]
    notes: tuple[str, ...]


def load_text(path: Path, name: str) -> TextFile:
    """Read a UTF-8 text file, with or without byte order mark.

    Parameters
    ----------
    path : Path
        Where it is.
    name : str
        What the user called it.

    Raises
    ------
    InputError
        If it is missing, a directory, too large, empty, binary or in another encoding.
    """
    shown = shown_name(name)
    data = _bytes_of(path, shown)
    if not data.strip():
        raise InputError(f"{shown}: the file is empty")
    _refuse_binary(data, shown)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        byte = f"byte 0x{data[error.start]:02x}"
        raise InputError(f"{shown}: line {line}: {byte} is not UTF-8 text; save the file as UTF-8") from None
    notes: tuple[str, ...] = ()
    if path.suffix.lower() in _SPREADSHEET_ENDINGS:
        notes = (f"read as text, which it is, although its name ends in {path.suffix!r}",)
    return TextFile(
        name=name,
        path=str(path.resolve()),
        sha256=hashlib.sha256(data).hexdigest(),
        encoding="UTF-8 with BOM" if data.startswith(b"\xef\xbb\xbf") else "UTF-8",
        lines=re.split(r"\r\n|\n|\r", text),
        notes=notes,
    )


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
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise InputError(f"{shown}: is UTF-16 text; save the file as UTF-8")
    if data.startswith(b"PK\x03\x04"):
        raise InputError(f"{shown}: is a spreadsheet or an archive, not text; save the table as CSV")
    head = data[:65536]
    if b"\x00" in data or len(head) - len(head.translate(None, _CONTROL)) > len(head) // 10:
        raise InputError(f"{shown}: is a binary file, not text; save the table as CSV")
