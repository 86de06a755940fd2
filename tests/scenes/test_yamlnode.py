"""YAML that is refused before it is looked at as a scene, each with its place; and files that can't be read."""

from __future__ import annotations

from pathlib import Path

import pytest
import yaml

from scenes.complaint import SceneError
from scenes.reader import read_scene
from scenes.yamlnode import MAX_BYTES, Mapping, Scalar, Sequence, compose, read_text
from tests.scenes.made import WHOLE, faults

BOMB = "a: &a [x, x, x, x, x, x, x, x, x]\n" + "".join(
    f"{name}: &{name} [{', '.join([f'*{below}'] * 9)}]\n" for below, name in zip("abcdefgh", "bcdefghi", strict=True))

CASES = [
    ("", "1:1: read an empty file, wanted a mapping of keys to values"),
    ("# only a comment\n", "1:1: read an empty file, wanted a mapping of keys to values"),
    ("just words", "1:1: read just words, wanted a mapping of keys to values"),
    ("- a\n- b\n", "1:1: read a list, wanted a mapping of keys to values"),
    ("title: !!python/object/apply:os.system [ls]\n",
     "1:8: read the tag tag:yaml.org,2002:python/object/apply:os.system, wanted values without tags"),
    ("title: !mine x\n", "1:8: read the tag !mine, wanted values without tags"),
    ("title: ! x\n", "1:8: read the tag !, wanted values without tags"),
    ("title: a\nfloor: 100 ft\ntitle: b\n", "3:1: read the key title again (first on line 1), wanted each key once"),
    ("title: a\n---\ntitle: b\n", "2:1: read a second document, wanted one document in a file"),
    ("a: &x {b: 1}\nc: {<<: *x}\n", "2:5: read the merge key <<, wanted like: to build on another scene"),
    ("? [a]\n: 1\n", "1:3: read a list, wanted a key that is a word"),
    ("a: &a [*a]\n", "1:8: read *a, wanted an alias of a complete value that stands before it"),
    ("a: *b\n", "1:4: read *b, wanted an alias of a complete value that stands before it"),
    (BOMB, "5:8: read more than 10000 values (aliases counted each time), wanted a scene of ordinary size"),
    ("a: " + "[" * 30 + "]" * 30, "1:28: read values nested more than 24 deep, wanted a scene of ordinary depth"),
    ("title: [a\n", "2:1: read text that is not YAML (expected ',' or ']', but got '<stream end>'), wanted YAML"),
    ("title: a: b\n", "1:9: read text that is not YAML (mapping values are not allowed here), wanted YAML"),
    ("title:\n\tx\n",
     "2:1: read text that is not YAML (found character '\\t' that cannot start any token), wanted YAML"),
    ('title: "\\UFFFFFFFF"\n', "1:11: read text that is not YAML (an escape or a number out of range), wanted YAML"),
    ('title: "\\uD800"\n', "1:8: read \ufffd, wanted text without control characters or half characters"),
    ('title: "a\\0b"\n', "1:8: read a\ufffdb, wanted text without control characters or half characters"),
    ("title: a\x07\n", "1:9: read the character U+0007, wanted text without control characters"),
]


@pytest.mark.parametrize(("text", "line"), CASES, ids=[line[:40] for _, line in CASES])
def test_refused(text: str, line: str) -> None:
    """The exact words and the place."""
    assert faults(text)[0] == f"s.yaml:{line}"


def test_text_that_python_would_run_is_not_run(tmp_path: Path) -> None:
    """A tag is refused, not obeyed."""
    made = tmp_path / "made"
    faults(f"title: !!python/object/apply:os.mkdir ['{made}']\n")
    assert not made.exists()


def test_aliases_of_ordinary_size_are_read() -> None:
    """One place for both slots."""
    root = compose("a: &p {x: 1}\nb: *p\n", "s.yaml")
    assert root.get("a") == root.get("b")


def test_nodes_agree_with_pyyaml() -> None:
    """Texts, order and kinds are those of PyYAML's own composer (an outside reading of the same text)."""

    def plain(node: object) -> object:
        if isinstance(node, Mapping):
            return {key: plain(value) for key, (_, value) in node.items.items()}
        if isinstance(node, Sequence):
            return [plain(item) for item in node.items]
        assert isinstance(node, Scalar)
        return node.text

    def theirs(node: yaml.Node) -> object:
        if isinstance(node, yaml.MappingNode):
            return {key.value: theirs(value) for key, value in node.value}
        if isinstance(node, yaml.SequenceNode):
            return [theirs(item) for item in node.value]
        return node.value

    assert plain(compose(WHOLE, "s.yaml")) == theirs(yaml.compose(WHOLE, yaml.SafeLoader))


def error_of(path: Path | str) -> str:
    with pytest.raises(SceneError) as caught:
        read_scene(path)
    return str(caught.value)


def test_not_utf8(tmp_path: Path) -> None:
    """The byte and where it stands."""
    file = tmp_path / "s.yaml"
    file.write_bytes("title: a\nnotes: über\n".encode("latin-1"))
    assert error_of(file) == f"{file}:2:8: read the byte 0xfc, wanted UTF-8 text"


def test_utf8_with_a_mark_is_read(tmp_path: Path) -> None:
    """As some editors write it."""
    file = tmp_path / "s.yaml"
    file.write_text("\ufeff" + WHOLE, encoding="utf-8")
    assert read_scene(file).title == "A loop"


def test_too_large(tmp_path: Path) -> None:
    """Refused before it is parsed."""
    file = tmp_path / "s.yaml"
    file.write_bytes(b"#" * (MAX_BYTES + 1))
    assert error_of(file) == f"{file}: read more than 256 KiB, wanted a scene of ordinary size"


def test_missing_folder_and_name_too_long(tmp_path: Path) -> None:
    """Each in its own words, none a traceback."""
    assert error_of(tmp_path / "none.yaml").startswith(f"read {tmp_path}"[:40])
    with pytest.raises(SceneError, match="read a folder, wanted a YAML file"):
        read_text(tmp_path)
    assert "wanted a shipped scene" in error_of("x" * 5000 + ".yaml")
    assert "wanted a shipped scene" in error_of("a\0b.yaml")
    assert "wanted a shipped scene" in error_of("")


def test_a_file_that_may_not_be_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The system's words, and exit code 2."""
    file = tmp_path / "s.yaml"
    file.write_text(WHOLE)

    def refuse(*args: object, **kwargs: object) -> object:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", refuse)
    assert error_of(file) == f"{file}: read Permission denied, wanted a YAML file that can be read"
