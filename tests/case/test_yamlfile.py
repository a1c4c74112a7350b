from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from assess.case.yamlfile import Document, closest, listed, nearest, read_yaml


def parse(folder: Path, content: str | bytes) -> Document:
    document, faults = read_yaml(write(folder, content))
    assert faults == []
    assert document is not None
    return document


def fault_of(folder: Path, content: str | bytes) -> str:
    document, faults = read_yaml(write(folder, content))
    assert document is None
    (fault,) = faults
    return str(fault).removeprefix(f"{folder}/")


def write(folder: Path, content: str | bytes) -> Path:
    path = folder / "case.yaml"
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return path


def test_lines_of_keys_and_items(tmp_path: Path) -> None:
    document = parse(tmp_path, "a: 1\nb:\n  c:\n    - x\n    - {d: 2,\n       e: 3}\n")
    assert document.data == {"a": 1, "b": {"c": ["x", {"d": 2, "e": 3}]}}
    assert document.line(("a",)) == 1
    assert document.line(("b", "c")) == 3
    assert document.line(("b", "c", 1)) == 5
    assert document.line(("b", "c", 1, "e")) == 6
    assert document.line(("b", "c", 1, "missing")) == 5  # the nearest thing around it
    assert document.line(()) == 1


def test_places_are_named_by_name_or_date_or_number(tmp_path: Path) -> None:
    document = parse(tmp_path, "m: [{name: girder}, {date: 2019-06-12}, {x: 1}]")
    assert document.label(("m", 0, "depth")) == "m.girder.depth"
    assert document.label(("m", 1)) == "m.2019-06-12"
    assert document.label(("m", 2)) == "m.#3"
    assert document.label(()) == "the case file"


def test_scalars_are_read_as_yaml_1_2_does(tmp_path: Path) -> None:
    text = "a: no\nb: true\nc: 12e6\nd: 2019-06-12\ne: 010\nf: 1:30\ng: ~\nh:\ni: 1e-3\nj: '5'"
    assert parse(tmp_path, text).data == {
        "a": "no",
        "b": True,
        "c": 12e6,
        "d": "2019-06-12",
        "e": 10,
        "f": "1:30",
        "g": None,
        "h": None,
        "i": 1e-3,
        "j": "5",
    }


def test_anchors_and_merges(tmp_path: Path) -> None:
    text = "a: &a\n  x: 1\n  y: 2\nb:\n  <<: *a\n  y: 3\nc: {<<: [{x: 5}, *a]}\nd: *a\n"
    document = parse(tmp_path, text)
    assert document.data["b"] == {"x": 1, "y": 3}
    assert document.data["c"] == {"x": 5, "y": 2}
    assert document.data["d"] == {"x": 1, "y": 2}
    assert document.line(("b", "x")) == 2  # where it is written
    assert document.line(("b", "y")) == 6


def test_byte_order_mark_and_line_ends(tmp_path: Path) -> None:
    document = parse(tmp_path, "\ufeffa: ü\r\nb: 2\r\n")
    assert document.data == {"a": "ü", "b": 2}
    assert document.line(("b",)) == 2


def test_all_duplicate_keys_are_named_with_both_lines(tmp_path: Path) -> None:
    document, faults = read_yaml(write(tmp_path, "a: 1\nb: {c: 1, c: 2}\na: 3\n"))
    assert document is not None  # the first of each stands, so that the rest can be checked
    assert document.data == {"a": 1, "b": {"c": 1}}
    assert [(fault.line, fault.what) for fault in faults] == [
        (3, "key 'a' stands twice, first in line 1"),
        (2, "key 'c' stands twice, first in line 2"),
    ]


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "case.yaml: the file is empty, given 0 bytes"),
        (b" \n\n", "case.yaml: the file is empty, given 3 bytes"),
        ("# nothing\n", "case.yaml: the file says nothing, given comments only"),
        ("- a\n- b\n", "case.yaml:1: a case file is a mapping of keys, given a list"),
        ("hello", "a case file is a mapping of keys, given 'hello'"),
        ("a: 1\nb: [1, 2\nc: 3\n", "case.yaml:3: this is not valid YAML: expected ',' or ']'"),
        ("a:\n\tb: 1\n", "case.yaml:2: this is not valid YAML.*indent with spaces, not tabs"),
        ("a: 1\n b: 2\n", "case.yaml:2: this is not valid YAML: mapping values"),
        ("a: *b\n", "case.yaml:1: this is not valid YAML: found undefined alias"),
        ("a: 1\n---\nb: 2\n", "case.yaml:2: this is not valid YAML: but found another document"),
        ("a: &x [*x]\n", "nested too deep"),
        ("a: &x {b: *x}\n", "nested too deep"),
        ("a: &x {<<: *x}\n", "nested too deep"),
        ("a: 1\n<<: 5\n", "case.yaml:2: << merges a mapping"),
        ("[" * 3000, "nested too deep|not valid YAML"),
        ("a: !!python/name:os.system\n", "case.yaml:1: a YAML tag that has no meaning here"),
        ("a: !!int x\n", "case.yaml:1: a value that cannot be read, given x"),
        ("? [a, b]\n: 1\n", "case.yaml:1: a key must be text or a number"),
        ("true: 1\n", "case.yaml:1: a key must be text or a number"),
        ("a: 1\nb: \x07\n", "case.yaml:2: a character that may not stand in text"),
        ("a: 1\nname: Brücke\n".encode("latin-1"), "case.yaml:2: .*looks like Latin-1.*given 'ü'"),
        ("a: 1\n".encode("utf-16"), "UTF-16 text, allowed UTF-8, save it as UTF-8"),
        (b"\x89PNG\r\n\x1a\n\x00\x00", "case.yaml: the file is not text"),
        (b"a: \x00\n", "case.yaml: the file is not text"),
    ],
)
def test_refuse(tmp_path: Path, content: str | bytes, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        raise ValueError(fault_of(tmp_path, content))


def test_refuse_aliases_that_unfold_without_end(tmp_path: Path) -> None:
    lines = ["a0: &a0 [1, 1, 1, 1, 1, 1, 1, 1, 1, 1]"]
    for n in range(1, 9):
        lines.append(f"a{n}: &a{n} [{', '.join([f'*a{n - 1}'] * 10)}]")
    assert "nested too deep" in fault_of(tmp_path, "\n".join(lines))


def test_refuse_folder_and_missing_file(tmp_path: Path) -> None:
    _, (folder,) = read_yaml(tmp_path)
    assert "this is a folder, not a case file" in str(folder)
    _, (missing,) = read_yaml(tmp_path / "no.yaml")
    assert str(missing).endswith("no.yaml: there is no such file, check the path")


def test_nearest() -> None:
    assert nearest("Covr", ["cover", "cores"]) == "did you mean 'cover'?"
    assert nearest("zzz", ["cover"]) == ""
    assert closest(12, ["123", 5]) == "123"


@given(st.binary(max_size=200) | st.text(max_size=200).map(str.encode))
@settings(
    max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
def test_any_bytes_are_read_or_refused(tmp_path: Path, content: bytes) -> None:
    document, faults = read_yaml(write(tmp_path, content))
    assert (document is None) == bool(faults)
    assert all(str(fault) for fault in faults)


@given(st.text(alphabet="ab:-{}[]&*<#'\"\n 1!|>?,%@~", max_size=60))
@settings(
    max_examples=300, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
def test_any_yaml_like_text_is_read_or_refused(tmp_path: Path, content: str) -> None:
    document, faults = read_yaml(write(tmp_path, content))
    assert (document is None) == bool(faults)


@pytest.mark.parametrize(
    "text",
    [
        "a: !!python/object/apply:os.system [ls]",
        "a: !!python/object:os.x {b: 1}",
        "a: !!python/name:os.system",
        "a: !!set {b, c}",
        "a: !mine {b: 1}",
    ],
)
def test_refuse_tags_of_any_sort_of_node(tmp_path: Path, text: str) -> None:
    path = tmp_path / "case.yaml"
    path.write_text(f"x: 1\n{text}\n", encoding="utf-8")
    document, (fault,) = read_yaml(path)
    assert document is None
    assert fault.line == 2
    assert "a YAML tag that has no meaning here" in fault.what


def test_keys_without_a_colon_are_remembered(tmp_path: Path) -> None:
    path = tmp_path / "case.yaml"
    text = "a: {source: drawings, sheet 3}\nb: {c: , d: 1}\ne:\n"
    path.write_text(text, encoding="utf-8")
    document, _ = read_yaml(path)
    assert document is not None
    assert document.bare == {("a", "sheet 3")}


def test_words_with_commas_are_listed_apart() -> None:
    assert listed(["a", "b"]) == "a, b"
    assert listed(["a, b", "c"]) == "a, b; c"
    assert listed([]) == "none"
