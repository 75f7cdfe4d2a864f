"""From what shakes a machine to forces on its freedoms, line by line, as functions of the running speed.

Rooms: ``train`` (which shaft follows which), ``aim`` (where a force acts and along what), ``strength`` (how
large each kind of force is at a speed), ``terms`` (what one table of a study does), ``drive`` (all together).
"""

from vib.drive.drive import Drive, DriveLine, drive

__all__ = ["Drive", "DriveLine", "drive"]
