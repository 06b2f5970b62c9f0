"""The body of a tidy log, read by the fastest reader at hand; what is no plain number is left to the patient one."""

from __future__ import annotations

import re
import sys
from pathlib import Path
from typing import Any

import numpy as np

from coulombook.balance.readings import FloatArray
from coulombook.intake.layout import Layout
from coulombook.units import LARGEST_NUMBER

# Without pandas at hand, its import is paid back by its speed from about this size on: measured, numpy takes three to
# four times as long for a megabyte, and the import as long as 100 MB with pandas or 30 MB with numpy.
PANDAS_PAYS_BYTE = 50_000_000
_LARGEST_WITH_NUMPY_BYTE = 200_000_000  # its texts take some ten times the file in memory

_LINE_END = re.compile(r"\r\n|\n|\r")


def read_fast(path: Path, size: int, all_byte: int, layout: Layout) -> dict[str, FloatArray] | None:
    """The columns as written, by quantity; None when the patient reader must look.

    ``all_byte`` is the size of all files that will be read, for the choice of the reader.
    """
    if layout.careful:
        return None
    # a text in UTF-16 must be decoded in any case, which is what pandas would save
    pays = "pandas" in sys.modules or all_byte >= PANDAS_PAYS_BYTE
    by_pandas = pays and layout.encoding == "utf-8" and not layout.lone_returns
    if not by_pandas and size > _LARGEST_WITH_NUMPY_BYTE:
        return None
    try:
        values = with_pandas(path, layout) if by_pandas else with_numpy(path, layout)
    except (ValueError, OverflowError, IndexError):
        return None
    arrays = list(values.values())
    # too few rows are the patient reader's to judge, and so is anything that is no finite number
    if not arrays[0].size:
        return None
    # the extremes of an array with a NaN are NaN, and no comparison with it holds
    if not all(array.min() >= -LARGEST_NUMBER and array.max() <= LARGEST_NUMBER for array in arrays):
        return None
    return values


def with_pandas(path: Path, layout: Layout) -> dict[str, FloatArray]:
    """The columns by pandas; ValueError for whatever is no number."""
    import pandas as pd

    places = sorted(layout.columns.values())
    # picking columns costs as much as reading one; a file of nothing else needs no picking
    pick = None if places == list(range(layout.width)) else places
    # skipping rows costs a look-up at every row below, a quarter of the time; heads do not, but pandas takes the first
    # column for an index unless told otherwise, and heads that are fewer than the cells for a mistake
    start: dict[str, Any] = {"header": layout.above, "index_col": False}
    if len(layout.units if layout.units_row else layout.heads) < layout.width:
        start = {"header": None, "skiprows": layout.body_row}
    # a path with UTF-8 is three times as fast as any other way; numbers are ASCII, whatever the free text is
    frame = pd.read_csv(
        path,
        sep=layout.separator,
        decimal=layout.decimal,
        **start,
        usecols=pick,
        dtype=np.float64,
        engine="c",
        na_filter=False,
        quoting=0 if layout.quotes else 3,
        encoding="utf-8",
        encoding_errors="replace",
    )
    return {
        quantity: np.array(frame.iloc[:, places.index(place)].to_numpy(), dtype=np.float64)
        for quantity, place in layout.columns.items()
    }


def with_numpy(path: Path, layout: Layout) -> dict[str, FloatArray]:
    """The columns by numpy; ValueError for whatever is no number."""
    # surrogates keep bytes that are no text from becoming anything a number could hold
    body = path.read_bytes().decode(layout.encoding, "surrogateescape")
    if "\0" in body:
        raise ValueError("binary data")
    start = 0
    for _ in range(layout.body_row):
        end = _LINE_END.search(body, start)
        if end is None:
            raise ValueError("no rows")
        start = end.end()
    body = body[start:]
    if layout.decimal == ",":
        if "." in body or layout.separator == ",":
            raise ValueError("two decimal signs")
        body = body.replace(",", ".")
    if "\r" in body:
        body = body.replace("\r\n", "\n").replace("\r", "\n")
    if not body.strip():
        raise ValueError("no rows")
    lines = [line for line in body.split("\n") if line.strip()]
    # loadtxt picks its columns and is blind to extra cells; rows of one width are what the heads promise
    if not layout.quotes and body.count(layout.separator) != len(lines) * lines[0].count(layout.separator):
        raise ValueError("rows of several widths")
    table = np.loadtxt(
        lines,
        delimiter=layout.separator,
        comments=None,
        usecols=list(layout.columns.values()),
        quotechar='"' if layout.quotes else None,
        ndmin=2,
    )
    return {quantity: np.ascontiguousarray(table[:, place]) for place, quantity in enumerate(layout.columns)}
