"""Meshes: from a file to cells with materials, and how their nodes hang together with the rest of a study.

Rooms: ``reading`` (meshio, contained), ``regions`` (names of cells), ``cleaning`` (what is broken, what can be
mended), ``finding`` (points of the study in the mesh), ``model`` (all of it, resolved), ``weaving`` (mesh and
frame in one set of freedoms), ``operators`` (shares of the regions), ``skin`` (the outer faces), ``accuracy``
(the error of the frequencies).
"""

from vib.structure.mesh.model import MeshModel, read_mesh_study

__all__ = ["MeshModel", "read_mesh_study"]
