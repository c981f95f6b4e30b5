"""The mesh of the half x >= 0: polygonized, evened out, mirrored and checked."""
import functools

import numpy as np

from strider.creature import CELL
from strider.surface import gradient, onto_surface, surface
from strider.vectors import cross, dot, expect, length


def cell_size(y, column):
    for low, high in zip(CELL, CELL[1:]):
        if y < high[0]:
            t = (max(y, low[0]) - low[0]) / (high[0] - low[0])
            return low[column] + (high[column] - low[column]) * t
    return CELL[-1][column]


# Corner 4i + 2j + k of a cell lies at (i, j, k); its edges start at the lower corner.
EDGES = [(a, a | 4 >> axis) for axis in range(3) for a in range(8) if not a & 4 >> axis]


@functools.lru_cache(maxsize=None)
def sheets(mask):
    """Per edge of a cell whose corners in `mask` are inside: the sheet of the surface it crosses,
    or -1. On a face with two opposite corners inside, the outside is connected and the inside not:
    so neighbouring cells agree and each sheet gets a vertex of its own."""
    label = list(range(8))
    diagonals = [(a, b) for a in range(8) for b in range(a) if a ^ b in (3, 5, 6)]
    outside = [(a, b) for a, b in diagonals if not mask >> a & 1 and not mask >> b & 1]
    for a, b in [(a, b) for a, b in EDGES if mask >> a & 1 == mask >> b & 1] + outside:
        label = [label[b] if of == label[a] else of for of in label]
    found = [(label[a], label[b]) if mask >> a & 1 else (label[b], label[a]) for a, b in EDGES]
    kinds = []
    for (a, b), sides in zip(EDGES, found):
        if mask >> a & 1 != mask >> b & 1 and sides not in kinds:
            kinds.append(sides)
    return [kinds.index(sides) if mask >> a & 1 != mask >> b & 1 else -1
            for (a, b), sides in zip(EDGES, found)]


def half_grid():
    """Corners of the cells as three arrays. The first column of cells straddles x = 0."""
    levels = [-.031]
    while levels[-1] < 2.15:
        levels.append(levels[-1] + cell_size(levels[-1], 2))
    wide = np.array([cell_size(y, 1) for y in levels])[None, :, None]
    across, along = np.arange(30)[:, None, None] - .5, np.arange(-78, 72)[None, None, :] + .0
    return [across * wide + 0.0 * along, np.array(levels)[None, :, None] + 0.0 * (across + along),
            along * wide + 0.0 * across]


def surface_nets():
    """Points (three arrays) and triangles of the half: a vertex for each sheet in a cell, a quad
    around each grid edge that crosses the surface."""
    grid = half_grid()
    field = surface(grid)
    rim = [field[-1], field[:, 0], field[:, -1], field[:, :, 0], field[:, :, -1]]
    expect(all((side > 0).all() for side in rim), "the creature leaves the grid")
    inside = field < 0.0

    cells = [n - 1 for n in field.shape]
    mask = np.zeros(cells, dtype=int)
    for c in range(8):
        i, j, k = c >> 2, c >> 1 & 1, c & 1
        mask += inside[i:i + cells[0], j:j + cells[1], k:k + cells[2]] << c
    mixed = np.argwhere((mask > 0) & (mask < 255))
    points, vertex = [], {}
    for cell in mixed.tolist():
        found = sheets(int(mask[tuple(cell)]))
        corner = [(cell[0] + (c >> 2), cell[1] + (c >> 1 & 1), cell[2] + (c & 1)) for c in range(8)]
        for sheet in range(max(found) + 1):
            cuts = []
            for e, (a, b) in enumerate(EDGES):
                if found[e] == sheet:
                    vertex[tuple(cell) + (e,)] = len(points)
                    a, b = corner[a], corner[b]
                    t = field[a] / (field[a] - field[b])
                    cuts.append([g[a] + t * (g[b] - g[a]) for g in grid])
            total = [0.0, 0.0, 0.0]
            for cut in cuts:
                total = [total[i] + cut[i] for i in range(3)]
            middle = cell[0] == 0
            points.append([0.0 if middle and i == 0 else total[i] / len(cuts) for i in range(3)])
    points = [np.array([float(p[i]) for p in points]) for i in range(3)]

    triangles = []
    for axis in range(3):
        u, v = (axis + 1) % 3, (axis + 2) % 3
        low, high = [slice(None)] * 3, [slice(None)] * 3
        low[axis], high[axis] = slice(0, -1), slice(1, None)
        for at in np.argwhere(inside[tuple(low)] != inside[tuple(high)]).tolist():
            if at[0] < 1:
                continue  # the mirror image has it
            quad = []
            for du, dv in ((1, 1), (0, 1), (0, 0), (1, 0)):
                cell = list(at)
                cell[u] -= du
                cell[v] -= dv
                a = du * (4 >> u) + dv * (4 >> v)
                quad.append(vertex[tuple(cell) + (EDGES.index((a, a | 4 >> axis)),)])
            triangles += split(points, quad if inside[tuple(at)] else quad[::-1])
    return points, np.array(triangles)


def split(points, quad):
    a, b, c, d = quad

    def gap(i, j):
        return length([points[k][i] - points[k][j] for k in range(3)])

    return [(a, b, c), (a, c, d)] if gap(a, c) <= gap(b, d) else [(b, c, d), (b, d, a)]


def edges_of(triangles):
    """Each directed edge with the corner opposite: dict (from, to) -> (triangle, corner)."""
    found = {}
    for t, (a, b, c) in enumerate(triangles.tolist()):
        for edge, corner in (((a, b), c), ((b, c), a), ((c, a), b)):
            expect(edge not in found, "an edge has more than two faces")
            found[edge] = (t, corner)
    return found


def corner_vectors(points, triangles, corner):
    a, b, c = (triangles[:, (corner + i) % 3] for i in range(3))
    return ([points[i][b] - points[i][a] for i in range(3)],
            [points[i][c] - points[i][a] for i in range(3)])


def flip_edges(points, triangles):
    """Flips edges whose opposite angles exceed 180 degrees together, where the mesh is smooth."""
    cotangent = []
    for corner in range(3):
        u, v = corner_vectors(points, triangles, corner)
        cotangent.append(dot(u, v) / np.maximum(length(cross(u, v)), 1e-12))
    normal = cross(*corner_vectors(points, triangles, 0))
    size = np.maximum(length(normal), 1e-12)
    normal = [n / size for n in normal]
    edges, rows = edges_of(triangles), triangles.tolist()
    wanted = []
    for (a, b), (t, c) in edges.items():
        if a < b and (b, a) in edges:
            s, d = edges[(b, a)]
            badness = cotangent[rows[t].index(c)][t] + cotangent[rows[s].index(d)][s]
            smooth = dot([n[t] for n in normal], [n[s] for n in normal])
            if badness < -1e-3 and smooth > .7:
                wanted.append((badness, a, b))
    touched, joined = set(), set(edges)
    for _, a, b in sorted(wanted):
        (t, c), (s, d) = edges[(a, b)], edges[(b, a)]
        if t in touched or s in touched or (c, d) in joined or (d, c) in joined:
            continue
        rows[t], rows[s] = [a, d, c], [d, b, c]
        touched.update((t, s))
        joined.update(((c, d), (d, c)))
    return np.array(rows)


def neighbours(triangles):
    """Both directions of every edge of the half, as two index arrays in a fixed order."""
    pairs = set()
    for a, b in edges_of(triangles):
        pairs.update(((a, b), (b, a)))
    pairs = np.array(sorted(pairs))
    return pairs[:, 0], pairs[:, 1]


def neighbour_mean(values, start, end, middle, sign):
    """Mean over the neighbours, those in the other half included. sign -1: changes sign there."""
    twice = middle[start] & ~middle[end]
    weight = np.where(twice, 2.0, 1.0)
    value = values[end] * np.where(twice, 1.0 + sign, 1.0)
    return (np.bincount(start, weights=value, minlength=len(values))
            / np.bincount(start, weights=weight, minlength=len(values)))


def relax(points, triangles, rounds):
    """Moves vertices towards the mean of their neighbours along the surface; flips edges."""
    for turn in range(rounds):
        middle = points[0] == 0.0
        start, end = neighbours(triangles)
        shift = [neighbour_mean(points[i], start, end, middle, -1.0 if i == 0 else 1.0) - points[i]
                 for i in range(3)]
        slope = gradient(points)
        steep = np.maximum(dot(slope, slope), .1)
        off = dot(shift, slope) / steep
        points = [points[i] + .6 * (shift[i] - off * slope[i]) for i in range(3)]
        off = surface(points) / steep
        points = [points[i] - off * slope[i] for i in range(3)]
        points[0] = np.where(middle, 0.0, points[0])
        if turn % 2 == 1:
            triangles = flip_edges(points, triangles)
    return onto_surface(points, 3), triangles


def both_halves(points, triangles):
    """The whole mesh: the half, then the mirror images of its vertices off the middle plane."""
    own = np.nonzero(points[0] != 0.0)[0]
    image = np.arange(len(points[0]))
    image[own] = len(image) + np.arange(len(own))
    whole = [np.concatenate([p, (-p if i == 0 else p)[own]]) for i, p in enumerate(points)]
    return whole, np.concatenate([triangles, image[triangles][:, ::-1]]), own


def check_mesh(points, triangles):
    """Closed, manifold, one piece, a sphere, outward, well shaped; returns numbers to print."""
    edges = edges_of(triangles)
    expect(all((b, a) in edges for a, b in edges), "the mesh is not closed")
    count = len(points[0])
    fans, parent = {}, list(range(count))

    def top(v):
        while parent[v] != v:
            parent[v] = parent[parent[v]]
            v = parent[v]
        return v

    for (a, b), (_, c) in edges.items():
        fans.setdefault(a, {})[b] = c
        parent[top(a)] = top(b)
    for fan in fans.values():  # the triangles around a vertex are one ring
        first = at = next(iter(fan))
        for _ in range(len(fan) - 1):
            at = fan[at]
            expect(at != first, "the mesh touches itself in a vertex")
    expect(len(fans) == count, "a vertex has no triangle")
    expect(len({top(v) for v in range(count)}) == 1, "the mesh is not of one piece")
    expect(count - len(edges) // 2 + len(triangles) == 2, "the mesh is no sphere")
    a, b, c = ([points[i][triangles[:, k]] for i in range(3)] for k in range(3))
    volume = sum((dot(a, cross(b, c)) / 6.0).tolist())
    expect(.1 < volume < 1.0, f"a volume of {volume}")
    sides = [dot(u, u) for k in range(3) for u in [corner_vectors(points, triangles, k)[0]]]
    area = length(cross(*corner_vectors(points, triangles, 0))) / 2.0
    quality = 4.0 * float(np.sqrt(3.0)) * area / (sides[0] + sides[1] + sides[2])
    worst = float(quality.min())
    expect(worst > .3, f"a triangle of quality {worst} (1: equilateral)")
    return volume, worst
