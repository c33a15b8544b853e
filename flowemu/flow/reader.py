"""Bytes of a YAML file -> a document: plain text data with a line and column for every key and value.

Scalars are read as text by the rules of YAML 1.2, so that `NO`, `12:30`, `010` and `1e-6` mean what the models say
and not what a loader guesses. Repeated keys, tags and second documents are refused, aliases are expanded to a bound.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from flowemu.errors import Fault, InputError
from flowemu.flow.document import Document, Mark, Path

MAX_BYTES = 1_000_000
MAX_DEPTH = 40
MAX_ENTRIES = 50_000
_EMPTY = ("", "~", "null", "Null", "NULL")


@dataclass
class Node:
    """A value of the file before aliases are expanded."""

    place: tuple[int, int]
    text: str | None = None
    items: list[Node] | None = None
    entries: dict[str, tuple[tuple[int, int], Node]] | None = None

    @property
    def empty(self) -> bool:
        return self.text is None and self.items is None and self.entries is None


@dataclass
class _Builder:
    """Puts the parser's events together; collects what is wrong on the way."""

    file: str
    events: Any
    faults: list[Fault] = field(default_factory=list)
    anchors: dict[str, Node] = field(default_factory=dict)
    open_anchors: set[str] = field(default_factory=set)

    def complain(self, place: tuple[int, int], text: str) -> None:
        self.faults.append(Fault(self.file, *place, text))

    def node(self, event: Any, depth: int) -> Node:
        import yaml

        place = _place(event)
        if depth > MAX_DEPTH:
            raise InputError([Fault(self.file, *place, f"nested more than {MAX_DEPTH} levels deep")])
        if isinstance(event, yaml.AliasEvent):
            return self._alias(event, place)
        if event.tag is not None and event.tag != "!":
            self.complain(place, f"the tag '{event.tag}' has no meaning here")
        self.open_anchors.add(event.anchor)
        node = self._value(event, place, depth)
        self.open_anchors.discard(event.anchor)
        if event.anchor is not None:
            self.anchors[event.anchor] = node
        return node

    def _alias(self, event: Any, place: tuple[int, int]) -> Node:
        if event.anchor in self.open_anchors:
            self.complain(place, f"the alias '*{event.anchor}' stands inside what it stands for")
        elif event.anchor not in self.anchors:
            self.complain(place, f"there is no anchor '&{event.anchor}' before this alias")
        return self.anchors.get(event.anchor, Node(place))

    def _value(self, event: Any, place: tuple[int, int], depth: int) -> Node:
        import yaml

        if isinstance(event, yaml.SequenceStartEvent):
            return Node(place, items=self._items(depth))
        if isinstance(event, yaml.MappingStartEvent):
            return Node(place, entries=self._entries(depth))
        plain = event.style is None or event.style == ""
        return Node(place, text=None if plain and event.value in _EMPTY else event.value)

    def _items(self, depth: int) -> list[Node]:
        import yaml

        items = []
        while not isinstance(event := next(self.events), yaml.SequenceEndEvent):
            items.append(self.node(event, depth + 1))
        return items

    def _entries(self, depth: int) -> dict[str, tuple[tuple[int, int], Node]]:
        import yaml

        entries: dict[str, tuple[tuple[int, int], Node]] = {}
        while not isinstance(event := next(self.events), yaml.MappingEndEvent):
            key = self.node(event, depth + 1)
            value = self.node(next(self.events), depth + 1)
            if key.text is None:
                self.complain(key.place, "a key must be a plain word")
            elif key.text in entries:
                line = entries[key.text][0][0]
                self.complain(key.place, f"the key '{key.text}' is repeated; it stands first on line {line}")
            else:
                entries[key.text] = (key.place, value)
        return entries


def _place(event: Any) -> tuple[int, int]:
    return event.start_mark.line + 1, event.start_mark.column + 1


def read_document(raw: bytes, file: str) -> Document:
    """The document in the bytes of a file.

    Raises
    ------
    InputError
        With every fault that was found; the parser itself stops at its first.
    """
    text = _decoded(raw, file)
    root = _parsed(text, file)
    if root is None or root.empty:
        raise InputError([Fault(file, 1, 1, "the file is empty; expected a flow, which begins with 'flow: ...'")])
    if root.entries is None:
        raise InputError([Fault(file, *root.place, "expected a mapping of sections such as 'flow: ...', 'steps: ...'")])
    marks: dict[Path, Mark] = {}
    data = _expanded(root, (), marks, file)
    return Document(file, data, marks)


def _decoded(raw: bytes, file: str) -> str:
    if len(raw) > MAX_BYTES:
        raise InputError([Fault(file, 1, 1, f"the file has {len(raw)} bytes; a flow has at most {MAX_BYTES}")])
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw[: error.start].count(b"\n") + 1
        column = error.start - raw.rfind(b"\n", 0, error.start)
        raise InputError([Fault(file, line, column, "the file is not text in UTF-8")]) from None
    for index, letter in enumerate(text):
        if not (letter.isprintable() or letter in "\t\n\r\x85\xa0\u2028\u2029" or ord(letter) > 0xA0):
            line, column = _line_column(text, index)
            name = "a NUL byte" if letter == "\0" else f"the control character {ord(letter):#04x}"
            raise InputError([Fault(file, line, column, f"{name} in the file; expected text")])
    return text


def _line_column(text: str, index: int) -> tuple[int, int]:
    return text.count("\n", 0, index) + 1, index - text.rfind("\n", 0, index)


def _parsed(text: str, file: str) -> Node | None:
    import yaml

    loader: Any = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
    builder = _Builder(file, yaml.parse(text, Loader=loader))
    root = None
    try:
        for event in builder.events:
            if isinstance(event, yaml.DocumentStartEvent):
                if root is not None:
                    builder.complain(_place(event), "a second document begins here; a flow file holds one")
                    break
                root = builder.node(next(builder.events), 0)
    except yaml.MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        place = (mark.line + 1, mark.column + 1) if mark else (1, 1)
        builder.complain(place, _yaml_complaint(text, mark, error))
    except yaml.YAMLError as error:
        builder.complain((1, 1), f"not YAML: {' '.join(str(error).split())}")
    if builder.faults:
        raise InputError(builder.faults)
    return root


def _yaml_complaint(text: str, mark: Any, error: Any) -> str:
    lines = text.split("\n")
    line = lines[mark.line] if mark and mark.line < len(lines) else ""
    indent = line[: len(line) - len(line.lstrip())]
    if "\t" in indent:
        return "a tab in the indentation; YAML indents with spaces"
    context = f" {error.context}" if error.context else ""
    return f"not YAML: {error.problem or 'cannot be read'}{context}"


def _expanded(node: Node, path: Path, marks: dict[Path, Mark], file: str) -> Any:
    """Plain data of a node, its aliases written out; fills in the marks."""
    if len(marks) > MAX_ENTRIES:
        text = f"the file expands to more than {MAX_ENTRIES} entries; are its aliases (*name) nested?"
        raise InputError([Fault(file, *node.place, text)])
    if node.entries is not None:
        data = {}
        for key, (place, value) in node.entries.items():
            marks[(*path, key)] = Mark(place, value.place)
            data[key] = _expanded(value, (*path, key), marks, file)
        return data
    if node.items is not None:
        for index, item in enumerate(node.items):
            marks[(*path, index)] = Mark(item.place, item.place)
        return [_expanded(item, (*path, index), marks, file) for index, item in enumerate(node.items)]
    return node.text
