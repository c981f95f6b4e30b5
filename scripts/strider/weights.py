"""Skin weights: painted from the bones, rounded to 16 bits, spoiled by a brush."""
import numpy as np

from strider.creature import BONES, CENTRE_OF, mirrored, station
from strider.mesh import neighbour_mean, neighbours
from strider.surface import capsule
from strider.vectors import expect, length, smoothstep


def bone_weights(points, index):
    """Weights of the half before smoothing, joints × vertices: bones whose surface is near share,
    and each bone fades into its neighbours along the limb."""
    parts = []
    for joint, before, start, end, after in BONES:
        (a, ra), (b, rb) = station(start), station(end)
        parts.append(capsule(points, a, b, ra, rb) + (joint, before, after))
    nearest = parts[0][0]
    for part in parts[1:]:
        nearest = np.minimum(nearest, part[0])
    weights, reach = np.zeros((len(index), len(points[0]))), .07
    for distance, t, joint, before, after in parts:
        near = np.maximum(1.0 - (distance - nearest) / reach, 0.0)
        near = near * near
        from_before = .5 * (1.0 - smoothstep(t / .4)) if before else 0.0 * t
        to_after = .5 * smoothstep((t - .6) / .4) if after else 0.0 * t
        own = 1.0 - from_before - to_after
        for name, share in ((joint, own), (before, from_before), (after, to_after)):
            if name:
                weights[index[name]] += near * share
    return weights


def skin_weights(points, triangles, own, names):
    """Joints and weights, four each per vertex of the whole mesh; heaviest first; float32."""
    index = {name: i for i, name in enumerate(names)}
    weights = bone_weights(points, index)
    middle = points[0] == 0.0
    start, end = neighbours(triangles)
    for _ in range(10):
        for name, j in index.items():
            if name.endswith(".L"):  # on the middle plane a limb hands over to the trunk
                trunk = index[CENTRE_OF.get(name[:-2], "pelvis")]
                weights[trunk] = np.where(middle, weights[trunk] + weights[j], weights[trunk])
                weights[j] = np.where(middle, 0.0, weights[j])
        total = 0.0 * weights[0]
        for row in weights:
            total = total + row
        weights = weights / total
        for j, row in enumerate(weights):
            if row.any():
                weights[j] = .5 * row + .5 * neighbour_mean(row, start, end, middle, 1.0)
    for name, j in index.items():
        if name.endswith(".L"):
            weights[index[CENTRE_OF.get(name[:-2], "pelvis")]][middle] += weights[j][middle]
            weights[j][middle] = 0.0
    order = np.argsort(-weights, axis=0, kind="stable")[:4].T
    chosen = np.take_along_axis(weights.T, order, axis=1)
    chosen = np.where(chosen < .004, 0.0, chosen)
    chosen = chosen / (chosen[:, 0] + chosen[:, 1] + chosen[:, 2] + chosen[:, 3])[:, None]
    mirror = np.array([index[mirrored(name)] for name in names])
    order = np.concatenate([order, mirror[order][own]])
    chosen = np.concatenate([chosen, chosen[own]])
    return clean(order, chosen)


def clean(joints, weights):
    """Heaviest first, empty slots joint 0, float32; the heaviest is what the others leave of 1."""
    order = np.argsort(-weights, axis=1, kind="stable")
    joints = np.take_along_axis(joints, order, axis=1)
    weights = np.rint(np.take_along_axis(weights, order, axis=1) * 1e6) / 1e6
    joints = np.where(weights > 0.0, joints, 0).astype(np.uint8)
    weights = weights.astype(np.float32)
    rest = weights[:, 1].astype(float) + weights[:, 2] + weights[:, 3]
    weights[:, 0] = (1.0 - rest).astype(np.float32)
    return joints, weights


def check_weights(joints, weights, names, points, own, half):
    """Sums, signs, sides and symmetry; `own` has images from `half` on."""
    total = weights[:, 0].astype(float) + weights[:, 1] + weights[:, 2] + weights[:, 3]
    expect(float(np.abs(total - 1.0).max()) <= 1.2e-7, "weights do not sum to 1")
    expect(bool((weights >= 0).all()), "a negative weight")
    for side, sign in ((".L", 1.0), (".R", -1.0)):
        of_side = np.array([name.endswith(side) for name in names])[joints] & (weights > 0)
        own_side = points[0] * sign > 0
        expect(bool(own_side[of_side.any(axis=1)].all()), "a limb owns a vertex of the other side")
    mirror = np.array([names.index(mirrored(name)) for name in names])
    same = (weights[half:] == weights[own]) & (
        (joints[half:] == mirror[joints[own]]) | (weights[own] == 0.0))
    expect(bool(same.all()), "weights are not symmetric")


def sixteen_bits(weights):
    """Normalized integers that sum to 65535 by largest remainder; ties go to the first."""
    exact = weights.astype(float) * 65535.0
    whole = np.floor(exact).astype(np.int64)
    order = np.argsort(-(exact - whole), axis=1, kind="stable")
    missing = 65535 - (whole[:, 0] + whole[:, 1] + whole[:, 2] + whole[:, 3])
    expect(bool(((missing >= 0) & (missing <= 4)).all()), "weights cannot be rounded to 16 bits")
    for rank in range(4):
        whole[np.arange(len(whole)), order[:, rank]] += missing > rank
    expect(bool((whole[weights == 0] == 0).all()), "rounding gave weight to an empty influence")
    return whole.astype(np.uint16)


def repaint(points, joints, weights, names):
    """The planted fault: a soft brush on the left shin that paints onto the right one."""
    left, right = names.index("shin.L"), names.index("shin.R")
    centre, radius, strength = (.275, .62, -.32), .088, .30
    distance = length([points[i] - centre[i] for i in range(3)])
    brush = strength * smoothstep((radius - distance) / (.5 * radius))
    patch = np.nonzero(brush > .01)[0]
    joints, weights = joints.copy(), weights.astype(float)
    for v in patch.tolist():
        slot = joints[v].tolist().index(left)
        free = 3
        expect(weights[v, free] == 0.0, "the patch has no influence to spare")
        joints[v, free] = right
        weights[v, free] = brush[v] * weights[v, slot]
        weights[v, slot] -= weights[v, free]
    return clean(joints, weights) + (patch,)
