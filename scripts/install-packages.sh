#!/bin/sh
# Install the Debian packages Skymend needs. Every package it uses is named here and nowhere else.
# Does nothing, and does not touch apt, when all of them are there.

# ---- the packages ----

# OpenMP comes with gcc; pkg-config finds the libraries.
build_packages="gcc make pkg-config libc6-dev libnetcdf-dev liblapacke-dev liblapack-dev libconfig-dev"

plot_packages="python3 python3-numpy python3-matplotlib python3-xarray python3-netcdf4"

# cdo, nco and netcdf-bin read the output file as its users do; python3-pyspectral carries an
# independent solar spectrum; libsundials-dev is the reference solver.
test_packages="libcmocka-dev libsundials-dev python3-scipy python3-pyspectral cdo nco netcdf-bin clang libomp-dev"

# To look at a report; with it there tests/check_plots.sh opens one. Large, so that no test needs it.
look_packages="chromium"

# For work on the program itself.
develop_packages="git clang clang-format shellcheck"

# For scripts/chroot-check.sh.
chroot_packages="git debootstrap"

usage() {
    cat <<END
Usage: scripts/install-packages.sh GROUP...

Installs with apt what is missing of the packages of each group:
  build    to compile the program
  plot     for the plots
  test     for the tests (takes in build and plot)
  look     Chromium (300 MB), to look at a report; a test opens one where it is there
  develop  second compiler, formatter, script checker
  chroot   for scripts/chroot-check.sh

As root, or with sudo where it asks for no password. Otherwise it prints the command and exits 1.
Exit status: 0 all there; 1 something is missing and could not be installed; 2 wrong usage.
END
}

say() {
    printf 'install-packages: %s\n' "$*" >&2
}

packages_of() {
    case $1 in
    build) echo "$build_packages" ;;
    plot) echo "$plot_packages" ;;
    test) echo "$build_packages $plot_packages $test_packages" ;;
    look) echo "$look_packages" ;;
    develop) echo "$develop_packages" ;;
    chroot) echo "$chroot_packages" ;;
    *) return 1 ;;
    esac
}

# A package counts as there when dpkg has unpacked and configured it, for any architecture.
is_installed() {
    dpkg-query -W -f '${db:Status-Status}\n' "$1" 2>/dev/null | grep -qx installed
}

# Lists fetched a moment too early or too late for the mirror: one more try is worth it.
update_lists() {
    $as_root apt-get update && return 0
    say "apt-get update failed; once more in 5 seconds"
    sleep 5
    $as_root apt-get update && return 0
    say "apt-get update failed again; trying with the package lists there are"
}

if [ $# -eq 0 ]; then
    usage >&2
    exit 2
fi
wanted=
for group in "$@"; do
    case $group in
    -h | --help)
        usage
        exit 0
        ;;
    esac
    if ! packages=$(packages_of "$group"); then
        say "there is no group \"$group\"; see --help"
        exit 2
    fi
    wanted="$wanted $packages"
done

if ! command -v dpkg-query >/dev/null || ! command -v apt-get >/dev/null; then
    say "this is no Debian-like system; install what corresponds to:$wanted"
    exit 1
fi

missing=
for package in $wanted; do
    case " $missing " in *" $package "*) continue ;; esac
    is_installed "$package" || missing="$missing $package"
done
[ -z "$missing" ] && exit 0

# No recommended packages: they would bring desktops and documentation.
if [ "$(id -u)" -eq 0 ]; then
    as_root="env"
elif command -v sudo >/dev/null && sudo -n true 2>/dev/null; then
    as_root="sudo -n env"
else
    say "missing:$missing"
    say "needs root; run: sudo apt-get update && sudo apt-get install --no-install-recommends$missing"
    exit 1
fi
as_root="$as_root DEBIAN_FRONTEND=noninteractive"

say "installing:$missing"
update_lists
# shellcheck disable=SC2086 # words on purpose
if ! $as_root apt-get install -y --no-install-recommends $missing; then
    say "apt-get install failed; see its messages above. Wanted:$missing"
    exit 1
fi
for package in $missing; do
    if ! is_installed "$package"; then
        say "apt-get reported success, but $package is not installed"
        exit 1
    fi
done
