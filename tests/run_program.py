"""The program as other programs and shells meet it: options, exit statuses, streams, interrupts, limits.
usage: run_program.py BUILD"""
import json
import os
import signal
import subprocess
import sys
import tempfile
import time

here = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))
build = sys.argv[1] if len(sys.argv) > 1 else "build"
program = os.path.join(here, build, "termwise")
sanitized = "sanitize" in build
env = dict(os.environ, TW_STDLIB=os.path.join(here, "stdlib"), LC_ALL="C.UTF-8")
folder = tempfile.mkdtemp()
passed = failed = 0


def check(good, words, *shown):
    global passed, failed
    passed += bool(good)
    failed += not good
    if not good:
        print("FAILED:", words, *shown)


def run(*words, stdin="", **more):
    return subprocess.run([program, *words], cwd=folder, env=env, input=stdin, text=True, stdout=subprocess.PIPE,
                          stderr=subprocess.PIPE, timeout=120, errors="replace", **more)


def file(name, content):
    path = os.path.join(folder, name)
    with open(path, "w", encoding="utf-8") as f:
        f.write(content)
    return name


# ---- options ----
r = run("--version")
check(r.returncode == 0 and r.stdout.startswith("termwise ") and len(r.stdout.split()) == 2, "--version", r)
r = run("--help")
check(r.returncode == 0 and all(o in r.stdout for o in ("-e", "--parse-only", "--results json", "--digits", "--quiet",
      "--keep-going", "--time-limit", "--memory-limit", "--version", "--help")) and not r.stderr, "--help", r)
for words in (["--nonsense"], ["-x"], ["--digits"], ["--digits", "0"], ["--digits", "ten"], ["--digits", "1e99"],
              ["--results", "xml"], ["--time-limit", "-1"], ["--time-limit", "soon"], ["--memory-limit", "0"], ["-e"],
              ["--quiet=yes"], ["--digits=3.5"]):
    r = run(*words)
    check(r.returncode == 2 and r.stderr.startswith("termwise: error: ") and r.stderr.count("\n") == 1 and not r.stdout,
          "wrong usage: " + " ".join(words), r)

# ---- what is run, and in which order ----
one = file("one.tw", "let a = 1\n")
two = file("two.tw", "let b = a + 1\nshow b\n")
r = run("--quiet", one, two)
check(r.returncode == 0 and r.stdout == "b = 2\n", "files run in order in one session", r)
r = run("--quiet", "-e", "let a = 5", two, "-e", "show a")
check(r.returncode == 0 and r.stdout == "b = 6\na = 5\n", "statements and files in the order of the command line", r)
r = run("--quiet", "-e", "let a = 1\nlet b = a\nshow b")
check(r.returncode == 0 and r.stdout == "b = 1\n", "several lines in one -e", r)
r = run("--quiet", "-", stdin="let a = 2\nshow a\n")
check(r.returncode == 0 and r.stdout == "a = 2\n", "- is standard input", r)
r = run("--", file("-odd.tw", "show pi_like\n"), stdin="")
check(r.returncode == 1 and "-odd.tw:1:" in r.stderr, "a file whose name begins with - behind --", r)
r = run(stdin="")
check(r.returncode == 0 and not r.stdout and not r.stderr, "no input at all", r)
r = run("--parse-only", file("writes.tw", "let a = 1\nwrite a as csv to \"never.csv\"\nlet b = (\n"))
check(r.returncode == 1 and not r.stdout and not os.path.exists(os.path.join(folder, "never.csv")), "--parse-only does nothing", r)
r = run("--parse-only", file("many.tw", "let a = )\nlet b = 1 2\nlet c = 3\nlet 4 = 5\n"))
check(r.returncode == 1 and [l.split(":")[1] for l in r.stderr.splitlines() if l.startswith("many.tw:")] == ["1", "2", "4"],
      "--parse-only reports every error", r)

# ---- exit statuses ----
r = run("-e", "let a = )")
check(r.returncode == 1 and r.stderr.startswith("-e:1:9: error: "), "a failed statement", r)
r = run("-e", "let a = )", "-e", "show a")
check(r.stderr.count("error:") == 1, "a script stops at its first failure", r)
r = run("--keep-going", "-e", "let a = )", "-e", "let b = 3\nshow b")
check(r.returncode == 1 and r.stdout.endswith("b = 3\n"), "--keep-going goes on and remembers", r)
for name, words in (("missing.tw", "No such file"), (".", "directory")):
    r = run(name)
    check(r.returncode == 1 and words in r.stderr and not r.stdout, "cannot read " + name, r)
r = run("--keep-going", "missing.tw", "-e", "show pi")
check(r.returncode == 1 and "missing.tw" in r.stderr, "--keep-going after a missing file", r)

# ---- results for programs ----
script = """large s
given a > 0
grant a > 1/2
let tilt(u) = 1/(1 + u)
let F = integral from 0 to inf of exp(-s*x)*tilt(x^2) dx
let A = expand F to 6 terms
expand F to 3 terms as B
steps A
coefficients of A from 0 to 4
remainder of A with 2 terms
evaluate A at s = 20
evaluate A at s = 20, 30
evaluate F at s = 20 to 20 digits
let v = evaluate F at s = 20
compare A at s = 20
write A as json to "a.json"
show A
show v
show a
help expand
help
drop B
use moments
plot terms of A at s = 3 to "x.svg"
let g = (
show nobody
recurrence of A
quit
"""
path = file("all.tw", script)
r = run("--results", "json", "--keep-going", path)
lines = r.stdout.splitlines()
objects = []
for line in lines:
    try:
        objects.append(json.loads(line))
    except ValueError as trouble:
        check(False, "a line that is no JSON: %s: %s" % (trouble, line[:200]))
statements = [l for l in script.splitlines()]
check(len(objects) == len(statements), "one object for each statement",
      len(objects), len(statements))
kinds = [o.get("result", o.get("format")) for o in objects]
check(all(k for k in kinds), "every object says what it is", kinds)
number = next(o for o in objects if o.get("result") == "number")
check(set(number) >= {"of", "at", "re", "im", "label", "way", "terms", "least_term", "conditions"} and number["of"] == "A"
      and number["at"] == {"s": "20"} and float(number["re"]["mid"]) > 0.04, "members of a number", number)
error = [o for o in objects if o.get("result") == "error"]
check(len(error) >= 3 and all(set(o) >= {"kind", "message", "file", "line", "column"} for o in error)
      and error[0]["kind"] == "unavailable" and error[0]["file"] == "all.tw" and error[0]["line"] == 24, "members of an error", error)
comparison = next(o for o in objects if o.get("result") == "comparison")
check(comparison["rows"] and all(not row["violated"] for row in comparison["rows"]), "rows of a comparison")
check(json.load(open(os.path.join(folder, "a.json")))["format"] == "termwise expansion", "the written file is JSON")
check(all("--results" not in o for o in objects) and r.stderr.count("error:") == len(error), "errors stand in both outputs", r.stderr)
plain = run("--keep-going", path)
check(plain.stdout.isascii() and all(l == l.rstrip() for l in plain.stdout.splitlines()), "text output is ASCII without trailing blanks",
      [l for l in plain.stdout.splitlines() if l != l.rstrip()])
check("\x1b" not in plain.stdout + plain.stderr, "no colour when not at a terminal")

# ---- a program on the other end of a pipe ----
p = subprocess.Popen([program, "--results", "json"], cwd=folder, env=env, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
p.stdin.write("let a = 2\n")
p.stdin.flush()
first = json.loads(p.stdout.readline())
p.stdin.write("let b = (a +\n")
p.stdin.flush()
time.sleep(0.2)
p.stdin.write("1)\nshow b\n")
p.stdin.flush()
second, third = json.loads(p.stdout.readline()), json.loads(p.stdout.readline())
p.stdin.close()
check(first["name"] == "a" and second["name"] == "b" and third["text"] == "b = 3" and p.wait(10) == 0,
      "answers come as soon as a statement is complete", first, second, third)
big = "".join("let v%d = %d + x\n" % (k, k) for k in range(20000)) + "show v19999\n"
start = time.time()
r = run("--quiet", stdin=big)
check(r.returncode == 0 and "v19999 = 19999 + x" in r.stdout, "20000 definitions through a pipe", r.returncode, r.stdout[-200:])
check(time.time() - start < (60 if sanitized else 10), "and they do not take long", time.time() - start)
r = run("--quiet", stdin="let a = (1 +\n" + "2 +\n" * 20000 + "3)\nshow a\n")
check(r.returncode in (0, 1) and r.stdout + r.stderr, "one bracket open over 20000 lines", r.returncode)
with open("/dev/full", "w") as full:
    r = subprocess.run([program, "-e", "let a = 1"], stdout=full, stderr=subprocess.PIPE, text=True, env=env, timeout=60)
check(r.returncode == 1 and "No space left" in r.stderr, "a full disk on standard output is said", r)
p = subprocess.Popen([program, "-e", "help\n" * 300], stdout=subprocess.PIPE, stderr=subprocess.PIPE, env=env)
p.stdout.read(10)
p.stdout.close()
check(p.wait(20) in (-signal.SIGPIPE, 1), "a reader that goes away ends the program", p.returncode)

# ---- interrupts and limits ----
SLOW = "sum from k = 1 to 20000 of sum from j = 1 to 20000 of 1/(j + k)"
p = subprocess.Popen([program, "-e", "evaluate " + SLOW, "-e", "let after = 1"], stdout=subprocess.PIPE, stderr=subprocess.PIPE,
                     text=True, env=env)
time.sleep(1.0)
p.send_signal(signal.SIGINT)
try:
    out, err = p.communicate(timeout=20)
    check(p.returncode == 130 and "interrupted" in err and not out, "an interrupt ends a script with status 130", p.returncode, err)
except subprocess.TimeoutExpired:
    p.kill()
    check(False, "an interrupt ends a script")
p = subprocess.Popen([program], stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=env)
time.sleep(0.3)
p.send_signal(signal.SIGINT)
check(p.wait(10) == 130, "an interrupt while waiting for input", p.returncode)
start = time.time()
r = run("--time-limit", "1", "--keep-going", "-e", "evaluate %s\nlet a = 3\nshow a" % SLOW)
check(r.returncode == 1 and "time" in r.stderr and r.stdout.endswith("a = 3\n") and time.time() - start < 8,
      "the time limit holds for each statement", r, time.time() - start)
r = run("--memory-limit", "100", "--keep-going", "-e", "large s\nexpand integral from 0 to inf of exp(-s*x)/(1 + x + x^3) dx to 20000 "
        "terms\nlet a = 3\nshow a")
check(r.returncode == 1 and "memory" in r.stderr and (sanitized or r.stdout.endswith("a = 3\n")), "the memory limit ends a statement", r)
deep = "(" * 100000 + "1" + ")" * 100000
r = run("--time-limit", "20", stdin="let a = %s\n" % deep)
check(r.returncode == 1 and ": error: " in r.stderr and len(r.stderr) < 2000, "100000 nested brackets", r.returncode, r.stderr[:300])
r = run("--time-limit", "20", stdin="let a = " + "-" * 100000 + "x\n")
check(r.returncode in (0, 1), "100000 signs", r.returncode)
r = run("--time-limit", "20", stdin="let a = " + "x^" * 100000 + "x\n")
check(r.returncode == 1, "100000 powers", r.returncode)
r = run("--time-limit", "20", stdin="let a = 1" + " + x" * 200000 + "\nshow a\n")
check(r.returncode == 0 and r.stdout.endswith("a = 1 + 200000*x\n"), "a sum of 200000 terms", r.returncode, r.stdout[-100:])
os.system("rm -rf " + folder)
print("%d passed, %d failed, 0 skipped" % (passed, failed))
sys.exit(failed != 0)
