"""Which region is made of what: cells to groups of one family and one material, lines to members."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure.cells import FAMILIES, Family, Properties
from vib.structure.mesh.reading import RawMesh
from vib.study import Study
from vib.study.materials import find_material
from vib.study.mesh import MeshRegion

Numbers = NDArray[np.intp]
_LINES = ("line", "line3")
_VERTEX = "vertex"


@dataclass(frozen=True)
class RegionFound:
    """One region of a mesh file: its cells by kind, and what the study makes of it (empty: nothing yet)."""

    name: str
    cells: Mapping[str, int]
    use: str

    def __str__(self) -> str:
        counted = ", ".join(f"{count} {kind}" for kind, count in self.cells.items())
        return f'"{self.name}" ({counted}): {self.use or "not yet assigned"}'


@dataclass(frozen=True, eq=False)
class Patch:
    """The cells of one region and kind: ``connectivity`` (e, k), ``numbers`` (e,) as in the file."""

    region: str
    kind: str
    connectivity: Numbers
    numbers: Numbers

    @property
    def family(self) -> Family:
        """The family of the cells."""
        return FAMILIES[self.kind]


def patches_of(raw: RawMesh) -> tuple[Patch, ...]:
    """The cells of a mesh by region and kind, points aside."""
    found = []
    for index, name in enumerate(raw.regions):
        for kind in dict.fromkeys(block.kind for block in raw.blocks):
            chosen = [
                (block.connectivity[mine], block.numbers[mine])
                for block in raw.blocks
                if block.kind == kind and (mine := block.region == index).any()
            ]
            if chosen and kind != _VERTEX:
                found.append(Patch(name, kind, *(np.concatenate(part) for part in zip(*chosen, strict=True))))
    return tuple(found)


def list_regions(study: Study, patches: tuple[Patch, ...]) -> tuple[RegionFound, ...]:
    """The regions found, and what the study makes of each."""
    assert study.mesh is not None
    cells: dict[str, dict[str, int]] = {}
    for patch in patches:
        cells.setdefault(patch.region, {})[patch.kind] = len(patch.connectivity)
    places = {point.set for point in study.points.values() if not isinstance(point, tuple)}
    found = []
    for name, counts in cells.items():
        region = study.mesh.regions.get(name)
        use = "" if region is None else _use(region)
        if region is None and name in places:
            use = "a set of points only"
        found.append(RegionFound(name, counts, use))
    return tuple(found)


def _use(region: MeshRegion) -> str:
    if region.use == "ignore":
        return "ignored"
    more = f", section {region.section}" if region.section else ""
    more += f", thickness {1000 * region.thickness:.4g} mm" if region.thickness is not None else ""
    return f"{region.material}{more}"


def check_assigned(study: Study, regions: tuple[RegionFound, ...], raw: RawMesh) -> None:
    """Raise ModelError for regions that the study says nothing about, or that the mesh does not have."""
    assert study.mesh is not None
    known = {region.name for region in regions} | set(raw.point_sets)
    faults = [
        f'mesh.regions.{name}: {raw.file} has no region "{name}"; it has {", ".join(r.name for r in regions)}'
        for name in study.mesh.regions
        if name not in known
    ]
    if any(not region.use for region in regions):
        listed = "; ".join(str(region) for region in regions)
        faults.append(
            f"mesh.regions: not every region of {raw.file} is assigned. Found: {listed}. Give each of them "
            "a [mesh.regions.NAME] with its material (shells also a thickness, lines a section), or "
            'use = "ignore"'
        )
    if faults:
        raise ModelError("\n".join(faults))


def used_patches(study: Study, patches: tuple[Patch, ...]) -> tuple[Patch, ...]:
    """The patches that are computed; every fault in what the regions are given, at once.

    Raises
    ------
    ModelError
        A thickness or section is missing, or is given where no such cells are.
    """
    assert study.mesh is not None
    used, faults = [], []
    for name, region in study.mesh.regions.items():
        mine = [patch for patch in patches if patch.region == name]
        if region.use == "ignore" or not mine:
            continue
        lines = [patch for patch in mine if patch.kind in _LINES]
        shells = [patch for patch in mine if patch.kind not in _LINES and patch.family.dimension == 2]
        entry = f"mesh.regions.{name}"
        if lines and region.section is None:
            faults.append(f'{entry}: it has lines and needs a section for them (or use = "ignore")')
        if shells and region.thickness is None:
            faults.append(
                f"{entry}: it has {' and '.join(p.kind for p in shells)} cells and needs a thickness"
            )
        if region.thickness is not None and not shells:
            faults.append(f"{entry}: a thickness is for triangles and quads, and it has none")
        if region.section is not None and not lines:
            faults.append(f"{entry}: a section is for lines, and it has none")
        used += mine
    if not used and not faults:
        faults.append("mesh.regions: every region is ignored, so that nothing of the mesh is left")
    if faults:
        raise ModelError("\n".join(faults))
    return tuple(used)


def properties_of(study: Study, name: str) -> tuple[Properties, float | None]:
    """Material and thickness of the cells of a region, and the damping ratio of its material.

    Raises
    ------
    ModelError
        No such material, or one that cells can't have.
    """
    assert study.mesh is not None
    region = study.mesh.regions[name]
    assert region.material is not None
    own = study.materials.get(region.material)
    entry = f"materials.{region.material}"
    if own is None:
        try:
            data = find_material(region.material)
        except ModelError as error:
            raise ModelError(f"mesh.regions.{name}.material: {error}") from None
    else:
        data = own.data
    ratio = data.poissons_ratio
    if own is not None and own.shear_modulus is not None:
        implied = data.youngs_modulus / (2 * own.shear_modulus) - 1
        if own.poissons_ratio is not None and abs(implied - own.poissons_ratio) > 1e-6:
            raise ModelError(
                f"{entry}: cells of a mesh are isotropic, and its moduli belong to a Poisson's ratio of "
                f"{implied:.4g}, not {own.poissons_ratio:.4g}; leave out shear_modulus or poissons_ratio"
            )
        ratio = implied
    try:
        properties = Properties(data.youngs_modulus, ratio, data.density, region.thickness, region.offset)
    except ModelError as error:
        raise ModelError(f"{entry} in mesh.regions.{name}: {error}") from None
    return properties, None if own is None else own.damping_ratio
