"""How much of a spreadsheet is read: a small file must not unfold until it fills the memory."""

from __future__ import annotations

from typing import Final

from ..errors import InputError

__all__ = ["MAX_CELLS", "MAX_CELL_LENGTH", "MAX_SHEET_BYTES", "MAX_SHEET_COLUMNS", "SheetSize"]

MAX_SHEET_COLUMNS: Final = 1000
MAX_CELLS: Final = 2_000_000
MAX_CELL_LENGTH: Final = 32_767
"""Characters of one cell; as many as common spreadsheets let a person enter (common practice, no source)."""
MAX_SHEET_BYTES: Final = 50_000_000


class SheetSize:
    """What has been read of all sheets of one file so far.

    Each method raises `InputError` where a limit is passed; they are called before anything is repeated.
    """

    def __init__(self, shown: str) -> None:
        self._shown = shown
        self._cells = self._bytes = 0

    def check_cell(self, row: int, length: int) -> None:
        """Refuse a cell of too many characters; `row` is its 1-based number."""
        if length > MAX_CELL_LENGTH:
            signs = f"a cell of {length} characters, more than the {MAX_CELL_LENGTH} that are read"
            raise InputError(f"{self._shown}: row {row} has {signs}; shorten it, or save the table as CSV")

    def check_columns(self, row: int, columns: int) -> None:
        """Refuse a row of too many columns."""
        if columns > MAX_SHEET_COLUMNS:
            raise InputError(f"{self._shown}: row {row} has more than the {MAX_SHEET_COLUMNS} columns that are read")

    def add_empty(self, rows: int) -> None:
        """Count empty rows, each as one cell."""
        self._add(rows, 0)

    def add_row(self, texts: list[str], repeated: int = 1) -> None:
        """Count a row that stands there `repeated` times."""
        # Python keeps up to four bytes a character in a text that is not ASCII
        size = sum(len(text) if text.isascii() else 4 * len(text) for text in texts)
        self._add(len(texts) * repeated, size * repeated)

    def _add(self, cells: int, size: int) -> None:
        self._cells += cells
        self._bytes += size
        if self._cells > MAX_CELLS:
            raise InputError(f"{self._shown}: has more than the {MAX_CELLS} cells that are read; save the table as CSV")
        if self._bytes > MAX_SHEET_BYTES:
            raise InputError(
                f"{self._shown}: its cells hold more than the {MAX_SHEET_BYTES / 1e6:.0f} MB of text that are read; "
                "save the table as CSV"
            )
