"""A file becomes a table: reading, kinds, bands, blanks, and counts."""

from engine.records.column import SMALL_COUNT, Coded, Column, Kind
from engine.records.reading import read_frame, read_table
from engine.records.table import Table

__all__ = ["SMALL_COUNT", "Coded", "Column", "Kind", "Table", "read_frame", "read_table"]
