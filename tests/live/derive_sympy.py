#!/usr/bin/env python3
"""Random netlists: `loopwright derive` against sympy's exact solution of the signal equations.

usage: derive_sympy.py BINARY [--count N] [--seed N] [--keep FOLDER]

Each netlist has 2 to 6 blocks in tangled loops: numeric and symbolic laws, dead times (commensurate, so that
E = exp(-q s) is one more indeterminate), matrix laws, direct gains. Asked are transfer functions between any two
signals, return ratios, matrices of them, and both with other signals cut open. The equations are written down here
from the meaning of the requests and solved over the field of fractions in s, E and the symbols; the result must be
the same fraction in lowest terms. A netlist whose algebraic loops have no solution must be told as `ill-posed-loop`.
Prints one line for each netlist that differs and a last line; exit status 1 if any does.
"""
import argparse
import ast
import json
import os
import random
import subprocess
import sys
import tempfile
from fractions import Fraction

from sympy import QQ
from sympy.polys.matrices import DomainMatrix

DELAY = Fraction(1, 10)


class Netlist:
    """A random netlist as text, and its equations v = M v over the field of fractions."""

    def __init__(self, rng):
        self.rng = rng
        self.symbols = ["K%d" % i for i in range(rng.choice([0, 0, 1, 2, 3]))]
        self.field = QQ.frac_field("s", "E", *self.symbols)
        self.s, self.delay = self.field.gens[0], self.field.gens[1]
        self.value = dict(zip(self.symbols, self.field.gens[2:]))
        self.lines = ["model random", "input r", "input d"]
        self.lines += ["param %s" % k for k in self.symbols]
        self.signals = ["r", "d"]
        self.drive = {"r": {}, "d": {}}      # signal -> {signal: coefficient}
        self.direct = {"r": {}, "d": {}}     # the same at infinite frequency
        self.asked = []
        self.write_blocks()
        self.write_requests()

    def number(self):
        """A small decimal, never zero: its text and value."""
        n = self.rng.choice([-1, 1]) * self.rng.randint(1, 40)
        text = str(n) if self.rng.random() < 0.5 else "%s%d.%d" % ("-" if n < 0 else "", abs(n) // 10, abs(n) % 10)
        return "(%s)" % text if n < 0 else text, self.field.from_sympy(_rational(Fraction(text)))

    def factor(self):
        """A number or a symbol."""
        if self.symbols and self.rng.random() < 0.4:
            name = self.rng.choice(self.symbols)
            return name, self.value[name]
        return self.number()

    def law(self):
        """A proper law: text, value, and value at infinite frequency."""
        kind = self.rng.choice(["gain", "lag", "lag", "lag", "lead", "second", "integrator", "delay"])
        k, kv = self.factor()
        zero = self.field.zero
        if kind == "gain":
            return k, kv, kv
        if kind == "integrator":
            return "%s/s" % k, kv / self.s, zero
        a, av = self.number()
        if kind == "lag":
            t, tv = self.factor()
            return "%s/(%s*s + %s)" % (k, t, a), kv / (tv * self.s + av), zero
        if kind == "lead":
            b, bv = self.number()
            return "%s*(s + %s)/(s + %s)" % (k, a, b), kv * (self.s + av) / (self.s + bv), kv
        if kind == "second":
            b, bv = self.number()
            return "%s/(s^2 + %s*s + %s)" % (k, a, b), kv / (self.s**2 + av * self.s + bv), zero
        n = self.rng.randint(1, 3)
        return "%s*exp(-%s*s)" % (k, str(float(n * DELAY))), kv * self.delay**n, zero

    def write_blocks(self):
        count = self.rng.randint(2, 6)
        outputs = ["x%d" % i for i in range(count)]
        for i, x in enumerate(outputs):
            readers = self.rng.sample(outputs, min(count, self.rng.randint(1, 3)))
            sources = readers + self.rng.sample(["r", "d"], self.rng.randint(0 if i else 1, 2))
            self.write_sum("e%d" % i, sources)
        i = 0
        while i < count:
            if i + 1 < count and self.rng.random() < 0.25:
                self.write_matrix(i)
                i += 2
            else:
                text, value, direct = self.law()
                self.lines.append("block B%d : e%d -> x%d = %s" % (i, i, i, text))
                self.put("x%d" % i, {"e%d" % i: value}, {"e%d" % i: direct})
                i += 1
        self.lines.append("output x%d" % (count - 1))
        if self.rng.random() < 0.06:
            self.write_ring()

    def write_ring(self):
        """One more loop, of gains k and 1/k only: it has no solution."""
        k = self.rng.choice([1, 2, 4, 5, 8])
        self.lines += ["sum ring = x0 + back", "block R1 : ring -> forth = %d" % k, "block R2 : forth -> back = 1/%d" % k]
        one = self.field.one
        self.put("ring", {"x0": one, "back": one}, {"x0": one, "back": one})
        self.put("forth", {"ring": one * k}, {"ring": one * k})
        self.put("back", {"forth": one / k}, {"forth": one / k})

    def write_sum(self, name, sources):
        parts, row = [], {}
        for source in sources:
            sign = self.rng.choice(["+", "-"])
            text, value = ("", self.field.one) if self.rng.random() < 0.6 else self.factor()
            parts.append("%s %s%s" % (sign, text + "*" if text else "", source))
            row[source] = value if sign == "+" else -value
        text = " ".join(parts)
        self.lines.append("sum %s = %s" % (name, text[2:] if text.startswith("+") else text))
        self.put(name, row, dict(row))

    def write_matrix(self, i):
        names_in, names_out = ["e%d" % i, "e%d" % (i + 1)], ["x%d" % i, "x%d" % (i + 1)]
        rows = [[self.law() if self.rng.random() < 0.8 else ("0", self.field.zero, self.field.zero) for _ in names_in]
                for _ in names_out]
        text = ", ".join("[%s]" % ", ".join(cell[0] for cell in row) for row in rows)
        self.lines.append("block B%d : %s -> %s = [%s]" % (i, ", ".join(names_in), ", ".join(names_out), text))
        for name, row in zip(names_out, rows):
            self.put(name, {n: c[1] for n, c in zip(names_in, row)}, {n: c[2] for n, c in zip(names_in, row)})

    def put(self, name, row, direct):
        self.signals.append(name)
        self.drive[name] = row
        self.direct[name] = direct

    def write_requests(self):
        inner = [x for x in self.signals if x not in "rd"]
        for _ in range(3):
            to, source = self.rng.choice(inner), self.rng.choice(self.signals)
            opened = self.rng.sample(inner, 1) if self.rng.random() < 0.35 else []
            self.lines.append("find %s / %s%s" % (to, source, " with %s open" % opened[0] if opened else ""))
            self.asked.append((to, source, [], opened))
        at = self.rng.sample(inner, self.rng.choice([1, 1, 2]))
        opened = [x for x in self.rng.sample(inner, 1) if x not in at] if self.rng.random() < 0.35 else []
        self.lines.append("find loop at %s%s" % (", ".join(at), " with %s open" % opened[0] if opened else ""))
        for to in at:
            for source in at:
                self.asked.append((to, source, at, opened))

    def ill_posed(self):
        """Whether the algebraic loops have no solution: det(I - D) = 0, D the gains at infinite frequency."""
        return self.matrix(self.direct, []).to_field().det() == self.field.zero

    def matrix(self, drive, cut):
        """I - M, the columns of cut signals zero: their readers see what is put in there and nothing else."""
        place = {name: i for i, name in enumerate(self.signals)}
        rows = [[self.field.one if i == j else self.field.zero for j in range(len(place))] for i in range(len(place))]
        for name, row in drive.items():
            for source, value in row.items():
                if source not in cut:
                    rows[place[name]][place[source]] -= value
        return DomainMatrix(rows, (len(place), len(place)), self.field)

    def solution(self, to, source, at, opened):
        """What signal `to` answers to a test signal of 1 at `source`."""
        cut = set(at) | set(opened)
        column = []
        for name in self.signals:
            if source in cut:
                column.append([self.drive[name].get(source, self.field.zero)])
            else:
                column.append([self.field.one if name == source else self.field.zero])
        right = DomainMatrix(column, (len(column), 1), self.field)
        answer = self.matrix(self.drive, cut).lu_solve(right).to_list()[self.signals.index(to)][0]
        return -answer if at else answer


def _rational(value):
    from sympy import Rational
    return Rational(value.numerator, value.denominator)


def polynomial(netlist, text):
    """A coefficient as JSON tells it, as an element of the field."""
    def walk(node):
        if isinstance(node, ast.Constant):
            return netlist.field.from_sympy(_rational(Fraction(node.value)))
        if isinstance(node, ast.Name):
            return netlist.value[node.id]
        if isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub):
            return -walk(node.operand)
        if isinstance(node, ast.BinOp):
            if isinstance(node.op, ast.Pow):
                return walk(node.left) ** node.right.value
            a, b = walk(node.left), walk(node.right)
            steps = {ast.Add: lambda: a + b, ast.Sub: lambda: a - b, ast.Mult: lambda: a * b, ast.Div: lambda: a / b}
            return steps[type(node.op)]()
        raise ValueError("cannot read %r" % text)
    return walk(ast.parse(text.replace("^", "**"), mode="eval").body)


def told(netlist, terms):
    total = netlist.field.zero
    for term in terms:
        steps = Fraction(term["delay"]) / DELAY
        assert steps.denominator == 1, "a delay that is no multiple of the basic one"
        factor = polynomial(netlist, term["coefficient"])
        total += factor * netlist.s ** term["power"] * netlist.delay ** int(steps)
    return total


def compare(netlist, transfer, wanted):
    """Why a result is not the wanted fraction in lowest terms, or None."""
    numerator, denominator = told(netlist, transfer["numerator"]), told(netlist, transfer["denominator"])
    if denominator == 0:
        return "denominator is zero"
    if numerator / denominator != wanted:
        return "not the solution of the signal equations"
    # The field keeps its elements in lowest terms, so the numerators may differ by a number only.
    if wanted != 0 and not (denominator / netlist.field(wanted.denom)).denom.is_ground:
        return "not in lowest terms"
    if wanted != 0 and not (denominator / netlist.field(wanted.denom)).numer.is_ground:
        return "not in lowest terms"
    return None


def run(binary, netlist, folder, name):
    path = os.path.join(folder, name + ".loop")
    with open(path, "w", encoding="utf-8") as file:
        file.write("\n".join(netlist.lines) + "\n")
    process = subprocess.run([binary, "derive", path, "--format", "json"], capture_output=True, timeout=60, check=False)
    document = json.loads(process.stdout)
    codes = [d["code"] for d in document["diagnostics"]]
    if netlist.ill_posed():
        good = process.returncode == 2 and "ill-posed-loop" in codes
        return "ill", None if good else "ill-posed, but status %d with %s" % (process.returncode, codes)
    if process.returncode != 0:
        return "well", "status %d with %s" % (process.returncode, codes)
    if len(document["transfers"]) != len(netlist.asked):
        return "well", "%d results for %d requests" % (len(document["transfers"]), len(netlist.asked))
    for transfer, (to, source, at, opened) in zip(document["transfers"], netlist.asked):
        why = compare(netlist, transfer, netlist.solution(to, source, at, opened))
        if transfer["to"] != to or transfer["at"] != at or transfer["open"] != opened:
            why = "told as to %(to)s at %(at)s open %(open)s" % transfer
        if why:
            what = "loop at " + ", ".join(at) if at else "%s / %s" % (to, source)
            return "well", "%s%s: %s" % (what, " with %s open" % opened[0] if opened else "", why)
    return "well", None


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("binary")
    parser.add_argument("--count", type=int, default=320)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--keep", help="folder for the netlists; a temporary one otherwise")
    options = parser.parse_args()
    binary = os.path.abspath(options.binary)
    counts, wrong = {"well": 0, "ill": 0}, 0
    with tempfile.TemporaryDirectory() as temporary:
        folder = options.keep or temporary
        os.makedirs(folder, exist_ok=True)
        for i in range(options.count):
            netlist = Netlist(random.Random(options.seed * 1_000_003 + i))
            name = "netlist_%d_%d" % (options.seed, i)
            try:
                kind, why = run(binary, netlist, folder, name)
            except (ValueError, KeyError, TypeError, AssertionError, subprocess.TimeoutExpired) as error:
                kind, why = "well", "%s: %s" % (type(error).__name__, error)
            counts[kind] += 1
            if why:
                wrong += 1
                print("%s: %s" % (name, why), flush=True)
                print("    " + "\n    ".join(netlist.lines))
    print("derive against sympy: %(well)d netlists and %(ill)d ill-posed ones," % counts, "%d differ" % wrong)
    return 1 if wrong or counts["well"] < options.count * 0.8 else 0


if __name__ == "__main__":
    sys.exit(main())
