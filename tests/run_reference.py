"""Reference cases through the whole program: every coefficient, the values, the bound, and the files read back.
usage: run_reference.py BUILD

For each case of tests/reference/cases.json of the families that this version has: the expansion as the program writes it in
JSON is compared with the reference term by term (by value, at a large s), CSV and text lists must hold the same exact
coefficients, the numbers printed must enclose the reference's 40-digit values, and the written bound must hold."""
import csv
import io
import json
import sys

import mpmath
from mpmath import mpf

from reader import Program, Score, terms, value
import os
from reader import HERE

FAMILIES = ("watson", "parts", "symbolic-parameter", "mellin-log", "laplace-interior", "laplace-endpoint",
            "high-order-saddle", "laplace-multi", "bessel-kernel", "two-scale", "phase", "descent")


program = Program(sys.argv[1] if len(sys.argv) > 1 else "build")
score = Score()
cases = json.load(open(os.path.join(HERE, "tests", "reference", "cases.json")))["cases"]


def doubt(want):
    """The reference values come from a quadrature with an absolute tolerance near 1e-76: tiny ones have fewer than 40 digits
    (4*E_3(120) of p-log-end, DLMF 8.19.1, shows it in the 23rd)."""
    return mpf(10) ** -38 * abs(want) + mpf(10) ** -75


def known(v):
    """A reference value: a decimal, or one for each part."""
    return mpmath.mpc(v["re"], v["im"]) if isinstance(v, dict) else mpf(v)


def numbers(at):
    return {k: value(v) for k, v in at.items()}


def script(case, count):
    lines = ["large s"] + ["given " + facts for facts in case["other_parameters"].values()]
    lines += ["let F = " + case["integral"], "let A = expand F to %d terms" % count]
    lines += ['write A as json to "a.json"', 'write A as csv to "a.csv"', 'write A as text to "a.txt"']
    for v in case["values"]:
        point = ", ".join("%s = %s" % p for p in v["at"].items())
        lines += ["evaluate A at " + point, "evaluate F at " + point + " to 30 digits"]
    return "\n".join(lines) + "\n"


def reference_terms(case, at):
    return terms(case["expansion"], at, "s")


def horizon(case, at):
    """Terms beyond the shortest lane's end are not known."""
    lanes = case["expansion"]["lanes"]
    return max(value(l["first_exponent"], **at) + (len(l["coefficients"]) - 1) * value(l["step"], **at) for l in lanes)


def check_coefficients(case, made):
    at = numbers(case["values"][-1]["at"])
    at["s"] = mpf(10) ** 6
    want = [t for t in reference_terms(case, at) if t[0] >= horizon(case, at) - mpf(10) ** -20]
    dominant = [c for c in made["contributions"] if c["dominance"] == "dominant"]
    got = [t for c in dominant for t in terms(c, at, "s")]
    got.sort(key=lambda t: (-t[0], -t[1]))
    if len(dominant) > 1:  # points of equal depth: the reference has their sum
        added = {}
        for t in got:
            key = (mpmath.nstr(t[0], 20), t[1])
            added[key] = (t[0], t[1], t[2] + (added[key][2] if key in added else 0))
        got = list(added.values())
    n = min(len(want), len(got))
    good = n >= min(8, len(want)) and all(abs(w[2] - g[2]) <= mpf(10) ** -35 * abs(w[2]) for w, g in zip(want, got))
    score.check(good, "%s: coefficients of the JSON file (%d compared)" % (case["id"], n))


def check_lists(case, made):
    rows = list(csv.DictReader(io.StringIO(program.read("a.csv"))))
    lanes = [(k, l, lane) for k, c in enumerate(made["contributions"]) for l, lane in enumerate(c["lanes"])]
    at = dict(numbers(case["values"][-1]["at"]))
    good = len(rows) == sum(len(lane["coefficients"]) for _, _, lane in lanes)
    for k, l, lane in lanes:
        mine = [r for r in rows if r["contribution"] == str(k) and r["lane"] == str(l)]
        for n, (row, c) in enumerate(zip(mine, lane["coefficients"])):
            words = row["coefficient"] if "coefficient" in row else row["numerator"] + "/" + row["denominator"]
            exponent = value(lane["first_exponent"], **at) + n * value(lane["step"], **at)
            good = good and int(row["n"]) == n and abs(value(words, **at) - value(c, **at)) <= mpf(10) ** -40 * abs(value(c, **at))
            good = good and abs(value(row["exponent"], **at) - exponent) < mpf(10) ** -40
    score.check(good, case["id"] + ": the CSV file holds the JSON file's coefficients")
    listed = [line.split(" ", 1)[1] for line in program.read("a.txt").splitlines() if not line.startswith("#")]
    flat = [c for _, _, lane in lanes for c in lane["coefficients"]]
    good = len(listed) == len(flat) and all(value(a, **at) == value(b, **at) for a, b in zip(listed, flat))
    score.check(good, case["id"] + ": the text file holds the JSON file's coefficients")


def check_bound(case, made):
    r = made["remainder"]
    if r["bound"] is None:
        score.check(r["label"] == "unknown" and made["parameters"], case["id"] + ": no bound in the file")
        return
    for v in case["values"]:
        at = numbers(v["at"])
        if r["from"] is not None and at["s"] < value(r["from"], **at):
            continue
        kept = sum(t[2] for c in made["contributions"] if c["dominance"] == "dominant" for t in terms(c, at, "s")[:r["terms"]])
        error = abs(known(v["value"]) - kept)
        score.check(error <= value(r["bound"], **at) * (1 + mpf(10) ** -12) + doubt(kept),
                    "%s: error %s above the %s bound of %s at %s" % (case["id"], mpmath.nstr(error, 5), r["label"], r["bound"], v["at"]))


def check_numbers(case, results):
    shown = [r for r in results if r.get("result") == "number"]
    score.check(len(shown) == 2 * len(case["values"]), case["id"] + ": a number for each request")
    for k, r in enumerate(shown):
        want = known(case["values"][k // 2]["value"])
        mid, radius = mpf(r["re"]["mid"]), mpf(r["re"]["radius"])
        if isinstance(want, mpmath.mpc):
            mid, radius = mpmath.mpc(mid, mpf(r["im"]["mid"])), radius + mpf(r["im"]["radius"])
        good = abs(mid - want) <= radius + doubt(want) and r["label"] in ("proved", "exact")
        score.check(good, "%s: %s +- %s (%s) against %s" % (case["id"], r["re"]["mid"], r["re"]["radius"], r["label"], want))
        if r["way"] == "quadrature":
            score.check(radius <= mpf(10) ** -30 * abs(want), case["id"] + ": 30 digits by quadrature")


for case in cases:
    if case["family"] not in FAMILIES:
        continue
    results, status, complaints = program.run(script(case, 12))
    score.check(status == 0, "%s: exit status %d\n%s" % (case["id"], status, complaints))
    if status != 0:
        continue
    made = json.loads(program.read("a.json"))
    check_coefficients(case, made)
    check_lists(case, made)
    check_bound(case, made)
    check_numbers(case, results)
score.end()
