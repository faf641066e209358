"""A network as a mixed-integer feasibility problem: two binaries a diode say which branch of its law holds."""

import numpy as np
from scipy.optimize import Bounds, LinearConstraint, linprog, milp

TIGHT = 1e-7
ROUNDS = 25


class Ends:
    """For each diode the least and greatest current and the least inner voltage of any solution."""

    def __init__(self, net):
        volts, amps = net.voltage_bound(), net.current_bound()
        breakdown = [net.elements[k]["breakdown"] for k in net.diodes]
        self.drop = np.array([net.elements[k]["drop"] for k in net.diodes])
        self.low = np.array([-2 * volts if b is None else -b for b in breakdown])
        self.most = np.full(len(breakdown), amps)
        self.least = np.array([0.0 if b is None else -amps for b in breakdown])

    def relaxation(self, net):
        """The diodes' laws without the choice: the triangles around their two legs."""
        rows, most = [], []
        for j, k in enumerate(net.diodes):
            u, i = net.inner(k), net.current(k)
            span = self.drop[j] - self.low[j]
            rows += [u, -u, i, -i]
            most += [self.drop[j], -self.low[j], self.most[j], -self.least[j]]
            if self.most[j] > 0:
                rows.append(i / self.most[j] - u / span)
                most.append(1 - self.drop[j] / span)
            if self.least[j] < 0:
                rows.append(i / self.least[j] + u / span)
                most.append(1 + self.low[j] / span)
        return np.array(rows), np.array(most)

    def tighten(self, net):
        """Moves each end in as far as the relaxation allows. Whether there is a solution at all is left to the
        program itself."""
        matrix, right = net.linear_laws()
        rows, most = self.relaxation(net)

        def greatest(row):
            result = linprog(-row, A_ub=rows, b_ub=most, A_eq=matrix, b_eq=right, bounds=(None, None))
            return -result.fun + 1e-6 if result.status == 0 else np.inf

        for j, k in enumerate(net.diodes):
            self.most[j] = max(0.0, min(self.most[j], greatest(net.current(k))))
            self.least[j] = min(0.0, max(self.least[j], -greatest(-net.current(k))))
            self.low[j] = min(max(self.low[j], -greatest(-net.inner(k))), self.drop[j] - 1e-3)


def assignment(net, ends, forbidden):
    """States (1 conducting, 0 blocking, -1 breakdown) of one solution, or None where there is none."""
    n, d = net.size, len(net.diodes)
    volts, amps = net.voltage_bound(), net.current_bound()
    matrix, right = net.linear_laws()
    wide = np.hstack([matrix, np.zeros((len(matrix), 2 * d))])
    constraints = [LinearConstraint(wide, right, right)]
    rows, low, high = [], [], []

    def add(row, on, off, least, most):
        """least <= row·x + on[1]·z[on[0]] + … <= most"""
        full = np.concatenate([row, np.zeros(2 * d)])
        for at, factor in (on, off):
            full[n + at] += factor
        rows.append(full)
        low.append(least)
        high.append(most)

    none = (0, 0.0)
    for j, k in enumerate(net.diodes):
        e = net.elements[k]
        conducts, breaks = j, d + j
        current, inner = net.current(k), net.inner(k)
        add(current, (conducts, -ends.most[j]), none, -np.inf, 0.0)
        add(current, (breaks, -ends.least[j]), none, 0.0, np.inf)
        add(inner, none, none, -np.inf, e["drop"])
        add(inner, (conducts, ends.low[j] - e["drop"]), none, ends.low[j], np.inf)
        if e["breakdown"] is not None:
            add(inner, none, none, -e["breakdown"], np.inf)
            span = e["drop"] + e["breakdown"]
            add(inner, (breaks, span), none, -np.inf, e["drop"])
        add(np.zeros(n), (conducts, 1.0), (breaks, 1.0), 0.0, 1.0)
    for states in forbidden:
        full = np.zeros(n + 2 * d)
        ones = 0
        for j, state in enumerate(states):
            for at, on in ((j, state == 1), (d + j, state == -1)):
                full[n + at] = -1.0 if on else 1.0
                ones += on
        rows.append(full)
        low.append(1.0 - ones)
        high.append(np.inf)
    constraints.append(LinearConstraint(np.array(rows), low, high))
    lower = np.concatenate([np.full(net.nodes, -volts), np.full(n - net.nodes, -amps), np.zeros(2 * d)])
    upper = np.concatenate([np.full(net.nodes, volts), np.full(n - net.nodes, amps), np.ones(2 * d)])
    for j, k in enumerate(net.diodes):
        if net.elements[k]["breakdown"] is None:
            upper[n + d + j] = 0.0
    whole = np.concatenate([np.zeros(n), np.ones(2 * d)])
    result = milp(np.zeros(n + 2 * d), constraints=constraints, integrality=whole, bounds=Bounds(lower, upper),
                  options={"time_limit": 20.0})
    if result.status == 2:
        return None
    if result.x is None:
        raise RuntimeError(f"no decision: {result.message}")
    z = np.rint(result.x[n:])
    return [int(z[j] - z[d + j]) for j in range(d)]


def point(net, states):
    """Potentials and currents with these states to full precision, or None where they do not hold after all."""
    matrix, right = net.linear_laws()
    rows, values, upper, most = [matrix], [right], [], []
    for state, k in zip(states, net.diodes):
        e = net.elements[k]
        inner, current = net.inner(k), net.current(k)
        if state == 0:
            rows.append(current[None])
            values.append([0.0])
            upper.append(inner)
            most.append(e["drop"])
            if e["breakdown"] is not None:
                upper.append(-inner)
                most.append(e["breakdown"])
        else:
            rows.append(inner[None])
            values.append([e["drop"] if state == 1 else -e["breakdown"]])
            upper.append(-state * current)
            most.append(0.0)
    equal, right = np.vstack(rows), np.concatenate(values)
    upper, most = np.array(upper), np.array(most)
    x, _, rank, _ = np.linalg.lstsq(equal, right, rcond=1e-12)
    if np.abs(equal @ x - right).max(initial=0.0) > TIGHT:
        return None
    if rank == net.size:
        return x if (upper @ x <= most + TIGHT).all() else None
    # something is left open: any point will do
    result = linprog(np.zeros(net.size), A_ub=upper, b_ub=most, A_eq=equal, b_eq=right, bounds=(None, None))
    return result.x if result.status == 0 else None


def solve(net):
    """One point of the solution set, or None. A binary that is nearly whole may hide a small current behind a large
    bound; such an assignment is solved again by itself, forbidden where it fails, and the search goes on."""
    forbidden, ends = [], Ends(net)
    for _ in range(4 if len(net.diodes) > 8 else 0):
        ends.tighten(net)
    while len(forbidden) < ROUNDS:
        states = assignment(net, ends, forbidden)
        if states is None:
            return None
        x = point(net, states)
        if x is not None:
            return x
        forbidden.append(states)
    raise RuntimeError("too many assignments failed")
