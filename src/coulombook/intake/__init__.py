"""Room: intake. Files become typed records; file, sheet, row and column are kept for every value."""
