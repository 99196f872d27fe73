#!/usr/bin/env python3
"""Seeded workload generator for loopwright (standard library only).

    workloads.py W1 --size 40 --seed 1 [--variant random] [--out DIR]

writes DIR/NAME.loop (the language of docs/language.md) and DIR/NAME.json, a neutral description of the
same system, and prints the two paths. For W5 it also writes NAME.py: the assignment file with the same
number of statements that CPython parses as the baseline.

The neutral JSON:
  inputs, outputs   signal names
  params            {name: {"value": "9/5" | null, "percent": "5" | null}}
  sums              [[name, [[coefficient, signal], ...]], ...]
  blocks            [[name, in, out, [numerator], [denominator], delay], ...]  coefficients from the highest
                    power of s down; exact ratios as strings, or (W2, W6) expressions in the params;
                    the law is num/den * exp(-delay*s)
  request           {"to": y, "from": r}
  extra             what the workload needs besides (frequency grid, loop point, sample count, ...)
"""
import argparse
import json
import os
import random
from fractions import Fraction

# ------------------------------------------------------------------------------------------- helpers


def dec(rng, lo, hi, places):
    """A decimal string with `places` decimals between lo and hi, never zero."""
    while True:
        k = rng.randint(round(lo * 10 ** places), round(hi * 10 ** places))
        if k:
            break
    sign, k = ("-" if k < 0 else ""), abs(k)
    if places == 0:
        return f"{sign}{k}"
    t = str(k).rjust(places + 1, "0")
    return f"{sign}{t[:-places]}.{t[-places:]}"


def ratio(text):
    f = Fraction(text)
    return str(f.numerator) if f.denominator == 1 else f"{f.numerator}/{f.denominator}"


def sum_text(terms):
    """terms: [(coefficient text, signal)]; a positive term comes first where there is one."""
    terms = sorted(terms, key=lambda t: t[0].startswith("-"))       # stable: positives first
    out = []
    for i, (c, sig) in enumerate(terms):
        neg = c.startswith("-")
        mag = c.lstrip("-")
        body = sig if mag == "1" else f"{mag}*{sig}"
        out.append(("-" if neg else "") + body if i == 0 else (" - " if neg else " + ") + body)
    return "".join(out)


class System:
    def __init__(self, workload, variant, size, seed):
        self.head = dict(workload=workload, variant=variant, size=size, seed=seed)
        self.name = f"{workload}_{variant}_{size}_{seed}"
        self.lines = [f"model {self.name}"]
        self.inputs, self.outputs, self.params = [], [], {}
        self.sums, self.blocks, self.extra = [], [], {}
        self.request = None

    def input(self, n):
        self.inputs.append(n)
        self.lines.append(f"input {n}")

    def output(self, n):
        self.outputs.append(n)
        self.lines.append(f"output {n}")

    def param(self, n, value=None, percent=None):
        self.params[n] = dict(value=None if value is None else ratio(value), percent=percent)
        t = f"param {n}"
        if value is not None:
            t += f" = {value}"
        if percent is not None:
            t += f" within {percent}%"
        self.lines.append(t)

    def sum(self, n, terms):
        self.sums.append([n, [[ratio(c), s] for c, s in terms]])
        self.lines.append(f"sum {n} = {sum_text(terms)}")

    def block(self, n, i, o, law, num, den, delay="0", symbolic=False):
        f = (lambda t: t) if symbolic else ratio
        self.blocks.append([n, i, o, [f(t) for t in num], [f(t) for t in den], ratio(delay)])
        self.lines.append(f"block {n} : {i} -> {o} = {law}")

    def find(self, to, frm):
        self.request = {"to": to, "from": frm}
        self.lines.append(f"find {to} / {frm}")

    def write(self, out):
        os.makedirs(out, exist_ok=True)
        loop = os.path.join(out, self.name + ".loop")
        with open(loop, "w") as f:
            f.write("\n".join(self.lines) + "\n")
        js = os.path.join(out, self.name + ".json")
        with open(js, "w") as f:
            json.dump(dict(self.head, inputs=self.inputs, outputs=self.outputs, params=self.params,
                           sums=self.sums, blocks=self.blocks, request=self.request, extra=self.extra), f)
        return loop, js


# --------------------------------------------------------------------------------------- W1: exact TF


def w1(n, seed, variant="random"):
    """A loop nest of n blocks of order 1 or 2, coefficients of 3 digits, about three extra links a block.
    variant random: links between any two blocks (an expander: elimination fills in, path and loop counts
    explode); local: links at most 6 blocks long (low treewidth, as most real diagrams)."""
    rng = random.Random(f"W1/{variant}/{n}/{seed}")
    S = System("W1", variant, n, seed)
    S.input("r")
    S.output("y")
    for i in range(1, n + 1):
        terms = [("1", "r" if i == 1 else f"x{i-1}")]
        seen = {i - 1}
        for kind in ("fb", "fb", "any"):
            lo, hi = (i, n) if kind == "fb" else (1, n)
            if variant == "local":
                lo, hi = max(lo, i - 6), min(hi, i + 6)
            j = rng.randint(lo, hi)
            if j in seen:
                continue
            seen.add(j)
            terms.append((("-" if kind == "fb" or rng.random() < 0.5 else "") + dec(rng, 0.1, 0.999, 3), f"x{j}"))
        S.sum(f"e{i}", terms)
        if rng.random() < 0.5:
            b, a = dec(rng, 0.5, 9.99, 2), dec(rng, 0.5, 9.99, 2)
            S.block(f"G{i}", f"e{i}", f"x{i}", f"{b}/(s + {a})", [b], ["1", a])
        else:
            b1, b0, a1, a0 = (dec(rng, 0.5, 9.99, 2) for _ in range(4))
            S.block(f"G{i}", f"e{i}", f"x{i}", f"({b1}*s + {b0})/(s^2 + {a1}*s + {a0})",
                    [b1, b0], ["1", a1, a0])
    S.sum("y", [("1", f"x{n}"), (dec(rng, 0.1, 0.999, 3), f"x{max(1, n // 2)}")])
    S.find("y", "r")
    return S


# ------------------------------------------------------------------------------------- W2: symbolic TF


def w2(k, seed, variant="crossing"):
    """k blocks K_i/(T_i s + 1), all 2k params kept; nested feedback (i, k+1-i), crossing feedback
    (i, i+2), feedforward links; which ones is random."""
    rng = random.Random(f"W2/{variant}/{k}/{seed}")
    S = System("W2", variant, k, seed)
    S.input("r")
    S.output("y")
    terms = {i: [("1", "r" if i == 1 else f"x{i-1}")] for i in range(1, k + 1)}
    terms[1].append(("-1", "y"))
    links = set()
    for i in range(2, k // 2 + 1):                                   # nested
        if rng.random() < 0.7:
            links.add((k + 1 - i, i, "-1"))
    for i in range(2, k - 1):                                        # crossing
        if rng.random() < 0.6:
            links.add((i + rng.choice((1, 2, 2)), i, "-1"))
    for i in range(1, k - 2):                                        # feedforward
        if rng.random() < 0.35:
            links.add((i, i + 3, "1"))
    seen = set()
    for a, b, c in sorted(links):
        if a <= k and (a, b) not in seen:
            seen.add((a, b))
            terms[b].append((c, "y" if a == k else f"x{a}"))
    for i in range(1, k + 1):
        S.param(f"K{i}")
        S.param(f"T{i}")
    for i in range(1, k + 1):
        S.sum(f"e{i}", terms[i])
        S.block(f"G{i}", f"e{i}", "y" if i == k else f"x{i}", f"K{i}/(T{i}*s + 1)", [f"K{i}"], [f"T{i}", "1"],
                symbolic=True)
    S.find("y", "r")
    S.extra = dict(keep="all")
    return S


# ------------------------------------------------------------------------- W3: sparse frequency response


def w3(n, seed, variant="grid"):
    """About n states: sections m s^2 + c s + k (two states) with a local controller (one state) each, in a
    chain or a square grid, plus a few long-range links. Response y / r at 200 log-spaced frequencies."""
    rng = random.Random(f"W3/{variant}/{n}/{seed}")
    S = System("W3", variant, n, seed)
    S.input("r")
    S.output("y")
    if variant == "grid":
        g = max(3, round((n / 3) ** 0.5))
        rows, cols = g, g
    elif variant == "chain":
        rows, cols = 1, max(3, round(n / 3))
    else:
        raise SystemExit(f"W3 has no variant {variant}")
    N = rows * cols
    links = {}
    for _ in range(max(3, min(30, N // 100))):
        links.setdefault(rng.randrange(N), []).append((dec(rng, 0.05, 0.2, 2), rng.randrange(N)))
    sig = lambda i: f"x{i}"
    for i in range(N):
        a, b = divmod(i, cols)
        terms = [("1", "r")] if i == 0 else []
        for da, db in ((-1, 0), (1, 0), (0, -1), (0, 1)):
            if 0 <= a + da < rows and 0 <= b + db < cols:
                terms.append((dec(rng, 0.8, 1.2, 2), sig((a + da) * cols + b + db)))
        for c, j in links.get(i, ()):
            if all(j != int(t[1][1:]) for t in terms if t[1] != "r"):
                terms.append((c, sig(j)))
        terms.append(("-1", f"u{i}"))
        S.sum(f"f{i}", terms)
        m, c, k = dec(rng, 0.8, 1.2, 2), dec(rng, 0.1, 0.3, 2), dec(rng, 4.5, 5.5, 2)
        S.block(f"P{i}", f"f{i}", sig(i), f"1/({m}*s^2 + {c}*s + {k})", ["1"], [m, c, k])
        kd, kp, p = dec(rng, 0.2, 0.9, 2), dec(rng, 0.2, 0.9, 2), dec(rng, 5, 20, 1)
        S.block(f"C{i}", sig(i), f"u{i}", f"({kd}*s + {kp})/(s + {p})", [kd, kp], ["1", p])
    j = min(rows - 1, 6) * cols + min(cols - 1, 6)
    S.sum("y", [("1", sig(j)), ("0.5", sig(1))])
    S.find("y", "r")
    S.extra = dict(frequencies=dict(low=0.01, high=100.0, count=200), states=3 * N)
    return S


# ----------------------------------------------------------------------------------------- W4: poles


def w4(n, seed, variant="dense"):
    """n first-order blocks, each reading a sum of all n outputs: a dense n by n state matrix."""
    rng = random.Random(f"W4/{variant}/{n}/{seed}")
    S = System("W4", variant, n, seed)
    S.input("r")
    S.output("y")
    span = max(1, round(300 / n ** 0.5))                             # spectral radius about 1.7
    for i in range(1, n + 1):
        terms = [("1", "r")] if i == 1 else []
        for j in range(1, n + 1):
            k = rng.randint(-span, span)
            if k:
                terms.append((f"{'-' if k < 0 else ''}{abs(k) // 100}.{abs(k) % 100:02d}", f"x{j}"))
        S.sum(f"e{i}", terms)
        a = dec(rng, 2, 6, 2)
        S.block(f"G{i}", f"e{i}", f"x{i}", f"1/(s + {a})", ["1"], ["1", a])
    S.sum("y", [("1", f"x{n}")])
    S.request = {"to": "y", "from": "r"}                             # no find: poles alone are asked for
    return S


# -------------------------------------------------------------------------------------- W5: front end


def w5(n, seed, variant="flat", out="."):
    """About n statements. flat: params, sums, blocks in one scope, shuffled. nested: four levels of defines,
    one instance of each leaf family, so that the elaborated network has about as many statements as the
    file. NAME.py holds the same number of Python assignments."""
    rng = random.Random(f"W5/{variant}/{n}/{seed}")
    name = f"W5_{variant}_{n}_{seed}"
    L, P = [], []                                                    # loop lines, python lines

    def both(a, b):
        L.append(a)
        P.append(b)

    if variant == "flat":
        m = max(1, (n - 3) // 5)
        for i in range(1, m + 1):
            K, T, c = dec(rng, 0.1, 9.99, 2), dec(rng, 0.01, 0.999, 3), dec(rng, 0.1, 0.9, 1)
            prev = "r" if i == 1 else f"x{i-1}"
            both(f"param K{i} = {K}", f"K{i} = {K}")
            both(f"param T{i} = {T}", f"T{i} = {T}")
            both(f"sum e{i} = {prev} - {c}*x{i}", f"e{i} = {prev} - {c}*x{i}")
            both(f"block C{i} : e{i} -> u{i} = K{i}*(1 + 1/(4*T{i}*s))", f"u{i} = K{i}*(1 + 1/(4*T{i}*s))")
            both(f"block G{i} : u{i} -> x{i} = 1/(T{i}*s + 1)^2", f"x{i} = 1/(T{i}*s + 1)**2")
        both(f"sum y = x{m}", f"y = x{m}")
        order = list(range(len(L)))
        rng.shuffle(order)                                           # order-free
        L = [L[i] for i in order]
        P = [P[i] for i in order]
        expanded = len(L)
    elif variant == "nested":
        # families of define leaf / pair / quad / unit: 4 + 3 + 3 + 3 + the 4 headers, 1 instance = 18 statements
        m = max(1, (n - 3) // 18)
        for i in range(1, m + 1):
            K, T, c = dec(rng, 0.1, 9.99, 2), dec(rng, 0.01, 0.999, 3), dec(rng, 0.1, 0.9, 1)
            prev = "r" if i == 1 else f"x{i-1}"
            both(f"define leaf{i}(K, T) : a -> b {{", f"leaf{i} = (K, T, a, b)")
            both("  sum e = a - " + c + "*b", "e = a - " + c + "*b")
            both("  block C : e -> u = K*(1 + 1/(4*T*s))", "C = K*(1 + 1/(4*T*s))")
            both("  block G : u -> v = 1/(T*s + 1)^2", "G = 1/(T*s + 1)**2")
            both("  block H : v -> b = 1/(0.01*s + 1)", "H = 1/(0.01*s + 1)")
            L.append("}")
            for up, low in (("pair", "leaf"), ("quad", "pair"), ("unit", "quad")):
                both(f"define {up}{i}(K) : a -> b {{", f"{up}{i} = (K, a, b)")
                both("  sum e = a - 0.1*b", "e = a - 0.1*b")
                args = f"K = K, T = {T}" if low == "leaf" else "K = K"
                both(f"  block inner : e -> m = {low}{i}({args})", f"m = {low}{i}({args})")
                both("  block out : m -> b = 1/(0.02*s + 1)", "b = 1/(0.02*s + 1)")
                L.append("}")
            both(f"block n{i} : {prev} -> x{i} = unit{i}(K = {K})", f"x{i} = unit{i}(K = {K})")
        both(f"sum y = x{m}", f"y = x{m}")
        expanded = 18 * m + 1
    elif variant == "expand":
        # a file of a few lines whose repeat makes n blocks and n sums
        m = max(1, n // 2)
        L = [f"repeat k in 1..{m} {{", "  sum e{k} = x{k-1} - 0.5*x{k}", "  block S{k} : e{k} -> x{k} = 2/(0.1*k*s + 1)",
             "}", "sum x0 = r", f"sum y = x{m}"]
        for i in range(1, m + 1):
            P.append(f"e{i} = x{i-1} - 0.5*x{i}")
            P.append(f"x{i} = 2/(0.1*{i}*s + 1)")
        expanded = 2 * m + 2
    else:
        raise SystemExit(f"W5 has no variant {variant}")
    L = [f"model {name}", "input r", "output y"] + L
    P = ["r = 1", "y = 0"] + P
    os.makedirs(out, exist_ok=True)
    loop, py, js = (os.path.join(out, name + e) for e in (".loop", ".py", ".json"))
    with open(loop, "w") as f:
        f.write("\n".join(L) + "\n")
    with open(py, "w") as f:
        f.write("\n".join(P) + "\n")
    with open(js, "w") as f:
        json.dump(dict(workload="W5", variant=variant, size=n, seed=seed,
                       extra=dict(lines=len(L), statements=len(P) + 1, expanded=expanded,
                                  bytes=os.path.getsize(loop), python_bytes=os.path.getsize(py))), f)
    return loop, js


# ------------------------------------------------------------------------------------------ W6: sweep


def w6(samples, seed, variant="servo"):
    """An 8th-order loop with five toleranced params; margins at u over `samples` samples. The seed moves the
    nominal values. size = number of samples."""
    rng = random.Random(f"W6/{variant}/{seed}")
    S = System("W6", variant, samples, seed)
    S.param("J", dec(rng, 1.6, 2.0, 2), "10")
    S.param("b", dec(rng, 0.4, 0.8, 2), "20")
    S.param("wf", dec(rng, 28, 36, 1), "10")
    S.param("zf", dec(rng, 0.04, 0.08, 3), "20")
    S.param("ta", dec(rng, 0.008, 0.012, 4), "15")
    S.input("r")
    S.output("y")
    kp = dec(rng, 18, 24, 1)
    S.sum("e", [("1", "r"), ("-1", "ym")])
    sy = dict(symbolic=True)
    S.block("PI", "e", "v", f"{kp}*(s + 0.5)/s", [ratio(kp), ratio(kp) + "*1/2"], ["1", "0"], **sy)     # 1
    S.block("lead", "v", "u", "(0.4*s + 1)/(0.02*s + 1)", ["2/5", "1"], ["1/50", "1"], **sy)           # 1
    S.block("act", "u", "tau", "1/(ta^2*s^2 + 1.4*ta*s + 1)", ["1"], ["ta*ta", "7/5*ta", "1"], **sy)    # 2
    S.block("rotor", "tau", "w", "1/(J*s + b)", ["1"], ["J", "b"], **sy)                                # 1
    S.block("flex", "w", "wl", "wf^2/(s^2 + 2*zf*wf*s + wf^2)", ["wf*wf"], ["1", "2*zf*wf", "wf*wf"], **sy)  # 2
    S.block("int", "wl", "y", "1/s", ["1"], ["1", "0"], **sy)                                           # 1
    S.sum("ym", [("1", "y")])
    S.find("y", "r")
    S.lines.append("require phase_margin at u >= 20 [deg]")
    S.lines.append("require gain_margin at u >= 1.5")
    S.extra = dict(loop="u", samples=samples, chain=["PI", "lead", "act", "rotor", "flex", "int"])
    return S


# ------------------------------------------------------------------------------------- W7: dead times


def w7(count, seed, variant="nested"):
    """Three nested loops with a dead time each. size = number of log-spaced frequencies; margins at u too."""
    rng = random.Random(f"W7/{variant}/{seed}")
    S = System("W7", variant, count, seed)
    S.input("r")
    S.output("y")
    d = [dec(rng, 0.005, 0.02, 3), dec(rng, 0.05, 0.15, 3), dec(rng, 0.2, 0.5, 3)]
    k1, k2, k3 = dec(rng, 2, 4, 2), dec(rng, 1.5, 2.5, 2), dec(rng, 2, 4, 2)
    t1, t2, t3 = dec(rng, 0.05, 0.15, 3), dec(rng, 0.4, 0.8, 2), dec(rng, 2, 4, 2)
    S.sum("e3", [("1", "r"), ("-1", "m3")])
    S.block("C3", "e3", "u3", f"{k3}*(s + 0.3)/s", [k3, ratio(Fraction(k3) * Fraction("0.3"))], ["1", "0"])
    S.sum("e2", [("1", "u3"), ("-1", "m2")])
    S.block("C2", "e2", "u2", k2, [k2], ["1"])
    S.sum("e1", [("1", "u2"), ("-1", "m1")])
    S.block("C1", "e1", "u", k1, [k1], ["1"])
    S.block("P1", "u", "x1", f"1/({t1}*s + 1)", ["1"], [t1, "1"])
    S.block("D1", "x1", "m1", f"exp(-{d[0]}*s)", ["1"], ["1"], delay=d[0])
    S.block("P2", "x1", "x2", f"1/({t2}*s + 1)", ["1"], [t2, "1"])
    S.block("D2", "x2", "m2", f"exp(-{d[1]}*s)", ["1"], ["1"], delay=d[1])
    S.block("P3", "x2", "y", f"1/({t3}*s + 1)", ["1"], [t3, "1"])
    S.block("D3", "y", "m3", f"exp(-{d[2]}*s)", ["1"], ["1"], delay=d[2])
    S.find("y", "r")
    S.extra = dict(frequencies=dict(low=0.01, high=100.0, count=count), loop="u3")
    S.lines.append("require phase_margin at u3 >= 20 [deg]")
    S.lines.append("require gain_margin at u3 >= 1.5")
    return S


# --------------------------------------------------------------------------------------------- main

VARIANTS = dict(W1=["random", "local"], W2=["crossing"], W3=["grid", "chain"], W4=["dense"],
                W5=["flat", "nested", "expand"], W6=["servo"], W7=["nested"])


def generate(workload, size, seed, variant=None, out="."):
    variant = variant or VARIANTS[workload][0]
    if variant not in VARIANTS[workload]:
        raise SystemExit(f"{workload} has the variants {', '.join(VARIANTS[workload])}")
    if workload == "W5":
        return w5(size, seed, variant, out)
    return globals()[workload.lower()](size, seed, variant).write(out)


if __name__ == "__main__":
    ap = argparse.ArgumentParser()
    ap.add_argument("workload", choices=sorted(VARIANTS))
    ap.add_argument("--size", type=int, required=True)
    ap.add_argument("--seed", type=int, default=1)
    ap.add_argument("--variant")
    ap.add_argument("--out", default="work")
    a = ap.parse_args()
    for p in generate(a.workload, a.size, a.seed, a.variant, a.out):
        print(p)
