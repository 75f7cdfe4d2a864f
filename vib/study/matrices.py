"""Matrices of a study: Matrix Market files, .npz files without pickles, or rows, scaled to SI."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from vib.errors import Fault, UnitError, VibError
from vib.study.machine import Matrices, MatrixEntry
from vib.units import LARGEST, parse

# kind of quantity whose unit scales each matrix
_KINDS = {
    "mass": "mass",
    "stiffness": "stiffness",
    "damping": "damping",
    "gyroscopic": "damping",
    "circulatory": "stiffness",
}
_MOST_BYTES = 8 * 10**9


@dataclass(frozen=True, eq=False)
class LoadedMatrices:
    """The matrices in SI units: dense arrays for rows and dense files, csr_array for sparse files."""

    mass: Any
    stiffness: Any
    damping: Any | None
    gyroscopic: Any | None
    circulatory: Any | None = None


def load_matrices(
    table: Matrices, folder: Path, units: dict[str, str]
) -> tuple[LoadedMatrices | None, list[Fault]]:
    """Read every matrix of the table; the faults found, or none and all matrices.

    Parameters
    ----------
    table, folder
        The [matrices] table, and the folder that file names are relative to.
    units
        The declared unit of a bare number, per kind.
    """
    found: dict[str, Any] = {}
    faults = []
    for name, kind in _KINDS.items():
        entry: MatrixEntry | None = getattr(table, name)
        if entry is None:
            found[name] = None
            continue
        try:
            found[name] = _load(entry, folder) * parse(1, kind, unit=entry.unit or units.get(kind))
            if max(abs(found[name].max()), abs(found[name].min())) > LARGEST:
                raise VibError(f"holds entries above {LARGEST:g} in SI units; check its numbers and its unit")
        except UnitError as error:
            message = str(error)
            if entry.unit is None and kind not in units:
                message = (
                    f'the unit of its numbers is not declared: add {kind} = "..." to [units] ({message})'
                )
            faults.append(Fault(f"matrices.{name}", message))
        except VibError as error:
            faults.append(Fault(f"matrices.{name}", str(error)))
    faults += _wrong_sizes(table, found) if not faults else []
    return (None, faults) if faults else (LoadedMatrices(**found), [])


def _wrong_sizes(table: Matrices, found: dict[str, Any]) -> list[Fault]:
    faults = []
    size = found["mass"].shape[0]
    for name, matrix in found.items():
        if matrix is not None and matrix.shape != (size, size):
            rows, columns = matrix.shape
            faults.append(
                Fault(
                    f"matrices.{name}",
                    f"is {rows} x {columns}; wanted {size} x {size}, the rows of the mass matrix",
                )
            )
    if table.freedoms and len(table.freedoms) != size:
        faults.append(
            Fault(
                "matrices.freedoms", f"names {len(table.freedoms)} freedoms, the mass matrix has {size} rows"
            )
        )
    if len(set(table.freedoms)) != len(table.freedoms):
        faults.append(Fault("matrices.freedoms", "names a freedom twice"))
    return faults


def _load(entry: MatrixEntry, folder: Path) -> Any:
    import numpy as np

    if entry.rows is not None:
        if len({len(row) for row in entry.rows}) > 1 or not entry.rows or not entry.rows[0]:
            raise VibError("its rows are of different lengths" if entry.rows else "has no rows")
        return np.array(entry.rows, dtype=float)
    path = folder / (entry.file or "")
    if not path.is_file():
        raise VibError(f'there is no file "{entry.file}" beside the study')
    try:
        matrix = _read_file(path)
    except VibError:
        raise
    except Exception as error:  # scipy and numpy raise many kinds on broken files
        raise VibError(
            f'"{entry.file}" cannot be read as a matrix: {str(error) or type(error).__name__}'
        ) from None
    if matrix.ndim != 2 or 0 in matrix.shape:
        raise VibError(f'"{entry.file}" holds an array of shape {matrix.shape}, not a matrix')
    if np.iscomplexobj(matrix) or not np.issubdtype(matrix.dtype, np.number):
        raise VibError(f'"{entry.file}" holds {matrix.dtype} entries; wanted real numbers')
    return matrix.astype(float)


def _read_file(path: Path) -> Any:
    import scipy.sparse as sparse

    if path.suffix == ".mtx":
        import scipy.io

        rows, columns, *_ = scipy.io.mminfo(path)
        matrix = scipy.io.mmread(path)
        if not sparse.issparse(matrix) and 8 * rows * columns > _MOST_BYTES:
            raise VibError(f"{rows} x {columns} dense entries are more than fit in memory")
        return sparse.csr_array(matrix) if sparse.issparse(matrix) else matrix
    if path.suffix == ".npz":
        return _read_npz(path)
    raise VibError(f'"{path.name}" is neither a .mtx (Matrix Market) nor a .npz file')


def _read_npz(path: Path) -> Any:
    """A sparse matrix as SciPy saves one, or the one array that the file holds; never a pickle."""
    import numpy as np
    import scipy.sparse as sparse

    with np.load(path, allow_pickle=False) as archive:
        names = list(archive)
        if "format" in names:
            return sparse.csr_array(sparse.load_npz(path))
        if len(names) != 1:
            raise VibError(
                f'"{path.name}" holds {len(names)} arrays ({", ".join(names[:5])}); wanted just one'
            )
        return archive[names[0]]
