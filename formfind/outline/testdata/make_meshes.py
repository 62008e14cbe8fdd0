"""Writes the meshes of this folder with an independent library.

Needs Debian's python3-meshio (tried with 5.0.0):

    /usr/bin/python3 make_meshes.py

A saddle over a square of 6 m in mm, of 5 x 5 squares without the middle one.
"""

import meshio

n = 5
points, triangles = [], []
for y in range(n + 1):
    for x in range(n + 1):
        a, b = 6000 * x / n, 6000 * y / n
        points.append([a, b, (a - 3000) * (b - 3000) / 6000])
for y in range(n):
    for x in range(n):
        if (x, y) != (2, 2):
            i = y * (n + 1) + x
            j = i + n + 1
            triangles += [[i, i + 1, j + 1], [i, j + 1, j]]
mesh = meshio.Mesh(points, {"triangle": triangles})
mesh.write("saddle.obj")
with open("saddle.obj") as f:  # without its first line, which has the time
    lines = f.readlines()[1:]
with open("saddle.obj", "w") as f:
    f.writelines(lines)
mesh.write("saddle.stl", binary=False)
mesh.write("saddle-binary.stl", binary=True)
