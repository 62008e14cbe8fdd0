"""L-BFGS-B of SciPy on the area functional, for comparison.

Reads a JSON file (position, free, triangles, stress, members, force, limit) and
prints seconds of processor time, iterations, the residual along the vertex
normals (norm of the resultants over norm of the sums of force sizes, as Newton
counts it), the smallest angle in rad, and positions.
"""

import json
import sys
import time

import numpy as np
from scipy.optimize import minimize

with open(sys.argv[1]) as f:
    d = json.load(f)
x0 = np.array(d["position"])
free = np.array(d["free"])
tri = np.array(d["triangles"])
mem = np.array(d["members"] or [], dtype=int).reshape(-1, 2)
force = np.array(d["force"] or [])
sigma = d["stress"]
n = len(x0)


def scatter(out, index, values):
    for k in range(3):
        out[:, k] += np.bincount(index, values[:, k], n)


def evaluate(x, sizes=False):
    p = x[tri]
    edge = [p[:, 2] - p[:, 1], p[:, 0] - p[:, 2], p[:, 1] - p[:, 0]]
    c = np.cross(edge[2], -edge[1])
    twice = np.linalg.norm(c, axis=1)
    unit = c / np.maximum(twice, 1e-300)[:, None]
    energy = 0.5 * sigma * twice.sum()
    grad, size = np.zeros((n, 3)), np.zeros(n)
    for k in range(3):
        g = 0.5 * sigma * np.cross(unit, edge[k])
        scatter(grad, tri[:, k], g)
        if sizes:
            size += np.bincount(tri[:, k], np.linalg.norm(g, axis=1), n)
    if len(mem):
        v = x[mem[:, 1]] - x[mem[:, 0]]
        length = np.linalg.norm(v, axis=1)
        energy += (force * length).sum()
        t = force[:, None] * v / length[:, None]
        scatter(grad, mem[:, 1], t)
        scatter(grad, mem[:, 0], -t)
        if sizes:
            size += np.bincount(mem.ravel(), np.repeat(force, 2), n)
    return (energy, grad, size, c) if sizes else (energy, grad)


def residual(x):
    _, grad, size, c = evaluate(x, True)
    normal = np.zeros((n, 3))
    for k in range(3):
        scatter(normal, tri[:, k], c)
    normal /= np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None]
    along = np.abs((grad * normal).sum(axis=1))
    on = np.zeros(n, bool)
    on[mem.ravel()] = True
    # A node of an edge cable: what is left across the cable.
    if len(mem):
        t = np.zeros((n, 3))
        v = x[mem[:, 1]] - x[mem[:, 0]]
        v /= np.linalg.norm(v, axis=1)[:, None]
        scatter(t, mem[:, 0], v)
        scatter(t, mem[:, 1], v)
        t /= np.maximum(np.linalg.norm(t, axis=1), 1e-300)[:, None]
        across = grad - (grad * t).sum(axis=1)[:, None] * t
        along = np.where(on, np.linalg.norm(across, axis=1), along)
    return np.linalg.norm(along[free]) / np.linalg.norm(size[free])


def smallest_angle(x):
    p = x[tri]
    least = np.pi
    for k in range(3):
        a, b = p[:, (k + 1) % 3] - p[:, k], p[:, (k + 2) % 3] - p[:, k]
        s = np.linalg.norm(np.cross(a, b), axis=1)
        least = min(least, np.arctan2(s, (a * b).sum(axis=1)).min())
    return float(least)


class Done(Exception):
    pass


last = {"x": x0[free].ravel(), "iterations": 0}
began = time.process_time()


def full(free_part):
    x = x0.copy()
    x[free] = free_part.reshape(-1, 3)
    return x


def fun(free_part):
    energy, grad = evaluate(full(free_part))
    return energy, grad[free].ravel()


def after(free_part):
    last["x"] = free_part.copy()
    last["iterations"] += 1
    if time.process_time() - began > d["limit"]:
        raise Done


try:
    minimize(fun, last["x"], jac=True, method="L-BFGS-B", callback=after,
             options={"maxiter": 10**6, "maxfun": 10**7, "ftol": 0, "gtol": 1e-14, "maxcor": 20})
except Done:
    pass
seconds = time.process_time() - began
x = full(last["x"])
print(json.dumps({"Seconds": seconds, "Iterations": last["iterations"], "Residual": float(residual(x)),
                  "MinAngle": smallest_angle(x), "Position": x.tolist()}))
