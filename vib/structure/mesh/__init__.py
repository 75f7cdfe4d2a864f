"""Meshes: from a file to cells with materials, and how their nodes hang together with the rest of a study.

Rooms: ``reading`` (meshio, contained), ``regions`` (names of cells), ``assign`` (what they are made of),
``cleaning`` (what is broken, what can be mended), ``finding`` (points of the study in the mesh), ``model``
(all of it, resolved), ``parts`` (whether it hangs together), ``weaving`` (mesh and frame in one set of
freedoms), ``operators`` (shares of the regions), ``skin`` (the outer faces), ``accuracy`` (the error of the
frequencies), ``whole`` (what the system gets of it).
"""

from vib.structure.mesh.model import MeshModel, read_mesh_study

__all__ = ["MeshModel", "read_mesh_study"]
