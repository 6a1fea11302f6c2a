"""Measures one native solver on a matrix written by run.ts and prints what row.ts calls a Row, or why it is absent.

Arguments: superlu or umfpack, the file (order, entries as int32; colStart, rowIndex as int32; re, im as float64),
the number of right-hand sides of the block, a limit of address space in bytes.
"""
import ctypes
import json
import resource
import sys
import time

PEER, PATH, BLOCK, LIMIT = sys.argv[1], sys.argv[2], int(sys.argv[3]), int(sys.argv[4])


def finish(result):
    print(json.dumps(result))
    sys.exit(0)


try:
    import numpy as np
    import scipy
    import scipy.sparse as sp
    import scipy.sparse.linalg as spla
except ImportError as missing:
    finish({"absent": f"{sys.executable}: {missing} (Debian: python3-scipy)"})


def read_matrix():
    with open(PATH, "rb") as file:
        order, entries = (int(v) for v in np.fromfile(file, np.int32, 2))
        start = np.fromfile(file, np.int32, order + 1)
        index = np.fromfile(file, np.int32, entries)
        values = np.empty(entries, complex)
        values.real = np.fromfile(file, float, entries)
        values.imag = np.fromfile(file, float, entries)
    return sp.csc_matrix((values, index, start), shape=(order, order))


def resident():
    with open("/proc/self/statm") as file:
        return int(file.read().split()[1]) * resource.getpagesize()


def peak_resident():
    return 1024 * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss


def timed(work):
    """Processor seconds, as in measure.ts."""
    start = time.process_time()
    result = work()
    return result, time.process_time() - start


def repeated(work, first):
    """As in measure.ts: more runs while they are short."""
    runs, spent = [first], first
    while len(runs) < 20 and spent < 4:
        runs.append(timed(work)[1])
        spent += runs[-1]
    return runs


def least(work):
    best, spent, runs = float("inf"), 0.0, 0
    while runs < 20 and spent < 2:
        seconds = timed(work)[1]
        best, spent, runs = min(best, seconds), spent + seconds, runs + 1
    return best


def backward_error(a, x, b):
    norm = abs(a).sum(axis=1).max()
    residual = abs(b - a @ x).max(axis=0)
    return float((residual / (norm * abs(x).max(axis=0) + abs(b).max(axis=0))).max())


def superlu(a, b):
    def options(order):
        return dict(permc_spec=order, diag_pivot_thresh=0.01, options=dict(SymmetricMode=True))

    before = resident()
    with_ordering = lambda: spla.splu(a, **options("MMD_AT_PLUS_A"))
    lu, whole = timed(with_ordering)
    one = least(lambda: lu.solve(b[:, 0]))
    block = least(lambda: lu.solve(b)) / BLOCK
    rise = peak_resident() - before
    x = lu.solve(b)
    below = np.diff(lu.L.indptr) - 1.0
    right = np.bincount(lu.U.tocsc().indices, minlength=a.shape[0]) - 1.0
    remark, ordering, runs = "", None, [whole]
    if whole < 30:
        # The same permutation applied beforehand leaves the numeric work alone.
        place = np.argsort(lu.perm_c)
        ordered = a[place][:, place].tocsc()
        ordered.sort_indices()
        natural = lambda: spla.splu(ordered, **options("NATURAL"))
        runs = repeated(natural, timed(natural)[1])
        ordering = max(0.0, min(repeated(with_ordering, whole)) - min(runs))
    else:
        remark = "factor includes ordering"
    return {
        "orderingS": ordering,
        "factorS": runs,
        "solveOneS": one,
        "solveBlockS": block,
        "bytes": None,
        "residentBytes": rise,
        "stored": int(lu.nnz),
        "operations": 8 * float(below @ right),
        "backwardError": backward_error(a, x, b),
        "remark": f"SciPy {scipy.__version__}" + (", " + remark if remark else ""),
    }


def load_umfpack():
    for name in ("libumfpack.so.6", "libumfpack.so.5", "libumfpack.so"):
        try:
            return ctypes.CDLL(name)
        except OSError as error:
            reason = error
    finish({"absent": f"{reason} (Debian: libsuitesparse-dev)"})


def blas_in_use():
    # SciPy's wheel brings an OpenBLAS of its own, which UMFPACK does not use.
    with open("/proc/self/maps") as file:
        paths = {line.split()[-1] for line in file if "blas" in line and "site-packages" not in line}
    return "OpenBLAS" if any("openblas" in path for path in paths) else "reference BLAS"


def umfpack(a, b):
    library = load_umfpack()
    doubles = lambda v: v.ctypes.data_as(ctypes.POINTER(ctypes.c_double))
    longs = lambda v: v.ctypes.data_as(ctypes.POINTER(ctypes.c_int64))
    order = ctypes.c_int64(a.shape[0])
    start, index = a.indptr.astype(np.int64), a.indices.astype(np.int64)
    re, im = np.ascontiguousarray(a.data.real), np.ascontiguousarray(a.data.imag)
    control, info = np.zeros(20), np.zeros(90)
    library.umfpack_zl_defaults(doubles(control))
    strategy, tolerance, ordering_at, refinements, symmetric_tolerance = 5, 3, 10, 7, 15
    control[strategy] = 3  # symmetric
    control[ordering_at] = 3  # METIS
    control[tolerance] = control[symmetric_tolerance] = 0.01
    control[refinements] = 0
    matrix = (longs(start), longs(index), doubles(re), doubles(im))

    def checked(status):
        if status != 0:
            finish({"absent": f"UMFPACK ended with status {status}" + (" (out of memory)" if status == -1 else "")})

    def analyse():
        symbolic = ctypes.c_void_p()
        checked(library.umfpack_zl_symbolic(
            order, order, *matrix, ctypes.byref(symbolic), doubles(control), doubles(info)))
        return symbolic

    before = resident()
    symbolic, ordering = timed(analyse)

    def factor():
        numeric = ctypes.c_void_p()
        checked(library.umfpack_zl_numeric(
            *matrix, symbolic, ctypes.byref(numeric), doubles(control), doubles(info)))
        return numeric

    def release(numeric):
        library.umfpack_zl_free_numeric(ctypes.byref(numeric))

    def solve(numeric, column):
        b_re, b_im = np.ascontiguousarray(column.real), np.ascontiguousarray(column.imag)
        x_re, x_im = np.empty_like(b_re), np.empty_like(b_im)
        checked(library.umfpack_zl_solve(
            ctypes.c_int64(0), *matrix, doubles(x_re), doubles(x_im), doubles(b_re), doubles(b_im),
            numeric, doubles(control), doubles(info)))
        return x_re + 1j * x_im

    numeric, first = timed(factor)
    unit = info[3]
    result = {"bytes": info[41] * unit, "stored": int(info[43] + info[44]) - a.shape[0], "operations": info[42]}
    one = least(lambda: solve(numeric, b[:, 0]))
    whole = lambda: np.stack([solve(numeric, b[:, c]) for c in range(BLOCK)], axis=1)
    block = least(whole) / BLOCK
    rise = peak_resident() - before
    x = whole()
    release(numeric)
    runs = repeated(lambda: release(factor()), first)
    used = {0: "AMD", 1: "AMD", 3: "METIS"}.get(int(info[19]), f"ordering {int(info[19])}")
    return {
        "orderingS": ordering,
        "factorS": runs,
        "solveOneS": one,
        "solveBlockS": block,
        "residentBytes": rise,
        "backwardError": backward_error(a, x, b),
        "remark": f"{used}, {blas_in_use()}, no block solves",
        **result,
    }


try:
    resource.setrlimit(resource.RLIMIT_AS, (LIMIT, LIMIT))
    matrix = read_matrix()
    random = np.random.default_rng(2)
    shape = (matrix.shape[0], BLOCK)
    right = random.uniform(-1, 1, shape) + 1j * random.uniform(-1, 1, shape)
    finish({"superlu": superlu, "umfpack": umfpack}[PEER](matrix, np.asfortranarray(right)))
except MemoryError:
    finish({"absent": f"more memory needed than the {LIMIT / 1e9:.1f} GB allowed"})
