"""A shelf of tiny pieces, materials and cases for the tests."""

from __future__ import annotations

from pathlib import Path

from fem.case.case import Case
from fem.case.read import loads
from fem.heat.body import Body
from fem.material import MATERIALS, Material
from fem.mesh.build import build
from fem.mesh.shape import Bar, Ring, Rod, Slab

WATER = {
    "kind": "melting",
    "melting_point": "0 degC",
    "latent_heat": "334 kJ/kg",
    "density": "1000 kg/m3",
    "solid": {"conductivity": "2.2 W/m/K", "heat_capacity": "2050 J/kg/K"},
    "liquid": {"conductivity": "0.56 W/m/K", "heat_capacity": "4200 J/kg/K"},
}
STEEL = {"kind": "plain", "density": "7900 kg/m3", "heat_capacity": "480 J/kg/K", "conductivity": "16 W/m/K"}
MIX = {"kind": "recipe", "sucrose": "18 %", "density": "1075 kg/m3"}


def material(entries: dict) -> Material:
    return MATERIALS[entries["kind"]].model_validate(entries).build()


def bar(wall: str | None = "0.8 mm", cell: str = "2 mm", corner: str = "6 mm") -> Bar:
    return Bar.model_validate(
        {
            "thickness": "22 mm",
            "width": "50 mm",
            "corner": corner,
            "cell": cell,
            **({"wall": wall} if wall else {}),
        }
    )


def slab(thickness: str = "20 mm", width: str = "4 mm", cell: str = "1 mm") -> Slab:
    return Slab.model_validate({"thickness": thickness, "width": width, "cell": cell})


def rod(radius: str = "14 mm", height: str = "20 mm", cell: str = "2 mm") -> Rod:
    return Rod.model_validate({"radius": radius, "height": height, "cell": cell})


def ring(inner: str = "4 mm", outer: str = "14 mm", height: str = "20 mm", cell: str = "2 mm") -> Ring:
    return Ring.model_validate({"inner": inner, "outer": outer, "height": height, "cell": cell})


def bar_body(mix: dict = MIX, wall: dict = STEEL, cell: str = "2 mm") -> Body:
    return Body(build(bar(cell=cell), 0.083), {"product": material(mix), "wall": material(wall)})


def slab_body(mix: dict = WATER, **keys: str) -> Body:
    return Body(build(slab(**keys), 0.1), {"product": material(mix)})


SMALL = """
schema = 1
title = "A small bar"
[piece]
section = "plane"
length = "50 mm"
start_temperature = "4 degC"
[shape]
form = "bar"
thickness = "12 mm"
width = "24 mm"
corner = "3 mm"
wall = "0.8 mm"
cell = "1.5 mm"
[regions]
product = "mix"
wall = "stainless"
[materials.mix]
kind = "recipe"
sucrose = "18 %"
[materials.stainless]
kind = "plain"
density = "7900 kg/m3"
heat_capacity = "480 J/kg/K"
conductivity = "16 W/m/K"
[[stages]]
name = "freeze"
lasts = "10 min"
[stages.surfaces.outside]
exchange = "fluid"
h = "250 W/m2/K"
coolant = "-22 degC"
[watch]
every = "5 s"
[watch.points]
centre = ["0 mm", "0 mm"]
[watch.rays]
flat = { from = ["6 mm", "0 mm"], to = ["0 mm", "0 mm"] }
[aim]
reach = "-12 degC"
"""


def small(*overrides: str, text: str = SMALL, folder: Path = Path()) -> Case:
    return loads(text, "small.toml", folder, overrides)
