"""Every public function and class says what it does, and every number or array it documents has its unit.

Read from the source with `ast`: nothing is imported, nothing runs.
"""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "pertcalc"
FILES = sorted(PACKAGE.rglob("*.py"))
SECTIONS_WITH_UNITS = ("Parameters", "Returns")
# "name : float", "v, b : array, shape (...)"; the type decides whether a unit is due.
ENTRY = re.compile(r"^[A-Za-z_]\w*(\s*,\s*[A-Za-z_]\w*)*\s*:\s*(?P<type>.+)$")
NUMERIC = re.compile(r"\b(float|complex|array|ndarray|array_like|ArrayLike|Array)\b")
# "[cm^-1]" stands alone; the bracket of list[float] touches a word and is no unit.
UNIT = re.compile(r"(?<![\w\]])\[[^\]\[]+\]")


def is_declaration(node: ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef) -> bool:
    """Attributes in disguise: properties and the `...` members of a Protocol, which their class describes."""
    if isinstance(node, ast.ClassDef):
        return False
    ellipsis = [ast.unparse(statement) for statement in node.body] == ["..."]
    return ellipsis or any(ast.unparse(decorator).endswith("property") for decorator in node.decorator_list)


def definitions(path: Path) -> Iterator[tuple[str, ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef]]:
    """Public functions, classes and methods of a file, with their dotted names; nested functions are private."""
    pending: list[tuple[str, ast.AST]] = [("", ast.parse(path.read_text(encoding="utf-8")))]
    while pending:
        prefix, owner = pending.pop()
        for node in ast.iter_child_nodes(owner):
            if not isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef) or node.name.startswith("_"):
                continue
            if not is_declaration(node):
                yield prefix + node.name, node
            if isinstance(node, ast.ClassDef):
                pending.append((f"{prefix}{node.name}.", node))


def entries(docstring: str) -> Iterator[tuple[str, str]]:
    """(head line, whole text) of each entry in the sections that must carry units."""
    lines = docstring.splitlines()
    section, head, text = "", "", ""
    for number, line in enumerate(lines):
        underlined = number + 1 < len(lines) and re.fullmatch(r"-{3,}", lines[number + 1].strip())
        if underlined or (line and not line[0].isspace() and ENTRY.match(line) and section in SECTIONS_WITH_UNITS):
            if head:
                yield head, text
            head, text = ("", "") if underlined else (line, line)
            section = line.strip() if underlined else section
        elif head and (not line.strip() or line[0].isspace()):
            text += "\n" + line
    if head:
        yield head, text


def missing_units(docstring: str) -> list[str]:
    """Heads of the numeric entries without a [unit]."""
    missing = []
    for head, text in entries(docstring):
        match = ENTRY.match(head)
        if match and NUMERIC.search(match["type"]) and not UNIT.search(text):
            missing.append(head)
    return missing


def identify(path: Path) -> str:
    return str(path.relative_to(PACKAGE))


@pytest.mark.parametrize("path", FILES, ids=identify)
def test_public_names_have_docstrings(path):
    assert ast.get_docstring(ast.parse(path.read_text(encoding="utf-8"))), f"{identify(path)} has no module docstring"
    bare = [name for name, node in definitions(path) if not ast.get_docstring(node)]
    assert not bare, f"{identify(path)}: no docstring on {', '.join(bare)}"


@pytest.mark.parametrize("path", FILES, ids=identify)
def test_documented_numbers_have_units(path):
    documented = [(name, ast.get_docstring(node) or "") for name, node in definitions(path)]
    problems = [f"{name}: {head.strip()!r}" for name, docstring in documented for head in missing_units(docstring)]
    assert not problems, f"{identify(path)}: no [unit] ([1] if it has none) on " + "; ".join(problems)


EXAMPLE = """One sentence.

Parameters
----------
T : float
    Temperature; > 0.
n : array, shape (...)
    Density [cm^-3].
rates : list[float]
    No unit here, only a type in brackets.
count : int
    Whole numbers need none.

Returns
-------
v : ndarray, shape (n,)
    Speed, no unit.

Notes
-----
x : float is prose here [1].
"""


def test_the_checker_sees_what_it_must():
    assert missing_units(EXAMPLE) == ["T : float", "rates : list[float]", "v : ndarray, shape (n,)"]
    assert missing_units(EXAMPLE.replace("Temperature;", "Temperature [K];")) == missing_units(EXAMPLE)[1:]
