"""The comparison of docs/speed.md: a loop that factors once a frequency with SciPy's splu.

    python3 tests/bench/splu_loop.py time ladder 1000 2000     # seconds for 2000 frequencies
    python3 tests/bench/splu_loop.py text ladder 1000 > ladder.bfl

The second form writes the same network as a circuit text. Needs SciPy; nothing else uses it.
"""

import sys
import time


def ladder(steps):
    yield "V", "gnd", "n0", 10.0
    for i in range(steps):
        yield "L", f"n{i}", f"n{i+1}", 1e-6, 0.01
        yield "C", f"n{i+1}", "gnd", 1e-9
    yield "R", f"n{steps}", "gnd", 50.0


def grid(edge):
    yield "V", "gnd", "x0_0", 10.0
    for i in range(edge):
        for j in range(edge):
            if j + 1 < edge:
                yield "R", f"x{i}_{j}", f"x{i}_{j+1}", 10.0
            if i + 1 < edge:
                yield "L", f"x{i}_{j}", f"x{i+1}_{j}", 1e-6, 0.0
            yield "C", f"x{i}_{j}", "gnd", 1e-10
    yield "R", f"x{edge-1}_{edge-1}", "gnd", 50.0


def text(elements):
    last = None
    for number, (kind, left, right, value, *loss) in enumerate(elements):
        unit = {"V": "V", "L": "H", "C": "F", "R": "Ω"}[kind]
        mark = " +" if kind == "V" else ""
        esr = f", esr {loss[0]} Ω" if loss and loss[0] else ""
        print(f"{left} -( e{number}: {value} {unit}{esr}{mark})- {right}")
        last = left
    print(f"read out = volts({last})")


def timed(elements, points):
    import numpy as np
    import scipy.sparse as sp
    import scipy.sparse.linalg as sl

    elements = list(elements)
    names = {}
    for _, left, right, *_ in elements:
        for node in (left, right):
            if node != "gnd":
                names.setdefault(node, len(names))
    size = len(names)
    constant, slope, right_side = [], [], {}
    for kind, left, right, value, *loss in elements:
        a, b = names.get(left), names.get(right)
        if kind in "RC":
            entries, y = (constant, 1 / value) if kind == "R" else (slope, value)
            for p, q, sign in ((a, a, 1), (b, b, 1), (a, b, -1), (b, a, -1)):
                if p is not None and q is not None:
                    entries.append((p, q, sign * y))
            continue
        for node, sign in ((a, 1), (b, -1)):
            if node is not None:
                constant += [(node, size, sign), (size, node, sign)]
        if kind == "L":
            constant.append((size, size, -loss[0]))
            slope.append((size, size, -value))
        else:
            right_side[size] = -value
        size += 1

    def matrix(entries):
        rows, columns, values = zip(*entries)
        return sp.csc_matrix((values, (rows, columns)), shape=(size, size))

    constant, slope = matrix(constant), matrix(slope)
    b = np.zeros(size, complex)
    for row, value in right_side.items():
        b[row] = value
    begun = time.time()
    for frequency in np.logspace(4, 7, points):
        sl.splu((constant + 2j * np.pi * frequency * slope).tocsc()).solve(b)
    print(f"{size} unknowns, {points} frequencies: {time.time() - begun:.2f} s")


if __name__ == "__main__":
    task, kind, count = sys.argv[1], {"ladder": ladder, "grid": grid}[sys.argv[2]], int(sys.argv[3])
    if task == "text":
        text(kind(count))
    else:
        timed(kind(count), int(sys.argv[4]))
