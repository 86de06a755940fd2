"""YAML text to plain marked nodes: mappings, sequences, scalars, each with file, line and column.

Refused: tags, merge keys, duplicate keys, several documents, text that is not UTF-8, and anything
whose size, depth or expansion through aliases is beyond a scene's.
"""

from __future__ import annotations

from collections.abc import Mapping as MappingType
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import yaml

from scenes.complaint import Log, Mark, SceneError, shown

MAX_BYTES = 256 * 1024
MAX_NODES = 10_000  # after aliases are expanded
MAX_DEPTH = 24
MAX_COMPLAINTS = 200


@dataclass(frozen=True, slots=True)
class Scalar:
    """A scalar: its text, and what YAML takes it for: str, int, float, bool, null or other."""

    mark: Mark
    text: str
    kind: str

    @property
    def is_none(self) -> bool:
        """Whether it is the word none."""
        return self.text == "none" and self.kind == "str"


@dataclass(frozen=True, slots=True)
class Sequence:
    """A sequence."""

    mark: Mark
    items: tuple[Node, ...]


@dataclass(frozen=True, slots=True)
class Mapping:
    """A mapping: key to the key's own mark and the value."""

    mark: Mark
    items: MappingType[str, tuple[Mark, Node]]

    def get(self, key: str) -> Node | None:
        """The value of a key, or None."""
        found = self.items.get(key)
        return None if found is None else found[1]


Node = Scalar | Sequence | Mapping


def what(node: Node) -> str:
    """A node as an error shows it."""
    if isinstance(node, Mapping):
        return "a mapping"
    if isinstance(node, Sequence):
        return "a list"
    return "nothing" if node.kind == "null" and node.text in ("", "~") else shown(node.text)


class _Stop(Exception):
    """Raised when the rest of a file can't be read."""


class _Builder:
    """Events to nodes, with limits."""

    def __init__(self, text: str, file: str, log: Log) -> None:
        self.loader = yaml.SafeLoader(text)
        self.file = file
        self.log = log
        self.anchors: dict[str, tuple[Node, int, int]] = {}  # node, its expanded size, its depth
        self.count = 0

    def mark(self, at: Any) -> Mark:
        return Mark(self.file, at.line + 1, at.column + 1)

    def complain(self, at: Any, read: str, wanted: str) -> None:
        self.log.add(self.mark(at), "", read, wanted)

    def document(self) -> Node | None:
        loader = self.loader
        loader.get_event()  # stream start
        if loader.check_event(yaml.StreamEndEvent):
            self.log.add(Mark(self.file, 1, 1), "", "an empty file", "a mapping of keys to values")
            return None
        loader.get_event()  # document start
        node, _, _ = self.node(0)
        loader.get_event()  # document end
        if not loader.check_event(yaml.StreamEndEvent):
            self.complain(loader.peek_event().start_mark, "a second document", "one document in a file")
        return node

    def grow(self, size: int, at: Any) -> None:
        self.count += size
        if self.count > MAX_NODES:
            self.complain(at, f"more than {MAX_NODES} values (aliases counted each time)", "a scene of ordinary size")
            raise _Stop

    def node(self, depth: int) -> tuple[Node, int, int]:
        event = self.loader.get_event()
        at = event.start_mark
        if depth > MAX_DEPTH:
            self.complain(at, f"values nested more than {MAX_DEPTH} deep", "a scene of ordinary depth")
            raise _Stop
        if isinstance(event, yaml.AliasEvent):
            if event.anchor not in self.anchors:
                self.complain(at, f"*{shown(str(event.anchor))}", "an alias of a complete value that stands before it")
                raise _Stop
            node, size, deep = self.anchors[event.anchor]
            self.grow(size, at)
            if depth + deep > MAX_DEPTH:
                self.complain(at, f"values nested more than {MAX_DEPTH} deep", "a scene of ordinary depth")
                raise _Stop
            return node, size, deep
        self.grow(1, at)
        if event.tag is not None:
            self.complain(at, f"the tag {shown(event.tag)}", "values without tags")
        if isinstance(event, yaml.ScalarEvent):
            made: tuple[Node, int, int] = (self.scalar(event), 1, 0)
        elif isinstance(event, yaml.SequenceStartEvent):
            made = self.sequence(at, depth)
        else:
            made = self.mapping(at, depth)
        if event.anchor:
            self.anchors[event.anchor] = made
        return made

    def scalar(self, event: yaml.ScalarEvent) -> Scalar:
        text = event.value
        if any(0xD800 <= ord(ch) <= 0xDFFF or (ord(ch) < 32 and ch not in "\n\t\r") for ch in text):
            self.complain(event.start_mark, shown(text), "text without control characters or half characters")
        tag = self.loader.resolve(yaml.ScalarNode, text, event.implicit) if event.tag is None else "str"
        kind = tag.rsplit(":", 1)[-1]
        return Scalar(self.mark(event.start_mark), text, kind if kind in KINDS else "other")

    def sequence(self, at: Any, depth: int) -> tuple[Node, int, int]:
        items: list[Node] = []
        size, deep = 1, 0
        while not self.loader.check_event(yaml.SequenceEndEvent):
            node, s, d = self.node(depth + 1)
            items.append(node)
            size, deep = size + s, max(deep, d + 1)
        self.loader.get_event()
        return Sequence(self.mark(at), tuple(items)), size, deep

    def mapping(self, at: Any, depth: int) -> tuple[Node, int, int]:
        items: dict[str, tuple[Mark, Node]] = {}
        size, deep = 1, 0
        while not self.loader.check_event(yaml.MappingEndEvent):
            key_at = self.loader.peek_event().start_mark
            key, ks, _ = self.node(depth + 1)
            value, vs, d = self.node(depth + 1)
            size, deep = size + ks + vs, max(deep, d + 1)
            if not isinstance(key, Scalar):
                self.complain(key_at, what(key), "a key that is a word")
            elif key.text == "<<":
                self.complain(key_at, "the merge key <<", "like: to build on another scene")
            elif key.text in items:
                first = items[key.text][0]
                self.complain(key_at, f"the key {shown(key.text)} again (first on line {first.line})",
                              "each key once")
            else:
                items[key.text] = (self.mark(key_at), value)
        self.loader.get_event()
        return Mapping(self.mark(at), items), size, deep


KINDS = ("str", "int", "float", "bool", "null")


def read_text(path: Path) -> str:
    """A file's text. Raises SceneError if it is missing, not a file, too large or not UTF-8."""
    log = Log()
    where = Mark(str(path))
    try:
        if not path.is_file():
            log.add(where, "", "a folder" if path.is_dir() else "no such file", "a YAML file")
            raise SceneError(log.complaints)
        with path.open("rb") as stream:
            data = stream.read(MAX_BYTES + 1)
    except (OSError, ValueError) as exc:
        log.add(where, "", f"{getattr(exc, 'strerror', None) or exc}", "a YAML file that can be read")
        raise SceneError(log.complaints) from None
    if len(data) > MAX_BYTES:
        log.add(where, "", f"more than {MAX_BYTES // 1024} KiB", "a scene of ordinary size")
        log.raise_if_any()
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as exc:
        before = data[: exc.start].decode("utf-8", "replace")
        line = before.count("\n") + 1
        log.add(Mark(str(path), line, len(before) - (before.rfind("\n") + 1) + 1), "",
                f"the byte 0x{data[exc.start]:02x}", "UTF-8 text")
        raise SceneError(log.complaints) from None


def compose(text: str, file: str) -> Mapping:
    """YAML text to its root mapping. Raises SceneError with all that can be said of the text as YAML."""
    log = Log()
    node: Node | None = None
    builder: _Builder | None = None
    try:
        builder = _Builder(text, file, log)
        node = builder.document()
        if node is not None and not isinstance(node, Mapping):
            log.add(node.mark, "", what(node), "a mapping of keys to values")
    except _Stop:
        pass
    except yaml.reader.ReaderError as exc:
        before = text[: exc.position]
        log.add(Mark(file, before.count("\n") + 1, exc.position - before.rfind("\n")), "",
                f"the character U+{ord(text[exc.position]):04X}", "text without control characters")
    except yaml.MarkedYAMLError as exc:
        at = exc.problem_mark or exc.context_mark
        mark = Mark(file, at.line + 1, at.column + 1) if at else Mark(file)
        log.add(mark, "", f"text that is not YAML ({exc.problem or exc.context})", "YAML")
    except (yaml.YAMLError, ValueError, OverflowError):
        # PyYAML lets Python's own errors through for escapes such as \\UFFFFFFFF
        mark = Mark(file) if builder is None else Mark(file, builder.loader.line + 1, builder.loader.column + 1)
        log.add(mark, "", "text that is not YAML (an escape or a number out of range)", "YAML")
    if log.complaints:
        raise SceneError(log.complaints[:MAX_COMPLAINTS])
    assert isinstance(node, Mapping)
    return node
