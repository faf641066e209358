"""Checks kneewise's states, currents and potentials against solvers of another kind: mixed-integer programming
(scipy.optimize.milp) and complementary pivoting.

    python check_states.py PATH-OF-KNEEWISE      answers from `kneewise states - --format json`
    python check_states.py exact                 answers from the tests' own enumeration, to check that

The networks come from `cargo run --example networks`. Ends with a line `N passed, N failed`."""

import json
import pathlib
import subprocess
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
        return [] if answer["verdict"] == "none" else [f"there is no solution, yet the verdict is {answer['verdict']}"]
    if answer["verdict"] not in ("unique", "shared", "floating", "shared+floating"):
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


def networks(*arguments):
    """Records of the generator."""
    home = pathlib.Path(__file__).parents[2]
    command = ["cargo", "run", "--quiet", "--example", "networks", "--", *arguments]
    lines = subprocess.run(command, cwd=home, check=True, stdout=subprocess.PIPE).stdout
    return [json.loads(line) for line in lines.splitlines()]


def ask(kneewise, text):
    """The nominal case of kneewise's own JSON, every quantity as an interval."""
    command = [kneewise, "states", "-", "--format", "json"]
    run = subprocess.run(command, input=text.encode(), stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    if run.returncode not in (0, 1):
        raise RuntimeError(f"kneewise ended with {run.returncode}: {run.stderr.decode()}\n{text}")
    case = json.loads(run.stdout)["cases"][0]
    solution = (case["solutions"] or [{"diodes": [], "nodes": []}])[0]

    def interval(value, ends):
        return [value, value] if value is not None else ends

    return {
        "verdict": case["verdict"],
        "states": {d["name"]: d["state"] for d in solution["diodes"]},
        "currents": {d["name"]: interval(d["current_A"], d["current_range_A"]) for d in solution["diodes"]},
        "potentials": {n["name"]: interval(n["voltage_V"], n["range_V"]) for n in solution["nodes"]},
    }


def compare(title, records, solver):
    """Passed and failed."""
    start, passed, failed, other = time.monotonic(), 0, 0, 0
    for record in records:
        net = Network(record)
        x = solver(net)
        if x is NotImplemented:
            other += 1
            continue
        found = differences(net, x, record["answer"])
        passed, failed = passed + (not found), failed + bool(found)
        if found and failed <= 5:
            print(f"{title}\n{record['text']}  " + "\n  ".join(found), file=sys.stderr)
    seconds = time.monotonic() - start
    print(f"{title}: {passed} agree, {failed} differ, {other} not for this solver, {seconds:.0f} s")
    return passed, failed


def main(kneewise):
    exact = ["--exact"] if kneewise == "exact" else []
    small = networks(*exact, "1500")
    large = networks("--first", "100000", "--diodes", "12..40", "300") if not exact else []
    hard = networks("--families") if not exact else []
    if not exact:
        kneewise = str(pathlib.Path(kneewise).resolve())
        for record in small + large + hard:
            record["answer"] = ask(kneewise, record["text"])
    results = [
        compare("small networks by mixed-integer programming", small, milp.solve),
        compare("small networks by complementary pivoting", small, lemke.solve),
        compare("networks of 12 to 40 diodes by mixed-integer programming", large[:20], milp.solve),
        compare("networks of 12 to 40 diodes by complementary pivoting", large, lemke.solve),
        compare("hard families by complementary pivoting", hard, lemke.solve),
    ]
    passed, failed = (sum(column) for column in zip(*results))
    print(f"{passed} passed, {failed} failed")
    return 1 if failed or not passed else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1]))
