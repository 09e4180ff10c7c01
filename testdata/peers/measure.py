"""Runs heatskin and its peers in turn on each mesh, and prints medians and ratios.

    python3 measure.py HEATSKIN SCRATCH RUNS THREADS LEVEL...

run.sh calls it, having put the meshes LEVEL.stl and the peer's libraries into SCRATCH.
Every run is a process of its own, from a binary STL file to a CSV file. Wall time, processor
time and peak memory are what the system says of that process, so that starting up
counts; stages are what each program says of itself. Both answers are held against the arcs
of the sphere. Only Python's own library is used here: a small process, because Linux counts a
parent's memory as its child's until the child has become another program.
"""

import json
import math
import os
import re
import statistics
import struct
import subprocess
import sys
import time

heatskin, scratch, runs, threads = sys.argv[1], sys.argv[2], int(sys.argv[3]), sys.argv[4]
levels = [int(word) for word in sys.argv[5:]]
here = os.path.dirname(os.path.abspath(__file__))
python = "/usr/bin/python3"
superlu_up_to = 7  # from there on it takes minutes
rows = ["whole run, s", "processor, s", "peak memory, MiB", "read, weld", "assemble", "order, analyse", "one factor", "one solve",
        "from heat to distance", "write", "factor, Mnonzeros", "factor, GFlop", "mean error, %", "largest error, %"]


def openblas(core):
    """The environment with OpenBLAS told which core to take the processor for. What else
    OpenBLAS was told, perhaps for the sake of other programs, is left out."""
    kept = {name: value for name, value in os.environ.items() if not name.startswith("OPENBLAS_")}
    kept.update(GOMAXPROCS=threads, OPENBLAS_NUM_THREADS=threads, OMP_NUM_THREADS=threads)
    if core:
        kept["OPENBLAS_CORETYPE"] = core
    return kept


def best_core():
    """OpenBLAS does not know every processor, and takes one that it does not know for one of
    2004. So each of its better kernels has a go at a product of matrices, and the fastest is used."""
    if "CORE" in os.environ:
        return os.environ["CORE"]
    trial = "import numpy, timeit; a = numpy.ones((512, 512)); a @ a; print(min(timeit.repeat(lambda: a @ a, number=4, repeat=7)))"
    seconds = {}
    for core in ("", "Haswell", "Zen", "SkylakeX", "Cooperlake") if os.uname().machine == "x86_64" else ("",):
        found = subprocess.run([python, "-c", trial], env=openblas(core), capture_output=True, text=True)
        if found.returncode == 0:  # not killed by an instruction that this processor lacks
            seconds[core] = float(found.stdout)
    return min(seconds, key=seconds.get)


core = best_core()
environment = openblas(core)


def run(command):
    began = time.perf_counter()
    with open(os.path.join(scratch, "said"), "w+") as said:
        process = subprocess.Popen(command, env=environment, stdout=said, stderr=said)
        _, status, usage = os.wait4(process.pid, 0)
        wall = time.perf_counter() - began
        process.returncode = os.waitstatus_to_exitcode(status)
        if process.returncode:
            said.seek(0)
            sys.exit(f"bench-peers: {' '.join(command)}: status {process.returncode}\n{said.read()[-2000:]}")
    return {"whole run, s": wall, "processor, s": usage.ru_utime + usage.ru_stime, "peak memory, MiB": usage.ru_maxrss / 1024}


def run_ours(mesh, table, record):
    found = run([heatskin, "distance", mesh, "--at-vertex", "0", "--out", table, "--summary", record, "--quiet"])
    with open(record) as f:
        summary = json.load(f)
    stages = {}
    for stage in summary["stages"]:
        stages[stage["name"]] = stages.get(stage["name"], 0) + stage["seconds"]
    found.update({
        "read, weld": stages["read"],
        "assemble": stages["measure"] + stages["place"] + stages["flip"],
        "order, analyse": stages["analyse"],
        "one factor": stages["factor"],
        "one solve": stages["heat"] / summary["solves"],
        "from heat to distance": stages["front"] + stages["chords"],
        "write": stages["write"],
        "factor, Mnonzeros": summary["matrix"]["factor_nonzeros"] / 1e6,
        "factor, GFlop": summary["matrix"]["factor_flops"] / 1e9,
    })
    return found, summary["stages"]


def run_peer(setting, mesh, table, record):
    found = run([python, os.path.join(here, "heat.py"), scratch, setting, mesh, table, record])
    with open(record) as f:
        peer = json.load(f)
    stages = peer["stages"]
    found.update({
        "read, weld": sum(stages["read"] + stages["weld"]),
        "assemble": sum(stages["assemble"]),
        "one factor": statistics.mean(stages["factor"]),
        "one solve": statistics.mean(stages["solve"]),
        "from heat to distance": stages["gradient"][0] + stages["factor"][1] + stages["solve"][1],
        "write": sum(stages["write"]),
        "factor, Mnonzeros": peer["factor_nonzeros"] / 1e6,
    })
    if setting.split("+")[0] != "superlu":  # which orders inside of factor, and counts nothing
        found["order, analyse"] = sum(stages["analyse"])
        found["factor, GFlop"] = peer["factor_flops"] / 1e9
    if not any("openblas" in name for name in peer["blas"]):
        found["slow BLAS"] = True
    return found, [{"name": name, "seconds": sum(s)} for name, s in stages.items()]


def errors(mesh, table):
    """Mean and largest error relative to the arc from the first corner of the file, in per cent."""
    with open(mesh, "rb") as f:
        f.seek(96)
        source = struct.unpack("<3f", f.read(12))
    total = largest = count = 0
    with open(table) as f:
        next(f)
        for row in f:
            _, *place, distance = map(float, row.split(","))
            x, y, z = (place[k - 2] * source[k - 1] - place[k - 1] * source[k - 2] for k in range(3))
            arc = math.atan2(math.sqrt(x * x + y * y + z * z), sum(a * b for a, b in zip(place, source)))
            if arc > 1e-6:  # not the source itself
                off = abs(distance / arc - 1)
                total, largest, count = total + off, max(largest, off), count + 1
    return {"mean error, %": 100 * total / count, "largest error, %": 100 * largest}


def median(results, key):
    values = [r[key] for r in results if key in r]
    return statistics.median(values) if values else None


def quietest(results):
    """The shortest run: what a machine that others use takes least from."""
    return min(r[rows[0]] for r in results)


def number(value):
    return "" if value is None else f"{value:.3g}" if abs(value) < 100 else f"{value:.0f}"


def measure(level):
    mesh, table, record = (os.path.join(scratch, name) for name in (f"{level}.stl", "out.csv", "run.json"))
    settings = os.environ.get("PEERS", "metis metis+curve amd+curve" + (" superlu" if level <= superlu_up_to else "")).split()
    contestants = ["heatskin"] + settings
    results, last = {c: [] for c in contestants}, {}
    for turn in range(runs):
        for c in contestants:
            found, last[c] = run_ours(mesh, table, record) if c == "heatskin" else run_peer(c, mesh, table, record)
            if turn == 0:  # the answer is the same every time
                found.update(errors(mesh, table))
            results[c].append(found)
    print(f"\n{10 * 4**level + 2} vertices, {20 * 4**level} triangles; medians of {runs} runs in turn; load {os.getloadavg()[0]:.1f}\n")
    print("| | heatskin |" + "".join(f" {s} | ratio |" for s in settings))
    print("|---|---:|" + "---:|---:|" * len(settings))
    ours = results["heatskin"]
    for key in rows:
        mine = median(ours, key)
        line = f"| {key} | {number(mine)} |"
        for s in settings:
            theirs = median(results[s], key)
            line += f" {number(theirs)} | {number(mine / theirs) if theirs else ''} |"
        print(line)
    print()
    for c in contestants:
        print(f"{c}: whole runs " + ", ".join(number(r["whole run, s"]) for r in results[c]) + " s; stages of the last: "
              + ", ".join(f"{s['name']} {number(s['seconds'])}" for s in last[c]))
    if any("slow BLAS" in r for s in settings for r in results[s]):
        print("No OpenBLAS was loaded by the peers: they are slower than they could be (on Debian: apt-get install libopenblas0-pthread).")
    for c in contestants:
        if not median(results[c], "mean error, %") <= 10:
            print(f"The answer of {c} is wrong here: its times count for little.")
    best = min(settings, key=lambda s: median(results[s], rows[0]))
    print(f"Against the fastest peer, {best}: " + ", ".join(f"{key.split(',')[0]} {number(median(ours, key) / median(results[best], key))} x" for key in rows[:3])
          + f"; quietest run against quietest {number(quietest(ours) / min(quietest(results[s]) for s in settings))} x")
    sys.stdout.flush()
    return median(ours, rows[0])


def main():
    with open("/proc/cpuinfo") as f:
        model = re.search(r"(?m)^model name\s*:\s*(.*)", f.read())
    print(f"{model.group(1) if model else os.uname().machine}, {os.cpu_count()} processors; {threads} threads each; "
          f"OpenBLAS core {core or 'as it finds best'}")
    print("Ratios are ours / theirs. Stages in seconds. Theirs leave out the start of Python; ours count what lies between two of")
    print("them to the first, so that they are not too short: the solve's with sorting by heat (make bench BENCH=Sphere has it alone).")
    print("Theirs factor twice, the second time between heat and distance.")
    walls = {level: measure(level) for level in sorted(set(levels))}
    known = sorted(walls)
    for low, high in zip(known, known[1:]):
        exponent = math.log(walls[high] / walls[low]) / math.log(4 ** (high - low))
        print(f"heatskin from {10 * 4**low + 2} to {10 * 4**high + 2} vertices: the whole run grows like n^{exponent:.2f}")


main()
