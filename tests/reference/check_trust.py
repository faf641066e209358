"""Checks the second opinion and the error bars of kneewise against the exponential law solved by SciPy.

    python check_trust.py PATH-OF-KNEEWISE [FIRST-SEED [NETWORKS]]

Random networks of 1 to 12 diodes with random models, supplies and temperatures. Those of one diode are solved in
closed form (Wright's omega, which is Lambert's W of an exponential), all others by scipy.optimize.root. Prints what the marks good, fair and poor are worth, and ends with a line
`N passed, N failed`."""

import json
import random
import subprocess
import sys

import numpy as np
from scipy import constants
from scipy.optimize import root
from scipy.special import wrightomega

KELVIN = constants.zero_Celsius
NEAR = 1e-6
STEEPEST = 60.0


def thermal(celsius):
    return constants.k / constants.e * (celsius + KELVIN)


class Diode:
    """One exponential junction at a temperature: IS(T) = IS (T/Tnom)^(XTI/N) exp(-EG/(N kT/q) (1 - T/Tnom))."""

    def __init__(self, rng, name, ends, celsius, known=True):
        self.name, self.ends, self.known = name, ends, known
        vt = thermal(celsius)
        self.area = rng.choice([1, 1, 1, 2, 10])
        self.rs = rng.choice([0.0, 10 ** rng.uniform(-2, 1)])
        self.bv = rng.choice([None, None, rng.uniform(2.5, 30)])
        self.nbv, self.ibv = 1.0, 1e-3
        text = []
        if known:
            saturation, n = 10 ** rng.uniform(-16, -7), rng.uniform(1.0, 2.0)
            gap, xti = rng.choice([(1.11, 3.0), (0.69, 2.0)])
            text += [f"IS={saturation:.6g}", f"N={n:.6g}", f"EG={gap}", f"XTI={xti}"]
            saturation, n = float(f"{saturation:.6g}"), float(f"{n:.6g}")
            ratio = (celsius + KELVIN) / (27 + KELVIN)
            move = ratio ** (xti / n) * np.exp(-gap / vt * (1 - ratio) / n)
            self.saturation, self.slope = saturation * self.area * move, n * vt
        else:
            # silicon: 0.7 V at 1 mA and 27 degrees, N = 1, -2 mV/K
            drop = 0.7 - 2e-3 * (celsius - 27)
            self.saturation, self.slope = 1e-3 / np.expm1(drop / vt), vt
        if self.rs:
            self.rs = float(f"{self.rs:.6g}")
            text.append(f"RS={self.rs:.6g}")
            self.rs /= self.area
        if self.bv:
            self.bv = float(f"{self.bv:.6g}")
            text.append(f"BV={self.bv:.6g}")
            if rng.random() < 0.5:
                self.nbv, self.ibv = 1.5, 1e-4
                text.append("IBV=1e-4 NBV=1.5")
            self.ibv *= self.area
            self.tail = self.nbv * vt
        self.model = " ".join(text)

    def card(self, nodes):
        a, c = (nodes[n] for n in self.ends)
        return [f"{self.name} {a} {c} M{self.name} {self.area}", f".model M{self.name} D({self.model})"]

    def law(self, x):
        """Current and conductance at the inner voltage x, continued along the tangent where it would overflow."""

        def steep(e):
            capped = np.exp(min(e, STEEPEST))
            return capped * (1 + max(e - STEEPEST, 0.0)), capped

        if x < self.slope:
            i, g = self.saturation * np.expm1(x / self.slope), self.saturation * np.exp(x / self.slope) / self.slope
        else:
            value, rate = steep(np.log(self.saturation) + x / self.slope)
            i, g = value - self.saturation, rate / self.slope
        if self.bv:
            value, rate = steep(np.log(self.ibv) - (x + self.bv) / self.tail)
            i, g = i - value, g + rate / self.tail
        return i, g


class Circuit:
    def __init__(self, seed, known=True):
        rng = random.Random(seed)
        self.celsius = rng.choice([27, 27, 27, round(rng.uniform(-40, 125))])
        count = rng.choice([1, 1, 2, 3, 4, 5, 6, 8, 10, 12])
        supplies = rng.choice([1, 1, 2])
        free = 1 if count == 1 else rng.randint(1, min(count + 1, 7))
        self.single = count == 1
        # node 0 is ground, then the supplies, then the free nodes
        self.held = [0.0] + [round(rng.choice([1, 1, -1]) * 10 ** rng.uniform(0, 1.4), 3) for _ in range(supplies)]
        self.nodes = ["0"] + [f"s{k}" for k in range(supplies)] + [f"n{k}" for k in range(free)]
        fixed = 1 + supplies
        self.resistors = []

        def resistor(a, b):
            self.resistors.append((a, b, float(f"{10 ** rng.uniform(1.5, 5.3):.4g}")))

        for k in range(free):
            resistor(rng.randrange(1, fixed + k), fixed + k)
        if self.single:
            self.resistors = self.resistors[:1]
            ends = [fixed, 0] if rng.random() < 0.85 else [0, fixed]
            self.diodes = [Diode(rng, "D1", ends, self.celsius, known)]
        else:
            for _ in range(rng.randint(1, free + 1)):
                a, b = rng.sample(range(len(self.nodes)), 2)
                if max(a, b) >= fixed:
                    resistor(a, b)
            self.diodes = []
            while len(self.diodes) < count:
                a, b = rng.sample(range(len(self.nodes)), 2)
                if max(a, b) < fixed:
                    continue
                self.diodes.append(Diode(rng, f"D{len(self.diodes) + 1}", (a, b), self.celsius, known))
        self.fixed = fixed
        self.seed = seed

    def text(self):
        lines = [f"random network {self.seed}", f".temp {self.celsius}"]
        lines += [f"V{k} {self.nodes[k]} 0 {self.held[k]}" for k in range(1, self.fixed)]
        lines += [f"R{k} {self.nodes[a]} {self.nodes[b]} {r}" for k, (a, b, r) in enumerate(self.resistors)]
        for d in self.diodes:
            lines += d.card(self.nodes)
        return "\n".join(lines + [".end", ""])

    def residual(self, z):
        """Kirchhoff's current law at the free nodes, each in volts across the resistors that meet there, then the
        voltage law of each diode; unknowns are the free potentials and the inner voltages."""
        free, count = len(self.nodes) - self.fixed, len(self.diodes)
        u = np.concatenate([self.held, z[:free]])
        f, jacobian = np.zeros(free + count), np.zeros((free + count, free + count))
        weight = np.zeros(free)
        for a, b, r in self.resistors:
            i = (u[a] - u[b]) / r
            for node, sign in ((a, 1), (b, -1)):
                row = node - self.fixed
                if row >= 0:
                    weight[row] += 1 / r
                    f[row] += sign * i
                    for other, way in ((a, 1), (b, -1)):
                        if other >= self.fixed:
                            jacobian[row, other - self.fixed] += sign * way / r
        for k, d in enumerate(self.diodes):
            i, g = d.law(z[free + k])
            a, b = d.ends
            f[free + k] = u[a] - u[b] - d.rs * i - z[free + k]
            jacobian[free + k, free + k] = -1 - d.rs * g
            for node, sign in ((a, 1), (b, -1)):
                row = node - self.fixed
                if row >= 0:
                    f[row] += sign * i
                    jacobian[row, free + k] += sign * g
                    jacobian[free + k, row] += sign
        f[:free] /= weight
        jacobian[:free] /= weight[:, None]
        return f, jacobian

    def solved(self):
        """Current of each diode; None where SciPy gives up."""
        if self.single:
            return self.closed()
        free = len(self.nodes) - self.fixed
        start = self.approach()
        with np.errstate(all="ignore"):
            answer = root(self.residual, start, jac=True, method="hybr", options={"xtol": 1e-14})
        z = answer.x
        for _ in range(4):
            z = z - self.step(z)
        if not np.abs(self.step(z)).max() < 1e-11:
            return None
        return [d.law(z[free + k])[0] for k, d in enumerate(self.diodes)]

    def approach(self):
        """Newton's method from nothing, no inner voltage leaping up its exponential: a start for SciPy."""
        free = len(self.nodes) - self.fixed
        z = np.zeros(free + len(self.diodes))
        for _ in range(400):
            step = -self.step(z)
            if not np.isfinite(step).all():
                break
            for k, d in enumerate(self.diodes):
                move = step[free + k]
                if move > d.slope and z[free + k] + move > 0:
                    z_up = max(z[free + k], 0.0)
                    step[free + k] = z_up - z[free + k] + d.slope * np.log1p(move / d.slope)
                elif d.bv and -move > d.tail and z[free + k] + move < -d.bv:
                    z_down = min(z[free + k], -d.bv)
                    step[free + k] = z_down - z[free + k] - d.tail * np.log1p(-move / d.tail)
            z = z + step
            if np.abs(step).max() < 1e-9:
                break
        return z

    def step(self, z):
        """What Newton's method would still move."""
        f, jacobian = self.residual(z)
        try:
            return np.linalg.solve(jacobian, f)
        except np.linalg.LinAlgError:
            return np.full(len(z), np.inf)

    def closed(self):
        d, (_, _, r) = self.diodes[0], self.resistors[0]
        seen = self.held[self.resistors[0][0]] * (1 if d.ends[0] else -1)
        ohms, s, sat = r + d.rs, d.slope, d.saturation
        if d.bv and seen < 0:
            # breakdown alone; the saturation current flows beside it
            log = np.log(ohms * d.ibv / d.tail) - (seen + ohms * sat + d.bv) / d.tail
            return [-(d.tail / ohms * wrightomega(log).real) - sat]
        log = np.log(ohms * sat / s) + (seen + ohms * sat) / s
        i = s / ohms * wrightomega(log).real - sat
        return [d.law(seen - ohms * i)[0] if abs(i) < 1e3 * sat else i]


class Table:
    """What the marks are worth."""

    def __init__(self):
        self.rows = []
        self.blocking = []

    def add(self, diode, exact, seed):
        error, bound = diode["current_error_A"], diode["leakage_bound_A"]
        if diode["state"] == "blocking":
            if bound is not None:
                self.blocking.append((abs(exact) <= bound * (1 + 1e-9), diode["trust"], seed, exact, bound))
        elif error is not None:
            told = diode["current_A"]
            off = abs(told - exact) / abs(exact) if exact * told > 0 else np.inf
            inside = abs(told - exact) <= error * (1 + 1e-9)
            self.rows.append((diode["state"], diode["trust"], inside, off, error / abs(told), seed, diode["name"]))

    def report(self):
        print("conducting and in breakdown, by mark:")
        for mark in ("good", "fair", "poor"):
            rows = [r for r in self.rows if r[1] == mark]
            if rows:
                off = [r[3] for r in rows]
                width = np.median([r[4] for r in rows])
                print(
                    f"  {mark}: {len(rows)}, inside {share(r[2] for r in rows):.1%}, median error {np.median(off):.2%},"
                    f" worst {max(off):.1%}, median half width {width:.2%}"
                )
        near = [r for r in self.rows if r[3] <= 0.05]
        far = [r for r in self.rows if r[3] > 0.20]
        good = [r for r in self.rows if r[1] == "good"]
        checks = [
            ("good ones inside their bar", share(r[2] for r in good), 0.98),
            ("all inside their bar", share(r[2] for r in self.rows), 0.95),
            ("median width of good bars under 5 %", float(2 * np.median([r[4] for r in good]) < 0.05), 1.0),
            ("within 5 % marked good", share(r[1] == "good" for r in near), 0.80),
            ("over 20 % off marked poor", share(r[1] == "poor" for r in far), 0.95),
            ("blocking under their leakage bound", share(b[0] for b in self.blocking), 0.98),
        ]
        for what, value, least in checks:
            print(f"  {what}: {value:.1%} (at least {least:.0%})")
        return [what for what, value, least in checks if value < least]


def share(truths):
    truths = list(truths)
    return sum(truths) / len(truths) if truths else 1.0


def asked(program, text):
    run = subprocess.run(
        [program, "states", "-", "--format", "json", "--fail-on", "error"], input=text, capture_output=True, text=True
    )
    return json.loads(run.stdout)["cases"][0]


def main(program, first=1, count=600):
    table, failed, passed, given_up, unlimited = Table(), 0, 0, 0, 0
    for seed in range(first, first + count):
        circuit = Circuit(seed, known=seed % 8 != 0)
        with np.errstate(all="ignore"):
            exact = circuit.solved()
        case = asked(program, circuit.text())
        if case["verdict"] == "none":
            # a diode straight across two supplies: unlimited current, no second opinion
            unlimited += 1
            continue
        if exact is None:
            given_up += 1
            continue
        if case["verdict"] != "unique":
            continue
        for diode, law, i in zip(case["solutions"][0]["diodes"], circuit.diodes, exact):
            refined = diode["refined"]
            if refined is None:
                failed += 1
                print(f"seed {seed}: no second opinion about {diode['name']}")
            elif abs(refined["current_A"] - i) <= NEAR * abs(i) + 1e-9 * law.saturation:
                passed += 1
            else:
                failed += 1
                print(f"seed {seed}: {diode['name']} carries {i:.9g}, told {refined['current_A']:.9g}")
            if law.known:
                table.add(diode, i, seed)
    print(f"networks from seed {first}: {count}, of unlimited current {unlimited}, given up by SciPy {given_up}")
    missed = table.report()
    for what in missed:
        print(f"missed: {what}")
    failed += len(missed)
    print(f"{passed} passed, {failed} failed")
    return table, failed


if __name__ == "__main__":
    sys.exit(1 if main(sys.argv[1], *map(int, sys.argv[2:]))[1] else 0)
