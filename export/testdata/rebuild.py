"""Rebuilds the equilibrium from an analysis hand-over folder alone.

    rebuild.py FOLDER

Knows nothing of the program that wrote it: reads the tables as read-me.txt
explains them, computes nodal forces from prestress and geometry, and solves
the linear equations of the prestressed state for the free nodes. Prints JSON:
the largest residual over the forces that meet at a node, the largest
difference of recomputed and listed reactions over the largest reaction, and how
far nodes move when the equations are solved, over the size of the model.
"""
import csv
import json
import os
import sys

import numpy as np
import scipy.sparse as sp
import scipy.sparse.linalg as spl

folder = sys.argv[1]


def table(name):
    with open(os.path.join(folder, name), newline="") as f:
        return list(csv.DictReader(line for line in f if not line.startswith("#")))


def vector(row, *names):
    return np.array([float(row[n]) for n in names])


nodes = table("nodes.csv")
n = len(nodes)
x = np.array([vector(r, "x [m]", "y [m]", "z [m]") for r in nodes])

# Every element pulls node i by -sum_j K_ij x_j.
rows, cols, vals = [], [], []
meeting = np.zeros(n)  # sum of the sizes of the forces at a node


def add(i, j, k):
    rows.append(i), cols.append(j), vals.append(k)


for m in table("members.csv"):
    i, j = int(m["node 1"]), int(m["node 2"])
    force = float(m["prestress force [N]"])
    length = np.linalg.norm(x[j] - x[i])
    assert abs(length - float(m["length [m]"])) <= 1e-12 * length
    if m["stiffness EA [N]"]:
        ea, l0 = float(m["stiffness EA [N]"]), float(m["unstressed length [m]"])
        assert abs(ea * (length - l0) / l0 - force) <= 1e-8 * ea, "stiffness, length and force agree"
    q = force / length
    for a, b, s in ((i, i, q), (j, j, q), (i, j, -q), (j, i, -q)):
        add(a, b, s)
    meeting[[i, j]] += abs(force)

for t in table("triangles.csv"):
    ids = [int(t["node %d" % k]) for k in (1, 2, 3)]
    p = x[ids]
    normal = np.cross(p[1] - p[0], p[2] - p[0])
    area = np.linalg.norm(normal) / 2
    normal /= 2 * area
    warp, weft = vector(t, "warp x", "warp y", "warp z"), vector(t, "weft x", "weft y", "weft z")
    assert np.allclose(np.cross(normal, warp), weft, atol=1e-9)
    sw, sf, ss = vector(t, "prestress warp [N/m]", "prestress weft [N/m]", "prestress shear [N/m]")
    stress = sw * np.outer(warp, warp) + sf * np.outer(weft, weft) + ss * (np.outer(warp, weft) + np.outer(weft, warp))
    # Gradient of the shape function of a node: across the opposite side, inwards.
    grad = [np.cross(normal, p[(k + 2) % 3] - p[(k + 1) % 3]) / (2 * area) for k in range(3)]
    for a in range(3):
        for b in range(3):
            add(ids[a], ids[b], area * grad[a] @ stress @ grad[b])
        meeting[ids[a]] += np.linalg.norm(area * stress @ grad[a])

K = sp.csr_matrix((vals, (rows, cols)), shape=(n, n))
load = np.zeros((n, 3))
for r in table("loads.csv"):
    load[int(r["node"])] += vector(r, "force x [N]", "force y [N]", "force z [N]")
meeting += np.linalg.norm(load, axis=1)

# Nodes of a rigid ring follow its centre.
follows = np.arange(n)
for r in table("rings.csv"):
    if r["rigid"] == "1":
        for v in r["nodes"].split():
            follows[int(v)] = int(r["centre node"])
fixed = np.zeros((n, 3), bool)
for r in table("supports.csv"):
    fixed[int(r["node"])] = [r["x"] == "1", r["y"] == "1", r["z"] == "1"]

pull = load - K @ x
gathered, weight = np.zeros((n, 3)), np.zeros(n)
np.add.at(weight, follows, meeting)
for d in range(3):
    own = fixed[:, d]  # a node held by itself does not hand its force on
    np.add.at(gathered[:, d], np.where(own, np.arange(n), follows), pull[:, d])

reaction, largest = np.zeros((n, 3)), 0.0
for r in table("reactions.csv"):
    v = vector(r, "reaction x [N]", "reaction y [N]", "reaction z [N]")
    reaction[int(r["node"])] = v
    assert (v == -vector(r, "action on foundation x [N]", "action on foundation y [N]", "action on foundation z [N]")).all()
size = np.linalg.norm(x.max(0) - x.min(0))
# Residuals at nodes that are not supported; a point with nothing attached carries nothing.
residual = np.where(fixed, 0, gathered)
loaded = weight > 0
worst = (np.linalg.norm(residual, axis=1)[loaded] / weight[loaded]).max()
mismatch = np.abs(np.where(fixed, gathered + reaction, 0)).max() / max(np.abs(reaction).max(), 1e-300)

# Solve for the free nodes, direction by direction. Ends of masts stay where they
# are here (their balance is part of the residual): with all foundations at one
# height and no loads any stretch of the whole upwards is in balance as well.
mast = np.zeros(n, bool)
for m in table("members.csv"):
    if m["may push"] == "1":
        mast[[int(m["node 1"]), int(m["node 2"])]] = True
moved = 0.0
for d in range(3):
    slave = (follows != np.arange(n)) & ~fixed[:, d]
    target = np.where(slave, follows, np.arange(n))
    tie = sp.csr_matrix((np.ones(n), (np.arange(n), target)), shape=(n, n))  # value of a node = that of its target
    offset = x[:, d] - x[target, d]
    A, b = tie.T @ K @ tie, tie.T @ (load[:, d] - K @ offset)
    free = np.where(~fixed[:, d] & ~slave & ~mast & (np.abs(A).sum(1).A1 > 0))[0]
    held = np.setdiff1d(np.arange(n), free)
    if len(free):
        y = spl.spsolve(A[free][:, free].tocsc(), b[free] - A[free][:, held] @ x[held, d])
        moved = max(moved, np.abs(y - x[free, d]).max() / size)

print(json.dumps({"residual": worst, "reactions": mismatch, "moved": moved, "nodes": n, "free": int((~fixed).all(1).sum())}))
