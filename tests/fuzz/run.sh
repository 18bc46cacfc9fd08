#!/bin/sh
# Fuzzes what reads foreign input and what must be sound: the parser, tables, the constructors of expressions (libFuzzer, clang,
# with the sanitized objects of `make SANITIZE=1 CC=clang`) and the growth records (random trees). Inputs that reached something
# new are kept in tests/fuzz/corpus for the next run, inputs that failed in tests/fuzz/found; the scripts of tests/script are
# where it starts. usage: run.sh [SECONDS], default 20 for each target.
set -eu
seconds=${1:-20}
cd "$(dirname "$0")/../.."
build=build/sanitize
make -s SANITIZE=1 CC="${FUZZ_CC:-clang}" $build/liblang.a $build/libtermwise.a
mkdir -p $build/fuzz tests/fuzz/found
for f in tests/fuzz/fuzz_*.c; do
    name=$(basename "$f" .c)
    mkdir -p "tests/fuzz/corpus/$name"
    # shellcheck disable=SC2046,SC2086
    ${FUZZ_CC:-clang} -O1 -g -fsanitize=fuzzer,address,undefined -fno-sanitize-recover=undefined -std=c11 -I. -D_GNU_SOURCE \
        -o "$build/fuzz/$name" "$f" $build/liblang.a $build/libtermwise.a -lreadline $(sh tools/flags.sh --libs)
    printf '== %s, %s s\n' "$name" "$seconds"
    "$build/fuzz/$name" -max_total_time="$seconds" -timeout=10 -rss_limit_mb=2048 -verbosity=0 -print_final_stats=1 \
        -artifact_prefix=tests/fuzz/found/ "tests/fuzz/corpus/$name" tests/script
done
if [ -x build/tests/engine/ball/test_growth ]; then
    printf '== growth records\n'
    TW_TRIALS=$((seconds * 20000)) build/tests/engine/ball/test_growth
fi
