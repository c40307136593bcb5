# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck shell=sh
# Shared by the scripts of this folder (sourced, POSIX shell): packages, Python, build folders.

say() { printf '%s\n' "$*" >&2; }
die() {
    say "error: $*"
    exit 1
}

# Packages of the named sections of packages.txt, one a line.
packages_of() {
    for section in "$@"; do
        sed -n "/^\[$section\]/,/^\[/p" "$source_dir/scripts/packages.txt" | grep -v '^[[#]' || true
    done
}

# Of the packages given, those that are not installed.
missing_of() {
    for package in "$@"; do
        state=$(dpkg-query -W -f='${db:Status-Status}' "$package" 2>/dev/null) || state=
        [ "$state" = installed ] || printf '%s\n' "$package"
    done
}

# Runs a command as root: directly, or through sudo.
as_root() {
    if [ "$(id -u)" = 0 ]; then
        "$@"
    else
        sudo "$@"
    fi
}

# Installs what is missing of the named sections; does nothing when all is there.
install_missing() {
    wanted=$(packages_of "$@")
    [ -n "$wanted" ] || die "scripts/packages.txt has no section $*"
    if ! command -v dpkg-query >/dev/null || ! command -v apt-get >/dev/null; then
        say "note: not a Debian-like system, so nothing is installed; the build needs the counterparts of:"
        say "  $(echo $wanted)"
        return 0
    fi
    missing=$(missing_of $wanted)
    [ -n "$missing" ] || return 0
    if [ "$(id -u)" != 0 ] && ! command -v sudo >/dev/null; then
        say "error: these packages are missing, and installing them needs root or sudo:"
        say "  $(echo $missing)"
        die "as root, run: apt-get update && apt-get install -y --no-install-recommends $(echo $missing)"
    fi
    say "installing: $(echo $missing)"
    # A repository that does not answer need not matter: whether the installation works decides.
    as_root env DEBIAN_FRONTEND=noninteractive apt-get -q -o DPkg::Lock::Timeout=300 update >&2 ||
        say "warning: apt-get update had errors; trying with the lists there are"
    as_root env DEBIAN_FRONTEND=noninteractive apt-get -q -o DPkg::Lock::Timeout=300 install -y \
        --no-install-recommends $missing >&2 || die "apt-get could not install the packages above"
}

# Prints the first Python that has NumPy and SciPy.
find_python() {
    for candidate in python3 /usr/bin/python3; do
        if "$candidate" -c 'import numpy, scipy' 2>/dev/null; then
            command -v "$candidate"
            return 0
        fi
    done
    return 1
}

# Configures a build folder, or brings an existing one up to date: configure FOLDER [OPTION…].
# Test files are found by listing, so an existing folder is configured again, not only built.
configure() {
    folder=$1
    shift
    command -v meson >/dev/null || die "meson is missing (see scripts/packages.txt)"
    again=
    mkdir -p "$folder"
    [ ! -f "$folder/meson-private/coredata.dat" ] || again=--reconfigure
    if ! meson setup $again "$@" "$folder" "$source_dir" >"$folder/setup.log" 2>&1; then
        cat "$folder/setup.log" >&2
        say "error: meson could not configure $folder (an old folder? remove it and try again)"
        return 1
    fi
}

# One thread per BLAS call, a fixed locale: what the program and the tests expect.
export OPENBLAS_NUM_THREADS=1 OMP_NUM_THREADS=1 LC_ALL=C.UTF-8
source_dir=$(cd "$(dirname "$0")/.." && pwd)
