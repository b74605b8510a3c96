#!/usr/bin/env bash
# Installs the .deb on a clean Debian root, runs the command there and takes it off again. Without root or debootstrap it runs
# from an unpacked tree instead, and says so.  usage: clean_root.sh DEB SCRATCH
# DEBIAN_MIRROR names another mirror; a root once made is kept in SCRATCH as a tar file.
set -euo pipefail
deb=$(realpath "$1")
mkdir -p "$2"
scratch=$(realpath "$2")
mirror=${DEBIAN_MIRROR:-http://deb.debian.org/debian}
scenario=usr/share/slipbench/configs/scenarios/conveyor_hot_rotor.toml
root=$(mktemp -d "$scratch/root.XXXXXX")
trap 'rm -rf --one-file-system "$root"' EXIT

digest() { python3 -c 'import json, sys; print(json.load(sys.stdin)["digest"]["plant"])'; }
dpkg-deb -x "$deb" "$root/unpacked"
"$root/unpacked/usr/bin/slipbench" --version
wanted=$("$root/unpacked/usr/bin/slipbench" run "$root/unpacked/$scenario" --json | digest)
echo "ran from an unpacked tree: plant $wanted"
if ((EUID != 0)) || ! command -v debootstrap >/dev/null; then
  echo "clean_root: DONE WITH AN UNPACKED TREE ONLY: a clean root needs root and debootstrap (tools/packages --long)"
  exit 0
fi

kept=$scratch/bookworm-minbase.tar
if [[ ! -s $kept ]]; then
  debootstrap --variant=minbase bookworm "$root/new" "$mirror" >"$scratch/debootstrap.log" || { tail -n 20 "$scratch/debootstrap.log"; exit 1; }
  tar -C "$root/new" -cf "$kept.part" --one-file-system . && mv "$kept.part" "$kept"
  rm -rf "$root/new"
fi
clean=$root/clean
mkdir "$clean"
tar -C "$clean" -xf "$kept"
cp /etc/resolv.conf "$clean/etc/resolv.conf"
echo "deb $mirror bookworm main" >"$clean/etc/apt/sources.list"
cp "$deb" "$clean/tmp/slipbench.deb"
inside() { chroot "$clean" env -i PATH=/usr/sbin:/usr/bin:/sbin:/bin LC_ALL=C DEBIAN_FRONTEND=noninteractive HOME=/tmp "$@"; }

[[ ! -e $clean/usr/bin/g++ && ! -e $clean/usr/bin/slipbench ]] || { echo "clean_root: the root is not clean"; exit 1; }
{ inside apt-get -q update && inside apt-get -q install -y --no-install-recommends /tmp/slipbench.deb; } >"$scratch/install.log" 2>&1 ||
  { tail -n 30 "$scratch/install.log"; exit 1; }
inside dpkg-query -W -f '${Package} ${Version}: ${db:Status-Status}\n' slipbench
inside slipbench --version
found=$(inside slipbench run "/$scenario" --json | digest)
[[ $found == "$wanted" ]] || { echo "clean_root: other bits there: $found"; exit 1; }
inside slipbench check "/$scenario" >/dev/null
inside dpkg --purge slipbench >/dev/null
left=$(find "$clean/usr" -path '*slipbench*' | head)
[[ -z $left ]] || { echo "clean_root: left behind: $left"; exit 1; }
echo "clean_root: DONE ON A CLEAN ROOT: Debian $(cat "$clean/etc/debian_version"), installed by apt, ran, purged"
