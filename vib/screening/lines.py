"""What an excitation means in Hz: one line per order and speed range, and per fixed frequency."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from vib.errors import ModelError, UnitError
from vib.units import parse

if TYPE_CHECKING:
    from vib.study.excitations import Excitation

DEFAULT_BAND = 0.20  # common practice, no source; a study or a caller can set another


@dataclass(frozen=True)
class Line:
    """One order of a running speed or of a speed range, or one fixed frequency, with its band.

    Attributes
    ----------
    excitation
        Name of the excitation.
    order
        Multiple of the running speed; None for a fixed frequency.
    speed
        Running speed (from, to), rev/s; None for a fixed frequency.
    from_hz, to_hz
        Excitation frequency; equal where there is one speed only.
    band
        Half width of the band as a share of the excitation frequency.
    """

    excitation: str
    order: float | None
    speed: tuple[float, float] | None
    from_hz: float
    to_hz: float
    band: float

    @property
    def band_from_hz(self) -> float:
        """The lowest frequency that is too near: (1 - band) times the lowest excitation frequency."""
        return (1.0 - self.band) * self.from_hz

    @property
    def band_to_hz(self) -> float:
        """The highest frequency that is too near: (1 + band) times the highest excitation frequency."""
        return (1.0 + self.band) * self.to_hz

    def separation(self, frequency_hz: float) -> float:
        """Signed distance of a frequency as a share of the nearest excitation frequency; 0 in the range."""
        nearest = min(max(frequency_hz, self.from_hz), self.to_hz)
        return (frequency_hz - nearest) / nearest if nearest else 0.0

    def speeds_to_avoid(self, frequency_hz: float, error_hz: float = 0.0) -> tuple[float, float] | None:
        """Running speeds (from, to), rev/s, whose band at this order holds a mode; None without an order.

        A mode at f lies in the band of the speed s where (1 - band) order s <= f <= (1 + band) order s;
        the error bar of the mode widens the range.
        """
        if self.order is None:
            return None
        lowest = max(frequency_hz - error_hz, 0.0) / (self.order * (1.0 + self.band))
        return lowest, (frequency_hz + error_hz) / (self.order * (1.0 - self.band))


def read_band(band: float | str | None) -> float:
    """A half width from a number, text such as "25 %", or None for the default of 20 %.

    Raises
    ------
    UnitError
        Not a ratio from 0 up to, and without, 1.
    """
    if band is None:
        return DEFAULT_BAND
    try:
        width = parse(band, "ratio")
    except UnitError as error:
        raise UnitError(f"band: {error}") from None
    if not 0.0 <= width < 1.0:
        raise UnitError(f'band: must be at least 0 and less than 1, got {width:g}; 20 % is 0.2 or "20 %"')
    return width


def excitation_lines(
    excitations: Sequence[Excitation], *, band: float | str | None = None
) -> tuple[Line, ...]:
    """Every line of every excitation, in the order of the study.

    Parameters
    ----------
    excitations
        As in a study; a band of their own wins over ``band``.
    band
        Half width for those that have none; default 20 % (common practice, no source).

    Raises
    ------
    ModelError
        There are no excitations, or two have the same name.
    UnitError
        The band is not a ratio below 1.
    """
    if not excitations:
        raise ModelError(
            "excitations: there are none to screen against; add [[excitations]] with a speed or frequencies "
            "to the study"
        )
    names = [excitation.name for excitation in excitations]
    if twice := next((name for name in names if names.count(name) > 1), None):
        raise ModelError(f"excitations: {twice!r} is there more than once; give each a name of its own")
    common = read_band(band)
    return tuple(line for excitation in excitations for line in _lines_of(excitation, common))


def _lines_of(excitation: Excitation, common: float) -> Iterator[Line]:
    band = common if excitation.band is None else excitation.band
    for order in excitation.orders if excitation.speed_ranges else ():
        for low, high in excitation.speed_ranges:
            yield Line(excitation.name, order, (low, high), order * low, order * high, band)
    for frequency in excitation.frequencies:
        yield Line(excitation.name, None, None, frequency, frequency, band)


def highest_needed_hz(
    excitations: Sequence[Excitation], *, band: float | str | None = None, accuracy: float = 0.005
) -> float:
    """The frequency (Hz) up to which modes are needed to screen against these excitations.

    The top of the highest band, raised by twice the accuracy asked of the modes, so that a mode just above
    the band whose error bar reaches into it is found as well.

    Parameters
    ----------
    excitations, band
        As in `excitation_lines`.
    accuracy
        Relative accuracy asked of the natural frequencies.

    Raises
    ------
    ModelError
        There are no excitations.
    """
    lines = excitation_lines(excitations, band=band)
    return max(line.band_to_hz for line in lines) * (1.0 + 2.0 * accuracy)
