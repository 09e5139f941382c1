"""The shape of the house, read from the source itself (DEVELOPERS.md, "The house")."""

from __future__ import annotations

import ast
import io
import tokenize
from pathlib import Path

import pytest

import geomap

PACKAGE = Path(geomap.__file__).parent
MODULES = sorted(PACKAGE.rglob("*.py"))
STAGES = {"readers", "intake", "soils", "ratings", "alignment"}
LEAVES = {"tables", "units", "errors"}
EVERYTHING = STAGES | LEAVES | {"geostat", "ground", "profile", "exports", "results", "registry", "corridor", "layers"}

# Who may import whom. A part is a package, or a module at the top.
ARROWS = {
    "__init__": {"gate", "pipeline", "results", "soils", "errors"},  # for type checkers; loaded when asked for
    "__main__": {"cli"},
    "cli": {"pipeline", "gate", "lab_table", "catalog", "starter", "exports", "errors"},
    "lab_table": {"readers", "intake", "soils", "exports", "registry", "tables", "errors"},
    "pipeline": EVERYTHING | {"inputs", "gate"},
    "gate": EVERYTHING - {"exports", "results", "layers", "geostat"} | {"inputs"},
    "inputs": {"catalog", "corridor", "registry", "readers", "alignment", "soils", "ratings", *LEAVES},
    "layers": {"results", "gate", "inputs", "corridor", "ground", "profile", *LEAVES},
    "catalog": {"readers", "soils", "ratings", "exports"},
    "starter": {"corridor", "corridor_text", "tables", "errors"},
    "corridor": {"corridor_checks", "corridor_text", "errors"},
    "corridor_checks": {"corridor_text", "registry", "tables", "errors"},
    "corridor_text": {"registry", "errors"},
    "registry": {"errors"},
    "results": {"tables", "errors"},
    "tables": set(),
    "units": set(),
    "errors": set(),
    "geostat": {"errors"},
    **dict.fromkeys(STAGES, LEAVES),
    "ground": {"geostat", *LEAVES},
    "profile": {"alignment", *LEAVES},
    "exports": {"results", *LEAVES},
}
MOST_MODULE_LINES = 250
MOST_FUNCTION_LINES = 50
MOST_PIPELINE_LINES = 150
BANNED_NAMES = {"utils", "helpers", "common", "core", "manager", "engine", "misc"}
ID = [str(m.relative_to(PACKAGE)) for m in MODULES]


def part_of(path: Path) -> str:
    first = path.relative_to(PACKAGE).parts[0]
    return first.removesuffix(".py")


def imported_parts(tree: ast.AST) -> set[str]:
    """Parts of geomap that a module imports, wherever the import stands."""
    found = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.ImportFrom):
            assert node.level == 0, "relative imports hide an arrow"
            if node.module == "geomap":
                found |= {alias.name for alias in node.names} - {"__version__"}
            elif node.module and node.module.startswith("geomap."):
                found.add(node.module.split(".")[1])
        elif isinstance(node, ast.Import):
            found |= {a.name.split(".")[1] for a in node.names if a.name.startswith("geomap.")}
    return found


def code_lines(source: str) -> set[int]:
    """Numbers of the lines that hold code: no comment, blank line or docstring."""
    lines: set[int] = set()
    skipped = {tokenize.COMMENT, tokenize.NL, tokenize.NEWLINE, tokenize.INDENT, tokenize.DEDENT, tokenize.ENDMARKER}
    for token in tokenize.generate_tokens(io.StringIO(source).readline):
        if token.type not in skipped:
            lines |= set(range(token.start[0], token.end[0] + 1))
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.Module | ast.ClassDef | ast.FunctionDef) and ast.get_docstring(node, clean=False):
            lines -= set(range(node.body[0].lineno, (node.body[0].end_lineno or 0) + 1))
    return lines


def forbidden(path: Path, tree: ast.AST) -> set[str]:
    part = part_of(path)
    return imported_parts(tree) - ARROWS[part] - {part}


@pytest.mark.parametrize("module", MODULES, ids=ID)
def test_imports_follow_the_arrows(module: Path) -> None:
    assert not forbidden(module, ast.parse(module.read_text("utf-8")))


def test_a_planted_wrong_import_is_caught() -> None:
    planted = ast.parse("def late():\n    from geomap.exports import geopackage\n")
    assert forbidden(PACKAGE / "soils" / "planted.py", planted) == {"exports"}


@pytest.mark.parametrize("module", MODULES, ids=ID)
def test_modules_and_functions_stay_short(module: Path) -> None:
    source = module.read_text("utf-8")
    lines = code_lines(source)
    most = MOST_PIPELINE_LINES if module.name == "pipeline.py" else MOST_MODULE_LINES
    assert len(lines) <= most, f"{len(lines)} code lines"
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.FunctionDef):
            body = {n for n in lines if node.body[0].lineno <= n <= (node.end_lineno or 0)}
            assert len(body) <= MOST_FUNCTION_LINES, f"{node.name}: {len(body)} code lines"


def test_every_part_has_its_arrows_and_a_telling_name() -> None:
    assert {part_of(m) for m in MODULES} == set(ARROWS)
    assert not {p for m in MODULES for p in (*m.relative_to(PACKAGE).parts[:-1], m.stem)} & BANNED_NAMES


@pytest.mark.parametrize("module", [m for m in MODULES if part_of(m) != "cli"], ids=str)
def test_only_the_command_line_prints_or_exits(module: Path) -> None:
    for node in ast.walk(ast.parse(module.read_text("utf-8"))):
        called = ast.unparse(node.func) if isinstance(node, ast.Call) else ""
        assert called not in ("print", "exit", "sys.exit", "click.echo"), f"line {node.lineno}"
