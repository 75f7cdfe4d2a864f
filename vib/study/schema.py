"""The study: what the user wrote, typed, SI inside, immutable."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import Field, PrivateAttr, create_model, field_validator, model_validator

from vib.study.excitations import Excitation, follow
from vib.study.geometry import Material, Members, Section, Support, Table
from vib.study.loads import AppliedLoad, BaseMotion, Respond
from vib.study.machine import Body, Damping, Impact, Matrices, Spring
from vib.study.mesh import Finder, Mesh, Point
from vib.study.quantities import Name, Quantity
from vib.study.severity import Severity
from vib.units import KINDS, UnitSystem, factor

if TYPE_CHECKING:
    from vib.study.matrices import LoadedMatrices
    from vib.study.records import Record
    from vib.study.tolerances import Tolerance
    from vib.system import System


class _OutputUnits(Table):
    output: Literal["si", "us"] = Field("si", description="the units that results are shown in")

    @field_validator("*")
    @classmethod
    def _known(cls, unit: str | None, info: Any) -> str | None:
        if unit is not None and info.field_name != "output":
            factor(unit, info.field_name)
        return unit

    def declared(self) -> dict[str, str]:
        """Unit of a bare number, per kind. Areas and second moments follow from the length."""
        units = {kind: unit for kind, unit in self if unit is not None and kind != "output"}
        if "length" in units:
            length = units["length"]
            units.setdefault("area", f"({length})^2")
            units.setdefault("second_moment", f"({length})^4")
        return units


if TYPE_CHECKING:
    Units = _OutputUnits
else:  # one optional entry per kind of quantity, so that no list of kinds has to be kept twice
    Units = create_model(
        "Units",
        __base__=_OutputUnits,
        __doc__="What a bare number means, by kind of quantity; text with a unit always wins.",
        **{
            kind: (Name | None, Field(None, description=f"unit of a bare {kind.replace('_', ' ')}"))
            for kind in KINDS
            if kind != "ratio"
        },
    )


class Study(Table):
    """One study file: a structure or matrices, its damping, what shakes it and what strikes it.

    Read one with `vib.read`. All figures are SI floats; frequencies and speeds are cycles per second.
    """

    title: Name = Field("Untitled study", description="shown on every output")
    units: Units = Units()
    up: Literal["x", "y", "z"] = Field(
        "z", description="the axis that points up: gravity, and the members' default up"
    )
    accuracy: Annotated[float, Quantity("ratio", 1e-5)] = Field(
        0.005, description="numerical accuracy asked of every natural frequency"
    )
    materials: dict[Name, Material] = {}
    sections: dict[Name, Section] = {}
    mesh: Mesh | None = None
    points: dict[Name, Point] = {}
    members: tuple[Members, ...] = ()
    bodies: tuple[Body, ...] = ()
    supports: tuple[Support, ...] = ()
    springs: tuple[Spring, ...] = ()
    damping: Damping = Damping()
    excitations: tuple[Excitation, ...] = ()
    impact: Impact | None = None
    loads: tuple[AppliedLoad, ...] = ()
    base_motion: BaseMotion | None = None
    response: Respond = Respond()
    severity: Severity | None = None
    matrices: Matrices | None = None

    _file: Path | None = PrivateAttr(None)
    _loaded: Any = PrivateAttr(None)
    _records: Any = PrivateAttr(None)
    _source: Any = PrivateAttr(None)

    @field_validator("accuracy")
    @classmethod
    def _useful(cls, accuracy: float) -> float:
        if accuracy > 0.2:
            raise ValueError("must be at most 20 %: a coarser answer is of no use")
        return accuracy

    @model_validator(mode="after")
    def _one_way(self) -> Study:
        if self.matrices is not None:
            built = [
                name
                for name in ("mesh", "points", "members", "bodies", "supports", "springs")
                if getattr(self, name)
            ]
            if built:
                raise ValueError(
                    f"a study has [matrices] or a structure, not both: remove {', '.join(built)}"
                )
        elif not (self.members or self.bodies or self.mesh):
            raise ValueError("nothing to study: give [[members]], [[bodies]], [mesh] or [matrices]")
        found = [name for name, point in self.points.items() if isinstance(point, Finder)]
        if found and self.mesh is None:
            raise ValueError(f"points.{found[0]} is to be found in a mesh, and there is no [mesh]")
        if self.base_motion is not None and self.matrices is not None:
            raise ValueError("base_motion needs a structure: bare matrices don't say what they stand on")
        follow(self.excitations)
        if self.severity is not None and self.matrices is not None and not self.severity.support_known:
            raise ValueError(
                "severity.support is needed with [matrices], which don't say which freedom moves along "
                'which axis: write support = "rigid" or "flexible"'
            )
        return self

    @property
    def output_units(self) -> UnitSystem:
        """The unit system that results are shown in."""
        return self.units.output

    @property
    def file(self) -> Path | None:
        """The file that the study was read from."""
        return self._file

    @property
    def loaded(self) -> LoadedMatrices | None:
        """The matrices of [matrices] in SI units; None for a structure."""
        loaded: LoadedMatrices | None = self._loaded
        return loaded

    @property
    def records(self) -> dict[str, Record]:
        """The records of loads and of the moving ground, SI, by entry such as ``"loads[0]"``."""
        return dict(self._records or {})

    @property
    def tolerances(self) -> dict[str, Tolerance]:
        """The tolerances that the file states, by entry such as ``"springs[0].stiffness.x"``."""
        return dict(self._source.tolerances) if self._source is not None else {}

    def varied(self, values: Mapping[str, float]) -> Study:
        """The same study with SI values in the place of entries, checked as if they stood in the file.

        Parameters
        ----------
        values
            By entry such as ``"springs[0].stiffness.x"``; frequencies and speeds in cycles per second.

        Raises
        ------
        StudyError
            There is no such entry, it is no quantity, or a value is none that it may have.
        ModelError
            The study was not read from a file.
        """
        from vib.study.varying import vary

        return vary(self, values)[0]

    def kind_of(self, entry: str, value: float = 1.0) -> str:
        """The kind of quantity (see `vib.units.KINDS`) that an entry holds; raises as `varied` does."""
        from vib.study.varying import vary

        return vary(self, {entry: value})[1][entry]

    def system(self, *, up_to: str | float | None = None) -> System:
        """The second-order system of this study, SI units inside.

        Parameters
        ----------
        up_to
            Cut the members finely enough for modes up to this frequency: text with a unit, or Hz.
            Without it they are cut moderately, and `System.modes` cuts them again where it must.

        Raises
        ------
        ModelError
            The structure cannot be built as described.
        """
        from vib.structure import build_system
        from vib.units import parse

        return build_system(
            self, frequency_hz=None if up_to is None else parse(up_to, "frequency", unit="Hz")
        )
