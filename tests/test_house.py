"""The house keeps its order: imports go one way, one module meets the solver, nothing stands about."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).parent.parent
PACKAGE = ROOT / "partpick"

# Each stage may import from itself and from those before it.
STAGES = [
    {"errors", "units", "reading", "quantities", "preferred", "progress", "parts", "request", "result", "connection"},
    {"physics"},
    {"tuning", "ratings"},
    {"plankeys", "plantables", "planfile"},
    {"report.files"},  # whole files or none: outputs and the starter share it
    {"catalogue", "catalogue_cells", "catalogue_defaults", "catalogue_labels", "catalogue_rows", "catalogue_table"},
    {"starter"},
    {"forms", "moved", "candidates"},
    {"search"},
    {"objective", "oscillating", "matching", "tapping", "trimming"},
    {"stressed", "rating_words", "tuning_range", "unstated"},
    {"circuit", "band_switch", "layouts", "receiver", "moved_figures", "assessment", "loads", "tank_figures",
     "oscillator_figures", "tracking_figures", "load_words", "coupling_figures", "fronts", "nothing_fits", "cover",
     "ladder", "ladder_field", "ladder_figures"},
    {"built", "cautions", "conduction", "stress"},
    {"audit"},
    {"solving"},
    {"report"},
    {"frames"},
    {"rendering", "batch"},
    {"terminal", "options", "jobs", "cli", "__main__", "__init__"},
]


def stage_of(module: str) -> int:
    parts = module.split(".")
    if ".".join(parts[:2]) == "report.files":
        return next(i for i, names in enumerate(STAGES) if "report.files" in names)
    for place, names in enumerate(STAGES):
        if parts[0] in names:
            return place
    raise AssertionError(f"{module} has no place in the house: add it to STAGES")


def imports_of(path: Path) -> list[str]:
    found = []
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.ImportFrom) and node.module:
            found += [f"{node.module}.{alias.name}" for alias in node.names]
        elif isinstance(node, ast.Import):
            found += [alias.name for alias in node.names]
    return found


def modules() -> dict[str, list[str]]:
    return {
        ".".join(path.relative_to(PACKAGE).with_suffix("").parts): imports_of(path)
        for path in sorted(PACKAGE.rglob("*.py"))
    }


def test_imports_go_one_way() -> None:
    """A stage that reaches forward would tie the house into a knot."""
    for module, imported in modules().items():
        if module == "__init__":
            continue
        for name in imported:
            if name.startswith("partpick.") and name != "partpick.__version__":
                target = name.removeprefix("partpick.")
                assert stage_of(target) <= stage_of(module), f"{module} imports {target}"


def test_physics_imports_nothing_from_the_rest() -> None:
    """Formulas stand by themselves."""
    for module, imported in modules().items():
        if module.startswith("physics."):
            assert all(n.startswith("partpick.physics") for n in imported if n.startswith("partpick")), module


def test_one_module_meets_the_solver() -> None:
    """The solver lives behind a wall."""
    assert [m for m, names in modules().items() if any(n.startswith("ortools") for n in names)] == ["search.cpsat"]


def test_the_top_level_holds_what_the_design_names() -> None:
    """Nothing else stands at the top."""
    listed = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=False)
    if listed.returncode != 0:
        return  # an unpacked source archive has no list of its own
    top = {line.split("/")[0] for line in listed.stdout.splitlines()}
    plain = {name for name in top if not name.startswith(".")}
    assert plain <= {"README.md", "DEVELOPERS.md", "pyproject.toml", "LICENSE", "partpick", "data", "tests"}


def test_the_catalogue_is_found_from_any_folder(tmp_path: Path) -> None:
    """An installed package, an editable one and a checkout all bring the shipped parts."""
    code = "from partpick.catalogue import load_catalogue; print(len(load_catalogue(None).capacitors))"
    run = subprocess.run(
        [sys.executable, "-c", code],
        cwd=tmp_path,
        capture_output=True,
        text=True,
        check=False,
        env={"PYTHONPATH": str(ROOT), "PATH": "/usr/bin:/bin"},
    )
    assert run.returncode == 0 and int(run.stdout) > 100, run.stderr
