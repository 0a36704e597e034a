#!/usr/bin/env bash
# From a clone to a compiled circuit: installs what is missing from Debian, builds Release, compiles a demo circuit
# for a demo machine, and shows the tally, the first lines of the timed list and where the files are.
set -euo pipefail
cd "$(dirname "$0")/.."
source tests/prepare.sh

circuit=corpus/fourier/fourier_8.qasm
machine=targets/lugger-12.toml
out=build/demo

install_missing
mkdir -p build "$out"
build build/program -DISINGLASS_TESTS=OFF -DISINGLASS_BENCH=OFF

say "compiling $circuit for $machine"
build/program/isinglass compile "$circuit" --target "$machine" \
  --out "$out/fourier_8.native.qasm" --timeline "$out/fourier_8.timeline.csv" --report "$out/fourier_8.report.html"
build/program/isinglass compile "$circuit" --target "$machine" --quiet \
  --out "$out/fourier_8.native.qasm" --timeline "$out/fourier_8.timeline.json"

say "the first lines of the timed list ($out/fourier_8.timeline.csv)"
head -8 "$out/fourier_8.timeline.csv"

say "the native program, read back and compared with the source"
build/program/isinglass verify "$circuit" "$out/fourier_8.native.qasm"

say "the files"
ls -1 "$out"/fourier_8.*
