"""The tables of a study about a mesh: its file, its regions, and points found in it."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import Discriminator, Field, Tag, ValidationInfo, field_validator, model_validator

from vib.study.geometry import Table
from vib.study.quantities import Axis, Name, Quantity, Vector, positive
from vib.units import factor


class MeshRegion(Table):
    """What the cells of one region of the mesh are made of.

    Solids need a material; shells a material and a thickness; lines a material and a section.
    """

    use: Literal["cells", "ignore"] = Field(
        "cells", description='"ignore" leaves the cells of the region out'
    )
    material: Name | None = Field(None, description="a name of [materials] or of the built-in table")
    thickness: Annotated[float, positive("length")] | None = Field(
        None, description="of triangles and quads, which become shells"
    )
    offset: Annotated[float, Quantity("length")] = Field(
        0.0, description="from the mesh surface to the middle of the shell, along the normals of its cells"
    )
    section: Name | None = Field(None, description="a name of [sections]; for lines, which become members")
    up: Axis | None = Field(None, description="for lines: as for members")
    turn: Annotated[float, Quantity("angle")] = Field(0.0, description="for lines: as for members")

    @model_validator(mode="after")
    def _whole(self) -> MeshRegion:
        given = self.model_fields_set - {"use"}
        if self.use == "ignore":
            if given:
                raise ValueError(f'use = "ignore" leaves nothing to say about {", ".join(sorted(given))}')
            return self
        if self.material is None:
            raise ValueError('needs a material (or use = "ignore")')
        if self.thickness is not None and self.section is not None:
            raise ValueError("takes a thickness (shells) or a section (lines), not both")
        if self.thickness is None and "offset" in given:
            raise ValueError("offset is for shells, which need a thickness")
        if self.section is None and (lines := given & {"up", "turn"}):
            raise ValueError(f"{' and '.join(sorted(lines))} are for lines, which need a section")
        return self


class Mesh(Table):
    """A mesh file beside the study: lines become members, surfaces shells, volumes solids."""

    file: Name = Field(description="any kind that meshio reads, such as .vtu, .vtk, .msh, .inp, .xdmf")
    length: Name = Field(
        "",
        validate_default=True,
        description='the unit of its coordinates, such as "mm"; files do not say it; default: [units] length',
    )
    tag: Name | None = Field(
        None, description="name of the integer cell data that tells the regions, where a file has several"
    )
    join_within: Annotated[float, positive("length")] | None = Field(
        None, description="nodes nearer to one another than this become one; default: none do"
    )
    regions: dict[Name, MeshRegion] = Field(
        {}, description="by name in the file, or tag as text; a mesh without regions has one, called all"
    )

    @field_validator("length", mode="before")
    @classmethod
    def _declared(cls, unit: object, info: ValidationInfo) -> object:
        declared = (info.context or {}).get("units", {}).get("length", "")
        if not (unit or declared):
            raise ValueError('is missing: the unit of the coordinates, such as length = "mm"')
        return unit or declared

    @field_validator("length")
    @classmethod
    def _known(cls, unit: str) -> str:
        factor(unit, "length")
        return unit

    @property
    def metres(self) -> float:
        """The length unit of the coordinates, m."""
        return factor(self.length, "length")


class Finder(Table):
    """A point or a set of points found in the mesh: exactly one of nearest, node, box, set.

    Supports and bodies take each point of a set, a spring to the ground is shared evenly among them, and an
    impact, an excitation or a place to watch means the mean motion over the set.
    """

    nearest: Vector | None = Field(None, description="the node of the mesh nearest to these coordinates")
    node: Annotated[int, Field(ge=1, strict=True)] | None = Field(
        None, description="a node by its place in the file, counted from 1"
    )
    box: tuple[Vector, Vector] | None = Field(
        None, description="every node between two opposite corners, faces of the box included"
    )
    set: Name | None = Field(None, description="every node of a point set or region of the mesh file")

    @model_validator(mode="after")
    def _one(self) -> Finder:
        given = [name for name, value in self if value is not None]
        if len(given) != 1:
            raise ValueError(
                f"needs exactly one of nearest, node, box, set; has {', '.join(given) or 'none'}"
            )
        return self

    @property
    def several(self) -> bool:
        """Whether it stands for a set of points."""
        return self.box is not None or self.set is not None


def _kind(value: Any) -> str:
    return "[find]" if isinstance(value, dict | Finder) else "[place]"


Point = Annotated[
    Annotated[Vector, Tag("[place]")] | Annotated[Finder, Tag("[find]")],
    Discriminator(_kind),
    Field(description="three lengths [x, y, z], or a table that finds it in the mesh"),
]
