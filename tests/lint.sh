#!/usr/bin/env bash
# clang-tidy over the files that changed since REVISION (all files without one). Slow: minutes for the whole tree.
# usage: bash tests/lint.sh [REVISION]
set -euo pipefail
cd "$(dirname "$0")/.."
source tests/prepare.sh clang-tidy
install_missing
[ -f build/release/compile_commands.json ] || { mkdir -p build; build build/release; }

if [ $# -gt 0 ]; then
  mapfile -t files < <(git diff --name-only --diff-filter=d "$1" -- '*.cpp')
else
  mapfile -t files < <(git ls-files 'compiler/*.cpp' 'passes/*.cpp' 'targets/*.cpp')
fi
say "clang-tidy reads ${#files[@]} files"
[ ${#files[@]} -eq 0 ] || printf '%s\n' "${files[@]}" | xargs -P2 -n4 clang-tidy -p build/release --quiet --warnings-as-errors='*'
