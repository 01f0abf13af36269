"""The rules of the house: who may import whom, sizes, public names, no leftovers."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
PACKAGE = ROOT / "pvfeas"
FILES = sorted(PACKAGE.rglob("*.py"))

# From the bottom up; a module may import from its own layer's earlier entries and from lower layers.
NUMBER_HALF = (
    ("errors", "constants", "keys", "options", "generating_vector", "showing", "suggestions"),
    ("laws", "results"),
    ("widths", "line"),
    ("frequency_noise", "patterns", "switching_noise", "tables", "profiles", "thresholds"),
    ("techniques", "centre_bounds", "limits", "systematics", "schedule"),
    ("problem", "reference", "averaging", "decision"),
    ("points", "conditional", "quantiles", "nominal", "roots", "summaries"),
    ("realisation", "required", "estimator", "linear", "monte_carlo", "integration"),
    ("questions",),
)
TEXT_LIBRARIES = {"pydantic", "pint"}
RENDERING = ("output", "plots")
RENDERING_MAY_IMPORT = {"results", "errors", "output", "plots", "options", "resources", "showing", "__version__"}


def module_name(path: Path) -> str:
    return path.relative_to(PACKAGE).with_suffix("").parts[0]


def imports(path: Path) -> set[str]:
    """Every module that a file imports, functions included, type-checking blocks too."""
    found: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module:
            found.add(node.module)
            if node.module == "pvfeas":
                found |= {f"pvfeas.{alias.name}" for alias in node.names}
    return found


def own(path: Path) -> set[str]:
    return {name.split(".")[1] for name in imports(path) if name.startswith("pvfeas.")}


def layer_of(module: str) -> int | None:
    return next((i for i, layer in enumerate(NUMBER_HALF) if module in layer), None)


@pytest.mark.parametrize("path", FILES, ids=lambda p: str(p.relative_to(PACKAGE)))
def test_sizes(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    assert len(text.splitlines()) <= 500
    for node in ast.walk(ast.parse(text)):
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef):
            assert (node.end_lineno or node.lineno) - node.lineno < 80, node.name


@pytest.mark.parametrize("path", FILES, ids=lambda p: str(p.relative_to(PACKAGE)))
def test_import_order(path: Path) -> None:
    module = module_name(path)
    layer = layer_of(module)
    if layer is not None:
        assert not {name.split(".")[0] for name in imports(path)} & TEXT_LIBRARIES
        for other in own(path):
            assert layer_of(other) is not None, f"{module} is of the number half and imports {other}"
            assert layer_of(other) <= layer, f"{module} imports {other}, which stands above it"
    if module in RENDERING:
        assert own(path) <= RENDERING_MAY_IMPORT
    if module not in ("commands", "cli", "__main__"):
        assert not own(path) & {"commands", "cli"}
        assert "click" not in imports(path)


def test_number_half_loads_without_text_libraries() -> None:
    code = (
        "import sys, pvfeas.questions.assess, pvfeas.questions.compare, pvfeas.questions.curves;"
        "print([m for m in ('pydantic', 'pint', 'matplotlib', 'rich', 'click', 'scipy.stats') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


@pytest.mark.parametrize("path", FILES, ids=lambda p: str(p.relative_to(PACKAGE)))
def test_no_pyplot_and_only_the_command_line_prints(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    assert "pyplot" not in imports(path)
    assert "matplotlib.pyplot" not in imports(path)
    if module_name(path) not in ("commands", "cli", "__main__"):
        calls = [n for n in ast.walk(ast.parse(text)) if isinstance(n, ast.Call) and isinstance(n.func, ast.Name)]
        assert "print" not in {c.func.id for c in calls if isinstance(c.func, ast.Name)}


@pytest.mark.parametrize("path", FILES, ids=lambda p: str(p.relative_to(PACKAGE)))
def test_every_module_and_public_name_is_documented(path: Path) -> None:
    tree = ast.parse(path.read_text(encoding="utf-8"))
    if not tree.body:
        return
    assert ast.get_docstring(tree), "module docstring"
    for node in tree.body:
        if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_"):
            assert ast.get_docstring(node), node.name


def test_public_names() -> None:
    import pvfeas

    assert set(pvfeas.__all__) <= set(dir(pvfeas))
    for name in pvfeas.__all__:
        assert getattr(pvfeas, name) is not None


def test_top_level() -> None:
    allowed = {"README.md", "DEVELOPERS.md", "pyproject.toml", "LICENSE", "pvfeas", "tests", "data"}
    tracked = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=True)
    tops = {line.split("/")[0] for line in tracked.stdout.splitlines()}
    assert {top for top in tops if not top.startswith(".")} <= allowed
