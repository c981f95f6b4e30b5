#!/usr/bin/env python3
"""Holds skins that skinfold computes against frames that two authoring tools exported as OBJ.

Usage: tool_frames.py SKINFOLD; exit code 77 where SKINFOLD_CHARACTERS has no such folder.
Tolerance: 1e-6 D by nearest vertex; the files hold single precision and six digits of text.
Catches: weights, bind matrices, clip sampling or dual quaternions read or computed otherwise than
the tools do. Source of the frames: README of the folder.
"""
import json
import os
import pathlib
import subprocess
import sys
import tempfile

import numpy as np


def vertices(path):
    return np.array([line.split()[1:4] for line in path.read_text().splitlines() if line.startswith("v ")], float)


def exported(skinfold, folder, rig, motion, skinning):
    suite = {"skinfold": "suite 1", "name": "tool", "weights": "normalize", "rig": {"file": rig.name},
             "motions": {"m": motion}, "methods": {"k": {"skinning": skinning}}}
    (folder / rig.name).write_bytes(rig.read_bytes())
    (folder / "s.json").write_text(json.dumps(suite))
    out = folder / "out.npy"
    subprocess.run([skinfold, "export", folder / "s.json", "--case", "main/m/k", "--to", out], check=True)
    return np.load(out)


def worst(skin, reference):
    """Largest distance from a vertex of either to the nearest of the other, over the diagonal."""
    distance = np.sqrt(((skin[:, None] - reference[None]) ** 2).sum(-1))
    diagonal = np.linalg.norm(reference.max(0) - reference.min(0))
    return max(distance.min(0).max(), distance.min(1).max()) / diagonal


def main():
    skinfold = sys.argv[1]
    default = pathlib.Path(__file__).resolve().parents[3] / "shared/characters"
    characters = pathlib.Path(os.environ.get("SKINFOLD_CHARACTERS") or default) / "tool_frames"
    if not characters.is_dir():
        print(f"skipped: no folder {characters.name} (set SKINFOLD_CHARACTERS)")
        return 77
    linear, dual = characters / "tube_linear_blend.glb", characters / "tube_dual_quaternion.glb"
    clips = [("Base", 0), ("Spin", 15), ("Wiggle", 20)]
    failed = 0
    with tempfile.TemporaryDirectory() as name:
        folder = pathlib.Path(name)
        for clip, frame in clips:
            # A span over the wanted time alone: frames count 24 a second, the last key is held.
            motion = {"clip": f"Skeleton|{clip}", "rate": 24, "span": [frame / 24, frame / 24]}
            skin = exported(skinfold, folder, linear, motion, "linear_blend")[0]
            error = worst(skin, vertices(characters / f"tube_linear_blend_{clip.lower()}_{frame}.obj"))
            print(f"linear blend, {clip} {frame}: {error:.2e} D")
            failed += error > 1e-6
        still = {"sweep": [{"joint": "@", "axis": [1, 0, 0], "degrees": [0, 0]}], "frames": 1}
        size = int.from_bytes(dual.read_bytes()[12:16], "little")
        scene = json.loads(dual.read_bytes()[20:20 + size])
        still["sweep"][0]["joint"] = f"#{scene['skins'][0]['joints'][0]}"
        error = worst(exported(skinfold, folder, dual, still, "dual_quaternion")[0],
                      vertices(characters / "tube_dual_quaternion.obj"))
        print(f"dual quaternion, rest pose: {error:.2e} D")
        failed += error > 1e-6
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
