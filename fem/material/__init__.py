"""Materials: from what a case says of them to enthalpy, conductivity and ice against temperature."""

from fem.material.material import Material
from fem.material.melting import Melting
from fem.material.plain import Plain
from fem.material.recipe import Recipe
from fem.material.table import Table

MATERIALS: dict[str, type[Recipe | Melting | Table | Plain]] = {
    "recipe": Recipe,
    "melting": Melting,
    "table": Table,
    "plain": Plain,
}
"""The model of each `kind` of the case file; each has `build() -> Material`."""

__all__ = ["MATERIALS", "Material", "Melting", "Plain", "Recipe", "Table"]
