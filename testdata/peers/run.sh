#!/usr/bin/env bash
# make bench-peers: heatskin beside the heat method as one writes it with SciPy and CHOLMOD.
#
# measure.py   runs them in turn, prints medians and ratios
# heat.py      the peer, a script
# cholmod.c    its door to CHOLMOD, and flush.c, which spares it slow arithmetic
# spheres/     the meshes
#
#   make bench-peers RUNS=3 LEVELS='5 7 8' THREADS=2
#   PEERS='metis superlu' make bench-peers          only these settings of the peer (heat.py has them)
#   CORE=Haswell make bench-peers                   which processor OpenBLAS is to think of, not the best by trial
#
# A level is a sphere of 10*4^level+2 vertices: 5 is 10 242, 7 is 163 842, 8 is 655 362, which takes
# some minutes; 9 is 2 621 442, wants 5 GiB and a quarter of an hour. The packages come from Debian:
# where they are missing and we are root, they are installed; where that cannot be,
# a notice says so and the status is 0. Everything else is made in a scratch folder and removed.
set -euo pipefail
cd "$(dirname "$0")/../.."
runs=${RUNS:-3} levels=${LEVELS:-5 7 8} threads=${THREADS:-$(nproc)}
packages="gcc libc6-dev python3-scipy libsuitesparse-dev libopenblas0-pthread"

missing=
if command -v dpkg-query >/dev/null; then
  for package in $packages; do
    [ "$(dpkg-query -W -f '${db:Status-Status}' "$package" 2>/dev/null)" = installed ] || missing="$missing $package"
  done
else
  missing=" $packages"
fi
if [ -n "$missing" ] && [ "$(id -u)" = 0 ] && command -v apt-get >/dev/null; then
  echo "bench-peers: installing$missing"
  { timeout 600 apt-get update && DEBIAN_FRONTEND=noninteractive timeout 600 apt-get install -y --no-install-recommends $missing; } \
    >/dev/null 2>&1 </dev/null && missing= || true
fi
if [ -n "$missing" ]; then
  echo "bench-peers: nothing was measured. Missing:$missing. They are Debian's packages, and take root to install: apt-get install$missing"
  exit 0
fi

scratch=$(mktemp -d)
trap 'rm -rf "$scratch"' EXIT
here=testdata/peers
gcc -O2 -shared -fPIC -I/usr/include/suitesparse "$here/cholmod.c" -o "$scratch/cholmod.so" -lcholmod
gcc -O2 -shared -fPIC "$here/flush.c" -o "$scratch/flush.so"
go run "./$here/spheres" "$scratch" $levels
/usr/bin/python3 "$here/measure.py" build/heatskin "$scratch" "$runs" "$threads" $levels
