"""Fields as a VTU time series with its PVD index, and the finest mesh as a Gmsh file, for common viewers."""

from pathlib import Path
from xml.sax.saxutils import escape, quoteattr

import meshio
import numpy as np

from fem.atomic import whole_file, whole_folder
from fem.results.numbers import Scale, Writer
from fem.results.record import Record


def write_fields(record: Record, folder: Path) -> Path:
    """Write temperatures as ``fields.pvd`` with one VTU file an instant, and ``extremes.vtu``.

    Coordinates are in the docket's length unit, the PVD's times in its time unit. Each frame holds the temperature at
    the nodes, in single precision, and the region's index of each cell. ``extremes.vtu`` holds highest, lowest and the
    time of the highest at the nodes, and of each cell its peak and its doubt; a quick look has no doubt, and its file
    neither. The folder appears whole or not at all.

    Raises
    ------
    OSError
        If the folder cannot be written.
    """
    writer, fields, mesh = Writer.of(record), record.fields, record.mesh
    heat, clock = writer.scale("temperature"), writer.scale("time")
    unit = heat.unit
    region = {"region": mesh.region.astype(np.int32)}
    cells = {**region, f"peak [{unit}]": heat.out(fields.peak[mesh.cells].max(axis=1))}
    if np.isfinite(fields.doubt).all():
        cells[f"doubt [{heat.step_unit.removeprefix('delta_')}]"] = heat.step(fields.doubt)
    nodes = {f"highest [{unit}]": heat.out(fields.peak), f"lowest [{unit}]": heat.out(fields.low)}
    if not record.steady:
        nodes[f"time of highest [{clock.unit}]"] = clock.out(fields.peak_time)
    shape = (_points(record, writer), [("triangle", mesh.cells.astype(np.int32))])
    with whole_folder(folder) as draft:
        names = []
        for i, T in enumerate(fields.T):
            names.append(f"frame-{i:04d}.vtu")
            _vtu(draft / names[-1], *shape, {f"temperature [{unit}]": heat.out(T).astype(np.float32)}, region)
        _vtu(draft / "extremes.vtu", *shape, nodes, cells)
        (draft / "fields.pvd").write_text(_index(record, names, clock), encoding="utf-8")
    return folder


def _vtu(
    path: Path,
    points: np.ndarray,
    blocks: list[tuple[str, np.ndarray]],
    nodes: dict[str, np.ndarray],
    cells: dict[str, np.ndarray],
) -> None:
    mesh = meshio.Mesh(points, blocks, point_data=nodes, cell_data={name: [values] for name, values in cells.items()})
    mesh.write(path, file_format="vtu", binary=True, compression="zlib")


def _points(record: Record, writer: Writer) -> np.ndarray:
    xy = writer.scale("length").out(record.mesh.points)
    return np.column_stack((xy, np.zeros(len(xy))))  # both formats are three-dimensional


def _index(record: Record, names: list[str], clock: Scale) -> str:
    """Return the PVD file: which frame belongs to which time."""
    regions = ", ".join(f"{i} = {name}" for i, name in enumerate(record.mesh.region_names))
    about = (record.title, f"docket {record.content_hash}", f"{record.kind}, {record.standing}")
    told = "; ".join((*about, f"time in {clock.unit}", f"regions: {regions}"))
    times = record.fields.times if record.steady else clock.out(record.fields.times)
    rows = [
        f'    <DataSet timestep="{t:.10g}" group="" part="0" file={quoteattr(name)}/>'
        for t, name in zip(times, names, strict=True)
    ]
    told = escape(told).replace("--", "- -")  # two hyphens would end the comment
    head = [
        '<?xml version="1.0"?>',
        f"<!-- {told} -->",
        '<VTKFile type="Collection" version="0.1" byte_order="LittleEndian">',
    ]
    return "\n".join([*head, "  <Collection>", *rows, "  </Collection>", "</VTKFile>", ""])


def write_mesh(record: Record, path: Path) -> Path:
    """Write the finest mesh as Gmsh's MSH 2.2 in text, regions and edges as named groups, in the docket's length unit.

    An edge of the mesh that lies on several named edges stands in the group of all their names together.

    Raises
    ------
    OSError
        If the file cannot be written.
    """
    mesh, regions = record.mesh, record.mesh.region_names
    names, label = np.unique(np.array(mesh.facet_labels, dtype=np.str_), return_inverse=True)
    edges = [f"edge {name}" if name in regions else str(name) for name in names]
    groups = (label.ravel() + 1 + len(regions), mesh.region + 1)
    out = meshio.Mesh(
        _points(record, Writer.of(record)),
        [("line", mesh.facets), ("triangle", mesh.cells)],
        cell_data={tag: [group.astype(np.int32) for group in groups] for tag in ("gmsh:physical", "gmsh:geometrical")},
        field_data={
            **{_quotable(name): np.array([i + 1, 2]) for i, name in enumerate(regions)},
            **{_quotable(name): np.array([i + 1 + len(regions), 1]) for i, name in enumerate(edges)},
        },
    )
    with whole_file(path) as draft:
        meshio.write(draft, out, file_format="gmsh22", binary=False)
    return path


def _quotable(name: str) -> str:
    """Return a name that the format's double quotes can hold."""
    return name.replace('"', "'")
