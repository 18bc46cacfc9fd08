"""Every word of the language has help, and its example does what the help says. usage: run_help.py BUILD

The words come from the program itself (`help` as JSON) and from the table of statements that the parser uses, so a statement
without help fails here (the table of all words is held against help in tests/lang/test_result.c). An example of a word that
this version has must run, in a folder that holds a file points.csv with values of s; one of a later word must be read
and refused with the words `not available in this version`."""
import concurrent.futures
import json
import os
import re
import subprocess
import sys
import tempfile

here = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))
program = os.path.join(here, sys.argv[1] if len(sys.argv) > 1 else "build", "termwise")
env = dict(os.environ, TW_STDLIB=os.path.join(here, "stdlib"))


def run(script, *options):
    with tempfile.TemporaryDirectory() as folder:
        with open(os.path.join(folder, "points.csv"), "w", encoding="utf-8") as f:
            f.write("s\n10\n20\n")
        r = subprocess.run([program, "--time-limit", "60", *options], input=script, cwd=folder, env=env, text=True,
                           stdout=subprocess.PIPE, stderr=subprocess.PIPE, timeout=180)
    return r


def check(word):
    """Words of complaint, one for each thing that is wrong."""
    wrong = []
    r = run("help %s\n" % word, "--results", "json")
    if r.returncode != 0:
        return ["no help for " + word]
    entries = json.loads(r.stdout)["entries"]
    shown = run("help %s\n" % word).stdout
    if any(len(line) > 79 for line in shown.splitlines()) or not shown.isascii():
        wrong.append("help %s prints a line wider than 79 columns, or not ASCII" % word)
    for entry in entries:
        example = entry["example"] + "\n"
        if not entry["example"].strip() or entry["about"].strip() == "":
            wrong.append("%s: no example or no explanation" % word)
            continue
        parsed = run(example, "--parse-only")
        if parsed.returncode != 0:
            wrong.append("%s: the example does not parse\n%s" % (word, parsed.stderr))
            continue
        r = run(example)
        if entry["available"]:
            if r.returncode != 0:
                wrong.append("%s: the example fails\n%s\n%s" % (word, example, r.stderr))
        elif r.returncode != 1 or "not available in this version" not in r.stderr:
            wrong.append("%s: the example of a later word gives status %d\n%s" % (word, r.returncode, r.stderr))
    return wrong


words = json.loads(run("help\n", "--results", "json").stdout)["words"]
statements = open(os.path.join(here, "lang", "syntax.h"), encoding="utf-8").read()
opening = {w.split()[0] for w in re.findall(r'X\([A-Z_]+, "([a-z ]+)"\)', statements)}
opening -= {"expansion"}  # stands after `let NAME =` only
passed = failed = 0
with concurrent.futures.ThreadPoolExecutor(2) as pool:
    for word, wrong in zip(words, pool.map(check, words)):
        passed += not wrong
        failed += bool(wrong)
        for w in wrong:
            print("FAILED:", w)
for word in sorted(opening):
    good = word in words
    passed += good
    failed += not good
    if not good:
        print("FAILED: no help for the word", word)
print("%d passed, %d failed, 0 skipped" % (passed, failed))
sys.exit(failed != 0)
