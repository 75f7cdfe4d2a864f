"""Pictures, drawn with matplotlib's object interface; nothing here opens a window.

Rooms: ``canvas`` (size, style, SVG and PNG), ``space`` (the view of a structure), ``structure``, ``shapes``
(modes), ``ringing``, ``speeds`` (speed-frequency diagram).
"""
