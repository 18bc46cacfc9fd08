"""Every worked job of examples/ runs unattended. usage: run_examples.py BUILD

An example must end with status 0 (unsuitable.tw, whose statements are refused on purpose, with 1), twice with the same output; each
file that it writes must be there and not empty, and JSON must say which format it has. Numbers that stand in an example both
from an expansion and from quadrature must overlap."""
import concurrent.futures
import json
import os
import re
import shutil
import subprocess
import sys
import tempfile

here = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))
program = os.path.join(here, sys.argv[1] if len(sys.argv) > 1 else "build", "termwise")
folder_of_examples = os.path.join(here, "examples")


def run(name, *options):
    """(status, standard output, complaints, folder)"""
    folder = tempfile.mkdtemp()
    for f in os.listdir(folder_of_examples):
        shutil.copy(os.path.join(folder_of_examples, f), folder)
    env = dict(os.environ, TW_STDLIB=os.path.join(here, "stdlib"), XDG_CACHE_HOME=folder, LC_ALL="C.UTF-8")
    r = subprocess.run([program, *options, name], cwd=folder, env=env, stdin=subprocess.DEVNULL, stdout=subprocess.PIPE,
                       stderr=subprocess.PIPE, text=True, timeout=300)
    return r.returncode, r.stdout, r.stderr, folder


def clashes(lines):
    """Numbers of one kind of point that do not overlap: quadrature against expansion."""
    wrong = []
    seen = {}
    for line in lines:
        o = json.loads(line)
        if o.get("result") != "number" or o.get("label") not in ("proved", "exact"):
            continue
        mid, radius = float(o["re"]["mid"]), float(o["re"]["radius"])
        key = (tuple(sorted(o["at"].items())), "%.3g" % mid)
        for m, r in seen.setdefault(key, []):
            if abs(m - mid) > r + radius + 1e-13 * abs(mid):
                wrong.append("%s: %r and %r" % (key, m, mid))
        seen[key].append((mid, radius))
    return wrong


def check(name):
    wrong = []
    status, out, complaints, folder = run(name, *(["--keep-going"] if name.startswith("unsuitable") else []))
    if status != (1 if name.startswith("unsuitable") else 0):
        wrong.append("status %d\n%s" % (status, complaints))
    words = open(os.path.join(folder_of_examples, name), encoding="utf-8").read()
    for f in re.findall(r'^(?:write|plot|evaluate) .* to "([^"]+)"', words, re.M):
        path = os.path.join(folder, f)
        if not os.path.exists(path) or os.path.getsize(path) == 0:
            wrong.append("%s is not written" % f)
        elif f.endswith(".json") and not json.load(open(path, encoding="utf-8"))["format"].startswith("termwise "):
            wrong.append("%s does not say its format" % f)
    shutil.rmtree(folder)
    again, lines, _, folder = run(name, "--results", "json", *(["--keep-going"] if name.startswith("unsuitable") else []))
    shutil.rmtree(folder)
    if again != status:
        wrong.append("a second run ends with %d" % again)
    wrong += clashes(lines.splitlines())
    return wrong


names = sorted(f for f in os.listdir(folder_of_examples) if f.endswith(".tw"))
failed = 0
with concurrent.futures.ThreadPoolExecutor(2) as pool:
    for name, wrong in zip(names, pool.map(check, names)):
        failed += bool(wrong)
        for w in wrong:
            print("FAILED: %s: %s" % (name, w))
print("%d passed, %d failed, 0 skipped" % (len(names) - failed, failed))
sys.exit(failed != 0)
