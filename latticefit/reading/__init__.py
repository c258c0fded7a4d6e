"""Reading: measurement files and run sheets become records; every repair is listed, nothing is guessed in silence."""

from .measurement import read_measurement
from .options import parse_assignment, parse_bounds, parse_grid, parse_interval
from .sheets import read_sheet, write_sheet

__all__ = [
    "parse_assignment",
    "parse_bounds",
    "parse_grid",
    "parse_interval",
    "read_measurement",
    "read_sheet",
    "write_sheet",
]
