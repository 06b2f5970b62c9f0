"""TOML settings with the line of every key kept, so that a fault can name its row."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import date, datetime
from pathlib import Path
from typing import Any

from coulombook.findings import Findings, Origin
from coulombook.intake.files import Folder, did_you_mean, read_bytes
from coulombook.intake.limits import LARGEST_SETTINGS_BYTE
from coulombook.intake.tables import quoted
from coulombook.units import UnitError, is_of_ordinary_size, parse_quantity, quantity_to_si

_HEADER = re.compile(r"\s*(\[\[?)\s*(.+?)\s*\]\]?\s*(#.*)?$")
_KEY = re.compile(r"""\s*("[^"]*"|'[^']*'|[\w.\-]+)\s*=""")
_KIND = {str: "text", bool: "true or false", int: "a whole number", float: "a number", list: "a list", dict: "a table",
         date: "a date", datetime: "a date-time"}  # fmt: skip


def fold(key: str) -> str:
    """A key without regard to case, runs of blanks, or underscores for blanks."""
    return " ".join(key.replace("_", " ").split()).casefold()


@dataclass(frozen=True, slots=True, eq=False)
class Settings:
    """A settings file: its content and where each key stands.

    ``rows`` maps (section as written, key as written) to a row; the n-th [[section]] is called ``section#n``.
    """

    file: str
    content: Mapping[str, Any]
    rows: Mapping[tuple[str, str], int]

    def origin(self, section: str, key: str = "") -> Origin:
        """The row of a key, or of its section when the key is not found as written."""
        return Origin(self.file, None, self.rows.get((section, key), self.rows.get((section, ""))))

    def where(self, section: str, key: str = "") -> str:
        """The place of a key, for a message."""
        parts = [str(self.origin(section, key))]
        if section:
            parts.append(f"[{section.partition('#')[0]}]")
        if key:
            parts.append(f"key '{key}'")
        return ", ".join(parts)


def read_settings(
    folder: Folder, path: Path, findings: Findings, mend: str = "add the file"
) -> Settings | None:
    """A TOML file, or None after a fault; ``mend`` says what would do where it is not there."""
    data = read_bytes(folder, path, LARGEST_SETTINGS_BYTE, findings, mend)
    if data is None:
        return None
    name = folder.name_of(path)
    try:
        text = data.decode("utf-8-sig")
        content = tomllib.loads(text)
    except UnicodeDecodeError:
        _broken(findings, name, "bytes that are no UTF-8", "save the file as UTF-8 text")
        return None
    except tomllib.TOMLDecodeError as error:
        message = str(error)
        place = re.search(r"\(at line (\d+), column \d+\)", message)
        row = int(place[1]) if place else None
        line = (
            quoted(text.splitlines()[row - 1].strip()) + ": " if row and row <= len(text.splitlines()) else ""
        )
        _broken(
            findings,
            Origin(name, None, row),
            f"{line}{re.sub(r' *[(]at .*[)]', '', message[:1].lower() + message[1:])}",
            "correct the line; text stands in quotes, a key with blanks too, and a date is written 2043-05-18",
        )
        return None
    except ValueError as error:  # Python turns a number of thousands of digits away
        _broken(findings, name, f"{error!s:.60}", "correct the number that is too long to be one")
        return None
    except RecursionError:
        _broken(findings, name, "brackets nested too deeply", "write the settings as the how-to shows")
        return None
    return Settings(name, content, _rows_of(text))


def _broken(findings: Findings, where: object, found: str, mend: str) -> None:
    findings.add(
        "broken-settings", where, "the settings are not valid TOML", mend, found=found, expected="TOML"
    )


def _rows_of(text: str) -> dict[tuple[str, str], int]:
    rows: dict[tuple[str, str], int] = {}
    counts: dict[str, int] = {}
    section = ""
    for number, line in enumerate(text.splitlines(), 1):
        header = _HEADER.match(line)
        key = _KEY.match(line)
        if header and not key:
            section = re.sub(r"""\s*\.\s*|["']""", lambda part: "." if "." in part[0] else "", header[2])
            if header[1] == "[[":
                counts[section] = counts.get(section, 0) + 1
                section = f"{section}#{counts[section]}"
            rows.setdefault((section, ""), number)
        elif key:
            rows.setdefault((section, key[1].strip("\"'")), number)
    return rows


class Section:
    """One section of settings, read key by key; what nobody asked for is an unknown key at the end.

    Keys match without regard to case, and with underscore or blank.
    """

    def __init__(self, settings: Settings, name: str, content: Mapping[str, Any], findings: Findings) -> None:
        self.settings = settings
        self.name = name
        self.content = content
        self.findings = findings
        self._written: dict[str, str] = {}
        for key in self.content:
            if fold(key) in self._written:
                self.findings.add(
                    "duplicate",
                    self.settings.where(self.name, key),
                    "the key is given twice in different spellings",
                    "delete one of them",
                    found=f"'{self._written[fold(key)]}' and '{key}'",
                    expected="the key once",
                )
            self._written[fold(key)] = key
        self._asked: list[str] = []

    def has(self, key: str) -> bool:
        """Whether a key is given."""
        return fold(key) in self._written

    def where(self, key: str = "") -> str:
        """The place of a key, for a message."""
        return self.settings.where(self.name, self._written.get(fold(key), key))

    def origin(self, key: str = "") -> Origin:
        """The row of a key."""
        return self.settings.origin(self.name, self._written.get(fold(key), key))

    def value(self, key: str) -> Any:
        """The value of a key, whatever its type; None when it is not given."""
        self._asked.append(key)
        written = self._written.get(fold(key))
        return None if written is None else self.content[written]

    def typed(self, key: str, kind: type[Any], expected: str) -> Any:
        """The value of a key when it has the type asked for, else None with a fault."""
        value = self.value(key)
        if value is None:
            return None
        if kind is float and isinstance(value, int) and not isinstance(value, bool):
            return float(value)
        if not isinstance(value, kind) or (isinstance(value, bool) and kind is not bool):
            self.fault("not-allowed", key, "the value has the wrong type", value, expected)
            return None
        return value

    def text(self, key: str, expected: str = "text in quotes") -> str | None:
        """A text."""
        value = self.typed(key, str, expected)
        return None if value is None else str(value)

    def texts(self, key: str, expected: str = "a list of texts") -> tuple[str, ...] | None:
        """A list of texts."""
        value = self.typed(key, list, expected)
        if value is None:
            return None
        if not all(isinstance(one, str) for one in value):
            self.fault("not-allowed", key, "the value has the wrong type", value, expected)
            return None
        return tuple(value)

    def choice(self, key: str, choices: Sequence[str]) -> str | None:
        """One of several words, without regard to case."""
        expected = " or ".join(f"'{one}'" for one in choices)
        value = self.text(key, expected)
        if value is None:
            return None
        for one in choices:
            if one.casefold() == " ".join(value.split()).casefold():
                return one
        self.fault(
            "not-allowed",
            key,
            "the value is none of those known",
            value,
            expected,
            did_you_mean(value, choices),
        )
        return None

    def quantity(self, key: str, dimension: str, example: str) -> float | None:
        """A quantity written with its unit, in SI."""
        expected = f"a number with its unit in quotes, such as '{example}'"
        value = self.text(key, expected)
        if value is None:
            return None
        try:
            return quantity_to_si(value, dimension)
        except UnitError as error:
            self.unit_fault(key, value, error)
        except ValueError:
            self.fault("not-a-number", key, "the value must be a number with its unit", value, expected)
        return None

    def share(self, key: str, expected: str) -> float | None:
        """A fraction from 0 to 1: a plain number, or a text with a unit such as %."""
        value = self.value(key)
        if value is None:
            return None
        number: float | None = None
        if isinstance(value, str):
            try:
                number = quantity_to_si(value, "fraction")
            except UnitError as error:
                self.unit_fault(key, value, error)
                return None
            except ValueError:
                pass
        elif isinstance(value, int | float) and not isinstance(value, bool):
            number = float(value)
        if number is None or not (0 <= number <= 1 and is_of_ordinary_size(number)):
            self.fault("not-allowed", key, "the value is not possible", value, expected)
            return None
        return number

    def fault(self, kind: str, key: str, text: str, value: object, expected: str, more: str = "") -> None:
        """Note a fault of a key."""
        self.findings.add(
            kind, self.where(key), text, f"correct the value{more}", found=shown(value), expected=expected
        )

    def unit_fault(self, key: str, value: str, error: UnitError) -> None:
        """Note a fault of the unit of a key."""
        hint = f"; did you mean '{error.suggestion}'?" if error.suggestion else ""
        unit = parse_quantity(value).unit
        missing = not unit and error.kind != "unknown-unit"
        self.findings.add(
            "unknown-unit" if missing else error.kind,
            self.where(key),
            "the value has no unit"
            if missing
            else "the unit is not known"
            if error.kind == "unknown-unit"
            else "the unit measures something else",
            f"correct the unit{hint}",
            found=quoted(value),
            expected=error.expected,
        )

    def report_unknown(self) -> None:
        """Fault every key that nobody asked for, with the nearest known one."""
        known = {fold(key): key for key in self._asked}
        for folded, written in self._written.items():
            if folded not in known:
                unused = [key for key in self._asked if not self.has(key)]
                self.findings.add(
                    "unknown-key",
                    self.settings.where(self.name, written),
                    "the key is not known",
                    f"correct or delete the key{did_you_mean(written.replace('_', ' '), unused)}",
                    found=f"'{written}'",
                    expected=", ".join(self._asked),
                )


def shown(value: object) -> str:
    """A value of a settings file for a message."""
    if isinstance(value, str):
        return quoted(value)
    kind = _KIND.get(type(value))
    return f"{value!s:.60} ({kind})" if kind and not isinstance(value, dict | list) else kind or str(value)


def section(settings: Settings, name: str, findings: Findings) -> Section:
    """A section by its folded name; empty when it is not there, with a fault when it is no section."""
    for written, content in settings.content.items():
        if fold(written) == fold(name):
            if isinstance(content, dict):
                return Section(settings, written, content, findings)
            findings.add(
                "not-allowed",
                settings.where("", written),
                "the name is that of a section",
                f"write it as a section: [{name}] and its keys below",
                found=shown(content),
                expected=f"a section [{name}]",
            )
    return Section(settings, name, {}, findings)
