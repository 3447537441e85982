"""The house: what each part of the library may import.  ``HOUSE`` is the single statement of the rule."""

import ast
import subprocess
import sys
from pathlib import Path
from typing import NamedTuple

import pytest
import scission

ROOT = Path(scission.__file__).parent
PROJECT = ROOT.parents[1]


class Room(NamedTuple):
    """What a part may import: other parts (all of them stand above it in ``HOUSE``), and packages."""

    parts: str = ""
    packages: str = ""


HOUSE: dict[str, Room] = {
    # numbers and plain data
    "units": Room(),
    "physics": Room(),
    "solution": Room(packages="numpy"),
    "masses": Room("units"),
    "thresholds": Room(),
    "diagnostics": Room("solution units", "numpy"),
    "geometry": Room("units", "numpy"),
    # what is to be computed
    "campaign": Room("units geometry diagnostics thresholds", "numpy pydantic yaml"),
    "records": Room("", "numpy h5py"),
    "forecast": Room("campaign records"),
    "plan": Room("campaign geometry forecast physics diagnostics", "numpy"),
    # computing, and what is kept of it
    "chemistry": Room("campaign plan physics solution diagnostics records units", "numpy h5py pyscf scipy"),
    # making sense of it
    "curves": Room("units", "numpy scipy lmfit"),
    "verdict": Room("thresholds", "numpy scipy"),
    "tables": Room("records", "numpy pandas pyarrow"),
    "analysis": Room(
        "campaign curves diagnostics geometry masses plan records tables thresholds units verdict",
        "numpy pandas",
    ),
    "report": Room("analysis curves diagnostics records tables thresholds units", "numpy pandas matplotlib"),
    # running it
    "handover": Room("records tables units", "numpy h5py pandas pyarrow xarray"),
    "execution": Room("analysis campaign chemistry diagnostics plan records report tables", "psutil yaml"),
    "cli": Room("campaign diagnostics execution forecast handover tables"),
}
"""Every part of the library, lowest first."""


def files():
    """Every module of the library with the part it belongs to; the package's own file belongs to none."""
    for path in sorted(ROOT.rglob("*.py")):
        part = path.relative_to(ROOT).parts[0].removesuffix(".py")
        if part != "__init__":
            yield part, path


def imports(path):
    """The modules that a file imports when it runs; what only the type checker reads does not count."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    typing_only = {
        id(inner)
        for node in ast.walk(tree)
        if isinstance(node, ast.If) and ast.unparse(node.test).endswith("TYPE_CHECKING")
        for statement in node.body
        for inner in ast.walk(statement)
    }
    for node in ast.walk(tree):
        if id(node) in typing_only:
            continue
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.level == 0:
            one_by_one = node.module == "scission"
            yield from (f"scission.{a.name}" for a in node.names) if one_by_one else [str(node.module)]
        elif isinstance(node, ast.ImportFrom):
            assert node.level <= len(path.relative_to(ROOT).parts) - 1, f"{path}: an import leaves its part"


def top(module):
    """(part, "") of an own module, ("", package) of anybody else's."""
    words = module.split(".")
    return (words[1] if len(words) > 1 else "", "") if words[0] == "scission" else ("", words[0])


def trespasses(part, path):
    """The imports of a file that its part's row does not allow."""
    room = HOUSE[part]
    parts, packages = {part, *room.parts.split()}, {*room.packages.split(), *sys.stdlib_module_names}
    for module in imports(path):
        own, foreign = top(module)
        if (own in HOUSE and own not in parts) or (foreign and foreign not in packages):
            yield f"{path.relative_to(ROOT)} imports {module}"


def test_every_part_has_a_row():
    """The table lists the parts of the library, no more and no fewer."""
    assert {part for part, _ in files()} == set(HOUSE)


def test_arrows_go_one_way():
    """A part imports only parts that stand above it in the table, so there is no circle."""
    names = list(HOUSE)
    upward = [
        (part, other)
        for i, part in enumerate(names)
        for other in HOUSE[part].parts.split()
        if other not in names[:i]
    ]

    assert upward == []


@pytest.mark.parametrize("part", HOUSE)
def test_a_part_imports_what_its_row_allows(part):
    """No file of a part imports another part or package than its row says, inside functions or outside."""
    assert [t for owner, path in files() if owner == part for t in trespasses(part, path)] == []


@pytest.mark.parametrize(
    ("package", "owner"), [("pyscf", "chemistry"), ("lmfit", "curves"), ("matplotlib", "report")]
)
def test_a_package_has_one_owner(package, owner):
    """The engine, the fitter and the painter can be replaced in one place each."""
    assert [part for part, room in HOUSE.items() if package in room.packages.split()] == [owner]


def test_scripts_are_thin():
    """Scripts of rules import the runner only and stay below 40 lines."""
    for path in sorted((PROJECT / "scripts").glob("*.py")):
        owners = {top(module)[0] for module in imports(path)} - {""}

        assert owners <= {"execution", "cli"}, path.name
        assert len(path.read_text(encoding="utf-8").splitlines()) <= 40, path.name


@pytest.mark.parametrize(
    "module", ["scission.cli", "scission.plan", "scission.execution.worker", "scission.analysis"]
)
def test_no_engine_is_loaded_where_nothing_is_computed(module):
    """Commands, plans, supervising workers and the analysis do not pay for importing the engine."""
    program = f"import sys, {module}; print('pyscf' in sys.modules)"
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=True, timeout=60
    )

    assert done.stdout.strip() == "False"
