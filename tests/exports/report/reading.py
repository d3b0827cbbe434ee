"""A page read back as a reader sees it: tables with their heads, texts by element id and class."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from html.parser import HTMLParser

_VOID = {"area", "br", "col", "hr", "img", "input", "link", "meta", "wbr"}


@dataclass
class Element:
    """An element with its text and children."""

    tag: str
    attributes: dict[str, str]
    parts: list[Element | str] = field(default_factory=list)

    @property
    def text(self) -> str:
        """All text in it."""
        return "".join(part if isinstance(part, str) else part.text for part in self.parts)

    def find(self, tag: str = "", **attributes: str) -> list[Element]:
        """Return the elements in it with that tag and those attributes (`class_` holds one class)."""
        found = []
        for part in self.parts:
            if isinstance(part, str):
                continue
            if (not tag or part.tag == tag) and all(part.has(k, v) for k, v in attributes.items()):
                found.append(part)
            found += part.find(tag, **attributes)
        return found

    def has(self, name: str, value: str) -> bool:
        """Whether the attribute has the value (one of them, for a class)."""
        told = self.attributes.get(name.rstrip("_"), "")
        return value in told.split() if name == "class_" else told == value


class _Reader(HTMLParser):
    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.root = Element("document", {})
        self.open = [self.root]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        # Cells and rows may leave their end tags out.
        if tag in ("td", "tr"):
            while self.open[-1].tag in ("td", "th") or (tag == "tr" and self.open[-1].tag == "tr"):
                self.open.pop()
        element = Element(tag, {name: value or "" for name, value in attrs})
        self.open[-1].parts.append(element)
        if tag not in _VOID:
            self.open.append(element)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.open[-1].parts.append(Element(tag, {name: value or "" for name, value in attrs}))

    def handle_endtag(self, tag: str) -> None:
        places = [place for place, element in enumerate(self.open) if element.tag == tag]
        if places:
            del self.open[places[-1] :]

    def handle_data(self, data: str) -> None:
        self.open[-1].parts.append(data)


def read_page(html: str) -> Element:
    """Return the page as a tree."""
    reader = _Reader()
    reader.feed(html)
    reader.close()
    return reader.root


@dataclass
class ReadTable:
    """A table of the page: (name of the column, its structure), and rows of texts."""

    heads: list[tuple[str, str]]
    rows: list[list[str]]


def read_tables(page: Element) -> dict[str, ReadTable]:
    """Return the data tables of a page by name."""
    tables = {}
    for table in page.find("table", class_="data"):
        heads = [
            (th.attributes["data-k"], th.attributes.get("data-g", ""))
            for th in table.find("thead")[0].find("th")
        ]
        rows = [
            [cell.text.strip("\n") for cell in row.find("td")] for row in table.find("tbody")[0].find("tr")
        ]
        tables[table.attributes["id"].removeprefix("t-")] = ReadTable(heads, rows)
    return tables


def shows(text: str, value: float) -> bool:
    """Whether `text` is `value` rounded to the digits it shows."""
    plain = text.replace(",", "").replace("−", "-").removesuffix("%").strip()
    shown = float(plain)
    mantissa, _, exponent = plain.partition("e")
    decimals = len(mantissa.partition(".")[2]) - int(exponent or 0)
    return abs(shown - value) <= 0.5000001 * 10.0**-decimals


def numbers_in(text: str) -> list[str]:
    """Return every figure in a text, as written; figures within a code or a name are not figures."""
    return re.findall(r"(?<![\w.,−-])−?\d[\d,]*(?:\.\d+)?(?:e[+-]?\d+)?(?![\w-])", text)
