#!/bin/sh
# Build and test the project in a fresh Debian system, so that nothing this machine happens to have
# is relied upon unsaid.

usage() {
    cat <<END
Usage: scripts/chroot-check.sh [--keep] [--suite NAME] FOLDER [TARGET...]

Makes a fresh Debian system (default suite: bookworm) in FOLDER, clones the last commit of this
project into it, and runs "make TARGET" there for each target (default: demo test), as root of that
system, so that scripts/install-packages.sh can install what is missing.

  FOLDER        must not exist yet or be empty; about 3 GB are needed; no mount with noexec or nodev
  --keep        leave the system in FOLDER (mounts are undone in any case)
  --suite NAME  another Debian suite

Needs root, debootstrap and git (scripts/install-packages.sh chroot). The mirror, its proxy and its
keys are those of this machine's apt. Not part of "make test": it takes long and loads packages.
Exit status: 0 all targets succeeded; 1 something failed; 2 wrong usage.
END
}

say() {
    printf 'chroot-check: %s\n' "$*" >&2
}

fail() {
    say "$*"
    exit 1
}

misuse() {
    say "$*; see --help"
    exit 2
}

keep=no
suite=bookworm
while [ $# -gt 0 ]; do
    case $1 in
    -h | --help)
        usage
        exit 0
        ;;
    --keep) keep=yes ;;
    --suite)
        [ $# -gt 1 ] || misuse "--suite needs a name"
        suite=$2
        shift
        ;;
    -*) misuse "there is no option $1" ;;
    *) break ;;
    esac
    shift
done
[ $# -gt 0 ] || misuse "name a folder"
folder=$1
shift
[ $# -gt 0 ] || set -- demo test

[ "$(id -u)" -eq 0 ] || misuse "needs root"
for tool in debootstrap git chroot mount umount; do
    command -v "$tool" >/dev/null || misuse "$tool is missing"
done
project=$(git -C "$(dirname "$0")" rev-parse --show-toplevel) || misuse "this is no git clone"
[ -n "$(git -C "$project" rev-parse --verify --quiet HEAD)" ] || misuse "there is no commit to clone"
[ -z "$(git -C "$project" status --porcelain)" ] || say "uncommitted changes are not looked at"
if [ -e "$folder" ] && [ -n "$(ls -A "$folder")" ]; then
    misuse "$folder is not empty"
fi

# What apt uses on this machine, whichever format its sources are written in. Every index of Debian
# itself, as "URI suite component"; the first of the suite proper is the mirror.
# shellcheck disable=SC2016 # apt expands these, not the shell
indexes=$(apt-get indextargets --format '$(ORIGIN) $(CODENAME) $(REPO_URI) $(SUITE) $(COMPONENT)' \
    'Identifier: Packages' | awk -v suite="$suite" \
    '$1 == "Debian" && index($2, suite) == 1 { print $3, $2, $NF }' | sort -u)
mirror=$(printf '%s\n' "$indexes" | awk -v suite="$suite" '$2 == suite { print $1; exit }')
[ -n "$mirror" ] || fail "apt on this machine has no source for Debian $suite"

mkdir -p "$folder" || exit 1
folder=$(cd "$folder" && pwd) || exit 1

# Undo the mounts before anything is removed: removal must never reach through them.
clean_up() {
    status=$?
    trap - EXIT
    if mountpoint -q "$folder/proc" && ! umount "$folder/proc" && ! umount -l "$folder/proc"; then
        say "could not unmount below $folder; nothing is removed, unmount it by hand"
    elif [ $keep = yes ]; then
        say "the system is kept in $folder"
    else
        rm -rf --one-file-system "$folder"
    fi
    exit $status
}
trap clean_up EXIT
trap 'exit 130' INT
trap 'exit 143' TERM HUP

say "making Debian $suite from $mirror"
debootstrap --variant=minbase --include=ca-certificates,git,make "$suite" "$folder" "$mirror" ||
    fail "debootstrap failed"

# Sources, proxy, certificates and name service as here: a mirror behind a proxy stays reachable.
printf '%s\n' "$indexes" | awk '
    { key = $1 " " $2; parts[key] = parts[key] " " $3 }
    END { for (key in parts) print "deb " key parts[key] }' >"$folder/etc/apt/sources.list"
apt-config dump | grep -i '^Acquire::.*Proxy' >"$folder/etc/apt/apt.conf.d/80proxy"
for file in /etc/resolv.conf /etc/hosts /etc/ssl/certs/ca-certificates.crt; do
    [ ! -r "$file" ] || cp -L "$file" "$folder$file" || fail "cannot copy $file"
done
mount -t proc proc "$folder/proc" || fail "cannot mount /proc"

git clone --quiet --no-hardlinks "$project" "$folder/root/project" || fail "cannot clone the project"

for target in "$@"; do
    say "make $target"
    # an environment of its own, so that no variable of this machine helps along
    if ! env -i PATH=/usr/sbin:/usr/bin:/sbin:/bin HOME=/root LANG=C.UTF-8 TERM="${TERM:-dumb}" \
        chroot "$folder" make -C /root/project "$target" </dev/null; then
        fail "make $target failed"
    fi
done
say "succeeded: make $*"
