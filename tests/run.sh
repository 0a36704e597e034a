#!/usr/bin/env bash
# Runs everything that must hold: installs what is missing, builds, checks the format, runs all tests.
set -euo pipefail
cd "$(dirname "$0")/.."
source tests/prepare.sh clang-format

install_missing
mkdir -p build
build build/release -DISINGLASS_TESTS=ON -DISINGLASS_BENCH=ON

say "checking the format"
git ls-files --cached --others --exclude-standard '*.h' '*.cpp' | xargs clang-format --dry-run -Werror

say "running the tests"
ctest --test-dir build/release --output-on-failure -j2
