#!/usr/bin/env python3
"""Our whole process against a baseline's computation alone, in one run.

    compare.py BINARY WORKLOAD[:VARIANT] SIZE [SIZE …] [--seed 1] [--rounds 3] [--folder DIR]

For each size a model is generated (workloads.py), then baseline (baselines.py, which reads a ready-made numeric
description and times its computation only) and our program (the whole process: read, check, compute, print to a
file) run in turn, round by round, so that both meet the same state of the machine. Printed are medians and the ratio
baseline / ours of each round's wall and CPU seconds. No figure is compared with one of another run or machine.

Needs the packages of requirements.txt; `OPENBLAS_CORETYPE` and `OPENBLAS_L2_SIZE` are left out of the environment,
since they slow a current numpy.
"""
import argparse
import json
import os
import statistics
import subprocess
import sys
import tempfile
import time

HERE = os.path.dirname(os.path.abspath(__file__))
COMMANDS = {"W1": ["derive"], "W2": ["derive"], "W5": ["check"]}


def environment():
    return {k: v for k, v in os.environ.items() if k not in ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE")}


def generate(workload, variant, size, seed, folder):
    command = [sys.executable, os.path.join(HERE, "workloads.py"), workload, "--size", str(size), "--seed", str(seed)]
    command += ["--out", folder] + (["--variant", variant] if variant else [])
    return subprocess.run(command, check=True, capture_output=True, text=True).stdout.split()


def baseline(description, text):
    command = [sys.executable, os.path.join(HERE, "baselines.py"), description] + (["--text"] if text else [])
    out = subprocess.run(command, check=True, capture_output=True, text=True, env=environment()).stdout
    d = json.loads(out)
    extra, cpu_extra = (d.get("text_seconds") or 0.0, d.get("text_cpu_seconds") or 0.0) if text else (0.0, 0.0)
    return d["seconds"] + extra, d["cpu_seconds"] + cpu_extra


def ours(binary, workload, model, folder):
    """Wall seconds, CPU seconds and peak MiB of one process."""
    with open(os.path.join(folder, "out.json"), "wb") as out:
        start = time.perf_counter()
        process = subprocess.Popen([binary] + COMMANDS[workload] + [model, "--format", "json"], stdout=out)
        _, status, usage = os.wait4(process.pid, 0)
        wall = time.perf_counter() - start
    if os.waitstatus_to_exitcode(status) != 0:
        raise SystemExit("%s: exit status %d" % (model, os.waitstatus_to_exitcode(status)))
    return wall, usage.ru_utime + usage.ru_stime, usage.ru_maxrss / 1024


def main():
    p = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    p.add_argument("binary")
    p.add_argument("workload")
    p.add_argument("sizes", type=int, nargs="+")
    p.add_argument("--seed", type=int, default=1)
    p.add_argument("--rounds", type=int, default=3)
    p.add_argument("--folder")
    a = p.parse_args()
    workload, _, variant = a.workload.partition(":")
    binary = os.path.abspath(a.binary)
    with tempfile.TemporaryDirectory() as scratch:
        folder = a.folder or scratch
        print("| workload | size | baseline s | ours s | ours CPU s | peak MiB | ratio wall | ratio CPU |")
        print("|---|---:|---:|---:|---:|---:|---:|---:|")
        for size in a.sizes:
            model, description = generate(workload, variant, size, a.seed, folder)[:2]
            rows = []
            for _ in range(a.rounds):
                base = baseline(description, workload == "W2")
                own = ours(binary, workload, model, folder)
                rows.append((base[0], own[0], own[1], own[2], base[0] / own[0], base[1] / own[1]))
            m = [statistics.median(column) for column in zip(*rows)]
            name = a.workload if variant else workload
            print("| %s | %d | %.3g | %.3g | %.3g | %.0f | %.2f | %.2f |" % (name, size, *m))
            sys.stdout.flush()


if __name__ == "__main__":
    main()
