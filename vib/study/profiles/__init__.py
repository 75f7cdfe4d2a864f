"""Cross sections from their dimensions: area, second moments, torsion constant, shear areas, outline.

Axes: x along the member, y across (width), z up (height). An upright I has its strong second moment about y,
as in EN 1993. Everything is in SI: metres and radians in, metres to their powers out.

Areas and second moments are exact for the outline with its roundings. Shear areas are energy values:
5/6 A for a rectangle, 9/10 A for a round bar, the flow along the middle lines of thin walls for the rest
(``walls``); the coefficients of Cowper (1966), which depend on Poisson's ratio, are not used.

Rooms: ``profile`` (the class), ``solid``, ``hollow``, ``thin_walled`` and ``general`` (the shapes),
``outlines`` (areas), ``walls`` (shear areas), ``torsion`` (torsion constants).
"""

from vib.study.profiles.general import general
from vib.study.profiles.hollow import circular_hollow, rectangular_hollow, square_hollow
from vib.study.profiles.profile import Profile
from vib.study.profiles.solid import flat, rectangle, round_bar
from vib.study.profiles.thin_walled import angle, channel, i_section, t_section, tapered_channel

__all__ = [
    "Profile",
    "angle",
    "channel",
    "circular_hollow",
    "flat",
    "general",
    "i_section",
    "rectangle",
    "rectangular_hollow",
    "round_bar",
    "square_hollow",
    "t_section",
    "tapered_channel",
]
