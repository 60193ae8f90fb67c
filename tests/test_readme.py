from __future__ import annotations

import re
import shutil
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def test_the_examples_run_as_they_stand(tmp_path: Path) -> None:
    # In a process that is not the main program, the sweep of 130 runs does not start.
    blocks = re.findall(r"```python\n(.*?)```", README, flags=re.DOTALL)
    assert len(blocks) == 5
    shutil.copytree(ROOT / "cases", tmp_path / "cases")
    (tmp_path / "examples.py").write_text("\n".join(blocks), encoding="utf-8")
    done = subprocess.run(
        [sys.executable, "-c", "import examples"], cwd=tmp_path, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
    said = done.stdout.splitlines()
    assert len(said) == 4
    assert float(said[0].split()[0]) > 1100


def test_every_command_is_named() -> None:
    from fem.cli import rimefront

    for command in rimefront.commands:
        assert f"rimefront {command}" in README, command


def test_the_two_lines_to_paste_are_one_line_each() -> None:
    blocks = re.findall(r"```sh\n(.*?)```", README, flags=re.DOTALL)
    assert [len(block.strip().splitlines()) for block in blocks[:2]] == [1, 1]
    assert "cases/workshop_bar.toml" in blocks[0]
    assert "pytest" in blocks[1]
