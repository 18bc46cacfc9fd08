#!/bin/sh
# Installs what building and testing Termwise needs on Debian 12, without asking. Works as root or through sudo.
set -eu
as_root() { if [ "$(id -u)" -eq 0 ]; then "$@"; else sudo "$@"; fi; }
export DEBIAN_FRONTEND=noninteractive
as_root apt-get -q update
as_root env DEBIAN_FRONTEND=noninteractive apt-get -q install -y --no-install-recommends \
    gcc clang make libc6-dev pkg-config re2c \
    libflint-dev libflint-arb-dev libcalcium-dev libantic-dev libmpfr-dev libgmp-dev libreadline-dev \
    libcmocka-dev python3 python3-mpmath libclang-rt-14-dev
