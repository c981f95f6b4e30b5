#!/usr/bin/env python3
"""Writes a rig, a motion and an engine's frames for Skinfold with NumPy: a post of two joints."""
import json
import pathlib
import sys

import numpy as np

out = pathlib.Path(sys.argv[1] if len(sys.argv) > 1 else ".")
rings, sides, frames = 9, 8, 5
angle = np.arange(sides) * 2 * np.pi / sides
points = np.array([[np.cos(a), 0.5 * r, np.sin(a)] for r in range(rings) for a in angle])
quads = [[r * sides + s, (r + 1) * sides + s, (r + 1) * sides + (s + 1) % sides, r * sides + (s + 1) % sides]
         for r in range(rings - 1) for s in range(sides)]
upper = np.clip((points[:, 1] - 1) / 2, 0, 1)  # weight of the upper joint

bind = np.array([np.eye(4), np.eye(4)])        # joint-to-model when the mesh was bound
bind[1, 1, 3] = 2
poses = np.repeat(bind[None], frames, axis=0)  # joint-to-model in every frame
for f in range(frames):
    c, s = np.cos(f * 0.2), np.sin(f * 0.2)
    poses[f, 1, :3, :3] = [[c, -s, 0], [s, c, 0], [0, 0, 1]]

skinning = poses @ np.linalg.inv(bind)         # an "engine" that blends linearly
moved = np.einsum("fjab,vb->fjva", skinning, np.c_[points, np.ones(len(points))])[..., :3]
skin = (1 - upper)[:, None] * moved[:, 0] + upper[:, None] * moved[:, 1]

(out / "post.obj").write_text("".join("v %r %r %r\n" % tuple(p) for p in points.tolist())
                              + "".join("f %d %d %d %d\n" % tuple(i + 1 for i in q) for q in quads))
joints = [{"name": n, "parent": p, "bind": b.ravel().tolist()} for n, p, b in zip(["root", "tip"], [None, "root"], bind)]
influences = [[[0, 1 - w], [1, w]] for w in upper.tolist()]
(out / "post.binding.json").write_text(json.dumps({"skinfold": "binding 1", "joints": joints, "influences": influences}))
np.save(out / "bend.npy", poses)
np.save(out / "engine.npy", skin)
