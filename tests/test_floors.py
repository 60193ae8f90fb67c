from __future__ import annotations

from pathlib import Path

from importlinter.cli import EXIT_STATUS_SUCCESS, lint_imports


def test_imports_go_down_only() -> None:
    root = Path(__file__).parent.parent
    assert lint_imports(config_filename=str(root / "pyproject.toml"), no_cache=True) == EXIT_STATUS_SUCCESS
