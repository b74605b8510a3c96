"""Recomputes gains, Riccati solutions, poles and responses of random systems with SciPy and with exact fractions.

    design_scipy.py DESIGN_SAMPLES SEED COUNT

Tolerance: two backward stable solvers may differ by what a relative change of the data of 1e-12 does to the answer (a few thousand
roundings, n^2 of them being usual at order 12); that is measured, by solving with data so changed.
"""
import json
import subprocess
import sys
import warnings
from fractions import Fraction

import numpy as np
import scipy.linalg as la
import scipy.signal

CHANGE = 1e-12
FLOOR = 1e-13  # a well-conditioned answer still rounds in its last digits
rng = np.random.default_rng(7)
failures, worst = [], {}


def shaken(m):
    return m * (1 + CHANGE * rng.uniform(-1, 1, m.shape))


def symmetric_shaken(m):
    m = shaken(m)
    return (m + m.T) / 2


def distance(a, b):
    return np.linalg.norm(a - b) / max(np.linalg.norm(b), 1e-300)


def sorted_poles(values, like):
    """values in the order of the nearest of `like`, each taken once."""
    left, out = list(values), []
    for p in like:
        k = int(np.argmin([abs(q - p) for q in left]))
        out.append(left.pop(k))
    return np.array(out)


def judge(what, case, ours, solve, data):
    """solve(*data) is the reference; data are (matrix, shaker) pairs."""
    reference = solve(*[m for m, _ in data])
    if "poles" in what:
        reference = sorted_poles(reference, ours)
    moved = 0.0
    for _ in range(3):
        other = solve(*[shake(m) for m, shake in data])
        moved = max(moved, distance(sorted_poles(other, reference) if "poles" in what else other, reference))
    found, allowed = distance(ours, reference), max(FLOOR, 3 * moved)
    worst[what] = max(worst.get(what, (0, 0)), (found / allowed, found))
    if not found <= allowed:
        failures.append(f"case {case}: {what} differs by {found:.2e}, allowed {allowed:.2e}")
    return moved


def fine_solve(M, right):
    """One step of refinement in long double."""
    first = la.solve(M.astype(float), right.astype(float)).astype(np.longdouble)
    return first + la.solve(M.astype(float), (right - M @ first).astype(float))


def regulator(discrete):
    """SciPy's solution, then two Newton steps whose residual is computed in long double: its own loses up to four digits here."""
    def solve(*data):
        A, B, Q, R, N = data
        X = (la.solve_discrete_are if discrete else la.solve_continuous_are)(A, B, Q, R, s=N).astype(np.longdouble)
        A, B, Q, R, N = (m.astype(np.longdouble) for m in data)
        gain = lambda X: fine_solve(R + B.T @ X @ B, B.T @ X @ A + N.T) if discrete else fine_solve(R, B.T @ X + N.T)
        for _ in range(2):
            K = gain(X)
            closed = A - B @ K
            left = Q + K.T @ R @ K - N @ K - K.T @ N.T
            left += closed.T @ X @ closed - X if discrete else closed.T @ X + X @ closed
            left, closed = left.astype(float), closed.astype(float)
            X = X + (la.solve_discrete_lyapunov(closed.T, left) if discrete else la.solve_continuous_lyapunov(closed.T, -left))
            X = (X + X.T) / 2
        return X.astype(float), gain(X).astype(float)
    return solve


def closed_poles(discrete):
    solve = regulator(discrete)
    return lambda A, B, Q, R, N, change: la.eigvals(A - B @ (solve(A, B, Q, R, N)[1] + change))


def gain_error(K, moved):
    """An error of K of the size that the data's change makes, in any direction: poles of A - B K follow K wherever it errs, while the data's
    change moves A, B and K together."""
    def shake(zero):
        change = rng.uniform(-1, 1, zero.shape)
        return change * moved * np.linalg.norm(K) / np.linalg.norm(change)
    return [(np.zeros(K.shape), shake)]


def exact_gain(A, b, poles):
    """Ackermann's formula in fractions: no rounding at all."""
    n = len(A)
    A = [[Fraction(x) for x in row] for row in A]
    times = lambda v: [sum(v[i] * A[i][j] for i in range(n)) for j in range(n)]
    columns, v = [], [Fraction(x) for x in b]
    for _ in range(n):
        columns.append(v)
        v = [sum(A[i][j] * v[j] for j in range(n)) for i in range(n)]
    # row C^-1 e_n': row . columns[k] = (k == n - 1)
    M = [columns[k] + [Fraction(int(k == n - 1))] for k in range(n)]
    for c in range(n):
        pivot = next(r for r in range(c, n) if M[r][c] != 0)
        M[c], M[pivot] = M[pivot], M[c]
        M[c] = [x / M[c][c] for x in M[c]]
        for r in range(n):
            if r != c and M[r][c] != 0:
                f = M[r][c]
                M[r] = [x - f * y for x, y in zip(M[r], M[c])]
    row = [M[i][n] for i in range(n)]
    for re, im in poles:
        re, im = Fraction(re), Fraction(im)
        if im == 0:
            row = [x - re * y for x, y in zip(times(row), row)]
        elif im > 0:
            once = times(row)
            row = [x - 2 * re * y + (re * re + im * im) * z for x, y, z in zip(times(once), once, row)]
    return np.array([[float(x) for x in row]])


def responses(discrete, step):
    def solve(A, B, C, D):
        if not discrete:
            A, B, C, D, _ = scipy.signal.cont2discrete((A, B, C, D), step, method="zoh")
        x, rows = np.zeros(len(A)), []
        for _ in range(11):
            rows.append(C @ x + D[:, 0])
            x = A @ x + B[:, 0]
        return np.array(rows)
    return solve


def main():
    program, seed, count = sys.argv[1:4]
    cases = json.loads(subprocess.run([program, seed, count], check=True, capture_output=True).stdout)
    assert len(cases) == int(count)
    ratios = []
    warnings.simplefilter("ignore")  # SciPy's ascent stops where it may: its result counts
    for i, c in enumerate(cases):
        A, B, C, D, Q, R, N, W, V = (np.array(c[k], float) for k in "A B C D Q R N W V".split())
        discrete = bool(c["discrete"])
        full, sym = lambda *ms: [(m, shaken) for m in ms], lambda *ms: [(m, symmetric_shaken) for m in ms]
        poles = lambda key: np.array([complex(*p) for p in c[key]["poles"]])
        solve = regulator(discrete)
        data = full(A, B) + sym(Q, R) + full(N)
        judge("lqr P", i, np.array(c["lqr"]["P"]), lambda *d: solve(*d)[0], data)
        K = np.array(c["lqr"]["K"])
        moved = judge("lqr K", i, K, lambda *d: solve(*d)[1], data)
        judge("lqr poles", i, poles("lqr"), closed_poles(discrete), data + gain_error(K, moved))
        none = full(np.zeros((len(A), len(C))))
        dual = full(A.T, C.T) + sym(W, V) + none
        judge("kalman P", i, np.array(c["kalman"]["P"]), lambda *d: solve(*d)[0], dual)
        L = np.array(c["kalman"]["L"])
        moved = judge("kalman L", i, L, lambda *d: solve(*d)[1].T, dual)
        judge("kalman poles", i, poles("kalman"), closed_poles(discrete), dual + gain_error(L.T, moved))
        judge("step", i, np.array(c["step"]), responses(discrete, .1), full(A, B, C, D))
        w = c["frequency"]
        z = np.exp(.1j * w) if discrete else 1j * w
        judge("frequency", i, np.array(c["re"]) + 1j * np.array(c["im"]),
              lambda A, B, C, D: C @ la.solve(z * np.eye(len(A)) - A, B) + D, full(A, B, C, D))
        if c["reference_gain"]:
            K = np.array(c["lqr"]["K"])
            def inverse_dc(A, B, C, D):
                return la.inv((C - D @ K) @ la.solve(np.eye(len(A)) * discrete - A + B @ K, B) + D)
            judge("reference gain", i, np.array(c["reference_gain"]), inverse_dc, full(A, B, C, D))
        wished, K = c["place"]["wished"], np.array(c["place"]["K"])
        wanted = np.array([complex(*p) for p in wished])
        if B.shape[1] == 1:
            judge("place K, one input", i, K, lambda A, B: exact_gain(A.tolist(), B[:, 0].tolist(), wished), full(A, B))
        else:
            got = la.eigvals(A - B @ K)
            # Bauer and Fike: a pole moves by kappa_2(X) times what rounds in A - B K.
            allowed = 1e-14 * c["place"]["condition"] * (np.linalg.norm(A) + np.linalg.norm(B @ K))
            error = np.max(abs(sorted_poles(got, wanted) - wanted))
            if not error <= allowed:
                failures.append(f"case {i}: placed poles off by {error:.2e}, allowed {allowed:.2e}")
            other = scipy.signal.place_poles(A, B, wanted, method="YT", maxiter=30)
            X = other.X / np.linalg.norm(other.X, axis=0)
            ratios.append(c["place"]["condition"] / np.linalg.cond(X))
    for what, (share, found) in sorted(worst.items()):
        print(f"{what}: largest share of the tolerance {share:.2g}, difference {found:.1e}")
    ratios.sort()
    print(f"kappa_2 of robust placement over SciPy's: median {ratios[len(ratios) // 2]:.3f}, "
          f"smallest {ratios[0]:.3f}, largest {ratios[-1]:.3f} of {len(ratios)}")
    # The same aim by the same kind of ascent: the typical case must be as good, no single one far worse.
    if ratios[len(ratios) // 2] > 1.01 or ratios[-1] > 3:
        failures.append("eigenvectors are worse conditioned than SciPy's")
    print("\n".join(failures) or f"{len(cases)} systems agree")
    return 1 if failures else 0


if __name__ == "__main__":
    sys.exit(main())
