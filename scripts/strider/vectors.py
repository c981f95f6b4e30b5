"""Vectors as lists of three arrays, and the small functions everything else shares."""
import sys

import numpy as np


def expect(holds, what):
    if not holds:
        sys.exit(f"make_demo: {what}")


def length(v):
    return np.sqrt(v[0] * v[0] + v[1] * v[1] + v[2] * v[2])


def cross(u, v):
    return [u[1] * v[2] - u[2] * v[1], u[2] * v[0] - u[0] * v[2], u[0] * v[1] - u[1] * v[0]]


def dot(u, v):
    return u[0] * v[0] + u[1] * v[1] + u[2] * v[2]


def smoothstep(t):
    t = np.minimum(np.maximum(t, 0.0), 1.0)
    return t * t * (3.0 - 2.0 * t)
