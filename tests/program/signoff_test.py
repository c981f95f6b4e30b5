#!/usr/bin/env python3
"""Sign-off and export as their users meet them."""
import hashlib
import json
import os
import shutil

import numpy as np
from skinfold import Desk, check, run_all


def weights_moved(desk, vertex, share):
    path = desk.folder / "post.binding.json"
    binding = json.loads(path.read_text())
    binding["influences"][vertex] = [[0, 1 - share], [1, share]]
    path.write_text(json.dumps(binding))


def record_of(desk, case="main/bend/ship"):
    return json.loads((desk.folder / "golden/post" / case / "record.json").read_text())


def tree(folder):
    return {str(p.relative_to(folder)): p.read_bytes() for p in sorted(folder.rglob("*")) if p.is_file()}


def a_chain_of_signoffs():
    """Catches: a history that is lost or cannot be followed, and frames that no record names."""
    with Desk() as desk:
        suite = desk.suite()
        desk.signed(suite)
        first = (desk.folder / "golden/post/main/bend/ship/record.json").read_bytes()
        weights_moved(desk, 40, 0.6)
        desk.run("gate", suite, code=1)
        desk.run("signoff", "skinfold-out", "--by", "Ida", "--role", "lead", "--why", "softer bend",
                 "--only", "*/bend/*", code=0)
        record = record_of(desk)
        check([s["by"] for s in record["signoffs"]] == ["Ida", "tester"], record["signoffs"])
        check(record["signoffs"][0]["predecessor"] == hashlib.sha256(first).hexdigest(), "predecessor")
        names = sorted(p.name for p in (desk.folder / "golden/post/main/bend/ship").iterdir())
        check(names == sorted(["record.json", record["frames_file"]]), names)
        check(len(record_of(desk, "main/turn/ship")["signoffs"]) == 1, "--only signed another case")
        desk.run("gate", suite, code=1)
        check(desk.cases()["main/bend/ship"]["verdict"] == "within", "the signed case is not within")


def dry_run_lists_what_would_be_written():
    """Catches: a dry run that writes, or that lists other paths than a sign-off writes."""
    with Desk() as desk:
        desk.run("gate", desk.suite(), code=1)
        listed = desk.run("signoff", "skinfold-out", "--by", "x", "--why", "y", "--dry-run", code=0).stdout.split()
        check(not (desk.folder / "golden").exists(), "the dry run wrote")
        desk.run("signoff", "skinfold-out", "--by", "x", "--why", "y", code=0)
        written = [str(desk.folder / "golden" / p) for p in tree(desk.folder / "golden")]
        check(sorted(map(os.path.realpath, listed)) == sorted(map(os.path.realpath, written)), (listed, written))


def refusals():
    """Catches: broken cases, cases beyond a limit or frames of another run made goldens."""
    with Desk() as desk:
        suite = desk.suite(limits={"edge_stretch.max": {"at_most": 1.001}})
        desk.run("gate", suite, code=1)
        refused = desk.run("signoff", "skinfold-out", "--by", "x", "--why", "y", code=1)
        check("beyond a limit, edge_stretch.max" in refused.stderr, refused.stderr)
        check(not (desk.folder / "golden").exists(), "a refused case was signed")
        desk.run("signoff", "skinfold-out", "--by", "x", "--why", "y", "--despite-limits", code=0)
        desk.run("signoff", "skinfold-out", "--by", " ", "--why", "y", code=2)
        desk.run("signoff", "skinfold-out", "--by", "x", code=2)
        desk.run("signoff", "skinfold-out", "--by", "x", "--why", "y", "--only", "nothing", code=2)

        broken = desk.suite("broken.json", name="other", rig={"mesh": "absent.obj", "binding": "post.binding.json"})
        desk.run("gate", broken, code=3)
        check("is broken" in desk.run("signoff", "skinfold-out", "--by", "x", "--why", "y", code=1).stderr, "broken")

        weights_moved(desk, 40, 0.6)
        desk.run("gate", suite, "--out", "one", code=1)
        weights_moved(desk, 41, 0.6)
        desk.run("gate", suite, "--out", "two", code=1)
        shutil.rmtree(desk.folder / "one/frames")
        shutil.copytree(desk.folder / "two/frames", desk.folder / "one/frames")
        refused = desk.run("signoff", "one", "--by", "x", "--why", "y", "--despite-limits", code=1)
        check("another run" in refused.stderr, refused.stderr)


def a_damaged_golden_breaks_its_case():
    """Catches: a golden with a flipped bit, a missing file or a record of another that is compared as if whole."""
    with Desk() as desk:
        suite = desk.suite()
        desk.signed(suite)
        folder = desk.folder / "golden/post/main/bend/ship"
        frames = folder / record_of(desk)["frames_file"]
        whole = frames.read_bytes()
        frames.write_bytes(whole[:500] + bytes([whole[500] ^ 1]) + whole[501:])
        desk.run("gate", suite, code=3)
        frames.unlink()
        desk.run("gate", suite, code=3)
        frames.write_bytes(whole)
        desk.run("gate", suite, code=0)
        (folder / "record.json").write_text("{")
        desk.run("gate", suite, code=3)
        check("record.json" in desk.cases()["main/bend/ship"]["problem"]["file"], "the file is not named")


def a_target_that_cannot_be_written():
    """Catches: some goldens signed and others not. (Root may write anywhere: a file in the way instead.)"""
    with Desk() as desk:
        desk.run("gate", desk.suite(), code=1)
        (desk.folder / "golden/post").mkdir(parents=True)
        (desk.folder / "golden/post/main").write_text("in the way")
        before = tree(desk.folder / "golden")
        desk.run("signoff", "skinfold-out", "--by", "x", "--why", "y", code=4)
        check(tree(desk.folder / "golden") == before, "something was written")


def exports_hold_what_the_gate_judged():
    """Catches: exports of another pose, order or unit. The writer blends linearly in NumPy by itself."""
    with Desk() as desk:
        suite = desk.suite()
        desk.run("export", suite, "--case", "main/bend/ship", "--to", "skin.npy", code=0)
        ours, theirs = np.load(desk.folder / "skin.npy"), np.load(desk.folder / "engine.npy")
        check(ours.shape == theirs.shape and np.abs(ours - theirs).max() < 1e-14, "not what NumPy computes")
        desk.run("export", suite, "--case", "main/bend/ship", "--to", "one.obj", "--frame", "4", code=0)
        lines = (desk.folder / "one.obj").read_text().splitlines()
        points = np.array([line.split()[1:] for line in lines if line.startswith("v ")], float)
        check(np.array_equal(points, ours[4]), "an OBJ that is not exact")
        desk.run("export", suite, "--case", "main/bend/ship", "--to", "skin.glb", code=0)
        desk.run("export", suite, "--case", "main/bend/ship", "--to", "all.obj", code=2)
        desk.run("export", suite, "--case", "main/bend/ship", "--to", "skin.fbz", code=2)
        desk.run("export", suite, "--case", "main/bend/ship", "--to", "skin.npy", "--frame", "5", code=2)
        missing = desk.run("export", suite, "--case", "main/bent/ship", "--to", "skin.npy", code=2)
        check("did you mean 'main/bend/ship'?" in missing.stderr, missing.stderr)


run_all([a_chain_of_signoffs, dry_run_lists_what_would_be_written, refusals, a_damaged_golden_breaks_its_case,
         a_target_that_cannot_be_written, exports_hold_what_the_gate_judged])
