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


def strip_torsion(length: float, thickness: float) -> float:
    """Torsion constant of a thin strip without end effects, length thickness^3 / 3, in m^4."""
    return length * thickness**3 / 3


def free_end_loss(thickness: float) -> float:
    """What a strip loses at one square free end, 0.105 thickness^4, in m^4.

    El Darwish & Johnston 1965; it is the limit of the rectangle series, 0.21 for two ends.
    """
    return 0.105 * thickness**4


def tee_junction(flange: float, web: float, root_radius: float) -> float:
    """What the junction of a web on the middle of a flange adds, alpha D^4, in m^4.

    I. A. El Darwish, B. G. Johnston, Torsion of structural shapes, J. Struct. Div. ASCE 91 (1965) 203-227
    (from memory); D is the circle inscribed in the junction. Fitted for web/flange of 0.5 to 1.
    """
    t, w, r = flange, web, root_radius
    diameter = ((t + r) ** 2 + w * (r + w / 4)) / (2 * r + t)
    alpha = -0.042 + 0.2204 * w / t + 0.1355 * r / t - 0.0865 * w * r / t**2 - 0.0725 * (w / t) ** 2
    return alpha * diameter**4


def corner_junction(flange: float, web: float, root_radius: float) -> float:
    """What the corner between a flange of full width and a web adds, alpha D^4, in m^4.

    El Darwish & Johnston 1965 (from memory), the L-shaped junction.
    """
    t, w, r = flange, web, root_radius
    diameter = 2 * ((3 * r + w + t) - math.sqrt(2 * (2 * r + w) * (2 * r + t)))
    alpha = -0.0908 + 0.2621 * w / t + 0.1231 * r / t - 0.0752 * w * r / t**2 - 0.0945 * (w / t) ** 2
    return alpha * diameter**4


def hollow_torsion(width: float, height: float, thickness: float, middle_radius: float) -> float:
    """Torsion constant of a rectangular hollow section, in m^4: t^3 h / 3 + 2 K A_h.

    EN 10210-2 and EN 10219-2, annex with the formulae (from memory): Bredt's closed wall plus the wall's own;
    h the length and A_h the area within the middle line, K = 2 A_h t / h.
    """
    b, a, t, rc = width - thickness, height - thickness, thickness, middle_radius
    line = 2 * (b + a) - 2 * rc * (4 - math.pi)
    inside = b * a - rc**2 * (4 - math.pi)
    return t**3 * line / 3 + 4 * inside**2 * t / line
