#!/bin/sh
# Fuzzes what reads foreign input and what must be sound: the parser (libFuzzer, clang) and the growth records (random trees).
# usage: run.sh [SECONDS], default 60 for each target.
set -eu
seconds=${1:-60}
build=build/fuzz
make -s BUILD=$build CC=clang CFLAGS='-O1 -g -fsanitize=fuzzer-no-link,address,undefined' $build/liblang.a $build/libtermwise.a
for f in tests/fuzz/fuzz_*.c; do
    name=$(basename "$f" .c)
    mkdir -p "$build/corpus/$name"
    # shellcheck disable=SC2046
    clang -O1 -g -fsanitize=fuzzer,address,undefined -std=c11 -I. -D_GNU_SOURCE -o "$build/$name" "$f" \
        $build/liblang.a $build/libtermwise.a -lreadline $(sh tools/flags.sh --libs)
    "$build/$name" -max_total_time="$seconds" -timeout=10 -rss_limit_mb=2048 "$build/corpus/$name" tests/script
done
make -s unit
TW_TRIALS=3000000 build/tests/engine/ball/test_growth
