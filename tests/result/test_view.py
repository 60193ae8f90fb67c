from __future__ import annotations

import subprocess
import sys
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner
from PIL import Image

from fem.cli import rimefront
from fem.errors import CaseError
from fem.result import view
from fem.result.view import CannotDraw, picture, window
from fem.run import run
from tests.pieces import small


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("view") / "out"
    with np.errstate(all="raise", under="ignore"):
        run(small("stages.freeze.lasts=120 s", "watch.frames=60 s"), path)
    return path


def child_ends(
    monkeypatch: pytest.MonkeyPatch, code: int, said: str = "", error: str = ""
) -> list[dict[str, Any]]:
    """Let the child end as told; return what it was asked, which the call fills."""
    asked: list[dict[str, Any]] = []

    def ended(command: list[str], **_: Any) -> subprocess.CompletedProcess[str]:
        asked.append({"command": command})
        return subprocess.CompletedProcess(command, code, said, error)

    monkeypatch.setattr(view, "subprocess", SimpleNamespace(run=ended))
    return asked


def drawn(folder: Path, out: Path, *what: Any) -> bool:
    """Draw where there is a graphics library; elsewhere the refusal has to name what is missing."""
    try:
        picture(folder, out, *what)
    except CannotDraw as refused:
        said = str(refused)
    else:
        return True
    assert "libegl1" in said
    assert "complete" in said
    assert not out.exists()
    return False


def test_a_picture_shows_the_section_or_a_sentence_says_what_is_missing(folder: Path, tmp_path: Path) -> None:
    out = tmp_path / "map.png"
    if not drawn(folder, out):
        return
    image = np.asarray(Image.open(out).convert("RGB")).astype(int)
    high, wide = image.shape[:2]
    assert high > wide
    coloured = np.ptp(image, axis=2) > 20
    # The section is drawn in colours, symmetrical to a pixel or two of its outline, on white.
    assert coloured[60:860].mean() > 0.5
    assert np.all(image[5:50, wide // 2 :] == 255)
    rows = slice(90, 830)
    gap = np.abs(image[rows] - image[rows, ::-1]).max(axis=2)
    assert np.mean(gap > 12) < 0.02
    # Cold at the rim, warm in the core: the palette rises from blue to yellow.
    middle = image[460, wide // 2]
    rim = image[460, 48]
    assert middle[0] > rim[0] + 40


def test_another_field_at_another_time_gives_another_picture(folder: Path, tmp_path: Path) -> None:
    pictures = []
    for number, (array, time) in enumerate([("ice", 60.0), ("ice", 120.0)]):
        out = tmp_path / f"{number}.png"
        if not drawn(folder, out, array, time):
            return
        pictures.append(out.read_bytes())
    assert pictures[0] != pictures[1]


def test_an_array_that_is_not_there_is_refused_with_those_that_are(folder: Path, tmp_path: Path) -> None:
    with pytest.raises(CaseError, match='did you mean "temperature_degC"') as refused:
        picture(folder, tmp_path / "map.png", "temperature")
    assert refused.value.problems[0].place == "--array"
    with pytest.raises(CaseError, match="at 60 s holds no array"):
        picture(folder, tmp_path / "map.png", "frozen_at_s", 60.0)
    assert not (tmp_path / "map.png").exists()


def test_a_folder_without_fields_is_refused(tmp_path: Path) -> None:
    with pytest.raises(CaseError, match="holds no fields"):
        picture(tmp_path, tmp_path / "map.png")
    with pytest.raises(CaseError, match="no such folder"):
        picture(tmp_path / "nowhere", tmp_path / "map.png")


def test_a_picture_that_cannot_be_written_is_an_error_with_its_name(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    with pytest.raises(FileNotFoundError) as failed:
        picture(folder, tmp_path / "nowhere" / "map.png")
    assert failed.value.filename == str(tmp_path / "nowhere" / "map.png")
    # Of two things that are missing the folder is named first.
    child_ends(monkeypatch, -11, "drawing\n")
    with pytest.raises(FileNotFoundError):
        picture(folder, tmp_path / "nowhere" / "map.png")


def test_a_crash_of_the_child_says_which_library_to_install(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    # What vtk does where no graphics library is installed: a segmentation fault.
    child_ends(monkeypatch, -11, "drawing\n", "")
    with pytest.raises(
        CannotDraw, match=r"no OpenGL library was found .*apt-get install libegl1 libgl1"
    ) as e:
        picture(folder, tmp_path / "map.png")
    assert f"The files in {folder} are complete" in str(e.value)


def test_a_crash_before_drawing_is_not_blamed_on_the_graphics_library(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    child_ends(monkeypatch, -11)
    with pytest.raises(CaseError, match="cut short or damaged"):
        picture(folder, tmp_path / "map.png")


def test_whatever_else_the_child_dies_of_is_said(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    child_ends(monkeypatch, 1, "", "Traceback\nImportError: no module named vtk\n")
    with pytest.raises(CannotDraw, match="no module named vtk"):
        picture(folder, tmp_path / "map.png")


def test_a_window_without_a_screen_points_to_pictures(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "platform", "linux")
    monkeypatch.delenv("DISPLAY", raising=False)
    monkeypatch.delenv("WAYLAND_DISPLAY", raising=False)
    asked = child_ends(monkeypatch, 0)
    with pytest.raises(CannotDraw, match="no screen"):
        window(folder)
    assert not asked
    monkeypatch.setenv("DISPLAY", ":0")
    window(folder)
    assert len(asked) == 1


def test_the_command_ends_with_1_where_nothing_can_be_drawn(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    child_ends(monkeypatch, -11, "drawing\n")
    result = CliRunner().invoke(rimefront, ["show", str(folder), "--picture", str(tmp_path / "map.png")])
    assert result.exit_code == 1
    assert "apt-get install" in result.output


def test_the_command_takes_a_time_with_its_unit(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    asked = child_ends(monkeypatch, 0)
    arguments = ["show", str(folder), "--picture", "map.png", "--time", "1 min", "--array", "ice"]
    assert CliRunner().invoke(rimefront, arguments).exit_code == 0
    assert '"array": "ice", "time": 60.0, "out": "map.png"' in asked[0]["command"][-1]
    wrong = CliRunner().invoke(rimefront, [*arguments[:-3], "60", "--array", "ice"])
    assert isinstance(wrong.exception, CaseError)
