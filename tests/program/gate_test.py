#!/usr/bin/env python3
"""The gate as its users meet it: from an unsigned suite to a caught fault, and every exit code."""
import json

import numpy as np
from skinfold import PROJECT, Desk, check, run_all


def from_unsigned_to_caught():
    """Catches: a gate that lets a painted weight pass, or blames something else than the weights."""
    with Desk() as desk:
        suite = desk.suite()
        desk.signed(suite)
        done = desk.run("gate", suite, code=0)
        check("2 within" in done.stdout, done.stdout)
        check(not (desk.folder / "skinfold-out/frames").exists(), "cases within left frames behind")
        binding = json.loads((desk.folder / "post.binding.json").read_text())
        binding["influences"][40] = [[0, 0.4], [1, 0.6]]
        (desk.folder / "post.binding.json").write_text(json.dumps(binding))
        desk.run("gate", suite, code=1)
        case = desk.cases()["main/bend/ship"]
        check(case["verdict"] == "beyond" and case["changed"] == ["weights"], case["changed"])
        worst = next(c for c in case["checks"] if c["statistic"] == "position.max")
        check(worst["verdict"] == "beyond" and worst["vertices"] == [40] and worst["frame"] == 4, worst)
        check(worst["joint"] == "tip" and worst["failing"] == 1, worst)
        check(len(list((desk.folder / "skinfold-out/frames/post/main/bend/ship").iterdir())) == 2, "no candidate")


def an_engine_is_held_against_the_golden_and_against_a_method():
    """Catches: engine frames compared in another order or unit, and a case that needs a golden though it names a method."""
    with Desk() as desk:
        methods = {"ship": {"skinning": "linear_blend"},
                   "engine": {"skinning": "given", "frames": "engine.npy", "against": "ship"}}
        suite = desk.suite(methods=methods, cases=["*/bend/engine"])
        desk.run("gate", suite, code=0)
        frames = np.load(desk.folder / "engine.npy")
        np.save(desk.folder / "engine.npy", frames.astype(np.float32))  # an engine in single precision
        desk.run("gate", suite, code=0)
        frames[2, 17] += 0.01
        np.save(desk.folder / "engine.npy", frames)
        desk.run("gate", suite, code=1)
        worst = next(c for c in desk.cases()["main/bend/engine"]["checks"] if c["statistic"] == "position.max")
        check(worst["frame"] == 2 and worst["vertices"] == [17], worst)
        np.save(desk.folder / "engine.npy", frames[:-1])
        desk.run("gate", suite, code=1)
        check(desk.cases()["main/bend/engine"]["checks"][0]["kind"] == "shape", "a missing frame is a shape")
        (desk.folder / "engine.npy").unlink()
        desk.run("gate", suite, code=3)


def a_mesh_alone_is_enough_where_every_skin_is_given():
    """Catches: bounds of joints asked of a mesh that has none."""
    with Desk() as desk:
        suite = desk.suite(rig={"mesh": "post.obj"}, motions={"bend": {"frames": 5}},
                           methods={"engine": {"skinning": "given", "frames": "engine.npy"}})
        desk.signed(suite)
        desk.run("gate", suite, code=0)


def exit_codes():
    """Catches: a check-in gate that takes one kind of failure for another."""
    with Desk() as desk:
        suite = desk.suite()
        desk.run("gate", suite, code=1)                                        # unsigned
        desk.run("gate", suite, "--allow-unsigned", code=0)
        check(desk.results()["verdict"] == "unsigned", "--allow-unsigned changes only the code")
        desk.run("gate", desk.suite("limit.json", name="limit", limits={"edge_stretch.max": {"at_most": 1.001}}),
                 "--allow-unsigned", code=1)                                   # beyond
        desk.run("gate", desk.suite("broken.json", name="broken", rig={"mesh": "absent.obj", "binding": "b.json"}),
                 code=3)
        desk.run("gate", desk.suite("wrong.json", limitz={}), code=2)
        desk.run("gate", suite, "--only", "nothing/**", code=2)
        desk.run("gate", suite, "--tag", "nothing", code=2)
        desk.run("gate", suite, suite, code=2)                                 # two suites of one name
        desk.run("gate", "absent.json", code=2)
        desk.run("gate", code=2)
        desk.run("gat", suite, code=2)
        desk.run("gate", suite, "--out", "post.obj/x", code=4)                 # results cannot be written
        desk.run("--version", code=0)
        desk.run("gate", "--help", code=0)
        desk.run("signoff", "nowhere", "--by", "x", "--why", "y", code=2)
        no_checks = desk.suite("none.json", name="none", limits={name: None for name in (
            "finite.bad", "weights.sum_error", "weights.unowned", "weights.negative", "bind.residual")})
        desk.run("gate", no_checks, code=2)                                    # a case without any check


def one_wrong_suite_does_not_stop_the_others():
    """Catches: results lost because another file could not be read."""
    with Desk() as desk:
        wrong = desk.suite("wrong.json", methods={"ship": {"skinning": "linear_blnd"}})
        done = desk.run("gate", wrong, desk.suite(), code=2)
        check("did you mean 'linear_blend'?" in done.stdout, done.stdout)
        check(len(desk.cases()) == 2, "the other suite was not gated")
        check(desk.results()["suites"][0]["problem"]["line"] == 1, "no place")


def same_bytes_for_any_number_of_jobs():
    """Catches: sums, orders or notes that depend on threads, and times, hosts or paths in the results."""
    with Desk() as desk:
        suite = desk.suite(motions={"bend": {"poses": "bend.npy"}, "turn": {"sweep": [
            {"joint": "tip", "axis": [1, 2, 3], "degrees": [0, 170]}], "frames": 37}})
        desk.signed(suite)
        desk.suite(methods={"ship": {"skinning": "dual_quaternion"}},
                   motions={"turn": {"sweep": [{"joint": "tip", "axis": [1, 2, 3], "degrees": [0, 170]}], "frames": 37}})
        texts = []
        for jobs in (1, 2, 5):
            desk.run("gate", suite, "--jobs", jobs, "--out", f"out{jobs}", code=1)
            texts.append((desk.folder / f"out{jobs}/results.json").read_bytes())
        desk.run("gate", desk.folder / suite, "--out", desk.folder / "outa", code=1)
        texts.append((desk.folder / "outa/results.json").read_bytes())
        check(len(set(texts)) == 1, "results.json differs")
        check(str(desk.folder).encode() not in texts[0], "an absolute path in results.json")


def profile_exact_sees_one_bit():
    """Catches: an `exact` that compares anything but the unrounded numbers."""
    with Desk() as desk:
        suite = desk.suite(rig={"mesh": "post.obj"}, motions={"bend": {"frames": 5}}, drift={"profile": "exact"},
                           methods={"engine": {"skinning": "given", "frames": "engine.npy"}})
        desk.signed(suite)
        desk.run("gate", suite, code=0)
        frames = np.load(desk.folder / "engine.npy")
        frames[3, 5, 0] = np.nextafter(frames[3, 5, 0], 9)
        np.save(desk.folder / "engine.npy", frames)
        desk.run("gate", suite, code=1)
        bits = desk.cases()["main/bend/engine"]["checks"][0]
        check(bits["kind"] == "bits" and bits["value"] == 1 and bits["frame"] == 3, bits)


def what_cannot_be_a_number_is_beyond():
    """Catches: NaN that compares as equal, or that a sign-off makes the golden."""
    with Desk() as desk:
        suite = desk.suite(rig={"mesh": "post.obj"}, motions={"bend": {"frames": 5}},
                           methods={"engine": {"skinning": "given", "frames": "engine.npy"}})
        good = np.load(desk.folder / "engine.npy")
        bad = good.copy()
        bad[1, 3, 2] = np.nan
        np.save(desk.folder / "engine.npy", bad)
        desk.run("gate", suite, code=1)
        done = desk.run("signoff", "skinfold-out", "--by", "x", "--why", "y", "--despite-limits", code=1)
        check("no finite numbers" in done.stderr, done.stderr)
        np.save(desk.folder / "engine.npy", good)
        desk.signed(suite)
        np.save(desk.folder / "engine.npy", bad)
        desk.run("gate", suite, code=1)
        checks = desk.cases()["main/bend/engine"]["checks"]
        finite = next(c for c in checks if c["statistic"] == "finite.bad" and c["kind"] == "limit")
        check(finite["value"] == 1 and finite["frame"] == 1, finite)
        check(all(c["verdict"] == "beyond" for c in checks if c["kind"] == "drift"), "a drift passed over NaN")


def the_readme_shows_the_example_writer_that_is_tested():
    """Catches: a README whose example is another than the one every test here starts from."""
    script = (PROJECT / "scripts/example_writer.py").read_text().split("import numpy as np\n")[1].strip()
    check(script in (PROJECT / "README.md").read_text(), "README.md and scripts/example_writer.py differ")


run_all([the_readme_shows_the_example_writer_that_is_tested, from_unsigned_to_caught, an_engine_is_held_against_the_golden_and_against_a_method,
         a_mesh_alone_is_enough_where_every_skin_is_given, exit_codes, one_wrong_suite_does_not_stop_the_others,
         same_bytes_for_any_number_of_jobs, profile_exact_sees_one_bit, what_cannot_be_a_number_is_beyond])
