"""Settings of the test run that cannot stand in pyproject.toml."""

from __future__ import annotations

import pytest


def pytest_configure(config: pytest.Config) -> None:
    """Let nbval find the patterns that it takes out of outputs, from whatever folder pytest was started in."""
    if getattr(config.option, "nbval_sanitize_with", "absent") is None:
        config.option.nbval_sanitize_with = str(config.rootpath / "tests" / "nbval_sanitize.cfg")
