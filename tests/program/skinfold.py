"""What the whole-program tests share: a folder of their own, and the program run in it."""
import json
import pathlib
import shutil
import subprocess
import sys
import tempfile

PROJECT = pathlib.Path(__file__).resolve().parents[2]
PROGRAM = sys.argv[1]


class Desk:
    """A temporary folder with a rig, a motion and engine frames from the example writer."""

    def __init__(self):
        self.folder = pathlib.Path(tempfile.mkdtemp(prefix="skinfold-program-"))
        subprocess.run([sys.executable, PROJECT / "scripts/example_writer.py", self.folder], check=True)

    def __enter__(self):
        return self

    def __exit__(self, *_):
        shutil.rmtree(self.folder)

    def suite(self, file="post.suite.json", **changes):
        """Writes a suite of the post; `changes` replace its members, None removes them."""
        suite = {
            "skinfold": "suite 1", "name": "post",
            "rig": {"mesh": "post.obj", "binding": "post.binding.json"},
            "motions": {"bend": {"poses": "bend.npy"},
                        "turn": {"sweep": [{"joint": "tip", "axis": [0, 1, 0], "degrees": [0, 60]}], "frames": 4}},
            "methods": {"ship": {"skinning": "linear_blend"}},
        }
        suite.update(changes)
        (self.folder / file).write_text(json.dumps({k: v for k, v in suite.items() if v is not None}))
        return file

    def run(self, *arguments, code=None):
        """Runs the program here; fails where it does not end with `code`."""
        done = subprocess.run([PROGRAM, *map(str, arguments)], cwd=self.folder, capture_output=True, text=True,
                              timeout=300)
        if code is not None and done.returncode != code:
            raise AssertionError(f"skinfold {' '.join(map(str, arguments))}: exit code {done.returncode}, expected "
                                 f"{code}\n{done.stdout}{done.stderr}")
        return done

    def signed(self, *gate_arguments):
        """Gates and signs off."""
        self.run("gate", *gate_arguments, code=1)
        self.run("signoff", "skinfold-out", "--by", "tester", "--why", "first", code=0)

    def results(self, out="skinfold-out"):
        return json.loads((self.folder / out / "results.json").read_text())

    def cases(self, out="skinfold-out"):
        return {case["name"]: case for suite in self.results(out)["suites"] for case in suite["cases"]}


def check(condition, what):
    if not condition:
        raise AssertionError(what)


def run_all(tests):
    """Runs each test function and ends with how many failed."""
    failed = 0
    for test in tests:
        try:
            test()
            print(f"ok      {test.__name__}")
        except Exception as error:  # a failed test must not hide the next one
            failed += 1
            print(f"FAILED  {test.__name__}: {error}")
    sys.exit(1 if failed else 0)
