"""How much of a file is read, and why: every limit of the readers in one place.

A limit keeps a damaged or hostile file from filling memory or an evening; each lies far above what a bench writes. What
goes beyond one is a fault that names the limit, never a guess.
"""

from __future__ import annotations

# --- text ---

FIRST_LOOK_BYTE = 65_536  # enough for the heads of nearly every log; more is read where they are not among it
LONGEST_PREAMBLE_BYTE = 4_194_304  # instruments that write their whole method above the heads stay well below
LONGEST_LINE = 65_536  # characters; a line of the bench's tables has some hundred
MOST_COLUMNS = 1_000  # of one table; the widest log of an instrument has some hundred
LARGEST_TABLE_BYTE = 100_000_000  # two million rows of a bench table; a larger file is not one
MOST_TABLE_ROWS = 500_000  # a day of 2,000 runs with 20 injections of 10 peaks each has 400,000
LARGEST_SETTINGS_BYTE = (
    1_000_000  # day.toml with an uncertainty and a species for everything has some ten thousand
)

# --- faults ---

MOST_ADVICE = 100  # faults of a kind that get the nearest known name, which takes milliseconds to look for

# --- logs ---

LARGEST_LOG_BYTE = 4_000_000_000  # 1e8 rows: a month of 40 readings a second
# row by row costs some 40 byte of memory and 3 us a reading (decision 19): a gigabyte and two minutes at this size
LARGEST_UNTIDY_LOG_BYTE = 1_000_000_000
MOST_WORDY_ROWS = (
    5_000  # remarks without a comment sign among the readings; each is looked at for heads and units
)
SHORTEST_STEP_SECOND = (
    1e-9  # no potentiostat takes a reading each nanosecond; shorter steps overflow their inverse
)
FARTHEST_START_SECOND = 86_400.0  # a log stamped more than a day from its run's `started` is another run's

# --- workbooks ---

LARGEST_UNPACKED_BYTE = 300_000_000  # pictures and all; ten times the text of a day of 50,000 peaks
LARGEST_MARKUP_BYTE = 120_000_000  # of cells and their texts; read as XML they take some ten seconds by then
LARGEST_SIDE_PART_BYTE = (
    16_000_000  # styles, names, themes: the styles of a workbook that has all it may have
)
MOST_TAGS = (
    8_000_000  # four to a cell: two million cells, some ten seconds and a gigabyte while they are read
)
MOST_SIDE_TAGS = 500_000  # a workbook with every one of its 65,490 cell formats in use has half of it
LONGEST_PROLOGUE_BYTE = 1_000_000  # comments above the XML of a part; spreadsheet programs write none
MOST_ROW_TAGS = (
    131_072  # eight to a cell of the widest row there is (16,384 cells), for a row is read as a whole
)
MOST_PARTS = 10_000  # a part a sheet, picture and chart
MOST_SHEETS = 500  # each is opened once, read or not
MOST_CELLS = 3_000_000  # of all tables, the blank ones of a row with them: a lone cell far out widens its row
MOST_SHEET_ROWS = 1_048_576  # of a sheet, as spreadsheet programs keep it
