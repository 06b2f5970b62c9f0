"""Room: comparison. The order of a comparison of days: their books, one under another, to the tables of a verdict."""
