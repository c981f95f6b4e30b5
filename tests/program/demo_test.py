#!/usr/bin/env python3
"""The demo's promise: the signed creature is within, the re-export too, the painted one is held back where it was painted."""
import os
import subprocess

from skinfold import PROGRAM, PROJECT, Desk, check, run_all

DEMO = PROJECT / "suites/demo"


def total_size(folder):
    return sum(p.stat().st_size for p in folder.rglob("*") if p.is_file())


def the_signed_creature_is_within():
    """Catches: a change of code or of goldens that moves the demo."""
    with Desk() as desk:
        desk.run("gate", DEMO / "suite.json", code=0)
        cases = desk.cases()
        check(len(cases) >= 10 and all(not c["changed"] for c in cases.values()), "inputs changed since sign-off")
        check(6000 <= next(iter(cases.values()))["vertices"] <= 10000, "another creature")
    check((DEMO / "strider.glb").stat().st_size < 2e6, "the creature is too large")
    check(total_size(PROJECT / "golden") < 8e6, "the goldens are too large")


def a_harmless_reexport_is_within():
    """Catches: a profile `reexport` too narrow for 16-bit weights, or weights that are not noticed at all."""
    with Desk() as desk:
        desk.run("gate", DEMO / "delivery/reexport.suite.json", code=0)
        check(all(c["changed"] == ["weights"] for c in desk.cases().values()), "changed should name the weights alone")


def a_painted_patch_is_held_back():
    """Catches: a fault of 47 vertices among 9,346 that passes, or is blamed on another place."""
    with Desk() as desk:
        desk.run("gate", DEMO / "delivery/repaint.suite.json", code=1)
        case = desk.cases()["strider/knee/ship"]
        check(case["changed"] == ["weights"], case["changed"])
        worst = next(c for c in case["checks"] if c["statistic"] == "position.max")
        check(worst["verdict"] == "beyond" and worst["joint"] == "shin.L" and worst["failing"] == 47, worst)
        x, y, z = worst["place"]
        check(0.1 < x < 0.4 and 0.4 < y < 0.9, worst["place"])
        within = [n for n, c in desk.cases().items() if c["verdict"] == "within"]
        check("strider/jaw/ship" in within, "a motion that does not move the patch is beyond")


def memory_does_not_grow_with_the_clip():
    """Catches: frames, poses or golden frames that are gathered instead of passed on in blocks."""
    peaks = []
    for frames in (40, 240):
        with Desk() as desk:
            desk.suite(rig={"file": "strider.glb"}, methods={"ship": {"skinning": "linear_blend"}}, motions={
                "tail": {"sweep": [{"joint": "tail_2", "axis": [1, 0, 0], "degrees": [0, 40]}], "frames": frames}})
            (desk.folder / "strider.glb").write_bytes((DEMO / "strider.glb").read_bytes())
            desk.signed("post.suite.json", "--jobs", "2")
            gate = subprocess.Popen([PROGRAM, "gate", "post.suite.json", "--jobs", "2"], cwd=desk.folder,
                                    stdout=subprocess.DEVNULL)
            _, status, usage = os.wait4(gate.pid, 0)
            check(status == 0, status)
            peaks.append(usage.ru_maxrss)
    check(peaks[1] < 1.25 * peaks[0], f"peak memory of 40 and of 240 frames: {peaks} KiB")


run_all([memory_does_not_grow_with_the_clip, the_signed_creature_is_within, a_harmless_reexport_is_within, a_painted_patch_is_held_back])
