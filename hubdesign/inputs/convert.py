"""One cell -> one value, strictly: what is not plainly right is refused with words.

float() would take 1_000, Infinity, nan and Arabic digits, so numbers must match a pattern first.
"""

from __future__ import annotations

import datetime
import re
from collections.abc import Callable
from dataclasses import dataclass

from hubdesign.checks.findings import nearest
from hubdesign.inputs.raw import Cell, is_blank, shown
from hubdesign.schema import Column, Setting, Value

_POINT = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]{1,4})?")
_COMMA = re.compile(r"[+-]?(?:[0-9]+,[0-9]*|,[0-9]+)(?:[eE][+-]?[0-9]{1,4})?")
_LIKE_THOUSANDS = re.compile(r"[+-]?[1-9][0-9]{0,2}[.,][0-9]{3}")
_ERROR_VALUES = ("#DIV/0!", "#N/A", "#NAME?", "#NULL!", "#NUM!", "#REF!", "#VALUE!")
_WORDS_FOR_NO_NUMBER = ("nan", "inf", "infinity", "none", "null", "n/a", "na", "-", "?")

#: Larger figures than this are a slip (or a unit) rather than data, and would ruin the arithmetic.
LARGEST = 1e15
_LONGEST_CODE = 32
_LONGEST_TEXT = 1000
_LONGEST_NUMBER = 400
_QUOTES = "\"'`\u2018\u2019\u201a\u201c\u201d\u201e\u00ab\u00bb\u2039\u203a"
_NOT_IN_CODES = "/\\,;|" + _QUOTES
_CHARACTER_NAMES = {" ": "a blank", "\u00a0": "a no-break blank", "/": "a slash", "\\": "a backslash"}


class BadCell(Exception):
    """A cell that cannot be read: `what` is wrong with it and a `cure`."""

    def __init__(self, what: str, cure: str = "") -> None:
        self.what, self.cure = what, cure
        super().__init__(what)


@dataclass
class Decimals:
    """What a file's numbers look like; one per file.

    Attributes
    ----------
    comma_allowed
        Whether a decimal comma is read.
    point, comma
        Where a decimal point, a decimal comma stood first, with its text.
    like_thousands, other
        Numbers with a separator and exactly three digits behind it (and the first of them), and the rest.
    """

    comma_allowed: bool = False
    where: str = ""
    point: str = ""
    comma: str = ""
    like_thousands: int = 0
    example: str = ""
    other: int = 0

    def saw(self, text: str, comma: bool) -> None:
        """Take note of a number with a decimal separator."""
        if comma:
            self.comma = self.comma or f"{self.where}: {text}"
        else:
            self.point = self.point or f"{self.where}: {text}"
        if _LIKE_THOUSANDS.fullmatch(text):
            self.like_thousands += 1
            self.example = self.example or f"{self.where}: {text}"
        else:
            self.other += 1


def convert(cell: Cell, spec: Column | Setting, decimals: Decimals) -> Value | tuple[str, ...]:
    """Return the value of a cell that is not blank.

    Raises
    ------
    BadCell
        It is not what `spec` asks for.
    """
    return _CONVERTERS[spec.kind](cell, spec, decimals)


def _number(cell: Cell, spec: Column | Setting, decimals: Decimals) -> float:
    if isinstance(cell, bool):
        raise BadCell(f"{shown(cell)} is yes/no, not a number", "write a number")
    if isinstance(cell, int | float):
        value = float(cell)
    elif isinstance(cell, str):
        value = _number_of_text(cell.strip(" "), spec, decimals)
    else:
        raise BadCell(f"{shown(cell)} is a date or time, not a number", "format the cell as a number")
    if value != value or abs(value) > LARGEST:
        given = shown(cell)
        raise BadCell(
            f"{given} is too large to be data (at most 1e15 is read)", "check the figure and its unit"
        )
    return _in_range(value, cell, spec)


def _number_of_text(text: str, spec: Column | Setting, decimals: Decimals) -> float:
    if len(text) > _LONGEST_NUMBER:
        raise BadCell(f"{shown(text)} is too long for a number", "check the cell")
    if _POINT.fullmatch(text):
        if "." in text and decimals.comma_allowed:
            decimals.saw(text, comma=False)
        value = float(text)
    elif decimals.comma_allowed and _COMMA.fullmatch(text):
        decimals.saw(text, comma=True)
        value = float(text.replace(",", "."))
    else:
        raise BadCell(*_no_number(text, spec, decimals))
    if value == 0.0 and any(digit in "123456789" for digit in re.split("[eE]", text)[0]):
        raise BadCell(f"{shown(text)} is too small to be told from 0", "write 0, or check the exponent")
    return value


def _no_number(text: str, spec: Column | Setting, decimals: Decimals) -> tuple[str, str]:
    """Return what is wrong with a text that is not a number, and a cure."""
    given = shown(text)
    if text.upper() in _ERROR_VALUES:
        return f"{given} is an error value of a spreadsheet", "repair its formula"
    if text.lower().lstrip("+-") in _WORDS_FOR_NO_NUMBER:
        return f"{given} is not a number", "write a finite number, or leave the cell blank where it may be"
    if _COMMA.fullmatch(text) and not decimals.comma_allowed:
        return (
            f"{given} is not a number: a decimal comma is read only in semicolon or tab files",
            f"write {text.replace(',', '.')}",
        )
    if re.fullmatch(r"[+-]?[0-9]{1,3}(?:[ _.,'\u00a0\u202f\u2019][0-9]{3})+(?:[.,][0-9]+)?", text):
        return f"{given} is not a number: thousands separators are not read", "leave them out"
    if spec.name in ("lat", "lon") and any(char.isdigit() for char in text):
        return f"{given} is not a number", "write decimal degrees, south and west with a minus sign"
    if text.endswith("%"):
        return f"{given} is not a number", "write a share such as 0.8, or the bare figure where the unit is %"
    if re.fullmatch(r"[+-]?[0-9.,]+ ?[^\d\s]+(?:/[^\d\s]+)?", text) and text.isascii():
        unit = f"; the unit is {spec.unit}" if spec.unit else ""
        return f"{given} is not a number", f"write the figure alone{unit}"
    if any(char.isdigit() for char in text) and not text.isascii():
        return f"{given} is not a number", "write it with the digits 0-9"
    return f"{given} is not a number", "write digits, with a decimal point where needed"


def _in_range(value: float, cell: Cell, spec: Column | Setting) -> float:
    low, high = spec.low, spec.high
    under = low is not None and (value < low or (spec.low_open and value == low))
    if not under and (high is None or value <= high):
        return value
    given = cell.strip(" ") if isinstance(cell, str) else shown(cell)
    if low is not None and high is not None:
        rule = f"{given} is outside {'above ' if spec.low_open else ''}{low:g}..{high:.10g}"
    elif spec.low_open and low == 0:
        rule = f"{given} is not above 0"
    elif low == 0:
        rule = f"{given} is negative; it must be at least 0"
    else:
        rule = f"{given} is under {low:g}"
    cure = _range_cure(value, spec)
    if isinstance(spec, Setting) and spec.alternatives and low is not None and high is not None:
        cure = f"write {low:g} to {high:g}, or " + " or ".join(f'"{word}"' for word in spec.alternatives)
    raise BadCell(rule, cure)


def _range_cure(value: float, spec: Column | Setting) -> str:
    if spec.name == "lat" and abs(value) <= 180:
        return "are lat and lon swapped?"
    if spec.unit == "share" and 2 <= value <= 100:
        return f"as a share it is {value / 100:g}"
    if spec.low == 0 and value < 0:
        return "check the sign"
    return f"check the figure and its unit ({spec.unit})" if spec.unit else "check the figure"


def _integer(cell: Cell, spec: Column | Setting, decimals: Decimals) -> int | float:
    value = _number(cell, spec, decimals)
    if value != int(value):
        raise BadCell(f"{shown(cell)} is not a whole number", f"write whole {spec.unit or 'numbers'}")
    return int(value)


def _yesno(cell: Cell, spec: Column | Setting, decimals: Decimals) -> bool:
    if isinstance(cell, bool):  # a workbook's own yes/no
        return cell
    word = cell.strip(" ").lower() if isinstance(cell, str) else ""
    if word not in ("yes", "no"):
        raise BadCell(f"{shown(cell)} is neither yes nor no", "write yes or no")
    return word == "yes"


def _choice(cell: Cell, spec: Column | Setting, decimals: Decimals) -> str:
    word = cell.strip(" ") if isinstance(cell, str) else ""
    if word not in spec.choices:
        cure = (nearest(word, spec.choices) if word else "") or f"write {' or '.join(spec.choices)}"
        raise BadCell(f"{shown(cell)} is none of {', '.join(spec.choices)}", cure)
    return word


def _text(cell: Cell, spec: Column | Setting, decimals: Decimals) -> str:
    if isinstance(cell, bool | datetime.date | datetime.time | datetime.timedelta):
        kind = "yes/no" if isinstance(cell, bool) else "a date or time"
        raise BadCell(f"{shown(cell)} is {kind}, not text", "format the cell as text")
    text = cell.strip(" ") if isinstance(cell, str) else _digits(cell)
    if len(text) > _LONGEST_TEXT:
        raise BadCell(f"{shown(text)} is too long; at most {_LONGEST_TEXT} are read", "shorten it")
    odd = next((char for char in text if not char.isprintable() and char != "\u00a0"), "")
    if odd:
        raise BadCell(f"{shown(text)} holds a line break or control character", "write it on one line")
    return text


def check_code(text: str) -> str:
    """Return `text` where it is a code: 1 to 32 printable characters without blank, slash, quote, separator.

    Raises
    ------
    BadCell
        It is not.
    """
    if len(text) > _LONGEST_CODE:
        raise BadCell(f"{shown(text)} is too long for a code", f"use at most {_LONGEST_CODE} characters")
    for char in text:
        if char in _NOT_IN_CODES or char.isspace() or not char.isprintable():
            name = _CHARACTER_NAMES.get(char) or ("a quote" if char in _QUOTES else shown(char))
            raise BadCell(
                f"{shown(text)} holds {name}: codes have no blank, slash, quote or separator",
                "use letters, digits, - or _",
            )
    return text


def _code(cell: Cell, spec: Column | Setting, decimals: Decimals) -> str:
    return check_code(code_text(cell))


def code_text(cell: Cell) -> str:
    """Return the text of a code cell; a numeric cell's integer.

    Raises
    ------
    BadCell
        It is a date, a boolean or not whole.
    """
    if isinstance(cell, str):
        return cell.strip(" ")
    if isinstance(cell, bool):
        raise BadCell(
            f"{shown(cell)} is a yes/no cell, not a code", "format the column as text, type it again"
        )
    if isinstance(cell, int | float):
        if cell != int(cell) or abs(cell) >= LARGEST:
            raise BadCell(f"the number {shown(cell)} is not a code", "format the column as text")
        return str(int(cell))
    raise BadCell(f"{shown(cell)} is a date, not a code", "format the column as text and type it again")


def _codes(cell: Cell, spec: Column | Setting, decimals: Decimals) -> tuple[str, ...]:
    parts = code_text(cell).split()
    for place, part in enumerate(parts):
        check_code(part)
        if part in parts[:place]:
            raise BadCell(f"{shown(cell)} names {part} twice", "name each once")
    return tuple(parts)


def _digits(cell: object) -> str:
    return str(int(cell)) if isinstance(cell, float) and cell == int(cell) else str(cell)


_CONVERTERS: dict[str, Callable[[Cell, Column | Setting, Decimals], Value | tuple[str, ...]]] = {
    "number": _number,
    "integer": _integer,
    "yesno": _yesno,
    "choice": _choice,
    "text": _text,
    "code": _code,
    "codes": _codes,
}


def is_numeric_code(cell: Cell, spec: Column) -> bool:
    """Return whether a workbook's numeric cell stands where a code belongs."""
    return spec.kind in ("code", "codes") and isinstance(cell, int | float) and not isinstance(cell, bool)


__all__ = ["BadCell", "Decimals", "check_code", "code_text", "convert", "is_blank", "is_numeric_code"]
