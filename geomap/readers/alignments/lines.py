"""One line out of whatever a file holds, checked so far as a reader can."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from geomap.errors import InputError, problem
from geomap.readers.options import TableOptions
from geomap.readers.sheets import Place
from geomap.readers.spatial import Layer, read_layer
from geomap.tables import schema
from geomap.tables.findings import Check, together
from geomap.tables.raw import RawTable

LINE_STRING, MULTI_LINE_STRING = 1, 5  # type numbers of shapely
SHOWN = 5

REPEATED_VERTEX = Check(
    "vertex twice", "convert", "each vertex once in a row", "a vertex that repeats the one before it was left out"
)
PARTS_JOINED = Check("line in parts", "convert", "one line", "parts that meet end to end were joined")
PARTS_TURNED = Check(
    "parts against each other",
    "query",
    "parts drawn in one direction",
    "joined in the direction of the first part; check that chainage runs so",
)
NO_LEVELS = Check("no levels in the line", "accept", "levels, or none", "the third coordinate was not used")

Vertices = npt.NDArray[np.float64]


@dataclass(frozen=True)
class RawLine:
    """The alignment as a file gives it.

    Attributes
    ----------
    file
        Name of the file (no folder).
    vertices
        Array (n, 2), or (n, 3) where the line carries levels; n is 2 or more, no vertex repeats the one before it.
    crs
        Coordinate system that the file states, as an authority code or well-known text; blank for none.
    findings
        What was noticed, in the layout of findings.
    """

    file: str
    vertices: Vertices
    crs: str = ""
    findings: pd.DataFrame = field(default_factory=pd.DataFrame)


def line_of_layer(path: Path, options: TableOptions, has_layers: bool = False) -> RawLine:
    """Return the one line of a spatial file.

    Raises
    ------
    InputError
        The layer holds no line, several features, or parts that do not meet end to end.
    """
    vertices_layout = schema.inputs()["vertices"]
    layer = read_layer(path, options, vertices_layout, _is_line_layer, has_layers)
    place = Place(layer.file, layer.name)
    shape = _one_line(layer, place)
    import shapely

    parts = [shapely.get_coordinates(part, include_z=bool(shapely.has_z(shape))) for part in shapely.get_parts(shape)]
    joined, notes = _joined(parts, place)
    vertices, about_vertices = checked_vertices(joined, place)
    return RawLine(layer.file, vertices, layer.crs, together([layer.findings, *notes, about_vertices]))


def line_of_table(table: RawTable) -> RawLine:
    """Return the line through the vertices of a table, in the order of its rows.

    Raises
    ------
    InputError
        A vertex has no number for x or y.
    """
    place = Place(table.file, table.sheet)
    axes = {name: pd.to_numeric(table.cells[name].astype(object), errors="coerce") for name in ("x", "y")}
    for name, values in axes.items():
        wrong = values.index[~np.isfinite(values.to_numpy(dtype=float, na_value=np.nan))]
        if len(wrong):
            row = int(wrong[0])
            cell = table.cells[name].fillna("").loc[row]
            where = f"{place.at(row)}, {table.headings[name].found}"
            remedy = f"correct the vertex ({len(wrong)} such in all)"
            raise InputError(problem(where, cell, "a number for every vertex", remedy))
    vertices = np.column_stack([axes["x"].to_numpy(dtype=float), axes["y"].to_numpy(dtype=float)])
    checked, notes = checked_vertices(vertices, place, table.cells.index.to_numpy())
    return RawLine(table.file, checked, table.crs, together([table.findings, notes]))


def checked_vertices(
    vertices: Vertices, place: Place, rows: npt.NDArray[np.int64] | None = None
) -> tuple[Vertices, pd.DataFrame]:
    """Return the vertices without repeated ones, and without a third coordinate that says nothing.

    Parameters
    ----------
    vertices
        Array (n, 2) or (n, 3).
    place
        File, and sheet or layer.
    rows
        Row number of each vertex, for findings.

    Raises
    ------
    InputError
        A coordinate is no finite number, or fewer than two vertices differ.
    """
    finite = np.isfinite(vertices[:, :2]).all(axis=1)
    if not finite.all():
        first = int(np.flatnonzero(~finite)[0]) + 1
        raise InputError(problem(str(place), f"vertex {first} without coordinates", "numbers", "correct the vertex"))
    notes = []
    if vertices.shape[1] == 3 and (not np.isfinite(vertices[:, 2]).all() or not vertices[:, 2].any()):
        notes.append(NO_LEVELS.row("", "a third coordinate that is zero or missing", **place.columns))
        vertices = vertices[:, :2]
    is_new = np.ones(len(vertices), dtype=bool)
    is_new[1:] = (np.diff(vertices[:, :2], axis=0) != 0).any(axis=1)
    if is_new.sum() < 2:
        count = len(vertices)
        found = "one vertex" if count == 1 else f"{count} vertices, all in one place" if count else "no vertex"
        raise InputError(problem(str(place), found, "two vertices apart, or more", "give the whole line"))
    for position in np.flatnonzero(~is_new):
        at = place if rows is None else place.at(int(rows[position]))
        found = f"vertex {position + 1}: {vertices[position, 0]:.12g}, {vertices[position, 1]:.12g}"
        notes.append(REPEATED_VERTEX.row("", found, **at.columns))
    return vertices[is_new], together(notes)


def _is_line_layer(info: Mapping[str, Any]) -> tuple[int, ...]:
    return (int("LineString" in str(info["geometry_type"]) or "Curve" in str(info["geometry_type"])),)


def _one_line(layer: Layer, place: Place) -> Any:
    """Return the only line geometry of a layer."""
    import shapely

    shapes = np.empty(0, dtype=object) if layer.geometry is None else layer.geometry
    kept = np.flatnonzero(~(shapely.is_missing(shapes) | shapely.is_empty(shapes)))
    if len(kept) == 1 and shapely.get_type_id(shapes[kept[0]]) in (LINE_STRING, MULTI_LINE_STRING):
        return shapes[kept[0]]
    if len(kept) > 1:
        names = "; ".join(_feature_name(layer, int(index)) for index in kept[:SHOWN])
        more = f" and {len(kept) - SHOWN} more" if len(kept) > SHOWN else ""
        raise InputError(
            f"{place}: found {len(kept)} features ({names}{more}); allowed: one line, the alignment; "
            "keep that one in the file, or save it as a layer of its own and name the layer"
        )
    found = "no line" if not len(kept) else f"a {shapes[kept[0]].geom_type}"
    raise InputError(problem(str(place), found, "one line, the alignment", "name the file or layer of the line"))


def _feature_name(layer: Layer, index: int) -> str:
    texts = [str(text) for text in layer.fields.iloc[index] if text]
    return f"{index + 1}: {', '.join(texts[:2])[:40]}" if texts else str(index + 1)


def _joined(parts: Sequence[Vertices], place: Place) -> tuple[Vertices, list[pd.DataFrame]]:
    """Return the parts as one line in the direction of the first part, and what there is to say about it."""
    if len(parts) == 1:
        return parts[0], []
    chain, rest, turned = parts[0], list(parts[1:]), 0
    while rest:
        for index, part in enumerate(rest):
            ends = (_meets(chain[-1], part[0]), _meets(part[-1], chain[0]))
            against = (_meets(chain[-1], part[-1]), _meets(part[0], chain[0]))
            if any(ends) or any(against):
                ordered = part if any(ends) else part[::-1]
                turned += not any(ends)
                at_end = ends[0] or (against[0] and not any(ends))
                chain = np.concatenate([chain, ordered[1:]] if at_end else [ordered[:-1], chain])
                del rest[index]
                break
        else:
            raise InputError(_gap(chain, rest, len(parts), place))
    check = PARTS_TURNED if turned else PARTS_JOINED
    found = f"{len(parts)} parts" + (f", {turned} drawn the other way" if turned else "")
    return chain, [check.row("", found, **place.columns)]


def _meets(first: Vertices, second: Vertices) -> bool:
    return bool((first[:2] == second[:2]).all())


def _gap(chain: Vertices, rest: Sequence[Vertices], count: int, place: Place) -> str:
    ends = np.array([end[:2] for part in rest for end in (part[0], part[-1])])
    gap = min(float(np.hypot(*(ends - end[:2]).T).min()) for end in (chain[0], chain[-1]))
    found = f"{count} parts, of which {len(rest)} do not meet the others end to end; the nearest gap is {gap:.6g}"
    return problem(str(place), found, "one connected line", "join the parts in a GIS")
