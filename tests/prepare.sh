# What a fresh Debian 12 lacks to build isinglass, and how to build it. Sourced by tests/run.sh and corpus/demo.sh,
# which say what they do; not to be run by itself.

packages=(antlr4 libantlr4-runtime-dev libeigen3-dev libfmt-dev doctest-dev libcli11-dev libtomlplusplus-dev
  nlohmann-json3-dev libbenchmark-dev librapidcheck-dev libpugixml-dev uuid-dev ninja-build cmake g++ ccache "$@")

say() { printf '== %s\n' "$*"; }

as_root() {
  if [ "$(id -u)" -eq 0 ]; then "$@"
  elif command -v sudo >/dev/null; then sudo "$@"
  else
    say "these packages are missing and neither root nor sudo is at hand: ${missing[*]}" >&2
    exit 1
  fi
}

install_missing() {
  missing=()
  for package in "${packages[@]}"; do
    dpkg-query -W -f='${Status}' "$package" 2>/dev/null | grep -q 'ok installed' || missing+=("$package")
  done
  if [ ${#missing[@]} -eq 0 ]; then
    say "all Debian packages are here"
    return
  fi
  say "installing from Debian: ${missing[*]}"
  as_root apt-get update -qq
  as_root env DEBIAN_FRONTEND=noninteractive apt-get install -y -qq --no-install-recommends "${missing[@]}" >/dev/null
}

# build FOLDER CMAKE_OPTION...: configures and builds Release there.
build() {
  local folder=$1
  shift
  say "building Release in $folder"
  cmake -S . -B "$folder" -G Ninja -DCMAKE_BUILD_TYPE=Release "$@" >"$folder.log" 2>&1 || { cat "$folder.log"; exit 1; }
  ninja -C "$folder"
}
