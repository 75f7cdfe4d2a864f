"""The tables of a study that describe what is built: materials, sections, members and supports."""

from __future__ import annotations

from functools import cached_property
from typing import TYPE_CHECKING, Annotated

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, model_validator

from vib.study.quantities import COMPONENTS, Axis, Name, Names, Quantity, Vector, positive

if TYPE_CHECKING:
    from vib.study.materials import MaterialData
    from vib.study.profiles import Profile


class Table(BaseModel):
    """A table of the study file: frozen, unknown keys are errors."""

    model_config = ConfigDict(extra="forbid", frozen=True, ignored_types=(cached_property,))


class Material(Table):
    """An elastic material; ``like`` starts from one of the built-in table, and other entries override it."""

    like: Name | None = Field(None, description="name of a built-in material to start from")
    youngs_modulus: Annotated[float, positive("stress")] | None = None
    poissons_ratio: Annotated[float, Quantity("ratio", -1.0, may_equal_least=False)] | None = None
    shear_modulus: Annotated[float, positive("stress")] | None = Field(
        None, description="default: youngs_modulus / (2 (1 + poissons_ratio))"
    )
    density: Annotated[float, Quantity("density", 0.0)] | None = None
    damping_ratio: Annotated[float, Quantity("ratio", 0.0)] | None = Field(
        None, description="share of critical damping when this material holds all the strain energy"
    )

    @model_validator(mode="after")
    def _complete(self) -> Material:
        from vib.study.materials import find_material

        if self.poissons_ratio is not None and self.poissons_ratio > 0.5:
            raise ValueError("poissons_ratio must be at most 0.5")
        if self.like is not None:
            find_material(self.like)
            return self
        lacking = [name for name in ("youngs_modulus", "density") if getattr(self, name) is None]
        if self.poissons_ratio is None and self.shear_modulus is None:
            lacking.append("poissons_ratio")
        if lacking:
            raise ValueError(f'missing {", ".join(lacking)} (or like = "structural steel" to start from it)')
        return self

    @cached_property
    def data(self) -> MaterialData:
        """All figures filled in: modulus (Pa), Poisson's ratio, density (kg/m^3), source."""
        from vib.study.materials import MaterialData, find_material

        base = find_material(self.like) if self.like else None
        ratio = (
            self.poissons_ratio if self.poissons_ratio is not None else (base.poissons_ratio if base else 0.0)
        )
        modulus = self.youngs_modulus or (base.youngs_modulus if base else 0.0)
        density = self.density if self.density is not None else (base.density if base else 0.0)
        changed = [
            key for key in ("youngs_modulus", "poissons_ratio", "density") if getattr(self, key) is not None
        ]
        source = base.source if base and not changed else "the study file"
        return MaterialData(self.like or "", modulus, ratio, density, source)

    @property
    def shear(self) -> float:
        """Shear modulus in Pa."""
        return self.shear_modulus or self.data.youngs_modulus / (2 * (1 + self.data.poissons_ratio))


# the function of `profiles` that draws each shape, and its dimensions; "?" marks those that may be left out
SHAPES: dict[str, tuple[str, str]] = {
    "rectangle": ("rectangle", "width height"),
    "flat": ("flat", "width thickness"),
    "round bar": ("round_bar", "diameter"),
    "square hollow": ("square_hollow", "width thickness outer_radius? inner_radius?"),
    "rectangular hollow": ("rectangular_hollow", "width height thickness outer_radius? inner_radius?"),
    "circular hollow": ("circular_hollow", "diameter thickness"),
    "I": ("i_section", "height width web_thickness flange_thickness root_radius?"),
    "channel": ("channel", "height width web_thickness flange_thickness root_radius?"),
    "angle": ("angle", "height width thickness root_radius? toe_radius?"),
    "T": ("t_section", "height width web_thickness flange_thickness root_radius?"),
}
_GENERAL = "area second_moment_y second_moment_z torsion_constant shear_area_y? shear_area_z?"

_Size = Annotated[float, positive("length")]
_Radius = Annotated[float, Quantity("length", 0.0)]


class Section(Table):
    """A cross section: a shape with dimensions, a designation of a published standard, or general figures."""

    shape: Name | None = Field(
        None,
        description="one of: "
        + ", ".join(SHAPES)
        + '; or a designation such as "SHS 100x100x6", "IPE 200", "W8x31"',
    )
    width: _Size | None = Field(None, description="along the section's y axis")
    height: _Size | None = Field(None, description="along the section's z axis (up)")
    thickness: _Size | None = None
    diameter: _Size | None = None
    web_thickness: _Size | None = None
    flange_thickness: _Size | None = None
    outer_radius: _Radius | None = None
    inner_radius: _Radius | None = None
    root_radius: _Radius | None = None
    toe_radius: _Radius | None = None
    area: Annotated[float, positive("area")] | None = None
    second_moment_y: Annotated[float, positive("second_moment")] | None = Field(
        None, description="about the horizontal axis y: resists bending in the vertical plane"
    )
    second_moment_z: Annotated[float, positive("second_moment")] | None = None
    torsion_constant: Annotated[float, positive("second_moment")] | None = None
    shear_area_y: Annotated[float, positive("area")] | None = Field(
        None, description="default: no shear flexibility"
    )
    shear_area_z: Annotated[float, positive("area")] | None = Field(
        None, description="default: no shear flexibility"
    )

    @model_validator(mode="after")
    def _complete(self) -> Section:
        given = set(self._given())
        if self.shape is None:
            wanted, what = _GENERAL, "a section without a shape"
        elif self.shape in SHAPES:
            wanted, what = SHAPES[self.shape][1], f'the shape "{self.shape}"'
        elif given:
            wanted, what = "", self._not_a_shape()
        else:
            wanted, what = "", ""  # a designation, which is looked up below
        required = {name for name in wanted.split() if not name.endswith("?")}
        allowed = {name.rstrip("?") for name in wanted.split()}
        if lacking := sorted(required - given):
            hint = (
                f" (or shape = one of: {', '.join(SHAPES)}, or a designation)" if self.shape is None else ""
            )
            raise ValueError(f"{what} needs {', '.join(lacking)}{hint}")
        if extra := sorted(given - allowed):
            raise ValueError(f"{what} does not take {', '.join(extra)}")
        _ = self.profile  # dimensions that do not make a section are faults of the file
        return self

    def _not_a_shape(self) -> str:
        """What a name with dimensions may have meant; a designation has none."""
        from vib.study.names import did_you_mean

        near = did_you_mean(str(self.shape), SHAPES)
        return f'"{self.shape}" is no shape{near}; the shapes are {", ".join(SHAPES)}; a designation'

    def _given(self) -> dict[str, float]:
        return {name: value for name, value in self if name != "shape" and value is not None}

    @cached_property
    def profile(self) -> Profile:
        """Area, second moments, torsion constant and the rest, SI."""
        from vib.study import profiles

        given = self._given()
        if self.shape is None:
            return profiles.general(**given)
        if self.shape not in SHAPES:
            from vib.study.catalogue import find_profile

            return find_profile(self.shape)
        drawn: Profile = getattr(profiles, SHAPES[self.shape][0])(**given)
        return drawn


def _component_list(value: object) -> object:
    """``"all"``, ``"translations"``, ``"rotations"`` or a list of components, as a tuple in order."""
    groups = {"all": COMPONENTS, "translations": COMPONENTS[:3], "rotations": COMPONENTS[3:]}
    names = [value] if isinstance(value, str) else value
    if not isinstance(names, list) or not names:
        raise ValueError(f'expected "all", "translations", "rotations" or a list of {", ".join(COMPONENTS)}')
    found: list[str] = []
    for name in names:
        if not isinstance(name, str) or (name not in groups and name not in COMPONENTS):
            raise ValueError(
                f'"{name}" is none of "all", "translations", "rotations", {", ".join(COMPONENTS)}'
            )
        found += groups.get(name, (name,))
    return tuple(component for component in COMPONENTS if component in found)


Components = Annotated[
    tuple[str, ...], BeforeValidator(_component_list, json_schema_input_type=str | list[str])
]


def _route(value: object) -> object:
    if not isinstance(value, list) or len(value) < 2 or not all(isinstance(name, str) for name in value):
        raise ValueError('expected the names of two or more points, such as ["A", "B"]')
    return value


def _list_of_runs(value: object) -> object:
    if isinstance(value, list) and value and all(isinstance(name, str) for name in value):
        raise ValueError('expected a list of runs, such as [["A", "B"]]: brackets around each run')
    return value


class Releases(Table):
    """Components, in the member's own axes, that are free at the two ends of every run (hinges, sliders)."""

    start: Components = ()
    end: Components = ()


class Members(Table):
    """A group of straight members of one section and material. Local x runs from start to end."""

    name: Name = Field("", description='default: numbered, such as "members 1"')
    section: Name
    material: Name = Field(description="a name of [materials] or of the built-in table")
    runs: Annotated[
        tuple[Annotated[tuple[Name, ...], BeforeValidator(_route, json_schema_input_type=list[str])], ...],
        BeforeValidator(_list_of_runs, json_schema_input_type=list[list[str]]),
    ] = Field(min_length=1, description="each run joins two or more points in a row")
    up: Axis | None = Field(
        None,
        description="direction the section's z axis (its height) is turned to; default: the study's up, "
        "and for members along it the next axis (x for up = z)",
    )
    turn: Annotated[float, Quantity("angle")] = Field(
        0.0, description="turn of the section about the member, after up"
    )
    tension: Annotated[float, Quantity("force")] = Field(
        0.0, description="steady pull along every run; a push is negative"
    )
    releases: Releases = Releases()
    offset_start: Vector = Field(
        (0.0, 0.0, 0.0), description="rigid arm from the start point to the member's end"
    )
    offset_end: Vector = Field(
        (0.0, 0.0, 0.0), description="rigid arm from the end point to the member's end"
    )


class Support(Table):
    """Points that are held still in some components."""

    at: Names
    hold: Components = Field(description='"all", "translations", "rotations" or a list of components')
