"""The implicit surface of the creature, negative inside. Points are three arrays."""
import numpy as np

from strider.creature import ELLIPSOIDS, LEAVES, SOFTNESS, TUBES, station
from strider.vectors import dot, length


def capsule(p, a, b, ra, rb, thin=None, share=1.0):
    """Distance to a tapered capsule, flattened to `share` of its thickness along `thin`, and how
    far from a to b the nearest point of the axis lies, 0 to 1."""
    axis, rel = [b[i] - a[i] for i in range(3)], [p[i] - a[i] for i in range(3)]
    if thin:
        more = (1.0 / share - 1.0) * dot(rel, thin)
        rel = [rel[i] + more * thin[i] for i in range(3)]
    t = np.minimum(np.maximum(dot(rel, axis) / dot(axis, axis), 0.0), 1.0)
    return length([rel[i] - t * axis[i] for i in range(3)]) - (ra + (rb - ra) * t), t


def ellipsoid(p, centre, radii):
    """First-order distance to an ellipsoid."""
    rel = [p[i] - centre[i] for i in range(3)]
    k0 = length([rel[i] / radii[i] for i in range(3)])
    k1 = length([rel[i] / (radii[i] * radii[i]) for i in range(3)])
    return k0 * (k0 - 1.0) / np.maximum(k1, 1e-9)


def rounded(stations):
    """A chain of stations with three more between each pair, on a Catmull-Rom spline."""
    chain = [place + (radius,) for place, radius in map(station, stations)]
    if len(chain) == 2:
        return chain
    found = [chain[0]]
    for i in range(len(chain) - 1):
        p, q, r, s = (chain[min(max(i + k, 0), len(chain) - 1)] for k in (-1, 0, 1, 2))
        for t in (.25, .5, .75, 1.0):
            found.append(tuple(
                b + .5 * t * (c - a + t * (2 * a - 5 * b + 4 * c - d + t * (3 * b - a - 3 * c + d)))
                for a, b, c, d in zip(p, q, r, s)))
    return found


def tube(p, stations):
    field, chain = None, rounded(stations)
    for a, b in zip(chain, chain[1:]):
        part = capsule(p, a[:3], b[:3], a[3], b[3])[0]
        field = part if field is None else np.minimum(field, part)
    return field


def smooth_minimum(a, b, k):
    h = np.maximum(k - np.abs(a - b), 0.0)
    return np.minimum(a, b) - h * h / (4.0 * k)


def merged(p, group):
    parts = [tube(p, stations) for stations in TUBES.get(group, [])]
    for (a, ra), (b, rb), thin, share in LEAVES.get(group, []):
        parts.append(capsule(p, a, b, ra, rb, thin, share)[0])
    if group == "trunk":
        parts += [ellipsoid(p, centre, radii) for centre, radii in ELLIPSOIDS]
    field = parts[0]
    for part in parts[1:]:
        field = smooth_minimum(field, part, SOFTNESS[group])
    return field


def surface(p):
    """Signed distance to the creature, roughly, negative inside. p: three arrays, any side."""
    near = [np.abs(p[0]), p[1], p[2]]
    field = smooth_minimum(merged(near, "leg"), merged([-near[0], p[1], p[2]], "leg"), .06)
    field = smooth_minimum(merged(near, "trunk"), field, .07)
    for group in ("frill", "eye", "jaw"):
        field = smooth_minimum(field, merged(near, group), SOFTNESS[group])
    return -smooth_minimum(-field, p[1], .012)  # flat soles on the ground


def gradient(p):
    step, slope = 1e-4, []
    for i in range(3):
        up, down = list(p), list(p)
        up[i], down[i] = p[i] + step, p[i] - step
        slope.append((surface(up) - surface(down)) / (2.0 * step))
    return slope


def onto_surface(p, rounds):
    """Newton steps along the gradient; vertices of the middle plane stay there."""
    middle = p[0] == 0.0
    for _ in range(rounds):
        value, slope = surface(p), gradient(p)
        slope[0] = np.where(middle, 0.0, slope[0])
        scale = value / np.maximum(dot(slope, slope), .1)
        p = [p[i] - scale * slope[i] for i in range(3)]
    return p
