"""Mesh files, through meshio: the one module that knows it.

A format has to name groups of cells: Gmsh MSH 2.2 and 4.1 (ASCII and binary) by its
physical groups, MED by its families. Most others number them at best.
"""

from __future__ import annotations

import contextlib
import io
import re
import warnings
from collections.abc import Callable, Iterator
from importlib.util import find_spec
from pathlib import Path
from typing import Any

import numpy as np

from fem.mesh.grid import Grid, grid_of

MOST_BYTES = 300_000_000
"""A larger file is refused before it is opened."""

MOST_NODES = 2_000_000
"""A finer mesh than this is refused: no run of it would end."""

# Beyond what the largest mesh takes; a count that was damaged must not eat the machine's memory.
MOST_MEMORY = 4_000_000_000

FLAT = {"triangle": 3, "quad": 4}
FORMATS = {".msh": "Gmsh", ".med": "MED"}
REMEDY = "save it as Gmsh MSH 4.1 or 2.2 with a physical group for each surface and each region"

Groups = dict[str, list[np.ndarray]]


def read(path: Path) -> Grid:
    """Read a mesh file.

    Parameters
    ----------
    path
        Its ending says the format.

    Returns
    -------
    The mesh in the units of the file, each cell in one named region.

    Raises
    ------
    ValueError
        In one sentence, why it cannot be used; it begins with the file's name.

    """
    try:
        _look_at(path)
        mesh = _load(path)
        if len(mesh.points) > MOST_NODES:
            raise ValueError(f"has {len(mesh.points)} nodes; {MOST_NODES} are the most that can be read")
        return _grid(mesh, _groups(mesh))
    except ValueError as error:
        raise ValueError(f"{path.name}: {error}") from error


def _look_at(path: Path) -> None:
    """Refuse what can be told from outside, or from the first lines."""
    ending = path.suffix.lower()
    if ending not in FORMATS:
        raise ValueError(f'is a "{ending}" file, whose names of surfaces and regions are not read; {REMEDY}')
    try:
        if not path.is_file():
            raise ValueError("is no file" if path.exists() else "is not there")
        size = path.stat().st_size
        if size > MOST_BYTES:
            most = f"{MOST_BYTES / 1e6:.0f} MB are the most that can be read"
            raise ValueError(f"has {size / 1e6:.0f} MB; {most}")
        with path.open("rb") as file:
            start = file.read(1_000_000)
    except OSError as error:
        raise ValueError(f"cannot be read: {error.strerror or error}") from error
    if not start.strip():
        raise ValueError("is empty")
    if ending == ".msh":
        _look_at_gmsh(start)
    if ending == ".med" and find_spec("h5py") is None:
        raise ValueError("is a MED file, which needs h5py: pip install h5py")


def _look_at_gmsh(start: bytes) -> None:
    """Refuse versions that meshio does not read, or reads as another, and names that it would lose."""
    head = re.match(rb"\s*(?:\$Comments.*?\$EndComments\s*)*\$MeshFormat\s+(\S+)", start, re.DOTALL)
    if head is None:
        raise ValueError(f'is no Gmsh file: it does not begin with "$MeshFormat"; {REMEDY}')
    version = head[1].decode(errors="replace")
    if version not in ("2", "2.1", "2.2", "4.1"):
        raise ValueError(f"is MSH version {version}; save it as MSH 4.1 or 2.2")
    names = re.search(rb"\$PhysicalNames\s+\d+\s+(.*?)\$EndPhysicalNames", start, re.DOTALL)
    listed = re.findall(rb'^\s*(\d+)\s+\d+\s+"(.*)"\s*$', names[1] if names else b"", re.MULTILINE)
    seen: dict[bytes, bytes] = {}
    for dimension, name in listed:
        if name in seen:
            kinds = {b"0": "points", b"1": "lines", b"2": "an area", b"3": "a volume"}
            used = [kinds.get(d, "something") for d in (seen[name], dimension)]
            word = "two groups" if used[0] == used[1] else f"{used[0]} and for {used[1]}"
            raise ValueError(f'has the name "{name.decode(errors="replace")}" for {word}; give each its own')
        seen[name] = dimension


def _load(path: Path) -> Any:
    import meshio

    # Not meshio.read, which prints what it finds wrong and leaves the program.
    reader: Callable[[Path], Any] = meshio.med.read if path.suffix.lower() == ".med" else meshio.gmsh.read
    said = io.StringIO()
    try:
        with (
            _bounded_memory(),
            warnings.catch_warnings(),
            contextlib.redirect_stdout(said),
            contextlib.redirect_stderr(said),
        ):
            warnings.simplefilter("ignore")
            return reader(path)
    except Exception as error:
        # A reader has no list of what it may raise on a damaged file: anything from KeyError to MemoryError.
        if "Incompatible cell data" in str(error) and "gmsh:physical" in str(error):
            raise ValueError(
                "has cells in no named group; name every area, and save without Mesh.SaveAll"
            ) from error
        why = f"{type(error).__name__}: {error}" if str(error) else type(error).__name__
        what = FORMATS[path.suffix.lower()]
        raise ValueError(f"is cut short or damaged, or no {what} file ({why})") from error


@contextlib.contextmanager
def _bounded_memory() -> Iterator[None]:
    """Let this process take `MOST_MEMORY` more than it has, where the system can hold it to that."""
    usage = Path("/proc/self/statm")
    if not usage.exists():
        yield
        return
    import resource

    soft, hard = resource.getrlimit(resource.RLIMIT_AS)
    now = int(usage.read_text().split()[0]) * resource.getpagesize()
    most = now + MOST_MEMORY if soft == resource.RLIM_INFINITY else min(soft, now + MOST_MEMORY)
    resource.setrlimit(resource.RLIMIT_AS, (most, hard))
    try:
        yield
    finally:
        resource.setrlimit(resource.RLIMIT_AS, (soft, hard))


def _groups(mesh: Any) -> Groups:
    """Return each named group as the numbers of its cells in each block."""
    # meshio puts the entities that bound each block of a Gmsh 4.1 file among the sets.
    sets = {name: list(cells) for name, cells in mesh.cell_sets.items() if not name.startswith("gmsh:")}
    if not sets:
        sets = _tagged(mesh)
    groups = {}
    for name, blocks in sets.items():
        members = [np.asarray([] if block is None else block, dtype=np.int64) for block in blocks]
        if any(len(member) for member in members):
            groups[name.strip("\0 ")] = members
    if not groups and mesh.field_data:
        raise ValueError("has names but no cell in any of them; save it without Mesh.SaveAll")
    if not groups:
        raise ValueError(f"names no groups of its cells; {REMEDY}")
    return groups


def _tagged(mesh: Any) -> Groups:
    """Return the groups of formats that number their cells: MSH 2.2 by tag and dimension, MED by family."""
    groups: Groups = {}
    families: dict[int, list[str]] = getattr(mesh, "cell_tags", {})
    for name in dict.fromkeys(name for names in families.values() for name in names):
        numbers = [family for family, names in families.items() if name in names]
        groups[name] = [np.flatnonzero(np.isin(found, numbers)) for found in mesh.cell_data["cell_tags"]]
    tags = mesh.cell_data.get("gmsh:physical")
    for name, (tag, dimension) in mesh.field_data.items() if tags is not None else ():
        groups[name] = [
            np.flatnonzero((np.asarray(found) == tag) & (block.dim == dimension))
            for block, found in zip(mesh.cells, tags, strict=True)
        ]
    return groups


def _grid(mesh: Any, groups: Groups) -> Grid:
    """Sort cells by kind and groups by what they hold."""
    kinds = [block.type for block in mesh.cells]
    for block in mesh.cells:
        if block.dim == 3:
            raise ValueError(f"has solid cells ({block.type}); a case takes a flat section")
        if block.type not in (*FLAT, "line", "vertex"):
            raise ValueError(
                f"has second-order or other cells ({block.type}); save it with first-order triangles and "
                "quadrilaterals (Gmsh: Mesh.ElementOrder = 1)"
            )
    if not any(kind in FLAT for kind in kinds):
        raise ValueError("has no triangles or quadrilaterals; mesh the areas, not the lines alone")
    arrays, firsts = {}, [0] * len(kinds)
    for kind, corners in (*FLAT.items(), ("line", 2)):
        mine = [i for i, found in enumerate(kinds) if found == kind]
        none = np.zeros((0, corners), dtype=np.int64)
        arrays[kind] = np.concatenate([none, *(mesh.cells[i].data.astype(np.int64) for i in mine)])
        sizes = [len(mesh.cells[i].data) for i in mine]
        before = len(arrays["triangle"]) if kind == "quad" else 0
        for i, first in zip(mine, np.cumsum([0, *sizes]), strict=False):
            firsts[i] = before + int(first)
    areas: dict[str, np.ndarray] = {}
    lines: dict[str, np.ndarray] = {}
    for name, members in groups.items():
        if not name:
            raise ValueError("has a group with an empty name; give it one")
        for found, wanted in ((areas, tuple(FLAT)), (lines, ("line",))):
            parts = [m + firsts[i] for i, m in enumerate(members) if kinds[i] in wanted and len(m)]
            if parts:
                found[name] = np.unique(np.concatenate(parts))
        if name in areas and name in lines:
            raise ValueError(f'has the name "{name}" for lines and for an area; give each its own')
    if not areas:
        raise ValueError(f"names no area; {REMEDY}")
    _numbered_lines(mesh, kinds, firsts, lines)
    return grid_of(mesh.points, arrays["triangle"], arrays["quad"], arrays["line"], areas, lines)


def _numbered_lines(mesh: Any, kinds: list[str], firsts: list[int], lines: dict[str, np.ndarray]) -> None:
    """Refuse lines that someone put into a group but did not name; those in none carry no heat."""
    tags = mesh.cell_data.get("gmsh:physical")
    if tags is None:
        return
    named = np.unique(np.concatenate([np.zeros(0, dtype=np.int64), *lines.values()]))
    for i, kind in enumerate(kinds):
        if kind != "line":
            continue
        numbered = np.flatnonzero(np.asarray(tags[i]) != 0)
        bare = numbered[~np.isin(numbered + firsts[i], named)]
        if len(bare):
            number = int(np.asarray(tags[i])[bare[0]])
            many = f"{len(bare)} lines in group {number}"
            raise ValueError(f"has {many}, which has no name; name it, or remove it")
