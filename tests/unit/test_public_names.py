from __future__ import annotations

import ast
import importlib
import json
import subprocess
import sys
from pathlib import Path
from pkgutil import iter_modules

import pytest

import kn_integrate

HEAVY = ("numpy", "scipy", "numba", "mpmath", "flint", "matplotlib")


def loaded_by(code: str) -> set[str]:
    """The top-level modules that a fresh interpreter has after running this code."""
    script = f"{code}\nimport sys, json; print(json.dumps(sorted(sys.modules)), file=sys.stderr)"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    return {name.split(".")[0] for name in json.loads(done.stderr.splitlines()[-1])}


def static_imports() -> dict[str, set[str]]:
    """What the block for type checkers imports, by module."""
    tree = ast.parse(Path(kn_integrate.__file__).read_text(encoding="utf-8"))
    blocks = [node for node in tree.body if isinstance(node, ast.If) and ast.unparse(node.test) == "TYPE_CHECKING"]
    assert len(blocks) == 1
    return {str(node.module): {item.name for item in node.names} for node in blocks[0].body}  # type: ignore[attr-defined]


def test_table_imports_and_all_name_the_same_things():
    homes = {module: set(names) for module, names in kn_integrate._HOMES.items()}
    assert homes == static_imports()
    assert set().union(*homes.values()) | {"__version__"} == set(kn_integrate.__all__)
    assert len(kn_integrate.__all__) == len(set(kn_integrate.__all__))


@pytest.mark.parametrize("name", [name for name in kn_integrate.__all__ if name != "__version__"])
def test_every_public_name_is_what_its_home_defines(name):
    home = importlib.import_module(f"kn_integrate.{kn_integrate._MODULE_OF[name]}")
    assert getattr(kn_integrate, name) is getattr(home, name)
    assert name in dir(kn_integrate)


def test_no_public_name_is_also_a_module():
    # Importing kn_integrate.x sets the attribute x of the package, which would hide a public x.
    modules = {module.name for module in iter_modules(kn_integrate.__path__)}
    assert not modules & set(kn_integrate.__all__)


def test_unknown_name_is_an_attribute_error():
    with pytest.raises(AttributeError, match="no attribute 'disc_integral'"):
        _ = kn_integrate.disc_integral


def test_importing_the_package_loads_no_numerical_library():
    assert not loaded_by("import kn_integrate") & set(HEAVY)
    assert not loaded_by("from kn_integrate import InputError, PoleError, Status, Estimate") & set(HEAVY)


@pytest.mark.parametrize(
    "args", [["--help"], ["disk", "--help"], ["info", "--help"], ["--version"], ["disk", "--n", "x"]]
)
def test_help_version_and_bad_flags_load_no_numerical_library(args):
    code = f"from kn_integrate.cli import main\ntry: main({args!r})\nexcept SystemExit: pass"
    loaded = loaded_by(code)
    assert "click" in loaded
    assert not loaded & set(HEAVY)


def test_citation_names_this_version():
    citation = Path(__file__).resolve().parents[2] / "CITATION.cff"
    assert f"\nversion: {kn_integrate.__version__}\n" in citation.read_text(encoding="utf-8")
