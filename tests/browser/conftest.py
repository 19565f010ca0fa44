"""One JupyterLab and one Chromium for all browser tests; skipped where there is no Chromium, unless one is demanded."""

import os
from pathlib import Path

import pytest
from browser.lab_driver import find_chromium, run_all, running_chromium, running_lab, settle

REQUIRE = "VORTEXWIDGETS_REQUIRE_BROWSER"


def missing(reason: str):
    if os.environ.get(REQUIRE) == "1":
        pytest.fail(f"{reason}, and {REQUIRE}=1 demands the browser tests")
    pytest.skip(f"{reason}: apt-get install chromium, pip install 'vortexwidgets[test]'")


@pytest.fixture(scope="module")
def artefacts():
    folder = Path(__file__).parent / "artefacts"
    folder.mkdir(exist_ok=True)
    return folder


@pytest.fixture(scope="module")
def chromium(tmp_path_factory):
    try:
        import playwright  # noqa: F401
    except ImportError:
        missing("playwright is not installed")
    executable = find_chromium()
    if executable is None:
        missing("no Chromium was found")
    with running_chromium(executable, tmp_path_factory.mktemp("profile")) as context:
        yield context


@pytest.fixture(scope="module")
def lab(tmp_path_factory, chromium):
    with running_lab(tmp_path_factory.mktemp("notebooks"), tmp_path_factory.mktemp("lab")) as lab:
        yield lab


@pytest.fixture(scope="module")
def open_panel(lab, chromium):
    """Call with a name and cells: the notebook is written, opened and run; returns its page with the panel drawn."""
    pages = []

    def open_panel(name: str, *cells: str):
        page = lab.open(chromium, lab.write(name, list(cells)))
        pages.append(page)
        errors = run_all(page)
        assert not errors, errors
        page.wait_for_selector(".vx-panel")
        settle(page)
        return page

    yield open_panel
    for page in pages:
        page.close()
