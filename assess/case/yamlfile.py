"""YAML that remembers its lines and refuses what is ambiguous.

Beside the safe subset of YAML this keeps to the plain reading of YAML 1.2: only ``true`` and
``false`` are truth values, ``12e6`` is a number, dates stay text.
"""

import difflib
import re
from collections.abc import Callable, Hashable, Iterable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import yaml

from assess.errors import Fault

Keys = tuple[Hashable, ...]  # where something stands: ("members", 0, "name")

_MOST_NODES = 200_000  # aliases of aliases can unfold a small file into a huge one
_DEEPEST = 60
_MERGE = "tag:yaml.org,2002:merge"
_CONTAINERS = ("tag:yaml.org,2002:map", "tag:yaml.org,2002:seq")
# What plain scalars mean, after YAML 1.2: 010 is ten, not eight.
_PLAIN: dict[str, Callable[[str], Any]] = {
    "tag:yaml.org,2002:str": str,
    "tag:yaml.org,2002:int": int,
    "tag:yaml.org,2002:float": lambda text: float(re.sub(r"\.(?=[inIN])", "", text)),
    "tag:yaml.org,2002:bool": lambda text: text.lower() == "true",
    "tag:yaml.org,2002:null": lambda _text: None,
}


@dataclass(frozen=True, slots=True)
class Document:
    """A parsed file with the line of every key and list item."""

    file: str
    data: dict[Any, Any]
    lines: dict[Keys, int] = field(default_factory=dict)
    moved: dict[Keys, Keys] = field(default_factory=dict)  # place in `data` -> place in the file
    bare: frozenset[Keys] = frozenset()  # keys between braces that have not even a colon

    def origin(self, keys: Keys) -> Keys:
        """Give the place in the file of a place in `data`."""
        for end in range(len(keys), 0, -1):
            if keys[:end] in self.moved:
                return self.moved[keys[:end]] + keys[end:]
        return keys

    def line(self, keys: Keys) -> int:
        """Give the line of a place, or of the nearest thing around it, counted from 1."""
        keys = self.origin(keys)
        for end in range(len(keys), 0, -1):
            if keys[:end] in self.lines:
                return self.lines[keys[:end]]
        return 1

    def label(self, keys: Keys) -> str:
        """Name a place as ``zones.deck.cover``, list items by their name, date or number."""
        words: list[str] = []
        here: Any = self.data
        for key in self.origin(keys):
            inside = here[key] if _has(here, key) else None
            if isinstance(here, list) and isinstance(key, int):
                said = inside if isinstance(inside, dict) else {}
                words.append(str(said.get("name") or said.get("date") or f"#{key + 1}"))
            else:
                words.append(str(key))
            here = inside
        return ".".join(words) or "the case file"

    def fault(
        self, keys: Keys, what: str, *, given: object = "", allowed: str = "", mend: str = ""
    ) -> Fault:
        """Make a fault that says its place: ``label: what``."""
        what = f"{self.label(keys)}: {what}"
        return Fault(self.file, self.line(keys), what, str(given), allowed, mend)


def _has(container: Any, key: Hashable) -> bool:
    if isinstance(container, list):
        return isinstance(key, int) and 0 <= key < len(container)
    return isinstance(container, dict) and key in container


def nearest(word: object, known: Iterable[object]) -> str:
    """Suggest the known word that is closest to a misspelt one.

    Parameters
    ----------
    word : object
        What was written.
    known : iterable
        What could have been meant.

    Returns
    -------
    str
        ``did you mean 'cover'?``, or nothing if none is close.

    Examples
    --------
    >>> nearest("covr", ["cover", "cores"])
    "did you mean 'cover'?"
    """
    found = closest(word, known)
    return f"did you mean {found!r}?" if found else ""


def closest(word: object, known: Iterable[object]) -> str:
    """Give the known word that is closest to a misspelt one, "" if none is close."""
    by_lower = {str(one).lower(): str(one) for one in known}
    found = difflib.get_close_matches(str(word).lower(), by_lower, n=1, cutoff=0.6)
    return by_lower[found[0]] if found else ""


def listed(words: Iterable[object]) -> str:
    """List words for the ``allowed`` of a fault, ``none`` if there are none."""
    said = [str(word) for word in words]
    return ("; " if any("," in word for word in said) else ", ").join(said) or "none"


class _Loader(yaml.SafeLoader):
    """SafeLoader that resolves plain scalars as YAML 1.2 does."""

    yaml_implicit_resolvers: dict[str, Any] = {}  # noqa: RUF012


for _tag, _pattern, _first in (
    ("null", r"~|null|Null|NULL|", ["~", "n", "N", ""]),
    ("bool", r"true|True|TRUE|false|False|FALSE", list("tTfF")),
    ("int", r"[-+]?[0-9]+", list("-+0123456789")),
    (
        "float",
        r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?|[-+]?\.(inf|Inf|INF)|\.(nan|NaN|NAN)",
        list("-+0123456789."),
    ),
    ("merge", r"<<", ["<"]),
):
    _Loader.add_implicit_resolver(
        f"tag:yaml.org,2002:{_tag}", re.compile(rf"(?:{_pattern})\Z"), _first
    )


class _Trouble(Exception):
    """Stop reading with one fault."""

    def __init__(self, line: int, what: str, given: str = "", mend: str = "") -> None:
        self.line, self.what, self.given, self.mend = line, what, given, mend
        super().__init__(what)


def read_yaml(path: Path) -> tuple[Document | None, list[Fault]]:
    """Read a YAML file whose top level is a mapping.

    Parameters
    ----------
    path : Path
        The file.

    Returns
    -------
    document : Document or None
        None if the file cannot be read at all.
    faults : list of Fault
        Everything wrong with the file as YAML; what else is wrong with a document that was
        read all the same may be looked for, but it is not to be used.
    """
    file = str(path)
    text, fault = _read_text(path)
    if text is None:
        return None, [fault] if fault else []
    try:
        root = _compose(text)
        tree = _Tree(file)
        data = tree.value(root, (), 0)
    except _Trouble as trouble:
        return None, [
            Fault(file, trouble.line, trouble.what, given=trouble.given, mend=trouble.mend)
        ]
    except RecursionError:
        return None, [Fault(file, 0, "keys are nested too deep to be read")]
    if not isinstance(data, dict):
        given = "a list" if isinstance(data, list) else repr(data)[:40]
        given = "nothing" if data is None else given
        mend = "begin with keys such as structure:, zones:, members:"
        return None, [Fault(file, 1, "a case file is a mapping of keys", given=given, mend=mend)]
    return Document(file, data, tree.lines, bare=frozenset(tree.bare)), tree.faults


def _read_text(path: Path) -> tuple[str | None, Fault | None]:
    """Read a file as UTF-8, saying what is wrong where that fails."""
    file = str(path)
    try:
        if path.is_dir():
            return None, Fault(file, 0, "this is a folder, not a case file")
        raw = path.read_bytes()
    except FileNotFoundError:
        return None, Fault(file, 0, "there is no such file", mend="check the path")
    except (OSError, ValueError) as error:
        return None, Fault(file, 0, f"the file cannot be opened: {error}")
    if not raw.strip(b"\xef\xbb\xbf \t\r\n"):
        mend = "`assess new NAME` writes a case to begin with"
        return None, Fault(file, 0, "the file is empty", given=f"{len(raw)} bytes", mend=mend)
    save, write = "save it as UTF-8", "write the case in a text editor"
    if raw.startswith((b"\xff\xfe", b"\xfe\xff")):
        return None, Fault(file, 0, "the file is UTF-16 text", allowed="UTF-8", mend=save)
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        if any(byte < 32 and byte not in b"\t\r\n" for byte in raw):
            return None, Fault(file, 0, "the file is not text", allowed="UTF-8 text", mend=write)
        what = "the file is not UTF-8 (it looks like Latin-1)"
        given = repr(raw[error.start : error.start + 1].decode("latin-1"))
        return None, Fault(file, line, what, given=given, allowed="UTF-8", mend=save)
    if "\0" in text:
        return None, Fault(file, 0, "the file is not text", allowed="UTF-8 text", mend=write)
    return text, None


def _compose(text: str) -> yaml.Node:
    """Parse to nodes, with the parser's complaints in plain words."""
    try:
        root = yaml.compose(text, Loader=_Loader)
    except yaml.MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        mend = "check the indentation, colons and quotes of this line and the one before"
        if "'\\t'" in str(error.problem):
            mend = "indent with spaces, not tabs"
        what = f"this is not valid YAML: {error.problem or error.context}"
        raise _Trouble(mark.line + 1 if mark else 0, what, mend=mend) from None
    except yaml.reader.ReaderError as error:
        line = text.count("\n", 0, error.position) + 1
        given = repr(text[error.position : error.position + 1])
        raise _Trouble(line, "a character that may not stand in text", given) from None
    except ValueError as error:  # such as the escape of an impossible character
        raise _Trouble(0, f"this is not valid YAML: {error}") from None
    if root is None:
        raise _Trouble(0, "the file says nothing", "comments only")
    return root


def _odd_tag(node: yaml.Node) -> _Trouble:
    what = "a YAML tag that has no meaning here"
    return _Trouble(_line(node), what, node.tag, "leave the tag out")


class _Tree:
    """Values of a node graph, and the lines they came from."""

    def __init__(self, file: str) -> None:
        self.file = file
        self.lines: dict[Keys, int] = {}
        self.bare: set[Keys] = set()
        self.faults: list[Fault] = []
        self._count = 0

    def value(self, node: yaml.Node, keys: Keys, depth: int) -> Any:
        self._count += 1
        if depth > _DEEPEST or self._count > _MOST_NODES:
            raise _Trouble(_line(node), "keys or aliases are nested too deep to be read")
        if not isinstance(node, yaml.ScalarNode) and node.tag not in _CONTAINERS:
            raise _odd_tag(node)
        if isinstance(node, yaml.MappingNode):
            return self._mapping(node, keys, depth)
        if isinstance(node, yaml.SequenceNode):
            items = []
            for index, item in enumerate(node.value):
                self.lines[(*keys, index)] = _line(item)
                items.append(self.value(item, (*keys, index), depth + 1))
            return items
        return self._scalar(node)

    def _scalar(self, node: yaml.Node) -> Any:
        if node.tag not in _PLAIN:
            raise _odd_tag(node)
        try:
            return _PLAIN[node.tag](str(node.value))
        except ValueError:
            given = str(node.value)[:40]
            raise _Trouble(_line(node), "a value that cannot be read", given) from None

    def _mapping(self, node: yaml.MappingNode, keys: Keys, depth: int) -> dict[Any, Any]:
        values: dict[Any, Any] = {}
        for key, item in self._merged(node, keys, depth) + self._own(node):
            self.lines[(*keys, key)] = _line(item[0])
            if item[0].end_mark.index == item[1].start_mark.index:  # no room for a colon
                self.bare.add((*keys, key))
            values[key] = self.value(item[1], (*keys, key), depth + 1)
        return values

    def _own(self, node: yaml.MappingNode) -> list[tuple[Hashable, tuple[yaml.Node, yaml.Node]]]:
        """List the pairs of a mapping; a key that stands twice is a fault and counts once."""
        seen: dict[Hashable, int] = {}
        pairs: list[tuple[Hashable, tuple[yaml.Node, yaml.Node]]] = []
        for key_node, value_node in node.value:
            if key_node.tag == _MERGE:
                continue
            key, line = self._key(key_node), _line(key_node)
            if key in seen:
                what = f"key {key!r} stands twice, first in line {seen[key]}"
                self.faults.append(Fault(self.file, line, what, mend="keep one of the two"))
                continue  # the first one stands, so that the rest can be looked at
            seen[key] = line
            pairs.append((key, (key_node, value_node)))
        return pairs

    def _key(self, node: yaml.Node) -> Hashable:
        key: Hashable = self._scalar(node) if isinstance(node, yaml.ScalarNode) else None
        if key is None or isinstance(key, bool):
            raise _Trouble(_line(node), "a key must be text or a number", mend="put it in quotes")
        return key

    def _merged(
        self, node: yaml.MappingNode, keys: Keys, depth: int
    ) -> list[tuple[Hashable, tuple[yaml.Node, yaml.Node]]]:
        """List the pairs that ``<<`` brings in; earlier sources win over later ones."""
        pairs: list[tuple[Hashable, tuple[yaml.Node, yaml.Node]]] = []
        own = {self._key(k) for k, _ in node.value if k.tag != _MERGE}
        for key_node, source in node.value:
            if key_node.tag != _MERGE:
                continue
            if depth > _DEEPEST:
                raise _Trouble(_line(source), "keys or aliases are nested too deep to be read")
            several = isinstance(source, yaml.SequenceNode)
            for part in source.value if several else [source]:
                if not isinstance(part, yaml.MappingNode):
                    raise _Trouble(_line(key_node), "<< merges a mapping, or a list of mappings")
                found = self._merged(part, keys, depth + 1) + self._own(part)
                fresh = {k: v for k, v in dict(found).items() if k not in own}
                pairs.extend(fresh.items())
                own.update(fresh)
        return pairs


def _line(node: yaml.Node) -> int:
    return int(node.start_mark.line) + 1
