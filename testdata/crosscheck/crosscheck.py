"""Hold heatskin against SciPy, a general-purpose library that shares no code with it.

    go run ./testdata/crosscheck DIRECTORY
    python3 testdata/crosscheck/crosscheck.py build/heatskin DIRECTORY

`make crosscheck` runs both. The matrices that heatskin computes on are assembled here
once more, from edge lengths (and from the corners' coordinates where the triangles are
those of the file); then its commands are run, and what they say is held against
expm_multiply, spsolve and eigsh on those matrices. Every line says how far apart the two
are and how far they may be. The status is 1 if one is further than that.
"""

import csv
import json
import os
import subprocess
import sys

import numpy as np
from scipy.io import mmread
from scipy.sparse import coo_matrix, diags
from scipy.sparse.linalg import eigsh, expm_multiply, spsolve

D = 0.7  # diffusivity

failures = 0


def judge(mesh, what, off, allowed, why):
    """Prints one comparison. off is relative to the largest value."""
    global failures
    good = off <= allowed
    failures += not good
    print(f"{'ok  ' if good else 'FAIL'} {mesh:8} {what:34} {off:8.1e} <= {allowed:.0e}  {why}")


def apart(got, want):
    return float(np.max(np.abs(got - want)) / np.max(np.abs(want)))


def assemble(n, corners, sides):
    """Stiffness, lumped and consistent mass of linear elements (G. Strang and G. J. Fix, An
    Analysis of the Finite Element Method, 1973, section 1.8): grad phi_i . grad phi_j A
    is e_i . e_j / (4 A), e_i being the side opposite to corner i, with the sides in one
    turn. sides are their squared lengths, m x 3."""
    a = sides
    dots = np.empty((len(a), 3, 3))
    for i in range(3):
        for j in range(3):
            k = 3 - i - j
            dots[:, i, j] = a[:, i] if i == j else (a[:, k] - a[:, i] - a[:, j]) / 2
    # 16 A^2 by Heron's formula, in the ordering that slivers need (W. Kahan, Miscalculating
    # Area and Angles of a Needle-like Triangle, 1986).
    z, y, x = np.sort(np.sqrt(a), axis=1).T
    area = np.sqrt((x + (y + z)) * (z - (x - y)) * (z + (x - y)) * (x + (y - z))) / 4
    stiffness = dots / (4 * area)[:, None, None]
    consistent = area[:, None, None] / 12 * (np.ones((3, 3)) + np.eye(3))
    rows = np.repeat(corners, 3, axis=1).ravel()
    columns = np.tile(corners, (1, 3)).ravel()

    def gather(values):
        return coo_matrix((values.ravel(), (rows, columns)), shape=(n, n)).tocsr()

    lumped = np.bincount(corners.ravel(), np.repeat(area / 3, 3), n)
    return gather(stiffness), lumped, gather(consistent)


def along_rim(n, corners, lengths, on):
    """Half the length of every edge of one face at its ends, where both are among on.
    lengths are those of the sides opposite to the corners."""
    sides = {}
    for face, length in zip(corners, lengths):
        for k in range(3):
            ends = tuple(sorted((face[(k + 1) % 3], face[(k + 2) % 3])))
            sides.setdefault(ends, []).append(length[k])
    along = np.zeros(n)
    for ends, found in sides.items():
        if len(found) == 1 and on[ends[0]] and on[ends[1]]:
            along[list(ends)] += found[0] / 2
    return along


def entries_apart(got, want):
    """Largest difference of entries, over the root of the product of their diagonals."""
    scale = diags(1 / np.sqrt(want.diagonal()))
    off = (scale @ (got - want) @ scale).tocoo()
    return float(np.max(np.abs(off.data))) if off.nnz else 0.0


def run(program, mesh, command, *flags, fields=True):
    """Runs one command and gives back the columns of its table."""
    out = os.path.splitext(mesh)[0] + "-" + command + ".csv"
    target = ["--out", out] if fields else ["--eigenvalues", out]
    subprocess.run([program, command, mesh, "--max-edge", "none", "--quiet", *flags, *target],
                   check=True, stderr=subprocess.DEVNULL)
    with open(out, newline="") as f:
        rows = list(csv.DictReader(f))
    return {name: np.array([float(row[name]) for row in rows]) for name in rows[0]}


def check(program, folder, name):
    with open(os.path.join(folder, name + ".json")) as f:
        about = json.load(f)
    mesh = os.path.join(folder, name + ".off")

    def matrix(kind):
        return mmread(os.path.join(folder, f"{name}-{kind}.mtx")).tocsr()

    stiffness, lumped, consistent = matrix("L"), matrix("lumped").diagonal(), matrix("consistent")
    n, original, source = len(lumped), about["original"], about["source"]
    corners = np.array(about["corners"]).reshape(-1, 3)
    squares = np.array(about["lengths"]).reshape(-1, 3)[:, [1, 2, 0]] ** 2  # opposite sides
    rounding = "rounding, slivers lose digits"
    own = assemble(n, corners, squares)
    judge(name, "L from edge lengths", entries_apart(stiffness, own[0]), 1e-12, rounding)
    judge(name, "M lumped", apart(lumped, own[1]), 1e-13, rounding)
    judge(name, "M consistent", entries_apart(consistent, own[2]), 1e-13, rounding)
    if not about["changed"]:
        with open(mesh) as f:
            words = f.read().split()
        points = np.array(words[4:4 + 3 * original], float).reshape(-1, 3)
        faces = np.array(words[4 + 3 * original:], int).reshape(-1, 4)[:, 1:]
        opposite = [np.sum((points[faces[:, (k + 1) % 3]] - points[faces[:, (k + 2) % 3]]) ** 2, axis=1) for k in range(3)]
        placed = assemble(original, faces, np.array(opposite).T)
        judge(name, "L from coordinates", entries_apart(stiffness, placed[0]), 1e-12, rounding)

    area = lumped.sum()
    root = np.sqrt(lumped)
    balanced = diags(1 / root) @ stiffness @ diags(1 / root)
    in_time = "the tolerance asked for, 1e-10"

    # Heat kernels: exp(-t D M^-1 L) M^-1 e, by way of the symmetric matrix.
    times = [area * share for share in (2e-4, 2e-3, 2e-2)]
    words = [repr(t) for t in times]
    found = run(program, mesh, "kernel", "--at-vertex", str(source), "--diffusivity", str(D),
                "--tolerance", "1e-10", "--time", ",".join(words))
    start = np.zeros(n)
    start[source] = 1 / root[source]
    for t, word in zip(times, words):
        want = expm_multiply(-t * D * balanced, start) / root
        judge(name, f"kernel, D t = {D * t / area:.1e} area", apart(found["u_t" + word], want[:original]), 2e-10, in_time)

    # A field that is given, held and lost at once: M u' = -K u + b with K = D L + c M.
    c, ambient, rate = 3 * D / area, 20.0, 5.0
    free = np.ones(n, bool)
    u = np.zeros(n)  # held values, then the steady state
    flags = ["--at-vertex", str(source), "--heat", "2", "--rate", str(rate), "--diffusivity", str(D),
             "--face-loss", f"{c!r},{ambient}", "--tolerance", "1e-10", "--time", words[1], "--steady"]
    if about["held"]:
        free[about["held"]] = False
        u[~free] = 7
        flags += ["--hold-boundary", "0=7"]
    k = (D * stiffness + diags(c * lumped)).tocsr()
    b = c * ambient * lumped
    b[source] += rate
    u[free] = spsolve(k[free][:, free].tocsc(), (b - k @ u)[free])
    found = run(program, mesh, "diffuse", *flags)
    judge(name, "steady state", apart(found["u_steady"], u[:original]), 1e-12, "rounding of both solves")
    start = -u  # the field at time 0, less the steady one
    start[source] += 2 / lumped[source]
    moving = np.zeros(n)
    half = root[free]
    moving[free] = expm_multiply(-times[1] * (diags(1 / half) @ k[free][:, free] @ diags(1 / half)), half * start[free]) / half
    judge(name, "held and losing, in time", apart(found["u_t" + words[1]], (u + moving)[:original]), 2e-10, in_time)

    # Edges that exchange heat: D du/dn = -c (u - ambient) adds c times half of each edge to both ends.
    if about["held"]:
        along = along_rim(n, corners, np.sqrt(squares), ~free)
        c = 2 * D / np.sqrt(area)
        b = c * ambient * along
        b[source] += rate
        want = spsolve((D * stiffness + diags(c * along)).tocsc(), b)
        found = run(program, mesh, "diffuse", "--at-vertex", str(source), "--rate", str(rate), "--diffusivity", str(D),
                    "--edge-loss", f"0={c!r},{ambient}", "--steady")
        judge(name, "steady state, edge losing", apart(found["u_steady"], want[:original]), 1e-12, "rounding of both solves")

    # Eigenvalues, insulated and held.
    for held in (False, True) if about["held"] else (False,):
        keep = free if held else np.ones(n, bool)
        flags = ["--hold-boundary", "0"] if held else []
        found = run(program, mesh, "modes", "--count", "12", *flags, fields=False)
        want = eigsh(stiffness[keep][:, keep].tocsc(), 12, diags(lumped[keep]).tocsc(), sigma=-1 / area, return_eigenvectors=False)
        judge(name, "12 eigenvalues" + (", held" if held else ""), apart(found["eigenvalue"], np.sort(want)), 1e-12, "rounding of both")

    # First passage to the held loop: D L T = M 1.
    if about["held"]:
        found = run(program, mesh, "passage", "--to-boundary", "0", "--diffusivity", str(D))
        want = np.zeros(n)
        want[free] = spsolve(D * stiffness[free][:, free].tocsc(), lumped[free])
        judge(name, "mean first passage", apart(found["mean_time"], want[:original]), 1e-12, "rounding of both solves")


def main():
    program, folder = sys.argv[1:]
    names = sorted(f[:-5] for f in os.listdir(folder) if f.endswith(".json"))
    for name in names:
        check(program, folder, name)
    print(f"crosscheck: {len(names)} meshes, {failures} comparisons failed")
    return 1 if failures or len(names) < 4 else 0


if __name__ == "__main__":
    sys.exit(main())
