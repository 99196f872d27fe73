#!/usr/bin/env python3
"""Large numeric netlists: `loopwright derive` against python-flint.

usage: derive_flint.py BINARY [--count N] [--seed N] [--blocks N]

Netlists of 5 to 150 blocks of order 1 or 2 with feedback and feedforward links. The result N/D of `find y / r` is held
against the signal equations in three ways: modulo a 61-bit prime at eight random points (J. T. Schwartz, Fast
probabilistic algorithms for verification of polynomial identities, 1980: a wrong fraction of degree d passes one of
them with a chance of d / 2^61); exactly over the rationals at two whole-number points; and gcd(N, D) = 1 by FLINT.
Prints one line for each netlist that differs and a last line; exit status 1 if any does.
"""
import argparse
import json
import os
import random
import subprocess
import sys
import tempfile

import flint

PRIME = 2305843009213693951  # 2^61 - 1
POINTS = 8


def build(rng, blocks):
    """Text of a netlist and its blocks: for each, the law's numerator and denominator and the sum that it reads."""
    lines, parts = ["model large", "input r", "output x%d" % (blocks - 1)], []
    for i in range(blocks):
        sources = {"r" if i == 0 else "x%d" % (i - 1): 1}
        for _ in range(rng.choice([0, 1, 1, 2])):
            near = rng.random() < 0.7
            j = min(blocks - 1, max(0, i + rng.randint(-5, 5))) if near else rng.randrange(blocks)
            sources.setdefault("x%d" % j, rng.choice([-1, 1]) * rng.randint(1, 99))
        terms = []
        for source, factor in sources.items():
            sign = "-" if factor < 0 else "+"
            terms.append("%s %s" % (sign, source if abs(factor) == 1 else "0.%02d*%s" % (abs(factor), source)))
        text = " ".join(terms)
        lines.append("sum e%d = %s" % (i, text[2:] if text.startswith("+") else text))
        order = rng.choice([1, 1, 2])
        numerator = [rng.randint(1, 999) for _ in range(rng.randint(1, order))]
        denominator = [rng.randint(1, 999) for _ in range(order + 1)]
        lines.append("block B%d : e%d -> x%d = (%s)/(%s)" % (i, i, i, written(numerator), written(denominator)))
        row = {int(s[1:]) if s != "r" else None: flint.fmpq(f, 1 if abs(f) == 1 else 100) for s, f in sources.items()}
        parts.append((numerator, denominator, row))
    rng.shuffle(lines)
    lines.append("find x%d / r" % (blocks - 1))
    return lines, parts


def written(coefficients):
    """A polynomial, constant term first, as text."""
    powers = ["%d" % c if i == 0 else "%d*s" % c if i == 1 else "%d*s^%d" % (c, i) for i, c in enumerate(coefficients)]
    return " + ".join(reversed(powers))


def equations(parts, point, number):
    """The matrix and the right side of den_i x_i - num_i sum = num_i r at one point, in the numbers given."""
    n = len(parts)
    matrix, right = [[number(0)] * n for _ in range(n)], [[number(0)] for _ in range(n)]
    for i, (numerator, denominator, row) in enumerate(parts):
        above, below = horner(numerator, point, number), horner(denominator, point, number)
        matrix[i][i] += below
        for j, factor in row.items():
            value = above * number(int(factor.p)) / number(int(factor.q))
            if j is None:
                right[i][0] += value
            else:
                matrix[i][j] -= value
    return matrix, right


def horner(coefficients, point, number):
    value = number(0)
    for c in reversed(coefficients):
        value = value * point + number(c)
    return value


def verify(parts, numerator, denominator, rng):
    """Why the fraction is not the solution in lowest terms, or None."""
    top, bottom = flint.fmpz_poly(numerator), flint.fmpz_poly(denominator)
    if top.gcd(bottom).degree() > 0 or top.gcd(bottom) != 1:
        return "not in lowest terms"
    if bottom.leading_coefficient() <= 0:
        return "the denominator's first coefficient is not positive"

    def modular(value):
        return flint.nmod(value, PRIME)

    tried = 0
    while tried < POINTS:
        point = modular(rng.randrange(PRIME))
        matrix, right = equations(parts, point, modular)
        try:
            solved = flint.nmod_mat(matrix, PRIME).solve(flint.nmod_mat(right, PRIME))
        except ZeroDivisionError:
            continue
        tried += 1
        if horner(denominator, point, modular) * solved[len(parts) - 1, 0] != horner(numerator, point, modular):
            return "differs modulo a prime"
    for point in (3, -7):
        matrix, right = equations(parts, flint.fmpq(point), flint.fmpq)
        solved = flint.fmpq_mat(matrix).solve(flint.fmpq_mat(right))
        if flint.fmpq(bottom(point)) * solved[len(parts) - 1, 0] != flint.fmpq(top(point)):
            return "differs at s = %d" % point
    return None


def coefficients(terms):
    degree = max((t["power"] for t in terms), default=0)
    values = [0] * (degree + 1)
    for term in terms:
        values[term["power"]] = int(term["coefficient"])
    return values


def run(binary, seed, blocks, folder):
    rng = random.Random(seed)
    lines, parts = build(rng, blocks)
    path = os.path.join(folder, "large_%d.loop" % seed)
    with open(path, "w", encoding="utf-8") as file:
        file.write("\n".join(lines) + "\n")
    process = subprocess.run([binary, "derive", path, "--format", "json"], capture_output=True, timeout=300, check=False)
    document = json.loads(process.stdout)
    if process.returncode != 0:
        codes = [d["code"] for d in document["diagnostics"]]
        return "status %d with %s" % (process.returncode, codes)
    transfer = document["transfers"][0]
    return verify(parts, coefficients(transfer["numerator"]), coefficients(transfer["denominator"]), rng)


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("binary")
    parser.add_argument("--count", type=int, default=50)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--blocks", type=int, help="of each netlist; from 5 to 150 otherwise")
    options = parser.parse_args()
    binary = os.path.abspath(options.binary)
    wrong = 0
    with tempfile.TemporaryDirectory() as folder:
        for i in range(options.count):
            blocks = options.blocks or 5 + 145 * i // max(1, options.count - 1)
            try:
                why = run(binary, options.seed * 1_000_003 + i, blocks, folder)
            except (ValueError, KeyError, TypeError, subprocess.TimeoutExpired) as error:
                why = "%s: %s" % (type(error).__name__, error)
            if why:
                wrong += 1
                print("%d blocks, seed %d: %s" % (blocks, options.seed * 1_000_003 + i, why), flush=True)
    print("derive against python-flint: %d netlists, %d differ" % (options.count, wrong))
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
