"""A file imports only what stands above it in the house plan."""

import ast
import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "vortexwidgets"

# The order of the house: a module imports only from lines above its own. __init__ files hold no code that imports.
ORDER = [
    "quantities",
    "formatting",
    "uncertainty",
    "units",
    "models.kernels",
    "models.model",
    "models.catalogue",
    "models.agreement",
    "models.notation",
    "models.derivation",
    "models.vortex",
    "fluid_equations",
    "property_library",
    "fluids",
    "survey.samples",
    "survey.survey",
    "survey.columns",
    "survey.table",
    "survey.facts",
    "survey.scaling",
    "survey.assembly",
    "survey.grid",
    "survey.reading",
    "survey.screening",
    "survey.instrument",
    "fitting.kept",
    "fitting.problem",
    "fitting.elimination",
    "fitting.separable",
    "fitting.limits",
    "fitting.starting",
    "fitting.result",
    "fitting.fit",
    "fitting.ranking",
    "data_drop",
    "core_pressure",
    "plots.style",
    "consequences",
    "plots.profile",
    "plots.survey",
    "plots.plane",
    "plots.result",
    "record.texts",
    "record.maths",
    "record.figures",
    "record.page",
    "record.values",
    "record.saving",
    "circumstances",
    "cautions",
    "appraisal",
    "widgets.state",
    "widgets.controls",
    "widgets.frame",
    "widgets.whole_frames",
    "widgets.canvas",
    "widgets.panel",
    "widgets.vortex_controls",
    "widgets.model_panel",
    "widgets.survey_figure",
    "widgets.survey_panel",
    "widgets.facts_controls",
    "widgets.survey_source",
    "widgets.model_choice",
    "widgets.record_controls",
    "widgets.job_text",
    "widgets.appraisal_page",
    "widgets.appraisal_panel",
    "command",
]


def rank(module: str) -> int:
    name = module.removeprefix("vortexwidgets.")
    for position, line in enumerate(ORDER):
        if name == line or name.startswith(line + "."):
            return position
    return -1


def modules():
    for path in sorted(PACKAGE.rglob("*.py")):
        parts = path.relative_to(PACKAGE).with_suffix("").parts
        if parts[-1] != "__init__":
            yield pytest.param(path, ".".join(parts), id=".".join(parts))


@pytest.mark.parametrize(("path", "module"), list(modules()))
def test_a_module_imports_only_from_above(path, module):
    own = rank(module)
    assert own >= 0, f"{module} has no place in the house plan: add it to ORDER"
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        names = []
        if isinstance(node, ast.ImportFrom) and node.module and node.module.startswith("vortexwidgets"):
            names = [f"{node.module}.{alias.name}" for alias in node.names]
        elif isinstance(node, ast.Import):
            names = [alias.name for alias in node.names if alias.name.startswith("vortexwidgets")]
        for name in names:
            other = rank(name)
            inside = module.startswith("consequences") and name.startswith("vortexwidgets.consequences")
            assert other < own or inside, f"{module} imports {name}, which stands below or beside it"


def test_the_order_names_only_files_that_exist():
    for line in ORDER:
        path = PACKAGE.joinpath(*line.split("."))
        assert path.with_suffix(".py").exists() or path.is_dir(), line


def test_importing_the_package_loads_no_heavy_library():
    code = (
        "import sys, vortexwidgets; heavy = {'sympy', 'scipy', 'matplotlib', 'ipywidgets', 'pint'} & set(sys.modules);"
        "sys.exit(f'loaded at import: {sorted(heavy)}' if heavy else 0)"
    )
    result = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert result.returncode == 0, result.stderr
