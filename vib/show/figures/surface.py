"""The surface of a mesh on paper: faces turned away are left out, the others painted from the back."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.show.figures.canvas import INK
from vib.show.figures.space import Array, on_paper, view

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from vib.system import MeshView

MOST_FACES = 12_000  # painted; more are thinned out first
VECTORS = 400  # more faces than this go into a picture as an image of 200 dots an inch
_FINER = 8  # times that the grid which thins faces out may be refined
_EDGES = 2500  # the lines between more faces than this would blacken the picture
_LIGHT = np.array([0.35, -0.55, 0.76])  # from above, over the left shoulder


def corners_of(mesh: MeshView) -> tuple[list[NDArray[np.intp]], list[str]]:
    """Faces of three and four corners, each with its part, thinned out where they are too many."""
    faces, parts = [], []
    for part, corners in mesh.faces:
        faces.append(corners)
        parts.append(part)
    total = sum(len(corners) for corners in faces)
    if total <= MOST_FACES:
        return faces, parts
    across = max(2, int(np.sqrt(MOST_FACES / 6)))  # right for a cube; slender bodies take a finer grid
    merged = _merged(mesh, faces, across)
    for _ in range(_FINER):
        across = -(-3 * across // 2)
        finer = _merged(mesh, faces, across)
        if sum(len(corners) for corners, _ in finer) > MOST_FACES:
            break
        merged = finer
    return [corners for corners, _ in merged], [parts[i] for _, i in merged]


def _merged(mesh: MeshView, faces: list[NDArray[np.intp]], across: int) -> list[tuple[NDArray[np.intp], int]]:
    """Nodes of one box of a grid become one; faces that shrink to a line or a point fall away.

    (J. Rossignac, P. Borrel, Modeling in Computer Graphics, Springer 1993, 455-465: vertex clustering.)
    """
    seen = np.unique(np.concatenate([corners.ravel() for corners in faces]))
    places = mesh.nodes_m[seen]
    low, size = places.min(axis=0), float(np.ptp(places, axis=0).max()) or 1.0
    box = np.floor((places - low) / size * across * (1 - 1e-9)).astype(np.int64)
    key = (box[:, 0] * (across + 1) + box[:, 1]) * (across + 1) + box[:, 2]
    _, first, place = np.unique(key, return_index=True, return_inverse=True)
    became = np.zeros(len(mesh.nodes_m), dtype=np.intp)
    became[seen] = seen[first[place.ravel()]]
    found = []
    for i, corners in enumerate(faces):
        for piece in ([0, 1, 2], [0, 2, 3])[: corners.shape[1] - 2]:
            moved = became[corners[:, piece]]
            ordered = np.sort(moved, axis=1)
            kept = (ordered[:, 1:] != ordered[:, :-1]).all(axis=1)
            _, once = np.unique(ordered[kept], axis=0, return_index=True)
            if len(once):
                found.append((moved[kept][once], i))
    return found


def paint(
    axes: Axes,
    mesh: MeshView,
    up: str,
    *,
    shift: Array | None = None,
    colours: Any = None,
    by_part: dict[str, str] | None = None,
    level: Array | None = None,
) -> None:
    """Paint the surface.

    Parameters
    ----------
    shift
        (k, 3) displacement to draw it with.
    colours, level
        A colour map and its argument (k,), 0 to 1, at each node.
    by_part
        Or a colour for each part.
    """
    from matplotlib.collections import PolyCollection
    from matplotlib.colors import to_rgb

    places = mesh.nodes_m if shift is None else mesh.nodes_m + shift
    faces, parts = corners_of(mesh)
    away = _sight(up)
    polygons: list[Array] = []
    depths: list[Array] = []
    paints: list[Array] = []
    for corners, part in zip(faces, parts, strict=True):
        at = places[corners]
        normal = np.cross(at[:, 1] - at[:, 0], at[:, 2] - at[:, 0])
        length = np.linalg.norm(normal, axis=1)
        facing = normal @ away / np.where(length > 0, length, 1.0)
        solid = _closed(mesh, part)
        seen = (facing < 0) if solid else np.ones(len(corners), dtype=bool)
        if by_part is not None:
            tone = np.tile(to_rgb(by_part.get(part, "#888888")), (int(seen.sum()), 1))
        else:
            assert level is not None
            tone = np.asarray(colours(level[corners[seen]].mean(axis=1)))[:, :3]
        light = np.abs(normal[seen] @ _turned_light(up)) / np.where(length[seen] > 0, length[seen], 1.0)
        shade = (0.72 + 0.28 * light)[:, None]
        polygons += list(on_paper(at[seen].reshape(-1, 3), up).reshape(-1, corners.shape[1], 2))
        depths.append(at[seen].mean(axis=1) @ away)
        paints.append(tone * shade)
    if not polygons:
        return
    order = np.argsort(-np.concatenate(depths), kind="stable")
    painted = np.concatenate(paints)[order]
    few = len(order) <= _EDGES
    collection = PolyCollection(
        [polygons[i] for i in order],
        facecolors=painted,
        edgecolors=INK if few else painted,
        linewidths=0.25 if few else 0.3,
        zorder=2.5,
    )
    collection.set_rasterized(len(order) > VECTORS)
    axes.add_collection(collection)


def outline(axes: Axes, mesh: MeshView, up: str, colour: str) -> None:
    """The edges where the surface bends sharply or ends, as thin lines: the mesh at rest."""
    from matplotlib.collections import LineCollection

    edges = sharp_edges(mesh)
    lines = on_paper(mesh.nodes_m[edges].reshape(-1, 3), up).reshape(-1, 2, 2)
    axes.add_collection(LineCollection(list(lines), colors=colour, linewidths=0.5, zorder=1))


def sharp_edges(mesh: MeshView, angle: float = 0.5) -> NDArray[np.intp]:
    """Edges (s, 2) of the surface with one face, or between faces at more than ``angle`` rad."""
    ends, normals = [], []
    for _, corners in mesh.faces:
        at = mesh.nodes_m[corners]
        normal = np.cross(at[:, 1] - at[:, 0], at[:, 2] - at[:, 0])
        normal /= np.maximum(np.linalg.norm(normal, axis=1), np.finfo(float).tiny)[:, None]
        pair = np.stack([corners, np.roll(corners, -1, axis=1)], axis=2).reshape(-1, 2)
        ends.append(np.sort(pair, axis=1))
        normals.append(np.repeat(normal, corners.shape[1], axis=0))
    edges, normal = np.concatenate(ends), np.concatenate(normals)
    order = np.lexsort((edges[:, 1], edges[:, 0]))
    edges, normal = edges[order], normal[order]
    same = (edges[1:] == edges[:-1]).all(axis=1)
    smooth = same & (np.abs(np.einsum("ei,ei->e", normal[1:], normal[:-1])) > np.cos(angle))
    calm = np.zeros(len(edges), dtype=bool)
    calm[1:] |= smooth
    calm[:-1] |= smooth
    return np.unique(edges[~calm], axis=0)


def _closed(mesh: MeshView, part: str) -> bool:
    """Whether a part consists of solids, whose faces are seen from one side only."""
    return any(name == part and not kind.startswith(("triangle", "quad")) for kind, name, _ in mesh.cells)


def _sight(up: str) -> Array:
    """(3,) the direction that one looks along."""
    right, raised = view(up)
    found: Array = -np.cross(right, raised)
    return found


def _turned_light(up: str) -> Array:
    turn = "xyz".index(up) + 1
    return np.roll(_LIGHT, turn)
