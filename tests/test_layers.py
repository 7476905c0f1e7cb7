"""The folders are the stages of the job and imports point one way; heavy modules load only when used."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parent.parent / "springlife"
# What each folder may import besides itself, in the order of the job.
BASE = {"errors", "units", "published", "files", "tables", "data"}
MAY_IMPORT = {
    "errors": set(),
    "units": {"errors"},
    "published": {"errors", "units"},
    "files": {"errors"},
    "tables": {"errors", "units"},
    "spring": BASE,
    "duty": BASE,
    "strength": BASE,
    "life": BASE | {"spring", "duty", "strength"},
    "report": BASE | {"spring", "duty", "strength", "life"},
    "fleet": BASE | {"spring", "duty", "strength", "life"},
    "cli": BASE | {"spring", "duty", "strength", "life", "report", "fleet"},
}


def imports(file: Path) -> set[str]:
    """Names of our own rooms that a file imports anywhere, inside functions too, but not for types only."""
    tree = ast.parse(file.read_text(encoding="utf-8"))
    found: set[str] = set()
    typing_only = {
        id(node)
        for test in ast.walk(tree)
        if isinstance(test, ast.If) and ast.unparse(test.test) == "TYPE_CHECKING"
        for node in ast.walk(test)
    }
    for node in ast.walk(tree):
        if id(node) in typing_only:
            continue
        if isinstance(node, ast.ImportFrom) and node.module and node.module.startswith("springlife."):
            found.add(node.module.split(".")[1])
        elif isinstance(node, ast.ImportFrom) and node.module == "springlife":
            found |= {alias.name for alias in node.names if (PACKAGE / alias.name).exists()}
        elif isinstance(node, ast.Import):
            found |= {a.name.split(".")[1] for a in node.names if a.name.startswith("springlife.")}
        assert not (isinstance(node, ast.ImportFrom) and node.level), f"{file}: relative import"
    return found


@pytest.mark.parametrize("file", sorted(PACKAGE.rglob("*.py")), ids=lambda f: str(f.relative_to(PACKAGE)))
def test_imports_point_one_way(file: Path) -> None:
    room = file.relative_to(PACKAGE).parts[0].removesuffix(".py")
    if room == "__init__":
        return
    allowed = MAY_IMPORT[room] | {room}
    assert imports(file) <= allowed, f"{room} may not import {imports(file) - allowed}"


def loaded_after(code: str) -> set[str]:
    script = f"import sys\n{code}\nprint('\\n'.join(sys.modules))"
    run = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    return set(run.stdout.split())


def test_importing_the_package_loads_nothing_heavy() -> None:
    heavy = {
        "numpy",
        "pandas",
        "scipy",
        "matplotlib",
        "numba",
        "pint",
        "pydantic",
        "rich",
        "pyarrow",
        "jinja2",
        "typst",
    }
    assert not heavy & loaded_after("import springlife")


def test_help_loads_nothing_heavy() -> None:
    code = "from springlife.cli import _parser\n_parser().format_help()"
    heavy = {"numpy", "pandas", "scipy", "matplotlib", "numba", "pint", "pydantic", "rich"}
    assert not heavy & loaded_after(code)


def test_a_plain_assess_loads_neither_plots_nor_statistics_nor_the_compiler() -> None:
    case = PACKAGE.parent / "loadcases" / "forwarder-seat" / "case.toml"
    code = (
        "import io, contextlib\nfrom springlife.cli import main\n"
        f"with contextlib.redirect_stdout(io.StringIO()):\n    main(['assess', {str(case)!r}])"
    )
    assert not {"matplotlib.pyplot", "scipy.stats", "numba", "pandas"} & loaded_after(code)


def test_every_public_name_loads() -> None:
    import springlife

    assert all(getattr(springlife, name) is not None for name in springlife.__all__)
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        springlife.nothing  # noqa: B018 - the access is the test
