"""What no table can know by itself: whether the parts of a case belong together."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from pydantic_core import PydanticCustomError

from fem.case.case import Aim, Piece, Stage
from fem.case.wording import Note
from fem.errors import unknown
from fem.mesh.form import Box
from fem.mesh.shape import SHAPES, MeshShape, Shape
from fem.quantity import DURATION
from fem.watch.schedule import SLOWEST, Watch

if TYPE_CHECKING:
    from fem.material import Material


@dataclass
class Parts:
    """The tables of a case that could be read; None for one that could not, or is not there.

    Parameters
    ----------
    tree
        The file as read; names are taken from here, so that an unreadable table still has them.
    piece, shape, watch, aim, stages
        Each table as its model.
    regions, materials
        The entries that could be read.
    built
        The materials as the solver will have them.

    """

    tree: dict[str, Any]
    piece: Piece | None = None
    shape: Shape | None = None
    watch: Watch | None = None
    aim: Aim | None = None
    regions: dict[str, str] = field(default_factory=dict)
    materials: dict[str, Any] = field(default_factory=dict)
    built: dict[str, Material] = field(default_factory=dict)
    stages: list[Stage | None] = field(default_factory=list)

    def table(self, key: str) -> dict[str, Any]:
        """Return a top table as written; empty where there is none."""
        raw = self.tree.get(key)
        return raw if isinstance(raw, dict) else {}

    def raw_stages(self) -> list[dict[str, Any]]:
        """Return the stages as written; an entry that is no table is empty."""
        raw = self.tree.get("stages")
        return [entry if isinstance(entry, dict) else {} for entry in raw] if isinstance(raw, list) else []

    def points(self) -> list[str]:
        """Return the names of the watched points as written."""
        raw = self.table("watch").get("points")
        return list(raw) if isinstance(raw, dict) else []

    def form(self) -> Shape | None:
        """Return a shape that knows at least its names, even if a dimension could not be read."""
        raw = self.table("shape")
        form = raw.get("form")
        if self.shape is None and isinstance(form, str) and form in SHAPES:
            kind = SHAPES[form]
            return kind.model_construct(**{key: raw[key] for key in kind.model_fields if key in raw})
        return self.shape

    def lasts(self) -> float | None:
        """Return the longest duration of the whole run [s]; None where a stage does not say."""
        try:
            return sum(DURATION.read(stage.get("lasts")) for stage in self.raw_stages()) or None
        except (PydanticCustomError, ValueError):
            return None


def check(parts: Parts) -> Iterator[Note]:
    """Find what does not fit together, in all parts that could be read."""
    yield from _section(parts)
    yield from _regions(parts)
    yield from _starts(parts)
    yield from _stages(parts)
    yield from _times(parts)
    yield from _places(parts)
    yield from _front(parts)


def _section(parts: Parts) -> Iterator[Note]:
    shape, section = parts.form(), parts.table("piece").get("section")
    if isinstance(parts.shape, MeshShape):
        said = parts.shape.file.beyond_axis(parts.shape.length_unit) if section == "axisymmetric" else None
        if said is not None:
            yield Note(("shape", "file"), said)
        return
    if shape is None or shape.section is None or section not in ("plane", "axisymmetric"):
        return
    if section != shape.section:
        yield Note(("piece", "section"), f'a {shape.form} is "{shape.section}", got "{section}"')


def _regions(parts: Parts) -> Iterator[Note]:
    shape = parts.form()
    there = shape.regions() if shape is not None else None
    given = parts.table("regions")
    for region in there or ():
        if region not in given and isinstance(parts.tree.get("regions"), dict):
            yield Note(("regions",), f'region "{region}" has no material; write {region} = "..."')
    for region in given:
        if there is not None and region not in there:
            yield Note(("regions", region), unknown("region", region, there))
    for region, material in parts.regions.items():
        if material not in parts.table("materials"):
            yield Note(("regions", region), unknown("material", material, parts.table("materials")))


def _starts(parts: Parts) -> Iterator[Note]:
    raw = parts.table("piece")
    start = raw.get("start", {})
    if not isinstance(start, dict) or "piece" not in parts.tree:
        return
    shape = parts.form()
    there = shape.regions() if shape is not None else None
    if there is None:
        there = tuple(parts.table("regions"))
    for region in start:
        if region not in there:
            yield Note(("piece", "start", region), unknown("region", region, there))
    bare = [region for region in there if region not in start]
    if "start_temperature" not in raw and bare:
        missing = f'is missing; write start_temperature = "4 degC", or a start for {", ".join(bare)}'
        yield Note(("piece", "start_temperature"), missing)


def _stages(parts: Parts) -> Iterator[Note]:
    shape = parts.form()
    there = shape.surfaces() if shape is not None else None
    seen: dict[str, int] = {}
    for number, stage in enumerate(parts.raw_stages()):
        surfaces = stage.get("surfaces")
        for surface in surfaces if isinstance(surfaces, dict) else ():
            if there is not None and surface not in there:
                yield Note(("stages", number, "surfaces", surface), unknown("surface", surface, there))
        name = stage.get("name")
        if isinstance(name, str) and name in seen:
            message = f'stage {seen[name] + 1} has the name "{name}" too; give each its own'
            yield Note(("stages", number, "name"), message)
        elif isinstance(name, str):
            seen[name] = number
    for number, read in enumerate(parts.stages):
        if read is not None and read.until is not None:
            yield from _watched(parts, read.until.at, ("stages", number, "until"))


def _times(parts: Parts) -> Iterator[Note]:
    lasts = parts.lasts()
    if lasts is None:
        return
    for key in ("every", "frames"):
        found = parts.table("watch").get(key)
        if parts.watch is not None and found is not None and getattr(parts.watch, key) > lasts:
            yield Note(("watch", key), f"{found} is longer than the whole run ({_time(lasts)})")
    if parts.aim is not None and parts.aim.within is not None and parts.aim.within > lasts:
        found = parts.table("aim")["within"]
        message = f"{found} is longer than all stages together ({_time(lasts)}); let the stages last longer"
        yield Note(("aim", "within"), message)


def _places(parts: Parts) -> Iterator[Note]:
    at = parts.table("aim").get("at")
    if isinstance(at, str):
        yield from _watched(parts, at, ("aim", "at"))
    box = parts.shape.box() if parts.shape is not None else None
    if parts.watch is None or box is None:
        return
    for name, point in parts.watch.points.items():
        yield from _inside(point, box, ("watch", "points", name))
    for name, ray in parts.watch.rays.items():
        yield from _inside(ray.from_, box, ("watch", "rays", name, "from"))
        yield from _inside(ray.to, box, ("watch", "rays", name, "to"))


def _watched(parts: Parts, at: str, path: tuple[str | int, ...]) -> Iterator[Note]:
    known = [SLOWEST, *parts.points()]
    if at not in known:
        yield Note(path, unknown("watched point", at, known))


def _inside(point: tuple[float, float], box: Box, path: tuple[str | int, ...]) -> Iterator[Note]:
    (left, low), (right, high) = box
    slack = 1e-9 * max(right - left, high - low)
    if not (left - slack <= point[0] <= right + slack and low - slack <= point[1] <= high + slack):
        yield Note(path, f"{_mm(*point)} mm is outside the piece, {_mm(left, low)} to {_mm(right, high)} mm")


def _front(parts: Parts) -> Iterator[Note]:
    if parts.watch is None:
        return
    # Without a ray and without a word about it nobody asks for a front.
    if "front" not in parts.watch.model_fields_set and not parts.watch.rays:
        return
    level = parts.watch.front.kind
    freezes = [r for r, name in parts.regions.items() if name in parts.built and parts.built[name].freezes]
    product = ["product"] if "product" in parts.regions else freezes or list(parts.regions)
    for name in dict.fromkeys(parts.regions[region] for region in product):
        material = parts.built.get(name)
        if material is None:
            continue
        if level == "freezing point" and material.freezing_point is None:
            remedy = "state its freezing_point, or take" if material.freezes else "take"
            message = f'material "{name}" has no freezing point; {remedy} an isotherm, front = "-3 degC"'
            yield Note(("watch", "front"), message)
        if level == "ice" and not (material.freezes and material.has_ice):
            message = f'material "{name}" does not say its ice; take an isotherm, front = "-3 degC"'
            yield Note(("watch", "front"), message)


def _time(seconds: float) -> str:
    if seconds < 120:
        return f"{seconds:.4g} s"
    return f"{seconds / 60:.4g} min" if seconds < 7200 else f"{seconds / 3600:.4g} h"


def _mm(x: float, y: float) -> str:
    return f"({x * 1e3:.4g}, {y * 1e3:.4g})"
