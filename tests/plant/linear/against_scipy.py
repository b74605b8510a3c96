#!/usr/bin/env python3
"""Random systems that print_systems judges, judged again by NumPy and SciPy.

    against_scipy.py PRINT_SYSTEMS SEED COUNT
"""
import json
import subprocess
import sys

import numpy as np
import scipy.linalg as la
import scipy.signal

EPS = np.finfo(float).eps
failed = 0
worst = {}


def expect(name, at, error, allowed):
    """error / allowed is kept, so that a tolerance that bites late shows in the table at the end."""
    global failed
    ratio = error / allowed if allowed > 0 else (0.0 if error == 0 else np.inf)
    if not ratio <= 1.0:
        failed += 1
        print(f"system {at}: {name}: error {error:.3g}, allowed {allowed:.3g}")
    worst[name] = max(worst.get(name, 0.0), ratio)


def matrix(values):
    return np.array(values[2:], dtype=float).reshape(int(values[0]), int(values[1]))


def system(line, name):
    return [matrix(line[f"{name}_{k}"]) for k in "ABCD"]


def complex_list(values):
    m = matrix(values)
    return m[:, 0] + 1j * m[:, 1]


def matched(ours, theirs):
    """Distance of each of ours to its partner, nearest pairs first; theirs may hold more."""
    ours, theirs, out = list(ours), list(theirs), []
    while ours:
        table = np.abs(np.subtract.outer(ours, theirs))
        i, j = np.unravel_index(table.argmin(), table.shape)
        out.append((ours.pop(i), theirs.pop(j), table[i, j]))
    return out


def gain(A, B, C, D, s):
    return C @ la.solve(s * np.eye(len(A)) - A, B) + D if len(A) else D.astype(complex)


def markov(A, B, C, count):
    out, reached = [], B
    for _ in range(count):
        out.append(C @ reached)
        reached = A @ reached
    return out


def same_plant(name, line, given, other, condition):
    """Markov parameters: each is a product whose rounding is at most n eps |C| |A|^k |B| times the change's condition."""
    A, B, C, D = given
    n, at = len(A), line["at"]
    size_a = max(la.norm(A, 2), 1e-300)
    for k, (x, y) in enumerate(zip(markov(A, B, C, 2 * n), markov(*other[:3], 2 * n))):
        size = la.norm(C) * size_a ** k * la.norm(B)
        expect(f"{name}: Markov parameters", at, la.norm(x - y), 1e3 * n * EPS * condition * size)
    expect(f"{name}: D", at, la.norm(D - other[3]), 0.0 if np.array_equal(D, other[3]) else 1e-300)


def poles(line, A):
    values, left, right = la.eig(A, left=True, right=True)
    angle = np.abs(np.sum(left.conj() * right, axis=0))
    for ours, theirs, off in matched(complex_list(line["poles"]), values):
        # First-order bound: eps ||A|| over the eigenvalue's angle; 10 n for both libraries' constants.
        where = np.argmin(np.abs(values - theirs))
        expect("poles", line["at"], off, 10 * len(A) * EPS * la.norm(A) / angle[where])
    reach = np.abs(values) if line["period_s"] else values.real
    edge = 1.0 if line["period_s"] else 0.0
    expect("stability", line["at"], float((line["stability"] == "stable") != bool(reach.max() < edge)), 0.0)
    return values


def ranks(line, given, values):
    A, B, C, _ = given
    co, c, o, _ = line["parts"]
    expect("ranks", line["at"], float(line["ranks"] != [co + c, co + o]), 0.0)
    expect("Kalman parts", line["at"], float(line["found"] != line["parts"]), 0.0)
    # Popov, Belevitch, Hautus by NumPy's SVD: values lie below 1e-13 or above 1e-8 for these systems, so 1e-10 parts them.
    table, seen = matrix(line["pbh"]), {}
    size = la.norm(A, 2)
    for p in complex_list(line["poles"]):
        shifted = (A - p * np.eye(len(A))) / size
        reach = la.svdvals(np.hstack([shifted, B / la.norm(B, 2)]))[-1] if la.norm(B) > 0 else 0.0
        see = la.svdvals(np.vstack([shifted, C / la.norm(C, 2)]))[-1] if la.norm(C) > 0 else 0.0
        seen[p] = (reach > 1e-10, see > 1e-10)
    theirs = np.array([seen[p] for p in complex_list(line["poles"])], dtype=float)
    expect("mode tests", line["at"], float(np.abs(theirs - table).sum()), 0.0)
    unstable = [abs(p) >= 1 if line["period_s"] else p.real >= 0 for p in seen]
    expect("stabilisable", line["at"],
           float(bool(line["stabilisable"]) != all(r or not u for (r, _), u in zip(seen.values(), unstable))), 0.0)
    expect("detectable", line["at"],
           float(bool(line["detectable"]) != all(s or not u for (_, s), u in zip(seen.values(), unstable))), 0.0)


def zeros(line, given):
    A, B, C, D = given
    n, p, m = len(A), *D.shape
    pencil = np.block([[A, B], [C, D]])
    mass = np.zeros_like(pencil)
    mass[:n, :n] = np.eye(n)
    # Singular at any s (a transfer function of lower rank): what QZ says of such a pencil means nothing.
    if la.svdvals(pencil - (0.3 + 0.4j) * mass)[-1] < 1e-12 * la.norm(pencil):
        return
    if p != m:
        # A random pencil that is not square loses rank at the modes its longer side can't help: those that the inputs
        # can't move when there are more inputs, those that the outputs don't show when there are more outputs.
        _, c, o, neither = line["parts"]
        hidden = (o if m > p else c) + neither
        expect("zeros: count, not square", line["at"], float(len(matrix(line["invariant_zeros"])) != hidden), 0.0)
        expect("transmission zeros, not square", line["at"], float(len(matrix(line["transmission_zeros"]))), 0.0)
        return
    ours = complex_list(line["invariant_zeros"])
    with np.errstate(all="ignore"):
        theirs = la.eigvals(pencil, mass)
    # Infinite zeros of order two come out near sqrt(1 / eps) times the norm; finite ones stay far below its root.
    bound = 1e4 * la.norm(pencil)
    theirs = theirs[np.isfinite(theirs)]
    expect("zeros: count", line["at"], float(len(ours) != (np.abs(theirs) < bound).sum()), 0.0)
    if len(ours) > len(theirs):
        return
    for z, other, off in matched(ours, theirs):
        u, s, vh = la.svd(pencil - z * mass)
        # Condition of a simple generalised eigenvalue: ||pencil|| / |y' mass x|.
        slope = abs(u[:, -1].conj() @ mass @ vh[-1].conj())
        size = la.norm(pencil) + abs(z)
        expect("zeros", line["at"], off, 100 * n * EPS * size / max(slope, 1e-300))
        expect("zeros: the pencil is singular there", line["at"], s[-1], 100 * n * EPS * size)


def gramians(line, given):
    if "Wc" not in line:
        return
    A, B, C, _ = given
    ours = matrix(line["Wc"]), matrix(line["Wo"])
    discrete = bool(line["period_s"])
    solve = la.solve_discrete_lyapunov if discrete else (lambda a, q: la.solve_continuous_lyapunov(a, -q))
    theirs = solve(A, B @ B.T), solve(A.T, C.T @ C)
    for name, x, y, a, q in (("Gramian Wc", ours[0], theirs[0], A, B @ B.T), ("Gramian Wo", ours[1], theirs[1], A.T, C.T @ C)):
        # The equation magnifies by 1 / sep; its Kronecker form tells it exactly at these sizes.
        one = np.eye(len(A))
        kron = np.kron(a, a) - np.kron(one, one) if discrete else np.kron(a, one) + np.kron(one, a)
        s = la.svdvals(kron)
        expect(name, line["at"], la.norm(x - y), 10 * len(A) * EPS * s[0] / s[-1] * max(la.norm(y), 1e-300))
    hankel = np.sort(matrix(line["hankel"]).ravel())[::-1]
    product = np.sqrt(np.maximum(np.linalg.eigvals(theirs[0] @ theirs[1]).real, 0.0))
    product = np.sort(product)[::-1][: len(hankel)]
    if len(hankel):
        # Squares are compared: those are what rounding of the Gramians moves, by eps times the product of their norms
        # and the condition of the product's eigenvectors, taken as 1e3.
        size = la.norm(theirs[0], 2) * la.norm(theirs[1], 2)
        expect("Hankel singular values", line["at"], np.abs(hankel ** 2 - product ** 2).max(), 1e3 * len(A) * EPS * size)


def discretised(line, given):
    if line["period_s"]:
        return
    for name, method in (("zero_order_hold", "zoh"), ("euler", "euler"), ("tustin", "bilinear")):
        theirs = scipy.signal.cont2discrete(tuple(given), 0.05, method=method)[:4]
        for letter, x, y in zip("ABCD", system(line, name), theirs):
            # ||A|| T is below 1 here: nothing is magnified.
            expect(f"{name} {letter}", line["at"], la.norm(x - y), 100 * EPS * max(1.0, la.norm(y)))


def forms(line, given):
    A, B, C, D = given
    minimal = system(line, "minimal")
    expect("minimal order", line["at"], float(len(minimal[0]) != line["parts"][0]), 0.0)
    same_plant("minimal", line, given, minimal, 10.0)
    for name in ("kalman", "modal"):
        T = matrix(line[f"{name}_T"])
        form = system(line, name)
        condition = np.linalg.cond(T)
        expect(f"{name}: A T = T A_z", line["at"], la.norm(A @ T - T @ form[0]),
               1e2 * len(A) * EPS * condition * la.norm(A) * la.norm(T))
        same_plant(name, line, given, form, condition ** 2)
    at = 1.0 if line["period_s"] else 0.0
    shifted = at * np.eye(len(A)) - A
    expect("DC gain", line["at"], la.norm(gain(A, B, C, D, at) - matrix(line["dc_gain"])),
           100 * EPS * np.linalg.cond(shifted) * (la.norm(D) + la.norm(B) * la.norm(C) / la.svdvals(shifted)[-1]))
    if "balanced_A" in line:
        form = system(line, "balanced")
        radius = np.abs(la.eigvals(A)).max()
        hankel = matrix(line["hankel"]).ravel()
        for angle in (0.3, 1.1, 1.9, 2.7):
            s = 1.5 * radius * np.exp(1j * angle) if line["period_s"] else 1.5j * radius * angle
            # States below n sqrt(eps) of the largest value are left out: twice their sum (Glover 1984), no more.
            # Beside that the rounding of C (s - A)^-1 B, whose parts may cancel to nothing.
            rounding = 100 * EPS * la.norm(B) * la.norm(C) / la.svdvals(s * np.eye(len(A)) - A)[-1]
            floor = len(A) * np.sqrt(EPS) * hankel.max(initial=0.0)
            expect("balanced: transfer function", line["at"], la.norm(gain(*given, s) - gain(*form, s)),
                   2 * len(A) * floor + 1e-10 * la.norm(gain(*given, s)) + rounding)


def main():
    tool, seed, count = sys.argv[1:]
    text = subprocess.run([tool, seed, count], check=True, capture_output=True, text=True).stdout
    lines = [json.loads(line) for line in text.splitlines()]
    expect("systems", -1, abs(len(lines) - int(count)), 0.0)
    for line in lines:
        given = system(line, "given")
        values = poles(line, given[0])
        ranks(line, given, values)
        zeros(line, given)
        gramians(line, given)
        discretised(line, given)
        forms(line, given)
    for name, ratio in sorted(worst.items()):
        print(f"{name:36} largest error / allowed {ratio:.2g}")
    print(f"{len(lines)} systems, {failed} failed")
    return 1 if failed or not lines else 0


sys.exit(main())
