"""The peer: distance from one vertex by the heat method (K. Crane, C. Weischedel, M.
Wardetzky, ACM Trans. Graph. 32(5), 2013), as one writes it with general-purpose libraries.

    python3 heat.py SCRATCH SETTING MESH.stl OUT.csv STAGES.json

SETTING is who factors: metis or amd (CHOLMOD with that ordering, by the library that
run.sh made in SCRATCH of cholmod.c), or superlu (SciPy's own). With "+curve" after it the
vertices are first numbered along a space-filling curve. The source is the first corner
in the file. The time is the square of the mean edge, as the authors advise; the Poisson
matrix is L + 1e-8 M, whose pattern is that of M + t L, so that one analysis serves both.
STAGES.json gets the seconds of each stage and what is known of the factor.

It is as fast as we can make such a script without leaving NumPy: numbers too small to be
normal are flushed to zero, and the table has nine digits where heatskin gives all.
"""

import ctypes
import json
import sys
import time

scratch, setting, source_file, table, record = sys.argv[1:]
ctypes.CDLL(scratch + "/flush.so").flush()

import numpy as np  # noqa: E402, after flush
from scipy.sparse import coo_matrix, csc_matrix, tril  # noqa: E402

solver, *extra = setting.split("+")
stages = {}
began = time.perf_counter()


def lap(name):
    """What has passed since the last lap belongs to the stage of this name."""
    global began
    now = time.perf_counter()
    stages.setdefault(name, []).append(now - began)
    began = now


def check(status):
    if status:
        sys.exit(f"heat.py: CHOLMOD's status is {status}")


def address(array):
    return ctypes.c_void_p(array.ctypes.data)


class Cholmod:
    def __init__(self, low):
        self.library = ctypes.CDLL(scratch + "/cholmod.so")
        self.low = low
        check(self.library.peer_analyse(low.shape[0], address(low.indptr), address(low.indices), address(low.data), int(solver == "metis")))

    def factor(self, values):
        self.values = values  # CHOLMOD keeps the address
        check(self.library.peer_factor(address(values)))

    def solve(self, b):
        x = np.empty_like(b)
        check(self.library.peer_solve(address(b), address(x)))
        return x

    def facts(self):
        nonzeros, operations, supernodal = ctypes.c_double(), ctypes.c_double(), ctypes.c_int()
        self.library.peer_foretold(ctypes.byref(nonzeros), ctypes.byref(operations), ctypes.byref(supernodal))
        return {"factor_nonzeros": nonzeros.value, "factor_flops": operations.value, "supernodal": bool(supernodal.value)}


class SuperLU:
    """Orders inside of every factorisation, so there is nothing to analyse."""

    def __init__(self, low):
        from scipy.sparse.linalg import splu
        self.splu, self.low = splu, low

    def factor(self, values):
        low = csc_matrix((values, self.low.indices, self.low.indptr), shape=self.low.shape)
        self.lu = self.splu((low + tril(low, -1).T).tocsc(), permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0, options={"SymmetricMode": True})

    def solve(self, b):
        return self.lu.solve(b)

    def facts(self):
        return {"factor_nonzeros": self.lu.L.nnz}


# Read. A record is a normal, three corners, and two bytes to spare.
records = np.fromfile(source_file, [("normal", "<f4", 3), ("corners", "<f4", (3, 3)), ("spare", "<u2")], offset=84)
corners = records["corners"].reshape(-1, 3) + np.float32(0)  # no -0
del records
lap("read")

# Weld corners of the same three numbers: sort their hashes, then see that those agree for no other reason.
words = corners.view(np.uint32).astype(np.uint64)
odd = np.array([0xC2B2AE3D27D4EB4F, 0x165667B19E3779F9, 0xD6E8FEB86659FD93], np.uint64)
_, first, faces = np.unique(words @ odd, return_index=True, return_inverse=True)
points = corners[first]
if not np.array_equal(points[faces], corners):
    sys.exit("heat.py: two corners have one hash")
points, faces = points.astype(float), faces.reshape(-1, 3).astype(np.int32)
del words, corners
source, n = faces[0, 0], len(points)
if "curve" in extra:
    # The cell of each vertex in a grid of 1024^3, its three numbers' bits interleaved.
    spread = sum((np.arange(1024) >> bit & 1) << 3 * bit for bit in range(10))
    cells = ((points - points.min(0)) * (1023.999 / np.ptp(points, axis=0).max())).astype(np.int32)
    order = np.argsort(spread[cells[:, 0]] | spread[cells[:, 1]] << 1 | spread[cells[:, 2]] << 2)
    place = np.empty(n, np.int32)
    place[order] = np.arange(n, dtype=np.int32)
    points, faces, source = points[order], place[faces], place[source]
    faces = faces[np.argsort(faces.min(1))]
lap("weld")

# Assemble. side[k] lies opposite to corner k, all three in one turn.
side = [points[faces[:, (k + 2) % 3]] - points[faces[:, (k + 1) % 3]] for k in range(3)]


def dot(a, b):
    return np.einsum("ij,ij->i", a, b)


squares = [dot(s, s) for s in side]
dots = [dot(side[(k + 1) % 3], side[(k + 2) % 3]) for k in range(3)]
twice_area = np.sqrt(squares[0] * squares[1] - dots[2] ** 2)
ends = [(faces[:, (k + 1) % 3], faces[:, (k + 2) % 3]) for k in range(3)]
entry = np.concatenate([d / (2 * twice_area) for d in dots])  # minus half the cotangent
i = np.concatenate([a for a, _ in ends])
j = np.concatenate([b for _, b in ends])
diagonal = -np.bincount(i, entry, n) - np.bincount(j, entry, n)
everyone = np.arange(n, dtype=np.int32)
low = coo_matrix((np.concatenate([diagonal, entry]), (np.concatenate([everyone, np.maximum(i, j)]), np.concatenate([everyone, np.minimum(i, j)]))), shape=(n, n)).tocsc()
low.sort_indices()
on_diagonal = low.indptr[:-1]  # the first of each column
mass = np.bincount(faces.ravel(), np.repeat(twice_area / 6, 3), n)
step = np.mean([np.sqrt(s).mean() for s in squares]) ** 2
del entry, i, j, diagonal, everyone, squares, dots, twice_area, ends
lap("assemble")

heat = step * low.data
heat[on_diagonal] += mass
poisson = low.data.copy()
poisson[on_diagonal] += 1e-8 * mass
lap("assemble")
system = (SuperLU if solver == "superlu" else Cholmod)(low)
lap("analyse")
system.factor(heat)
lap("factor")
b = np.zeros(n)
b[source] = 1
u = system.solve(b)
lap("solve")

# The unit field X against the gradient of u, and its integral against the gradient of each
# corner's hat function. Both gradients are sums of sides turned by 90 degrees in the triangle,
# and a dot product does not mind a turn: with w = sum u_k side_k that integral is
# -w.side_k / (2 |w|). Far out u is as small as 1e-270, hence the division before anything is squared.
at = np.abs(u)[faces]
at /= np.maximum(at.max(1), 1e-307)[:, None]
w = (at[:, 1] - at[:, 0])[:, None] * side[1] + (at[:, 2] - at[:, 0])[:, None] * side[2]
w /= np.maximum(np.sqrt(dot(w, w)), 1e-300)[:, None]
b = sum(np.bincount(faces[:, k], -0.5 * dot(w, side[k]), n) for k in range(3))
lap("gradient")
system.factor(poisson)
lap("factor")
distance = system.solve(b)
distance -= distance.min()
lap("solve")

with open(table, "w") as out:
    out.write("vertex,x,y,z,distance\n")
    for k in range(0, n, 1 << 16):
        part = slice(k, min(k + (1 << 16), n))
        rows = zip(range(part.start, part.stop), *points[part].T.tolist(), distance[part].tolist())
        out.write("".join(["%d,%.9g,%.9g,%.9g,%.9g\n" % row for row in rows]))
lap("write")

with open("/proc/self/maps") as maps:
    blas = sorted({line.split("/")[-1].strip() for line in maps if "blas" in line})
with open(record, "w") as out:
    json.dump({"stages": stages, "vertices": n, "blas": blas, **system.facts()}, out)
