#!/bin/sh
# Puts program, library, header, pkg-config file, man pages, shell completion and the standard library in place.
# usage: install.sh BUILD DESTDIR PREFIX VERSION
set -eu
build=$1 root=$2$3 prefix=$3 version=$4
install -d "$root/bin" "$root/lib/pkgconfig" "$root/include" "$root/share/termwise/stdlib" "$root/share/man/man1" \
    "$root/share/man/man3" "$root/share/bash-completion/completions" "$root/share/doc/termwise/examples"
install -m 755 "$build/termwise" "$root/bin/termwise"
install -m 644 "$build/libtermwise.a" "$root/lib/libtermwise.a"
install -m 644 engine/termwise.h "$root/include/termwise.h"
install -m 644 stdlib/*.tw "$root/share/termwise/stdlib/"
install -m 644 tools/termwise.1 "$root/share/man/man1/termwise.1"
python3 tools/man3.py engine/termwise.h >"$root/share/man/man3/termwise.3"
install -m 644 tools/termwise.bash "$root/share/bash-completion/completions/termwise"
install -m 644 README.md LICENSE "$root/share/doc/termwise/"
install -m 644 examples/* "$root/share/doc/termwise/examples/"
cat >"$root/lib/pkgconfig/termwise.pc" <<END
prefix=$prefix
libdir=\${prefix}/lib
includedir=\${prefix}/include

Name: termwise
Description: Asymptotic expansions of integrals with exact coefficients and proved remainders
Version: $version
Libs: -L\${libdir} -ltermwise $(sh tools/flags.sh --libs)
Cflags: -I\${includedir}
END
