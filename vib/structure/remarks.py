"""What was assumed, and what looks odd, in words."""

from __future__ import annotations

from vib.structure.layout import Layout


def assumptions(layout: Layout) -> tuple[str, ...]:
    """Everything that was taken as rigid, massless, undamped or not modelled."""
    return ()
