"""Computes sparse-solves.json with SciPy. From the top of the repository:

    npx tsc -p tests/benchmarks
    mkdir /tmp/cases && node tests/benchmarks/dist/tests/references/sparse-solves-export.js /tmp/cases
    python3 tests/references/sparse-solves.py /tmp/cases > tests/references/sparse-solves.json

Solutions come from SciPy's SuperLU with partial pivoting on the equilibrated matrix, refined with residuals in
extended precision until they stand still, so that their own error is far below what the test allows.
"""
import json
import os
import sys

import numpy as np
import scipy
import scipy.sparse as sp
import scipy.sparse.linalg as spla

FOLDER = sys.argv[1]


def read(path):
    with open(path, "rb") as file:
        real = lambda count: np.fromfile(file, float, count)
        order, entries, weights = (int(v) for v in np.fromfile(file, np.int32, 3))
        start = np.fromfile(file, np.int32, order + 1)
        index = np.fromfile(file, np.int32, entries)
        complex_of = lambda count: real(count) + 1j * real(count)
        csc = lambda values: sp.csc_matrix((values, index, start), shape=(order, order))
        dynamic, undamped = csc(complex_of(entries)), csc(real(entries))
        vectors = [complex_of(order) for _ in range(1 + weights)]
    return dynamic, undamped, vectors[0], vectors[1:]


def equilibration(a):
    modulus = abs(a).tocoo()
    rows, cols, data = modulus.row[modulus.data > 0], modulus.col[modulus.data > 0], modulus.data[modulus.data > 0]
    d = np.ones(a.shape[0])
    for _ in range(8):
        most = np.zeros(a.shape[0])
        scaled = data * d[rows] * d[cols]
        np.maximum.at(most, rows, scaled)
        np.maximum.at(most, cols, scaled)
        d /= np.sqrt(np.where(most > 0, most, 1))
    return 2.0 ** np.round(np.log2(d))


class Solver:
    def __init__(self, a):
        self.a, self.d = a.tocsc(), equilibration(a)
        self.scaled = (sp.diags(self.d) @ a @ sp.diags(self.d)).tocsc()
        self.lu = spla.splu(self.scaled)
        self.norm = abs(self.scaled).sum(axis=1).max()
        coo = self.scaled.tocoo()
        self.entries = coo.row, coo.col, coo.data.astype(np.clongdouble)

    def solve(self, b):
        """Refined in extended precision; returns x = D y."""
        row, col, data = self.entries
        right = (self.d * b).astype(np.clongdouble)
        y = np.zeros(len(b), np.clongdouble)
        for _ in range(60):
            product = np.zeros(len(b), np.clongdouble)
            np.add.at(product, row, data * y[col])
            residual = right - product
            # A thousandth of what the test allows; extended precision reaches 1e-19.
            if abs(residual).max() <= 1e-17 * (self.norm * abs(y).max() + abs(right).max()):
                return (self.d * y).astype(complex)
            residual = residual.astype(complex)
            if np.iscomplexobj(self.scaled.data):
                y = y + self.lu.solve(residual)
            else:
                y = y + self.lu.solve(residual.real) + 1j * self.lu.solve(residual.imag)
        raise RuntimeError("refinement did not settle")


def sensitivity(solver, transposed, w, x, b):
    """|w·δx| ≤ η × this for every x whose normwise backward error is η, given or equilibrated units."""
    y = transposed.solve(w)
    norm = lambda a: abs(a).sum(axis=1).max()
    given = abs(y).sum() * (norm(solver.a) * abs(x).max() + abs(b).max())
    d = solver.d
    scaled = (abs(y) / d).sum() * (norm(solver.scaled) * (abs(x) / d).max() + (d * abs(b)).max())
    return min(given, scaled)


def functionals(a, right, weights):
    solver, transposed = Solver(a), Solver(a.T.tocsc())
    x = solver.solve(right)
    return [
        {"re": v.real, "im": v.imag, "sensitivity": sensitivity(solver, transposed, w, x, right)}
        for w in weights
        for v in [w @ x]
    ]


def determinant(a):
    d = equilibration(a)
    scaled = (sp.diags(d) @ a @ sp.diags(d)).toarray()
    sign, log = np.linalg.slogdet(scaled)
    # |δ ln det| ≤ ε Σ |A⁻¹|ᵀ |A| when every entry changes by at most ε of itself.
    spread = (abs(np.linalg.inv(scaled)).T * abs(scaled)).sum()
    return {"logAbs": log - 2 * np.log(d).sum(), "phase": float(np.angle(sign)), "sensitivity": spread}


def inertia(a):
    d = equilibration(a)
    eigenvalues = np.linalg.eigvalsh((sp.diags(d) @ a @ sp.diags(d)).toarray())
    return {
        "negative": int((eigenvalues < 0).sum()),
        "positive": int((eigenvalues > 0).sum()),
        "smallest": float(abs(eigenvalues).min() / abs(eigenvalues).max()),
    }


def reference(name):
    dynamic, undamped, right, weights = read(os.path.join(FOLDER, name))
    return {
        "name": name,
        "order": dynamic.shape[0],
        "entries": int(dynamic.nnz),
        "sums": [float(abs(dynamic.data.real).sum()), float(abs(dynamic.data.imag).sum()), float(abs(undamped.data).sum())],
        "solve": functionals(dynamic, right, weights),
        "adjoint": functionals(dynamic.conj().T.tocsc(), right, weights),
        "determinant": determinant(dynamic),
        "symmetric": functionals(undamped, right.real + 0j, [w.real + 0j for w in weights]),
        "inertia": inertia(undamped),
    }


print(json.dumps({
    "what": "Numbers Σ wᵢ xᵢ of solutions of A x = b and Aᴴ x = b, determinants and inertias of the matrices in sparse-solves-cases.ts",
    "source": f"SciPy {scipy.__version__}, NumPy {np.__version__}, by sparse-solves.py",
    "cases": [reference(name) for name in sorted(os.listdir(FOLDER))],
}, indent=1, ensure_ascii=False))
