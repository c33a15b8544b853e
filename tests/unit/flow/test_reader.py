"""The YAML reader: text as text, a place for everything, and one clear line for what is not a flow at all."""

from __future__ import annotations

import pytest

from flowemu.errors import InputError
from flowemu.flow import reader
from flowemu.flow.reader import read_document


def said(raw: bytes) -> list[str]:
    with pytest.raises(InputError) as caught:
        read_document(raw, "f.yaml")
    return caught.value.lines()


def test_scalars_stay_text_by_the_rules_of_yaml_1_2() -> None:
    text = b"a: NO\nb: 12:30\nc: 1e-6\nd: 010\ne: '100'\nf: 0x1F\ng: 2001-01-01\nh: ~\ni:\nj: 'null'\nk: yes\n"
    data = read_document(text, "f.yaml").data
    assert data == {
        "a": "NO", "b": "12:30", "c": "1e-6", "d": "010", "e": "100", "f": "0x1F", "g": "2001-01-01", "h": None,
        "i": None, "j": "null", "k": "yes",
    }  # fmt: skip


def test_every_key_and_value_has_a_place() -> None:
    document = read_document(b"a: 1\nb:\n  - x: {y: 2}\n  - z\n", "f.yaml")
    assert document.marks[("a",)].value == (1, 4)
    assert document.marks[("b", 0, "x", "y")].key == (3, 9)
    assert document.marks[("b", 0, "x", "y")].value == (3, 12)
    assert document.marks[("b", 1)].value == (4, 5)


def test_a_fault_stands_at_the_nearest_known_entry() -> None:
    document = read_document(b"steps:\n  - etch: {with: hf}\n", "f.yaml")
    assert str(document.fault(("steps", 0, "etch", "with"), "t")) == "f.yaml:2:18: t"
    assert str(document.fault(("steps", 0, "etch", "with"), "t", at_key=True)) == "f.yaml:2:12: t"
    assert str(document.fault(("steps", 0, "etch", "time"), "t", at_key=True)) == "f.yaml:2:5: t"
    assert str(document.fault(("window", "box"), "t")) == "f.yaml:1:1: t"


def test_an_optional_level_is_skipped() -> None:
    document = read_document(b"window: [1, 2]\n", "f.yaml")
    assert document.fault(("window", "box", 1), "t").column == 13


@pytest.mark.parametrize(
    ("raw", "says"),
    [
        (b"", "f.yaml:1:1: the file is empty"),
        (b"# only a remark\n", "f.yaml:1:1: the file is empty"),
        (b"~\n", "f.yaml:1:1: the file is empty"),
        (b"- a\n", "f.yaml:1:1: expected a mapping of sections"),
        (b"just words\n", "f.yaml:1:1: expected a mapping of sections"),
        (b"a: 1\nb: \xff\n", "f.yaml:2:4: the file is not text in UTF-8"),
        (b"a: 1\nb: \0\n", "f.yaml:2:4: a NUL byte in the file"),
        (b"a: \x07\n", "f.yaml:1:4: the control character 0x07 in the file"),
        (b"a:\n\tb: 1\n", "f.yaml:2:1: a tab in the indentation; YAML indents with spaces"),
        (b"a: 1\na: 2\n", "f.yaml:2:1: the key 'a' is repeated; it stands first on line 1"),
        (b"a: {b: 1, b: 2}\n", "f.yaml:1:11: the key 'b' is repeated"),
        (b"a: !!int 3\n", "f.yaml:1:4: the tag 'tag:yaml.org,2002:int' has no meaning here"),
        (b"a: *x\n", "f.yaml:1:4: there is no anchor '&x' before this alias"),
        (b"a: &x [*x]\n", "f.yaml:1:8: the alias '*x' stands inside what it stands for"),
        (b"[a]: 1\n", "f.yaml:1:1: a key must be a plain word"),
        (b"a: 1\n---\nb: 2\n", "f.yaml:2:1: a second document begins here"),
        (b"a: [1, 2\n", "f.yaml:2:1: not YAML: "),
        (b"a: b: c\n", "f.yaml:1:5: not YAML: mapping values are not allowed in this context"),
        (b"a: " + b"[" * 50 + b"]" * 50, "f.yaml:1:44: nested more than 40 levels deep"),
    ],
)
def test_what_is_not_a_flow_is_one_clear_line(raw: bytes, says: str) -> None:
    lines = said(raw)
    assert len(lines) == 1
    assert lines[0].startswith(says)


def test_a_file_that_is_too_large_is_not_even_parsed() -> None:
    assert "1000003 bytes; a flow has at most 1000000" in said(b"a: " + b"x" * reader.MAX_BYTES)[0]


def test_a_bounded_alias_is_written_out() -> None:
    document = read_document(b"a: &x {b: 1}\nc: *x\n", "f.yaml")
    assert document.data == {"a": {"b": "1"}, "c": {"b": "1"}}
    assert document.marks[("c", "b")].value == (1, 11)


def test_a_merge_key_is_a_key_like_any_other() -> None:
    assert read_document(b"a: &x {b: 1}\nc: {<<: *x}\n", "f.yaml").data["c"] == {"<<": {"b": "1"}}


def test_a_byte_order_mark_is_no_fault() -> None:
    assert read_document(b"\xef\xbb\xbfa: 1\n", "f.yaml").data == {"a": "1"}


def test_nested_aliases_are_refused_before_they_fill_the_memory() -> None:
    lines = ["a0: &a0 [x, x, x, x, x, x, x, x, x, x]"]
    lines += [f"a{i}: &a{i} [{', '.join([f'*a{i - 1}'] * 10)}]" for i in range(1, 30)]
    assert "the file expands to more than 50000 entries" in said("\n".join(lines).encode())[0]
