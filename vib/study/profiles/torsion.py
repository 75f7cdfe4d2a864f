"""Torsion constants (St Venant) of solid, open and hollow sections. Lengths are metres throughout."""

from __future__ import annotations

import math


def rectangle_torsion(one: float, other: float) -> float:
    """St Venant torsion constant of a solid rectangle, in m^4.

    J = a b^3 (1/3 - 64/pi^5 (b/a) sum over odd n of tanh(n pi a / 2 b) / n^5), a >= b:
    S. Timoshenko, J. N. Goodier, Theory of Elasticity, torsion of rectangular bars (from memory).
    """
    a, b = max(one, other), min(one, other)
    # 40 odd terms leave less than 1e-9 of the sum; what tanh = 1 leaves is added from zeta(5).
    tail = 31 / 32 * 1.0369277551433699
    total = tail + sum((math.tanh(n * math.pi * a / (2 * b)) - 1) / n**5 for n in range(1, 80, 2))
    return a * b**3 * (1 / 3 - 64 / math.pi**5 * (b / a) * total)


def crossed_torsion(
    flanges: int, height: float, width: float, web: float, flange: float, radius: float
) -> float:
    """Torsion constant of an I (two flanges) or T (one flange), in m^4.

    Rectangles, less what a free end of the web loses, and for each junction alpha D^4, D being the circle
    inscribed in it: I. A. El Darwish, B. G. Johnston, Torsion of structural shapes, J. Struct. Div. ASCE 91
    (1965) 203-227 (from memory). For a web much thinner than the flange their fit turns negative, and the
    junction adds nothing. A web of more than twice the flange is outside their fit; it then counts as
    a whole rectangle with four (two) stubs, and the junctions add nothing.
    """
    if web > 2 * flange:
        stub = max(_strip((width - web) / 2, flange) - _end(flange), 0.0)
        return rectangle_torsion(height, web) + 2 * flanges * stub
    clear = _strip(height - flanges * flange, web) - (2 - flanges) * _end(web)
    t, w, r = flange, web, radius
    diameter = ((t + r) ** 2 + w * (r + w / 4)) / (2 * r + t)
    alpha = -0.042 + 0.2204 * w / t + 0.1355 * r / t - 0.0865 * w * r / t**2 - 0.0725 * (w / t) ** 2
    return flanges * (rectangle_torsion(width, flange) + max(alpha, 0.0) * diameter**4) + max(clear, 0.0)


def channel_torsion(height: float, width: float, web: float, tip: float, root: float, radius: float) -> float:
    """Torsion constant of a channel with flanges from ``root`` to ``tip`` thick, in m^4.

    As ``crossed_torsion``, with the L junction of the same source, for which the thicker wall runs through
    the corner.
    """
    if web > root:
        stub = max(_taper(width - web, tip, root) - _end(tip), 0.0)
        walls = 2 * stub + rectangle_torsion(height, web)
    else:
        mean = (tip + root) / 2
        flange = rectangle_torsion(width, mean) + _taper(width, tip, root) - _strip(width, mean)
        walls = 2 * flange + _strip(height - 2 * root, web)
    return walls + 2 * _corner(web, root, radius)


def angle_torsion(leg_a: float, leg_b: float, thickness: float, radius: float) -> float:
    """Torsion constant of an angle, in m^4; as ``channel_torsion``."""
    return (
        _strip(leg_a + leg_b - thickness, thickness)
        - 3 * _end(thickness)
        + _corner(thickness, thickness, radius)
    )


def crossed_torsion_remarks(web: float, flange: float, radius: float) -> tuple[str, ...]:
    """A remark where ``crossed_torsion`` is more than about 5 % off a two-dimensional solution."""
    if web <= 2 * flange and radius <= 2 * flange:
        return ()
    return (
        "the torsion constant may be 10 % or more off: web thicker than twice the flange, or root radius "
        "above twice the flange",
    )


def _strip(length: float, thickness: float) -> float:
    return length * thickness**3 / 3


def _taper(length: float, one: float, other: float) -> float:
    """The strip integral of t^3 / 3 for a thickness that changes evenly."""
    return length * (one + other) * (one**2 + other**2) / 12


def _end(thickness: float) -> float:
    """What a strip loses at one square end: El Darwish & Johnston; half of 0.21 in the rectangle series."""
    return 0.105 * thickness**4


def _corner(one: float, other: float, radius: float) -> float:
    """What an L junction adds, alpha D^4: El Darwish & Johnston; the thicker wall counts as the flange.

    Below their range (walls of 0.4 to 1) the fit turns negative without a rounding; it then adds nothing.
    """
    t, w, r = max(one, other), min(one, other), radius
    diameter = 2 * ((3 * r + w + t) - math.sqrt(2 * (2 * r + w) * (2 * r + t)))
    alpha = -0.0908 + 0.2621 * w / t + 0.1231 * r / t - 0.0752 * w * r / t**2 - 0.0945 * (w / t) ** 2
    return max(alpha, 0.0) * diameter**4


def hollow_torsion(width: float, height: float, thickness: float, middle_radius: float) -> float:
    """Torsion constant of a rectangular hollow section, in m^4: t^3 h / 3 + 2 K A_h.

    EN 10210-2 and EN 10219-2, annex with the formulae (from memory): Bredt's closed wall plus the wall's own;
    h the length and A_h the area within the middle line, K = 2 A_h t / h.
    """
    b, a, t, rc = width - thickness, height - thickness, thickness, middle_radius
    line = 2 * (b + a) - 2 * rc * (4 - math.pi)
    inside = b * a - rc**2 * (4 - math.pi)
    return t**3 * line / 3 + 4 * inside**2 * t / line
