"""Finished numbers in, pictures, tables and one page out (floor 4)."""
