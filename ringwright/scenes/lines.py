"""From key paths to line numbers: where in a TOML document each key stands.

`tomllib` says what a document holds but not where. This scanner walks a document that `tomllib` has accepted (TOML 1.0) and records
the line of every key, of every element of an array, and of every table header; it judges nothing.
"""

from __future__ import annotations

Path = tuple[str | int, ...]


def key_lines(text: str) -> dict[Path, int]:
    """Line number, from 1, of every key path of a valid TOML document."""
    scanner = _Scanner(text)
    scanner.document()
    return scanner.lines


class _Scanner:
    def __init__(self, text: str) -> None:
        self.text = text.replace("\r\n", "\n")
        self.at = 0
        self.line = 1
        self.lines: dict[Path, int] = {}
        self.tables: dict[Path, int] = {}  # how many tables an array of tables has so far
        self.prefix: Path = ()

    def document(self) -> None:
        self.blank()
        while self.at < len(self.text):
            if self.text[self.at] == "[":
                self.header()
            else:
                self.pair(self.prefix)
            self.blank()

    def header(self) -> None:
        many = self.text.startswith("[[", self.at)
        self.move(2 if many else 1)
        parts = self.key()
        self.move(2 if many else 1)
        self.prefix = ()
        for depth, part in enumerate(parts):
            self.prefix += (part,)
            last = depth == len(parts) - 1
            if many and last:
                self.lines.setdefault(self.prefix, self.line)
                self.tables[self.prefix] = self.tables.get(self.prefix, 0) + 1
            if self.prefix in self.tables:
                self.prefix += (self.tables[self.prefix] - 1,)
            self.lines.setdefault(self.prefix, self.line)

    def pair(self, prefix: Path) -> None:
        line = self.line
        for part in self.key():
            prefix += (part,)
            self.lines.setdefault(prefix, line)
        self.move(1)  # the equals sign
        self.spaces()
        self.value(prefix)

    def key(self) -> list[str]:
        """A dotted key; stands on the equals sign or the closing bracket afterwards."""
        parts = []
        while True:
            self.spaces()
            if self.text[self.at] in "\"'":
                parts.append(self.string())
            else:
                start = self.at
                while self.text[self.at] not in " \t.=]":
                    self.at += 1
                parts.append(self.text[start : self.at])
            self.spaces()
            if self.text[self.at] != ".":
                return parts
            self.at += 1

    def value(self, path: Path) -> None:
        here = self.text[self.at]
        if here in "\"'":
            self.string()
        elif here == "[":
            self.array(path)
        elif here == "{":
            self.inline_table(path)
        else:
            while self.at < len(self.text) and self.text[self.at] not in ",]}\n#":
                self.at += 1

    def array(self, path: Path) -> None:
        self.move(1)
        self.blank()
        index = 0
        while self.text[self.at] != "]":
            self.lines.setdefault((*path, index), self.line)
            self.value((*path, index))
            self.blank()
            if self.text[self.at] == ",":
                self.move(1)
                self.blank()
            index += 1
        self.move(1)

    def inline_table(self, path: Path) -> None:
        self.move(1)
        self.blank()
        while self.text[self.at] != "}":
            self.pair(path)
            self.blank()
            if self.text[self.at] == ",":
                self.move(1)
                self.blank()
        self.move(1)

    def string(self) -> str:
        """Skip a string of any of the four kinds; returns it as a key is written."""
        import tomllib

        quote = self.text[self.at]
        mark = quote * 3 if self.text.startswith(quote * 3, self.at) else quote
        start = self.at
        self.move(len(mark))
        while not self.text.startswith(mark, self.at):
            self.move(2 if quote == '"' and self.text[self.at] == "\\" else 1)
        self.move(len(mark))
        while len(mark) == 3 and self.at < len(self.text) and self.text[self.at] == quote:
            self.move(1)
        return "" if len(mark) == 3 else str(tomllib.loads(f"key = {self.text[start : self.at]}")["key"])

    def blank(self) -> None:
        """White space, line ends and comments."""
        while self.at < len(self.text):
            if self.text[self.at] == "#":
                while self.at < len(self.text) and self.text[self.at] != "\n":
                    self.at += 1
            elif self.text[self.at] in " \t\n":
                self.move(1)
            else:
                return

    def spaces(self) -> None:
        while self.at < len(self.text) and self.text[self.at] in " \t":
            self.at += 1

    def move(self, steps: int) -> None:
        self.line += self.text.count("\n", self.at, self.at + steps)
        self.at += steps
