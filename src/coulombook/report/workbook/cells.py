"""A sheet as columns of cells, before it is written: what stands in a cell, what kind it is, where others find it.

Formulas are text that names cells; a sheet under construction tells the letter of every column it was given, so that
a formula names only columns that are there already.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from enum import Enum

from coulombook.book import Cell

HEAD_ROW = 4  # rows as the spreadsheet counts them
FIRST_ROW = 6  # of the records; between the two it says how each column is found
MOST_ROWS = 1_048_576 - FIRST_ROW  # records that a sheet can hold


class Kind(Enum):
    """What a cell is to the person who audits it; the value says so in words."""

    TEXT = "a name, or where something stands in the day's files"
    ENTERED = "entered: read from the day's files; change it and what follows from it changes"
    COMPUTED = "computed: found by the tally; stays as it is when other cells change"
    FORMULA = "formula: follows from cells of this workbook"


@dataclass(frozen=True, slots=True, eq=False)
class Column:
    """One column. ``u`` (standard uncertainties) decides how many digits are shown, not what is stored.

    A record without a value stays empty; in a column of formulas, one without a formula is a computed value.
    """

    head: str
    kind: Kind
    values: Sequence[Cell]
    how: str
    formulas: Sequence[str | None] | None = None
    u: Sequence[Cell] | None = None
    wide: bool = False  # long text, wrapped
    choices: tuple[str, ...] = ()  # what may be entered
    kinds: Sequence[Kind] | None = None  # of each record, where they differ
    exact: bool = False  # every digit is shown


@dataclass(slots=True, eq=False)
class Sheet:
    """A sheet under construction: ``rows`` records under the heads of its columns.

    ``frozen`` columns stay in sight; ``parted`` is the head of the column at whose changes a line is drawn.
    """

    name: str
    title: str
    about: str
    rows: int
    frozen: int = 1
    parted: str | None = None
    filtered: bool = False
    columns: list[Column] = field(default_factory=list)
    letters: dict[str, str] = field(default_factory=dict)
    names: dict[str, str] = field(default_factory=dict)  # defined names of single cells

    @property
    def lines(self) -> range:
        """Rows of the records, as the spreadsheet counts."""
        return range(FIRST_ROW, FIRST_ROW + self.rows)

    @property
    def next_letter(self) -> str:
        """Letter that the next column will have, for a column whose cells name each other."""
        return letters_of(len(self.columns))

    def __getitem__(self, head: str) -> str:
        """What stands before the row when another sheet names a cell of the column: ``gas!M``."""
        return f"{self.quoted}!{self.letters[head]}"

    @property
    def quoted(self) -> str:
        """The sheet's name as formulas write it."""
        return f"'{self.name}'" if " " in self.name else self.name

    def span(self, head: str, first: int, stop: int) -> str:
        """Cells of the records ``first`` to ``stop`` (excluded), as another sheet names them."""
        letter = self.letters[head]
        return f"{self.quoted}!{letter}{FIRST_ROW + first}:{letter}{FIRST_ROW + stop - 1}"

    def text(self, head: str, values: Iterable[Cell], how: str = "", *, wide: bool = False) -> str:
        """Add a column of text; its letter."""
        return self.add(Column(head, Kind.TEXT, list(values), how, wide=wide))

    def entered(
        self, head: str, values: Iterable[Cell], how: str = "", *, choices: tuple[str, ...] = ()
    ) -> str:
        """Add a column of what the files say; its letter."""
        return self.add(Column(head, Kind.ENTERED, _without_noise(values), how, choices=choices))

    def computed(
        self, head: str, values: Iterable[Cell], how: str = "", *, u: Sequence[Cell] | None = None
    ) -> str:
        """Add a column of values that no formula here follows; its letter."""
        return self.add(Column(head, Kind.COMPUTED, listed(values), how, u=u))

    def formula(
        self,
        head: str,
        formulas: Iterable[str | None],
        values: Iterable[Cell],
        how: str = "",
        *,
        u: Sequence[Cell] | None = None,
    ) -> str:
        """Add a column of formulas, each with the value it had when the day was tallied; its letter."""
        return self.add(Column(head, Kind.FORMULA, listed(values), how, list(formulas), u))

    def add(self, column: Column) -> str:
        """Add any column; its letter."""
        assert len(column.values) == self.rows, f"{self.name}, {column.head}"
        assert column.formulas is None or len(column.formulas) == self.rows, f"{self.name}, {column.head}"
        assert column.head not in self.letters, f"{self.name}, {column.head}"
        letter = letters_of(len(self.columns))
        self.letters[column.head] = letter
        self.columns.append(column)
        return letter


def letters_of(place: int) -> str:
    """Name of a column by its place, as the spreadsheet names it.

    >>> letters_of(0), letters_of(25), letters_of(26), letters_of(701), letters_of(702)
    ('A', 'Z', 'AA', 'ZZ', 'AAA')
    """
    name = ""
    place += 1
    while place:
        place, rest = divmod(place - 1, 26)
        name = chr(ord("A") + rest) + name
    return name


def listed(values: Iterable[Cell]) -> list[Cell]:
    """Plain cells; NaN is an absent value, and so is the infinite that a division by nothing leaves."""
    plain: list[Cell] = values.tolist() if hasattr(values, "tolist") else list(values)
    return [
        None if isinstance(one, float) and (one != one or one in (_INFINITE, -_INFINITE)) else one
        for one in plain
    ]


_INFINITE = float("inf")


def _without_noise(values: Iterable[Cell]) -> list[Cell]:
    """Readings as people typed them: what the change of unit did to the sixteenth digit is taken back."""
    return [float(f"{one:.15g}") if isinstance(one, float) else one for one in listed(values)]


def joined(sheet_and_column: str, rows: Sequence[int]) -> str:
    """Cells of one column in some records, listed for a function: ``gas!M6,gas!M9``."""
    return ",".join(f"{sheet_and_column}{FIRST_ROW + row}" for row in rows)


Sheets = Mapping[str, Sheet]
