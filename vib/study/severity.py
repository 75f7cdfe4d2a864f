"""The table [severity]: what vibration of this machine is judged by, and where."""

from __future__ import annotations

from typing import Annotated, Literal, get_args

from pydantic import BeforeValidator, Field, field_validator, model_validator

from vib.study.geometry import Table
from vib.study.quantities import Name, Names, Quantity, positive

Standard = Literal["ISO 20816-3", "ISO 10816-3", "ISO 10816-1"]
Stand = Literal["rigid", "flexible"]

# ISO 20816-3:2022 (ISO 10816-3:2009), figures from memory: machines from 15 kW to 50 MW; group 1 above
# 300 kW, or electrical machines of shaft height 315 mm and more; group 2 down to 160 mm
_LEAST_POWER, _LARGE_POWER, _GREATEST_POWER = 15e3, 300e3, 50e6
_LEAST_HEIGHT, _LARGE_HEIGHT = 0.160, 0.315
# ISO 10816-1:1995 annex B, figures from memory: class I to 15 kW, class II to 75 kW
_SMALL_POWER, _MEDIUM_POWER = 15e3, 75e3
_SLACK = 1e-9  # a nameplate figure in another unit is not to change the group by round-off


class StandPerAxis(Table):
    """How the machine stands along each axis; what is not given is judged from the computed frequencies."""

    x: Stand | None = None
    y: Stand | None = None
    z: Stand | None = None


def _stand(value: object) -> object:
    if isinstance(value, str):
        if value not in get_args(Stand):
            raise ValueError(
                f'expected "rigid", "flexible" or a table such as {{z = "rigid"}}, got "{value}"'
            )
        return {"x": value, "y": value, "z": value}
    return value


def _whole_group(value: object) -> object:
    if isinstance(value, bool) or value not in (1, 2):
        raise ValueError("expected 1 (large machines) or 2 (medium machines)")
    return value


class OwnLimits(Table):
    """Limits of the user's own, such as those of a purchase specification."""

    name: Name = Field("own limits", description="where they come from; shown beside each number")
    at: Names | None = Field(None, description="places that they hold for; default: all that are judged")
    velocity_rms: Annotated[float, positive("velocity")] | None = Field(
        None, description="r.m.s. velocity, of all frequencies"
    )
    displacement_rms: Annotated[float, positive("length")] | None = Field(
        None, description="r.m.s. displacement, of all frequencies"
    )
    displacement_peak: Annotated[float, positive("length")] | None = Field(
        None, description="zero to peak displacement; half of peak to peak"
    )
    force: Annotated[float, positive("force")] | None = Field(
        None, description="amplitude of the force into each support and mount"
    )

    @model_validator(mode="after")
    def _any(self) -> OwnLimits:
        if not any((self.velocity_rms, self.displacement_rms, self.displacement_peak, self.force)):
            raise ValueError(
                "names no limit: give velocity_rms, displacement_rms, displacement_peak or force"
            )
        moves = (self.velocity_rms, self.displacement_rms, self.displacement_peak)
        if self.at is not None and not any(moves):
            raise ValueError("at goes with limits of velocity or displacement; force holds for every support")
        return self


class Severity(Table):
    """By what the predicted vibration is judged: a standard, limits of one's own, or both."""

    standard: Standard | None = Field(
        None,
        description="default: ISO 10816-1 where machine_class is given, ISO 20816-3 where group, power or "
        "shaft_height is, else none",
    )
    group: Annotated[Literal[1, 2], BeforeValidator(_whole_group)] | None = Field(
        None, description="machine group of ISO 20816-3: 1 large, 2 medium"
    )
    machine_class: Literal["I", "II", "III", "IV"] | None = Field(
        None, description="machine class of ISO 10816-1"
    )
    power: Annotated[float, positive("power")] | None = Field(
        None, description="rated power, from which group or class follows"
    )
    shaft_height: Annotated[float, positive("length")] | None = Field(
        None, description="of an electrical machine: shaft above feet, from which the group follows"
    )
    support: Annotated[
        StandPerAxis,
        BeforeValidator(_stand, json_schema_input_type=Stand | StandPerAxis),
    ] = Field(
        StandPerAxis(),
        description="for all axes, or per axis; default: judged per axis from the "
        "computed frequencies, as the standard does",
    )
    places: Names | None = Field(
        None,
        description='bearings and feet: points and bodies, alone or with a component ("bearing y"); '
        "default: every body",
    )
    main: Name | None = Field(
        None,
        description="the excitation whose running speed is the main excitation frequency; default: the one "
        "whose speed varies in a run-up",
    )
    limits: tuple[OwnLimits, ...] = Field(
        (), description="limits of the user's own, beside or instead of a standard"
    )
    separation_margin: Annotated[float, Quantity("ratio", 0.0)] | None = Field(
        None,
        description="critical speeds stay away from the running speeds by this share of them; default: by "
        "the amplification factor",
    )

    @field_validator("separation_margin")
    @classmethod
    def _below_one(cls, margin: float | None) -> float | None:
        if margin is not None and margin >= 1:
            raise ValueError('must be less than 1; a margin of 15 % is written 0.15 or "15 %"')
        return margin

    @model_validator(mode="after")
    def _whole(self) -> Severity:
        given = self._given()
        if not given and self.standard is None:
            if not self.limits:
                raise ValueError(
                    "says nothing to judge by: give group, power, shaft_height, machine_class or "
                    "[[severity.limits]]"
                )
            return self
        if len(given) != 1:
            what = ", ".join(given) or "none of them"
            raise ValueError(f"{self.rules} needs exactly one of {', '.join(self._known())}; there is {what}")
        if given[0] not in self._known():
            raise ValueError(
                f"{given[0]} does not go with {self.rules}; give one of {', '.join(self._known())}"
            )
        if self.rules != "ISO 10816-1":
            self._in_scope()
        return self

    def _given(self) -> list[str]:
        names = ("group", "machine_class", "power", "shaft_height")
        return [name for name in names if getattr(self, name) is not None]

    def _known(self) -> tuple[str, ...]:
        if self.rules == "ISO 10816-1":
            return ("machine_class", "power")
        return ("group", "power", "shaft_height")

    def _in_scope(self) -> None:
        mend = 'judge by [[severity.limits]] or, as a machine in general, by standard = "ISO 10816-1"'
        if self.power is not None and not _LEAST_POWER * (1 - _SLACK) <= self.power <= _GREATEST_POWER:
            raise ValueError(
                f"power: {self.rules} is for machines from 15 kW to 50 MW (figures from memory), not of "
                f"{self.power / 1e3:g} kW; {mend}"
            )
        if self.shaft_height is not None and self.shaft_height < _LEAST_HEIGHT * (1 - _SLACK):
            raise ValueError(
                f"shaft_height: {self.rules} is for shaft heights from 160 mm up (figures from memory), not "
                f"{1e3 * self.shaft_height:g} mm; {mend}, with power or machine_class"
            )

    @property
    def rules(self) -> Standard | None:
        """The standard that is judged by; None where only the user's own limits are."""
        if self.standard is not None or not self._given():
            return self.standard
        return "ISO 10816-1" if self.machine_class is not None else "ISO 20816-3"

    @property
    def machine_group(self) -> int | None:
        """Group 1 or 2 of ISO 20816-3, stated or from power or shaft height; None by other rules."""
        if self.rules not in ("ISO 20816-3", "ISO 10816-3"):
            return None
        if self.group is not None:
            return self.group
        if self.power is not None:
            return 1 if self.power > _LARGE_POWER * (1 + _SLACK) else 2
        assert self.shaft_height is not None
        return 1 if self.shaft_height >= _LARGE_HEIGHT * (1 - _SLACK) else 2

    @property
    def needs_support(self) -> bool:
        """Whether the limits depend on how the machine stands, rigid or flexible."""
        return self.machine_group is not None or self.class_on("rigid") != self.class_on("flexible")

    @property
    def support_known(self) -> bool:
        """Whether nothing about the support needs to be judged from the computed frequencies."""
        return not self.needs_support or None not in (self.support.x, self.support.y, self.support.z)

    def class_on(self, stand: Stand) -> str | None:
        """Class I to IV of ISO 10816-1 on a support of this kind; None by other rules."""
        if self.rules != "ISO 10816-1":
            return None
        if self.machine_class is not None:
            return self.machine_class
        assert self.power is not None
        if self.power <= _SMALL_POWER * (1 + _SLACK):
            return "I"
        if self.power <= _MEDIUM_POWER * (1 + _SLACK):
            return "II"
        return "III" if stand == "rigid" else "IV"

    @property
    def machine_words(self) -> str:
        """What the machine was taken for, and why."""
        if self.rules is None:
            return "judged by own limits only"
        if self.group is not None or self.machine_class is not None:
            which = f"class {self.machine_class}" if self.machine_class else f"group {self.group}"
            return f"{which} of {self.rules}, as stated"
        by = f"power {self.power / 1e3:g} kW" if self.power is not None else self._height_words()
        if self.machine_group is not None:
            return f"group {self.machine_group} of {self.rules}, by its {by}"
        small = self.class_on("rigid")
        which = f"class {small}" if small in ("I", "II") else "class III where rigid, IV where flexible"
        return f"{which} of {self.rules}, by its {by}"

    def _height_words(self) -> str:
        assert self.shaft_height is not None
        return f"shaft height {1e3 * self.shaft_height:g} mm"
