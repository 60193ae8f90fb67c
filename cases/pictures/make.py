"""Makes the README's two pictures: PYTHONPATH=. python cases/pictures/make.py RUN (needs Chromium)."""

from __future__ import annotations

import io
import sys
import tempfile
from pathlib import Path

import numpy as np
from matplotlib.collections import LineCollection
from matplotlib.colors import ListedColormap
from matplotlib.ticker import MaxNLocator
from matplotlib.tri import Triangulation
from PIL import Image

from fem.result.answer import duration
from fem.result.contents import read_contents
from fem.result.drawing import BLACK, drawing
from fem.result.maps import last_frame
from fem.result.report import write_report
from tests.result.chromium import Browser

HERE = Path(__file__).parent
GREY = ListedColormap(["#d9d9d9"])
WIDE, HIGH, DOTS = 900, 640, 150  # pixels, and pixels per inch


def draw_map(run: Path, out: Path) -> None:
    """Draw the last temperature and the local freezing time, the slowest point marked."""
    frame, contents = last_frame(run), read_contents(run)
    x, y = (1e3 * v for v in contents.summary["slowest"]["at_m"][:2])
    reach = contents.summary["aim"]["reach_degC"]
    panels = (
        ("temperature_degC", 1.0, "cividis", f"temperature after {duration(frame.time or 0.0)}, °C"),
        ("local_freezing_time_s", 1.0 / 60.0, "viridis", f"time from freezing point to {reach:g} °C, min"),
    )
    points = 1e3 * frame.points
    with drawing() as figure_of:
        figure = figure_of((WIDE / DOTS, HIGH / DOTS))
        for ax, (array, scale, palette, label) in zip(figure.subplots(1, 2), panels, strict=True):
            values = scale * frame.values[array]
            shown = np.isfinite(values[frame.triangles]).all(axis=1)
            grid = Triangulation(points[:, 0], points[:, 1], frame.triangles[shown])
            inside = values[np.unique(frame.triangles[shown])]
            levels = MaxNLocator(28).tick_values(inside.min(), inside.max())
            if not shown.all():
                bare = frame.triangles[~shown]
                ax.tripcolor(points[:, 0], points[:, 1], np.zeros(len(points)), triangles=bare, cmap=GREY)
            art = ax.tricontourf(grid, np.nan_to_num(values), levels=levels, cmap=palette)
            lines = LineCollection(list(points[frame.outline]), colors=BLACK, linewidths=0.7)
            ax.add_collection(lines)
            for colour, width in (("white", 3.0), (BLACK, 1.4)):
                ax.plot(x, y, "o", ms=10, mfc="none", mec=colour, mew=width)
            ax.annotate("slowest point", (x, y), (0, -9), textcoords="offset points", ha="center", va="top",
                        color="white" if array != "temperature_degC" else BLACK)  # fmt: skip
            ax.set_xlim(points[:, 0].min() - 0.5, points[:, 0].max() + 0.5)
            ax.set_ylim(points[:, 1].min() - 0.5, points[:, 1].max() + 0.5)
            ax.set_aspect("equal")
            ax.set_axis_off()
            bar = figure.colorbar(art, ax=ax, fraction=0.05, pad=0.03, aspect=26, location="left")
            bar.outline.set_visible(False)
            bar.locator = MaxNLocator(7)
            bar.update_ticks()
            bar.set_label(label.replace("-", "−"))
        raw = io.BytesIO()
        figure.savefig(raw, format="png", dpi=DOTS)
    Image.open(raw).convert("RGB").quantize(256).save(out, optimize=True)


def draw_report(run: Path, out: Path) -> None:
    """Take a picture of the report's first screen."""
    # The browser may still be tidying its profile when it is told to end.
    room = tempfile.TemporaryDirectory(ignore_cleanup_errors=True)
    with room as folder, Browser(Path(folder)) as browser:
        page = write_report(run, Path(folder) / "report.html")
        browser.open(page, 1280, 900)
        browser.ask("document.documentElement.style.overflow = 'hidden'")
        browser.picture(out)
    image = Image.open(out).convert("RGB")
    image.quantize(256, method=Image.Quantize.MEDIANCUT, dither=Image.Dither.NONE).save(out, optimize=True)


if __name__ == "__main__":
    draw_map(Path(sys.argv[1]), HERE / "workshop_bar_map.png")
    draw_report(Path(sys.argv[1]), HERE / "workshop_bar_report.png")
