#!/bin/sh
# Every measurement in one run: the C programs of this folder, then the program as a user starts it, then the figures of the
# README, quadrature beside mpmath among them. CPU times, medians. usage: run.sh BUILD
build=$1
for x in "$build"/tests/bench/bench_*; do
    if [ -x "$x" ] && [ -f "$x" ]; then
        printf '== %s\n' "$(basename "$x")"
        "$x"
    fi
done
printf '== bench_program.py\n'
python3 tests/bench/bench_program.py "$build"
printf '== figures.py\n'
python3 tests/bench/figures.py "$build"
