"""Checks kneewise's states, currents and potentials against solvers of another kind: mixed-integer programming
(scipy.optimize.milp) and complementary pivoting. Arguments are SOLVER=FILE with the JSON lines of `cargo run --example
networks`; ends with a line `N passed, N failed`."""

import json
import sys
import time

import lemke
import milp
from network import MILLI, Network

NEAR = 1e-6


def within(value, interval, scale):
    """Whether a value lies in [low, high], null being unbounded."""
    if interval is None:
        return False
    low, high = interval
    slack = NEAR * max(scale, abs(value))
    return (low is None or value >= low - slack) and (high is None or value <= high + slack)


def ideal(e):
    return e["drop"] == 0 and e["series"] == 0


def differences(net, x, answer):
    """What of a solution does not lie within the answer."""
    if x is None:
        return [] if answer["verdict"] == "None" else [f"there is no solution, yet the verdict is {answer['verdict']}"]
    if answer["verdict"] not in ("Unique", "Shared", "Floating", "SharedFloating"):
        return [f"there is a solution, yet the verdict is {answer['verdict']}"]
    found = []
    for node, name in enumerate(net.record["nodes"][1:]):
        if not within(x[node], answer["potentials"].get(name), 1.0):
            found.append(f"v({name}) = {x[node]:.9g}, got {answer['potentials'].get(name)}")
    for k in net.diodes:
        e = net.elements[k]
        # what merely circulates among ideal diodes is left out of an answer, not of a program's point
        if ideal(e) and sum(ideal(net.elements[other]) for other in net.diodes) > 1:
            continue
        current = x[net.nodes + k] / MILLI
        got = answer["currents"].get(e["name"])
        if not within(current, got, 1e-3):
            found.append(f"i({e['name']}) = {current:.9g}, got {got}")
        state = "conducting" if current > NEAR else "breakdown" if current < -NEAR else None
        if state and answer["states"].get(e["name"]) not in (state, "open"):
            found.append(f"{e['name']} is {state}, got {answer['states'].get(e['name'])}")
    return found


def check(record, solver):
    net = Network(record)
    x = solver(net)
    return NotImplemented if x is NotImplemented else differences(net, x, record["answer"])


SOLVERS = {"milp": milp.solve, "lemke": lemke.solve}


def main(jobs):
    passed = failed = 0
    for job in jobs:
        name, path = job.split("=", 1)
        start, good, bad, other = time.monotonic(), 0, 0, 0
        with open(path, encoding="utf-8") as lines:
            for line in lines:
                record = json.loads(line)
                found = check(record, SOLVERS[name])
                if found is NotImplemented:
                    other += 1
                elif found:
                    bad += 1
                    if bad <= 5:
                        print(f"{name} differs on\n{record['text']}  " + "\n  ".join(found), file=sys.stderr)
                else:
                    good += 1
        seconds = time.monotonic() - start
        print(f"{path} by {name}: {good} agree, {bad} differ, {other} not for this solver, {seconds:.0f} s")
        passed, failed = passed + good, failed + bad
    print(f"{passed} passed, {failed} failed")
    return 1 if failed or not passed else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
