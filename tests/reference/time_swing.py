"""Time for each simulated period of a bridge rectifier with reservoir: kneewise against SciPy's Radau at rtol 1e-6.

Both in one run on one machine. kneewise steps through many periods of a span that is asked for, its start and the reading of
the text measured apart and taken off; SciPy integrates the exponential law of the same circuit for a few periods.

usage: time_swing.py KNEEWISE
"""

import subprocess
import sys
import time

import numpy as np
from scipy.integrate import solve_ivp

NVT, IS, CREST, HERTZ, FARADS, OHMS, SERIES = 2 * 1.9 * 0.025865, 2.6e-9, 16.9706, 50.0, 1e-3, 150.0, 0.1
NETLIST = """t
V1 p n SIN(0 16.9706 50)
D1 p out DX
D2 n out DX
D3 0 p DX
D4 0 n DX
C1 out 0 1000u
R1 out 0 150
.tran 10u {stop}
.model DX D
*@ drop DX 0.7
"""


def kneewise(program, periods):
    text = NETLIST.format(stop=periods / HERTZ)
    best = float("inf")
    for _ in range(5):
        begun = time.perf_counter()
        subprocess.run([program, "swing", "-", "--format", "json"], input=text, text=True, capture_output=True, check=False)
        best = min(best, time.perf_counter() - begun)
    return best


def current(volts):
    """i = IS*(exp((volts - SERIES*i)/NVT) - 1) by Newton's method."""
    i = max(0.0, (volts - 1.4) / SERIES)
    for _ in range(30):
        e = IS * np.exp(min((volts - SERIES * i) / NVT, 200.0))
        step = (e - IS - i) / (1 + e * SERIES / NVT)
        i += step
        if abs(step) < 1e-12 + 1e-9 * abs(i):
            break
    return i


def radau(periods):
    def rate(t, x):
        return [(current(abs(CREST * np.sin(2 * np.pi * HERTZ * t)) - x[0]) - x[0] / OHMS) / FARADS]

    best = float("inf")
    for _ in range(3):
        begun = time.perf_counter()
        solve_ivp(rate, (0, periods / HERTZ), [15.0], method="Radau", rtol=1e-6, atol=1e-9, max_step=1 / HERTZ / 50)
        best = min(best, time.perf_counter() - begun)
    return best / periods


def main():
    program = sys.argv[1]
    few, many = 50, 2050
    ours = (kneewise(program, many) - kneewise(program, few)) / (many - few)
    theirs = radau(5)
    print(f"a period takes kneewise {1e6 * ours:.1f} us and SciPy's Radau {1e6 * theirs:.0f} us: {theirs / ours:.0f} times as long")
    sys.exit(0 if theirs >= 20 * ours else 1)


if __name__ == "__main__":
    main()
