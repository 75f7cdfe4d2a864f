"""From the member tables to arrays with one entry per stretch: the straight bit between two points."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure import axes
from vib.structure.beam import Bars
from vib.structure.rigid import arms, turned
from vib.study import Study
from vib.study.geometry import Members
from vib.study.materials import MaterialData, find_material
from vib.study.profiles import Profile
from vib.study.quantities import COMPONENTS

Indices = NDArray[np.intp]
Flags = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Stretches:
    """Every stretch of every run, s of them.

    ``ends`` (s, 2) point numbers; ``tips_m`` (s, 2, 3) where the member really begins and ends, rigid
    offsets included; ``reach_m`` (s, 2, 3) from point to tip; ``released`` (s, 2, 6) in member axes;
    ``axes`` (s, 3, 3) drawn axes as rows; ``bars`` of full length with ``principal_axes`` (s, 3, 3);
    ``group`` (s,) number of the member table; ``entries`` and ``labels`` name each stretch; ``pull`` (s,)
    the steady axial force, N.
    """

    ends: Indices
    tips_m: NDArray[np.float64]
    reach_m: NDArray[np.float64]
    released: Flags
    axes: NDArray[np.float64]
    principal_axes: NDArray[np.float64]
    bars: Bars
    group: Indices
    entries: tuple[str, ...]
    labels: tuple[str, ...]
    pull: NDArray[np.float64]

    @property
    def separate(self) -> Flags:
        """(s, 2): ends that are not simply the point itself, because of an offset or a release."""
        found: Flags = self.released.any(axis=2) | (self.reach_m != 0).any(axis=2)
        return found

    def attachment(self) -> NDArray[np.float64]:
        """(s, 2, 6, 6): how the components of each end follow those of its point.

        What is released does not follow. Exactly the identity where nothing is released or offset.
        """
        turn = turned(self.axes)[:, None]
        held = ~self.released
        follow = np.swapaxes(turn, -1, -2) @ (held[..., :, None] * turn)
        whole = np.stack([held[..., :3].all(axis=2), held[..., 3:].all(axis=2)], axis=2)
        for k, rows in enumerate((slice(0, 3), slice(3, 6))):
            follow[whole[..., k], rows, :] = np.eye(6)[rows]
        found: NDArray[np.float64] = follow @ arms(self.reach_m)
        return found


def read_stretches(study: Study, points: dict[str, int], faults: list[str]) -> Stretches:
    """Arrays of the study's members; faults are appended in words, each naming its entry."""
    coordinates = coordinates_of(study)
    rows = [
        (i, entry, run, k)
        for i, members in enumerate(study.members)
        for entry, run in _named_runs(i, members)
        for k in range(len(run) - 1)
    ]
    count = len(rows)
    group = np.array([i for i, *_ in rows], dtype=np.intp)
    ends = np.array([[points[run[k]], points[run[k + 1]]] for _, _, run, k in rows], dtype=np.intp).reshape(
        -1, 2
    )
    reach = np.zeros((count, 2, 3))
    released = np.zeros((count, 2, 6), dtype=bool)
    for s, (i, _, run, k) in enumerate(rows):
        members = study.members[i]
        if k == 0:
            reach[s, 0] = members.offset_start
            released[s, 0] = [name in members.releases.start for name in COMPONENTS]
        if k == len(run) - 2:
            reach[s, 1] = members.offset_end
            released[s, 1] = [name in members.releases.end for name in COMPONENTS]
    tips = coordinates[ends] + reach
    along = tips[:, 1] - tips[:, 0]
    length = np.linalg.norm(along, axis=1)
    extent = max(float(np.ptp(tips, axis=(0, 1)).max()), float(np.abs(reach).max())) if count else 0.0
    entries = tuple(f'{entry} ("{study.members[i].name}")' for i, entry, _, _ in rows)
    labels = _labels([f"{study.members[i].name} {run[k]}-{run[k + 1]}" for i, _, run, k in rows])
    for s in np.flatnonzero(length <= 1e-9 * extent).tolist():
        name_a, name_b = (rows[s][2][rows[s][3] + k] for k in (0, 1))
        apart = "at the same place" if length[s] == 0 else f"only {length[s]:.3g} m apart"
        faults.append(f"{entries[s]}: no length between {name_a} and {name_b}; its ends are {apart}")
    along = np.where(length[:, None] > 0, along, [1.0, 0.0, 0.0]) / np.where(length > 0, length, 1.0)[:, None]
    drawn = _drawn_axes(study, group, along, entries, faults)
    bars, angle = _bars(study, group, np.where(length > 0, length, 1.0))
    for s in np.flatnonzero(loose(released) & (bars.density == 0)).tolist():
        faults.append(
            f"{entries[s]}: its releases let it move freely and it has no mass, so its movement is "
            "undetermined; hold a component at one end, or give its material a density"
        )
    pull = np.array([members.tension for members in study.members])[group] if count else np.zeros(0)
    return Stretches(
        ends, tips, reach, released, drawn, axes.turn_about_x(drawn, angle), bars, group, entries, labels,
        pull,
    )  # fmt: skip


def coordinates_of(study: Study) -> NDArray[np.float64]:
    """Coordinates (p, 3) of the points of a plain study, m, none of which is still to be found in a mesh."""
    places = list(study.points.values())
    return np.array(places, dtype=float).reshape(-1, 3)


def pieces_of(bars: Bars, counts: Indices) -> Bars:
    """One piece of each stretch that is cut into ``counts`` (s,) equal pieces."""
    return replace(bars, length=bars.length / counts)


def loose(released: Flags) -> Flags:
    """(s,) stretches that their releases (s, 2, 6) leave free to move by themselves as rigid bodies."""
    found = np.zeros(len(released), dtype=bool)
    both_ends = np.asarray(released.any(axis=2))
    for s in np.flatnonzero(both_ends[:, 0] & both_ends[:, 1]):
        start, end = ~released[s]
        rows = np.concatenate([np.eye(6)[start], arms(np.array([1.0, 0.0, 0.0]))[end]])
        found[s] = np.linalg.matrix_rank(rows) < 6
    return found


def _labels(names: list[str]) -> tuple[str, ...]:
    """Each name once: the second of the same gets a (2), and so on."""
    times: Counter[str] = Counter()
    found = []
    for name in names:
        times[name] += 1
        found.append(name if times[name] == 1 else f"{name} ({times[name]})")
    return tuple(found)


def _named_runs(i: int, members: Members) -> list[tuple[str, tuple[str, ...]]]:
    return [(f"members[{i}].runs[{j}]", run) for j, run in enumerate(members.runs)]


def _drawn_axes(
    study: Study, group: Indices, along: NDArray[np.float64], entries: tuple[str, ...], faults: list[str]
) -> NDArray[np.float64]:
    if not len(group):
        return np.zeros((0, 3, 3))
    explicit = np.array([members.up is not None for members in study.members])[group]
    given = np.array([members.up or (0.0, 0.0, 0.0) for members in study.members])[group]
    up = np.where(explicit[:, None], given, axes.default_up(along, study.up))
    useless = axes.parallel(along, up)
    for s in np.flatnonzero(useless):
        faults.append(f"{entries[s]}: up lies along the member and cannot turn its section; give another up")
    turn = np.array([members.turn for members in study.members])[group]
    return axes.member_axes(along, np.where(useless[:, None], axes.default_up(along, "z"), up), turn)


def material_of(study: Study, i: int) -> tuple[MaterialData, float, float | None]:
    """Material data, shear modulus (Pa) and damping ratio of a member table.

    Raises
    ------
    ModelError
        No such material.
    """
    name = study.members[i].material
    if name in study.materials:
        own = study.materials[name]
        return own.data, own.shear, own.damping_ratio
    try:
        data = find_material(name)
    except ModelError as error:
        raise ModelError(f"members[{i}].material: {error}") from None
    return data, data.shear_modulus, None


def profile_of(study: Study, i: int) -> Profile:
    """The section of a member table.

    Raises
    ------
    ModelError
        No such section.
    """
    name = study.members[i].section
    if name not in study.sections:
        raise ModelError(f'members[{i}].section: no section is named "{name}"; add [sections.{name}]')
    return study.sections[name].profile


def _bars(study: Study, group: Indices, length: NDArray[np.float64]) -> tuple[Bars, NDArray[np.float64]]:
    rows = []
    for i in range(len(study.members)):
        profile = profile_of(study, i)
        data, shear, _ = material_of(study, i)
        rows.append(
            (
                profile.area,
                profile.second_moment_y,
                profile.second_moment_z,
                profile.torsion_constant,
                profile.shear_area_y,
                profile.shear_area_z,
                data.youngs_modulus,
                shear,
                data.density,
                profile.principal_angle,
            )
        )
    columns = np.array(rows, dtype=float).reshape(-1, 10)[group].T
    names = [field.name for field in fields(Bars)][1:]
    return Bars(length=length, **dict(zip(names, columns[:9], strict=True))), columns[9]
