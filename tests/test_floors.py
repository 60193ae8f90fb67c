from __future__ import annotations

import subprocess
import sys
from pathlib import Path


def test_imports_go_down_only() -> None:
    # In a process of its own: the linter switches off every logger that it finds.
    command = [sys.executable, "-c", "from importlinter.cli import lint_imports_command as run; run()"]
    root = Path(__file__).parent.parent
    done = subprocess.run([*command, "--no-cache"], cwd=root, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout
