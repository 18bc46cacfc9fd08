"""Runs every script of tests/script and compares. usage: run_scripts.py BUILD [NAME ...]

NAME.tw is run in an empty folder that holds a copy of the script and of the files in tests/script/files; NAME.expected holds
what it must give: standard output, then `--- stderr` and standard error, then `--- status N`. The first line of a script is a
comment that says why it exists. A second line `# options: ...` gives options of the program; `# input` in it feeds the script
through standard input instead of naming it; `# file NAME` compares a file that the script writes (section `--- file NAME`).
Expected files are never rewritten by this: with a difference both sides are shown."""
import concurrent.futures
import difflib
import glob
import os
import shutil
import subprocess
import sys
import tempfile

here = os.path.dirname(os.path.abspath(__file__))
build = os.path.join(os.path.dirname(here), sys.argv[1] if len(sys.argv) > 1 else "build")
program = os.path.join(build, "termwise")


def header(path):
    """(options, through standard input, files to compare) from the comment lines at the top; the first must say why."""
    options, through_input, files = [], False, []
    with open(path, "rb") as f:
        lines = f.read().split(b"\n")
    if not lines[0].startswith(b"# ") or len(lines[0]) < 20:
        raise ValueError("the first line must be a comment that says why the script exists")
    for line in lines[1:]:
        if line.startswith(b"# options:"):
            options = line[10:].decode().split()
        elif line == b"# input":
            through_input = True
        elif line.startswith(b"# file "):
            files.append(line[7:].decode().strip())
        else:
            break
    return options, through_input, files


def run(path):
    name = os.path.basename(path)
    options, through_input, files = header(path)
    folder = tempfile.mkdtemp()
    try:
        shutil.copy(path, folder)
        for extra in glob.glob(os.path.join(here, "script", "files", "*")):
            shutil.copy(extra, folder)
        before = set(os.listdir(folder))
        env = dict(os.environ, TW_STDLIB=os.path.join(os.path.dirname(here), "stdlib"), LC_ALL="C.UTF-8")
        words = [program] + options + ([] if through_input else [name])
        source = open(path, "rb") if through_input else subprocess.DEVNULL
        r = subprocess.run(words, cwd=folder, env=env, stdin=source, stdout=subprocess.PIPE, stderr=subprocess.PIPE,
                           timeout=120)
        out = r.stdout.decode("utf-8", "replace")
        out += "--- stderr\n" + r.stderr.decode("utf-8", "replace") + "--- status %d\n" % r.returncode
        for f in files:
            out += "--- file %s\n" % f + open(os.path.join(folder, f), encoding="utf-8", newline="").read()
        left = [f for f in os.listdir(folder) if f not in files and f not in before and not f.endswith((".bin", ".txt"))]
        if left:
            out += "--- left behind: %s\n" % " ".join(sorted(left))
        return out
    except (ValueError, OSError, subprocess.TimeoutExpired) as trouble:
        return "--- %s: %s\n" % (name, trouble)
    finally:
        shutil.rmtree(folder)


def main():
    chosen = sys.argv[2:]
    paths = sorted(glob.glob(os.path.join(here, "script", "*.tw")))
    if chosen:
        paths = [p for p in paths if os.path.basename(p)[:-3] in chosen]
    passed = failed = 0
    with concurrent.futures.ThreadPoolExecutor(2) as pool:
        for path, got in zip(paths, pool.map(run, paths)):
            expected = path[:-3] + ".expected"
            want = open(expected, encoding="utf-8", newline="").read() if os.path.exists(expected) else ""
            if got == want:
                passed += 1
                continue
            failed += 1
            print("FAILED:", os.path.basename(path))
            sys.stdout.writelines(difflib.unified_diff(want.splitlines(True), got.splitlines(True), "expected", "printed"))
    print("%d passed, %d failed, 0 skipped" % (passed, failed))
    return failed != 0


if __name__ == "__main__":
    sys.exit(main())
