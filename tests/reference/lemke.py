"""Complementary pivoting (Lemke 1965; Cottle, Pang & Stone, The Linear Complementarity Problem, 1992, algorithm
4.4.5 with the lexicographic rule) on a network seen from its diodes. For the positive semidefinite matrices of passive
networks it ends in a solution, or in a ray where there is none."""

import numpy as np

TINY = 1e-11


def lemke(matrix, q):
    """z >= 0 with w = q + matrix z >= 0 and z·w = 0, or None where there is none."""
    m = len(q)
    if (q >= 0).all():
        return np.zeros(m)
    # rows: w - matrix z - z0 = q; columns: w, z, z0, q
    tableau = np.hstack([np.eye(m), -matrix, -np.ones((m, 1)), q[:, None]])
    basis = list(range(m))
    enters, row = 2 * m, int(np.argmin(q))
    for _ in range(60 * m + 200):
        leaves = basis[row]
        tableau[row] /= tableau[row, enters]
        others = np.arange(m) != row
        tableau[others] -= np.outer(tableau[others, enters], tableau[row])
        basis[row] = enters
        if leaves == 2 * m:
            z = np.zeros(2 * m + 1)
            z[basis] = tableau[:, -1]
            return z[m:2 * m]
        enters = leaves + m if leaves < m else leaves - m
        row = leaving(tableau, enters, basis, m)
        if row is None:
            return None
    raise RuntimeError("complementary pivoting did not end")


def leaving(tableau, enters, basis, m):
    """The row with the lexicographically least ratio; z0 first where it ties."""
    column = tableau[:, enters]
    rows = [r for r in range(m) if column[r] > TINY]
    if not rows:
        return None
    for place in [-1, *range(m)]:
        ratios = [tableau[r, place] / column[r] for r in rows]
        least = min(ratios)
        rows = [r for r, ratio in zip(rows, ratios) if ratio <= least + 1e-12 * (1 + abs(least))]
        if place == -1:
            for r in rows:
                if basis[r] == 2 * m:
                    return r
        if len(rows) == 1:
            break
    return rows[0]


def solve(net):
    """Potentials and diode currents, None where there is no solution, or NotImplemented where the network without
    its diodes has no unique answer of its own."""
    matrix, right = net.linear_laws()
    keep = [j for j in range(net.size) if j - net.nodes not in net.diodes]
    square, ports = matrix[:, keep], matrix[:, [net.nodes + k for k in net.diodes]]
    if square.shape[0] != square.shape[1] or np.linalg.cond(square) > 1e10:
        return NotImplemented
    still = np.linalg.solve(square, right)
    response = np.linalg.solve(square, -ports)
    across = np.array([net.voltage(k)[keep] for k in net.diodes])
    seen, resistance = across @ still, -(across @ response)
    resistance += np.diag([net.elements[k]["series"] / 1e3 for k in net.diodes])
    drops = np.array([net.elements[k]["drop"] for k in net.diodes])
    back = [j for j, k in enumerate(net.diodes) if net.elements[k]["breakdown"] is not None]
    levels = np.array([net.elements[net.diodes[j]]["breakdown"] for j in back])
    matrix = np.block([[resistance, -resistance[:, back]], [-resistance[back], resistance[np.ix_(back, back)]]])
    q = np.concatenate([drops - seen, levels + seen[back]])
    # what is nothing but rounding would pass for a resistance, or for a voltage left over
    matrix[np.abs(matrix) < 1e-12 * np.abs(matrix).max(initial=1.0)] = 0.0
    q[np.abs(q) < 1e-12 * np.abs(still).max(initial=1.0)] = 0.0
    z = lemke(matrix, q)
    if z is None:
        return None
    currents = z[:len(drops)].copy()
    currents[back] -= z[len(drops):]
    x = np.zeros(net.size)
    x[keep] = still + response @ currents
    x[[net.nodes + k for k in net.diodes]] = currents
    return x
