"""What is fuzzed: a target takes any bytes, and returns unless the program breaks its word.

Its word: a function of text refuses what it cannot read with the error its docstring names; a day is answered with
findings, each of which says what and where, whatever its files hold.
"""

from __future__ import annotations

import tempfile
from collections.abc import Callable, Iterable
from contextlib import suppress
from pathlib import Path

from tests.faults.day import GOOD, TABLES, workbook_of, write_day

import coulombook
from coulombook.findings import Severity
from coulombook.intake.text import UnreadableText, decode, guess_separator, lines_of, rows_below
from coulombook.species import load_species, parse_formula
from coulombook.units import DIMENSIONS, conversion, parse_head, parse_quantity, quantity_to_si

Target = Callable[[bytes], None]
_ROOM = Path("/dev/shm") if Path("/dev/shm").is_dir() else None


def text(data: bytes) -> None:
    """Bytes to lines and rows."""
    with suppress(UnreadableText):
        lines = lines_of(decode(data))
        if lines:
            rows_below(lines, 0, guess_separator(lines))


def heads(data: bytes) -> None:
    """Heads, units and quantities with units."""
    words = data.decode("utf-8", "replace")
    dimension = sorted(DIMENSIONS)[len(data) % len(DIMENSIONS)]
    for read in (
        lambda: parse_head(words),
        lambda: conversion(words, dimension),
        lambda: parse_quantity(words),
        lambda: quantity_to_si(words, dimension),
    ):
        with suppress(ValueError):  # which UnitError is one of
            read()


def names(data: bytes) -> None:
    """Names of species and formulas."""
    words = data.decode("utf-8", "replace")
    load_species().find(words)
    with suppress(ValueError):
        parse_formula(words)


def settings(data: bytes) -> None:
    """The file day.toml of a day."""
    _answer({"day.toml": data})


def calibration(data: bytes) -> None:
    """A calibration: its settings or its standards."""
    name = ("gases/calibration.toml", "gases/standards.csv", "liquids/standards.csv")[
        data[0] % 3 if data else 0
    ]
    _answer({f"calibrations/{name}": data[1:]})


def tables(data: bytes) -> None:
    """One table of a day as a text file."""
    name = TABLES[data[0] % len(TABLES)] if data else TABLES[0]
    _answer({f"{name}.csv": data[1:]})


def traces(data: bytes) -> None:
    """A potentiostat log, or a voltammogram."""
    name = "traces/a1.csv" if not data or data[0] % 2 else "scans/m1-40.csv"
    _answer({name: data[1:]})


def workbook(data: bytes) -> None:
    """The workbook of a day, damaged."""
    _answer({"day.xlsx": data, **{f"{name}.csv": None for name in TABLES}})


def cells(data: bytes) -> None:
    """The workbook of a day, whole, with any text in the cells of one of its sheets."""
    name = TABLES[data[0] % len(TABLES)] if data else TABLES[0]
    words = data[1:].decode("utf-8", "replace")
    # what no workbook can hold, its writer refuses
    words = "".join(one for one in words if one in "\n" or one.isprintable())
    sheets = {one: GOOD[f"{one}.csv"] for one in TABLES} | {name: words}
    with suppress(ValueError):  # a cell too long for a workbook
        _answer({"day.xlsx": workbook_of(sheets), **{f"{one}.csv": None for one in TABLES}})


TARGETS: dict[str, Target] = {
    one.__name__: one for one in (text, heads, names, settings, calibration, tables, traces, workbook, cells)
}


def seeds(name: str) -> Iterable[bytes]:
    """Inputs to begin with."""
    if name == "settings":
        return [GOOD["day.toml"].encode(), *_examples("day.toml")]
    if name == "calibration":
        return [bytes([0]) + GOOD["calibrations/gases/calibration.toml"].encode(),
                bytes([1]) + GOOD["calibrations/gases/standards.csv"].encode()]  # fmt: skip
    if name in ("tables", "cells"):
        return [bytes([place]) + GOOD[f"{one}.csv"].encode() for place, one in enumerate(TABLES)]
    if name == "traces":
        return [b"\1" + GOOD["traces/a1.csv"].encode(), b"\0" + GOOD["scans/m1-40.csv"].encode()]
    if name == "workbook":
        return [workbook_of({one: GOOD[f"{one}.csv"] for one in TABLES})]
    if name == "text":
        return [GOOD["gas.csv"].encode(), GOOD["gas.csv"].replace(",", ";").encode("utf-16"), b"a;b\r1,5;2\r"]
    if name == "heads":
        return [
            b"E / V",
            b"mole fraction / ppm",
            b"I (mA)",
            b"scan rate / mV s^-1",
            b"1.2e-3 umol",
            b"20 sccm",
            b"5 %",
        ]
    return [b"ethylene", b"C2H4", b"n-PrOH", b"CH3COO-", b"(CH3)2CO"]


def _examples(pattern: str) -> list[bytes]:
    root = Path(__file__).resolve().parents[2] / "example_experiments"
    return [path.read_bytes() for path in sorted(root.rglob(pattern))]


def _answer(changes: dict[str, bytes | None]) -> None:
    """Check a day of which some files are changed, and hold the answer to what was promised."""
    with tempfile.TemporaryDirectory(dir=_ROOM) as place:
        day = write_day(Path(place), changes)
        found = coulombook.check(day).findings
    for one in found:
        if one.severity is Severity.STOP:
            assert one.where, one
            assert one.text, one
            assert one.mend, one
