"""Reads files with an independent reader and prints what they hold as JSON.

    measure.py READER FILE...     READER: vtk, meshio, ezdxf

Prints a line for each file: counts, the bounding box, the total area of triangles and the total
length of lines; for VTU the point and cell data too.
"""
import json
import sys

import numpy as np


def measure(points, triangles, lines):
    points = np.asarray(points, float).reshape(-1, 3)
    triangles = np.asarray(triangles, int).reshape(-1, 3)
    out = {"points": len(points), "triangles": len(triangles)}
    a, b, c = (points[triangles[:, k]] for k in range(3))
    out["area"] = float(np.linalg.norm(np.cross(b - a, c - a), axis=1).sum() / 2)
    out["length"] = float(sum(np.linalg.norm(np.diff(points[list(l)], axis=0), axis=1).sum() for l in lines))
    if len(points):
        out["lo"], out["hi"] = points.min(0).tolist(), points.max(0).tolist()
    return out


def with_vtk(name):
    import vtk
    from vtk.util.numpy_support import vtk_to_numpy as array

    kind = {"obj": vtk.vtkOBJReader, "stl": vtk.vtkSTLReader, "ply": vtk.vtkPLYReader,
            "vtu": vtk.vtkXMLUnstructuredGridReader}[name.rsplit(".")[-1]]
    reader = kind()
    reader.SetFileName(name)
    errors = []
    reader.AddObserver("ErrorEvent", lambda *_: errors.append("error"))
    reader.Update()
    assert not errors
    grid = reader.GetOutput()
    triangles, lines = [], []
    for i in range(grid.GetNumberOfCells()):
        ids = grid.GetCell(i).GetPointIds()
        ids = [ids.GetId(k) for k in range(ids.GetNumberOfIds())]
        if grid.GetCellType(i) == vtk.VTK_TRIANGLE:
            triangles.append(ids)
        else:
            assert grid.GetCellType(i) in (vtk.VTK_LINE, vtk.VTK_POLY_LINE)
            lines.append(ids)
    out = measure(array(grid.GetPoints().GetData()), triangles, lines)
    if name.endswith("vtu"):
        for data, key in ((grid.GetPointData(), "point_data"), (grid.GetCellData(), "cell_data")):
            out[key] = {data.GetArrayName(k): array(data.GetArray(k)).tolist() for k in range(data.GetNumberOfArrays())}
    return out


def with_meshio(name):
    import meshio

    mesh = meshio.read(name)
    triangles = [t for c in mesh.cells if c.type == "triangle" for t in c.data]
    lines = [t for c in mesh.cells if c.type == "line" for t in c.data]
    out = measure(mesh.points, triangles, lines)
    if name.endswith("vtu"):
        out["point_data"] = {k: np.asarray(v).tolist() for k, v in mesh.point_data.items()}
        out["cell_data"] = {k: np.concatenate([np.asarray(b) for b in v]).tolist() for k, v in mesh.cell_data.items()}
    return out


def with_ezdxf(name):
    import ezdxf

    doc = ezdxf.readfile(name)
    audit = doc.audit()
    assert not audit.errors, [str(e.message) for e in audit.errors]
    points, triangles, lines = [], [], []
    layers, texts = {}, []

    def add(vertices):
        at = len(points)
        points.extend((v[0], v[1], v[2]) for v in vertices)
        return list(range(at, len(points)))

    for e in doc.modelspace():
        layers[e.dxf.layer] = layers.get(e.dxf.layer, 0) + 1
        if e.dxftype() == "3DFACE":
            triangles.append(add([e.dxf.vtx0, e.dxf.vtx1, e.dxf.vtx2]))
        elif e.dxftype() == "LINE":
            lines.append((e.dxf.layer, add([e.dxf.start, e.dxf.end])))
        elif e.dxftype() == "POLYLINE":
            assert e.is_3d_polyline
            ids = add([v.dxf.location for v in e.vertices])
            lines.append((e.dxf.layer, ids + ids[:1] if e.is_closed else ids))
        elif e.dxftype() == "TEXT":
            texts.append(e.dxf.text)
    cables = [l for layer, l in lines if layer not in ("fixed_line", "ring")]
    out = measure(points, triangles, cables)
    out.update(layers=layers, texts=texts, version=doc.dxfversion, defined=[l.dxf.name for l in doc.layers])
    return out


for path in sys.argv[2:]:
    print(json.dumps(globals()["with_" + sys.argv[1]](path)))
