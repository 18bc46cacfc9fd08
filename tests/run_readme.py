"""Runs every transcript of the documents and compares. usage: run_readme.py BUILD

A transcript is a fenced block marked `console`. A line `$ COMMAND` is run by the shell in an empty folder that holds the
examples, with the built program first in the path; the lines below it, up to the next `$`, are what it must print (both
outputs). `$ termwise` alone opens a session: the lines `tw> ` and `... ` are typed, the others must be printed. The
documents are never rewritten by this."""
import os
import re
import shutil
import subprocess
import sys
import tempfile

here = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))
build = os.path.join(here, sys.argv[1] if len(sys.argv) > 1 else "build")
passed = failed = 0


def blocks(path):
    lines = open(path, encoding="utf-8").read().split("\n")
    k = 0
    while k < len(lines):
        if lines[k].strip() == "```console":
            start = k + 1
            k += 1
            body = []
            while lines[k].strip() != "```":
                body.append(lines[k])
                k += 1
            yield start, body
        k += 1


def commands(body):
    out = []
    for line in body:
        if line.startswith("$ "):
            out.append((line[2:], []))
        elif out:
            out[-1][1].append(line)
        else:
            raise SystemExit("a transcript must start with a command: " + line)
    return out


def run(command, typed, folder):
    env = dict(os.environ, PATH=build + os.pathsep + os.environ["PATH"], TW_STDLIB=os.path.join(here, "stdlib"))
    r = subprocess.run(["sh", "-c", command], cwd=folder, env=env, input=typed or "", stdout=subprocess.PIPE,
                       stderr=subprocess.STDOUT, text=True, timeout=120)
    return [line.rstrip() for line in r.stdout.rstrip("\n").split("\n")] if r.stdout.strip() else []


for name in ("README.md", "DEVELOPERS.md"):
    path = os.path.join(here, name)
    if not os.path.exists(path):
        continue
    for start, body in blocks(path):
        folder = tempfile.mkdtemp()
        for f in os.listdir(os.path.join(here, "examples")):
            if f.endswith((".tw", ".csv")):
                shutil.copy(os.path.join(here, "examples", f), folder)
        good = True
        for command, lines in commands(body):
            session = command.strip() == "termwise"
            typed = "\n".join(line[4:] for line in lines if re.match(r"(tw>|\.\.\.) ", line)) + "\n"
            want = [line.rstrip() for line in lines if not (session and re.match(r"(tw>|\.\.\.) ", line))]
            while want and not want[-1]:
                want.pop()
            got = run(command, typed if session else None, folder)
            if got != want:
                good = False
                print("%s:%d: `%s` prints otherwise" % (name, start, command))
                print("  expected:\n    " + "\n    ".join(want))
                print("  printed:\n    " + "\n    ".join(got))
        shutil.rmtree(folder)
        passed += good
        failed += not good
print("%d passed, %d failed, 0 skipped" % (passed, failed))
sys.exit(failed != 0)
