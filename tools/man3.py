"""Writes the man page of the library from engine/termwise.h, so that the two cannot differ. usage: man3.py HEADER > PAGE"""
import re
import sys

lines = open(sys.argv[1], encoding="utf-8").read().split("\n")
print('.TH TERMWISE 3 2026-12-01 "Termwise 0.1.0" "Library functions"')
print(".SH NAME\nlibtermwise \\- asymptotic expansions of integrals, from C")
print(".SH SYNOPSIS\n.nf\n#include <termwise.h>\n.fi\n.SH DESCRIPTION\n.nf")
body = "\n".join(lines[lines.index("#define TERMWISE_H") + 1:lines.index("#endif")])
intro = "\n".join(lines[:lines.index("#ifndef TERMWISE_H")])
for line in (intro + "\n" + body).split("\n"):
    if re.match(r"#include", line):
        continue
    line = line.replace("\\", "\\e")
    print("\\&" + line if line[:1] in (".", "'") else line)
print(".fi\n.SH SEE ALSO\n.BR termwise (1)")
