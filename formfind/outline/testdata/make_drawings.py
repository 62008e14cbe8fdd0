"""Writes the DXF drawings of this folder, and that of an example, with an
independent library.

Needs Debian's python3-ezdxf (tried with 0.18.1):

    PYTHONHASHSEED=0 /usr/bin/python3 make_drawings.py

The places and shapes are invented.
"""

import math
import re

import ezdxf


def save(doc, name):
    """Saves a drawing without what changes from run to run."""
    doc.saveas(name)
    with open(name, encoding="utf-8") as f:
        text = f.read()
    # Times, GUIDs and the name of the writer.
    text = re.sub(r"\{[0-9A-F]{8}(-[0-9A-F]{4}){3}-[0-9A-F]{12}\}", "{00000000-0000-0000-0000-000000000000}", text)
    text = re.sub(r"(\$TD(?:U?CREATE|U?UPDATE)\n 40\n)[^\n]*", r"\g<1>0.0", text)
    text = re.sub(r"\d+\.\d+(\.\d+)? @ \d{4}-\d\d-\d\dT[^\n]*", "0", text)
    with open(name, "w", encoding="utf-8", newline="\n") as f:
        f.write(text)


def entities(version, name):
    """One entity of each kind that is read, and some that are not."""
    doc = ezdxf.new(version)
    if version != "R12":
        doc.header["$INSUNITS"] = 4
    m = doc.modelspace()
    for layer in ("LINES", "LIGHT", "HEAVY", "SPACE", "ROUND", "DOTS", "TURNED", "REST"):
        doc.layers.new(layer)
    m.add_line((0, 0, 100), (3000, 0, 200), dxfattribs={"layer": "LINES"})
    if version != "R12":
        m.add_lwpolyline(
            [(0, 0, 0.5), (2000, 0, 0), (2000, 1000, 0)],
            format="xyb",
            close=True,
            dxfattribs={"layer": "LIGHT", "elevation": 4500},
        )
    m.add_polyline2d(
        [(0, 0, 0), (1000, 0, -1), (1000, 2000, 0)],
        format="xyb",
        dxfattribs={"layer": "HEAVY", "elevation": (0, 0, 250)},
    )
    m.add_polyline3d([(0, 0, 0), (1000, 0, 500), (1000, 1000, 1500)], dxfattribs={"layer": "SPACE"})
    m.add_arc((1000, 1000, 30), 500, 30, 120, dxfattribs={"layer": "ROUND"})
    m.add_circle((5000, 0, 60), 800, dxfattribs={"layer": "ROUND"})
    m.add_point((7, 8, 9), dxfattribs={"layer": "DOTS"})
    # An arch: a half circle in the plane x–z from (0, 0, 0) to (4000, 0, 0).
    # In its own plane with normal −y, its x axis is the world's x.
    m.add_arc((2000, 0, 0), 2000, 0, 180, dxfattribs={"layer": "TURNED", "extrusion": (0, -1, 0)})
    m.add_circle((-1000, 2000, -300), 100, dxfattribs={"layer": "TURNED", "extrusion": (0, 0, -1)})
    if version != "R12":
        m.add_lwpolyline([(0, 0, 1), (1000, 0, 0)], format="xyb", dxfattribs={"layer": "TURNED", "extrusion": (0, 0, -1)})
    block = doc.blocks.new("TREE")
    block.add_line((0, 0), (1, 1))
    m.add_blockref("TREE", (10, 10), dxfattribs={"layer": "REST"})
    m.add_text("label", dxfattribs={"layer": "REST"})
    if version != "R12":
        m.add_ellipse((0, 0), (3, 0), 0.5, dxfattribs={"layer": "REST"})
        m.add_spline([(0, 0), (1, 1), (2, 0)], dxfattribs={"layer": "REST"})
        doc.layout("Layout1").add_line((0, 0), (99, 99), dxfattribs={"layer": "LINES"})
    save(doc, name)


def yard():
    """A yard with a wall, five cables, a tree, a ridge and two masts, in mm."""
    doc = ezdxf.new("R2010")
    doc.header["$INSUNITS"] = 4
    m = doc.modelspace()
    for layer in ("RIM", "WALL", "TREE", "RIDGE", "MAST", "PAVING"):
        doc.layers.new(layer)
    m.add_lwpolyline([(0, 0), (7000, -1500), (14000, 0), (15500, 6000)], dxfattribs={"layer": "RIM"})
    # The wall is drawn from the other end and misses the rim by 3 mm.
    m.add_line((15502, 6002), (13000, 11000), dxfattribs={"layer": "WALL"})
    m.add_line((13000, 11000), (1000, 10500), dxfattribs={"layer": "WALL"})
    m.add_line((1000, 10500), (0, 0), dxfattribs={"layer": "RIM"})
    m.add_circle((9500, 7200), 900, dxfattribs={"layer": "TREE"})
    m.add_line((4000, 4500), (7000, 4000), dxfattribs={"layer": "RIDGE"})
    m.add_line((7000, 4000), (10500, 3800), dxfattribs={"layer": "RIDGE"})
    m.add_point((4000, 4500), dxfattribs={"layer": "MAST"})
    m.add_point((10500, 3800), dxfattribs={"layer": "MAST"})
    for k in range(5):
        m.add_line((-2000, 2000 * k), (17000, 2000 * k), dxfattribs={"layer": "PAVING"})
    save(doc, "yard.dxf")


def curves():
    """Ellipses and splines, and places on them by the library's own evaluation."""
    doc = ezdxf.new("R2010")
    doc.header["$INSUNITS"] = 4
    m = doc.modelspace()
    places = []
    for layer in ("WHOLE", "PART", "TILTED", "FREE", "ROUND", "CORNER", "CLOSED", "SPACE"):
        doc.layers.new(layer)

    def ellipse(layer, *args, **attribs):
        e = m.add_ellipse(*args, dxfattribs={"layer": layer, **attribs})
        a, b = e.dxf.start_param, e.dxf.end_param
        for v in e.vertices([a + (b - a) * k / 200 for k in range(201)]):
            places.append((layer, *v))

    ellipse("WHOLE", (1000, 2000, 50), (3000, 1000, 0), 0.4)
    ellipse("PART", (0, 0, 0), (0, 5000, 0), 0.7, 0.5, 4.0)
    ellipse("TILTED", (0, 0, 0), (4000, 0, 0), 0.5, 0, math.pi, extrusion=(0, -1, 0))

    def spline(layer, s):
        s.dxf.layer = layer
        t = s.construction_tool()
        for v in t.approximate(400):
            places.append((layer, *v))

    spline("FREE", m.add_open_spline([(0, 0), (2000, 3000), (4000, -2000), (9000, 1000), (7000, 6000)]))
    # A quarter of a circle of 1000 as a rational curve: exact.
    spline("ROUND", m.add_rational_spline([(1000, 0), (1000, 1000), (0, 1000)], [1, math.sqrt(0.5), 1], degree=2))
    corner = m.add_spline(dxfattribs={"degree": 3})
    corner.control_points = [(0, 0), (0, 2000), (1000, 3000), (3000, 3000), (5000, 3000), (6000, 1000), (3000, 0)]
    corner.knots = [0, 0, 0, 0, 1, 1, 1, 2, 2, 2, 2]
    spline("CORNER", corner)
    closed = m.add_spline(dxfattribs={"degree": 3})
    closed.set_closed([(0, 0, 0), (4000, 500, 0), (5000, 4000, 0), (1000, 5000, 0), (-2000, 2000, 0)])
    spline("CLOSED", closed)
    spline("SPACE", m.add_open_spline([(0, 0, 0), (1000, 3000, 2000), (4000, 3000, -1000), (6000, 0, 3000)]))
    save(doc, "curves.dxf")
    with open("curves.csv", "w", encoding="utf-8", newline="\n") as f:
        f.write("layer,x,y,z\n")
        for layer, x, y, z in places:
            f.write(f"{layer},{x:.6f},{y:.6f},{z:.6f}\n")


def ropewalk():
    """The drawing of the example ropewalk-yard: a plan in mm, drawn for a yard."""
    doc = ezdxf.new("R2010")
    doc.header["$INSUNITS"] = 4
    m = doc.modelspace()
    for layer in ("RIM", "WALL", "ARCH", "TREE", "PAVING", "NOTES"):
        doc.layers.new(layer)
    # Three sides of the yard are open; the rim goes round them.
    m.add_lwpolyline([(0, 9000), (-600, 0), (7500, -1800), (15600, 0), (15000, 9000)], dxfattribs={"layer": "RIM"})
    # The long wall of the ropewalk.
    m.add_line((15000, 9000), (7500, 9000), dxfattribs={"layer": "WALL"})
    m.add_line((7500, 9000), (0, 9000), dxfattribs={"layer": "WALL"})
    # An arch across the yard, seen from above.
    m.add_line((7500, -1800), (7500, 9000), dxfattribs={"layer": "ARCH"})
    # The old lime tree.
    m.add_circle((11400, 4200), 1100, dxfattribs={"layer": "TREE"})
    for k in range(4):
        m.add_line((-600, 2000 * k), (15600, 2000 * k), dxfattribs={"layer": "PAVING"})
    m.add_text("ropewalk", dxfattribs={"layer": "NOTES", "height": 300}).set_pos((6000, 9300))
    save(doc, "../../../examples/ropewalk-yard.dxf")


entities("R12", "entities-r12.dxf")
entities("R2000", "entities-r2000.dxf")
entities("R2018", "entities-r2018.dxf")
yard()
curves()
ropewalk()
