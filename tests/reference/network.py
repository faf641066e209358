"""A network as the generator writes it, and its linear laws. Volts, milliamperes and kilohms throughout, so that the
numbers a solver with absolute tolerances sees are near one."""

import heapq

import numpy as np

MILLI = 1e3


class Network:
    """Unknowns: the potential of every node but ground, then the current of every element but capacitors."""

    def __init__(self, record):
        self.record = record
        self.nodes = len(record["nodes"]) - 1
        self.elements = [e for e in record["elements"] if e["name"][0] != "C"]
        self.size = self.nodes + len(self.elements)
        self.diodes = [k for k, e in enumerate(self.elements) if e["name"][0] == "D"]

    def voltage(self, k):
        """Row that gives the voltage across element k."""
        row = np.zeros(self.size)
        for node, sign in ((self.elements[k]["from"], 1.0), (self.elements[k]["to"], -1.0)):
            if node:
                row[node - 1] += sign
        return row

    def inner(self, k):
        """Row that gives the voltage of diode k without its series resistance."""
        row = self.voltage(k)
        row[self.nodes + k] -= self.elements[k]["series"] / MILLI
        return row

    def current(self, k):
        row = np.zeros(self.size)
        row[self.nodes + k] = 1.0
        return row

    def linear_laws(self):
        """Matrix and right-hand side of Kirchhoff's current law and of every element that is no diode."""
        rows, right = [], []
        for node in range(1, self.nodes + 1):
            row = np.zeros(self.size)
            for k, e in enumerate(self.elements):
                row[self.nodes + k] += (e["from"] == node) * 1.0 - (e["to"] == node) * 1.0
            rows.append(row)
            right.append(0.0)
        for k, e in enumerate(self.elements):
            letter = e["name"][0]
            if letter == "R":
                rows.append(self.voltage(k) - e["value"] / MILLI * self.current(k))
                right.append(0.0)
            elif letter == "V":
                rows.append(self.voltage(k))
                right.append(e["value"])
            elif letter == "L":
                rows.append(self.voltage(k))
                right.append(0.0)
            elif letter == "I":
                rows.append(self.current(k))
                right.append(e["value"] * MILLI)
        return np.array(rows), np.array(right)

    def voltage_bound(self):
        """More volts than any potential needs.

        Where every source of voltage stands on ground and resistors reach every node: across any level above the
        highest held potential everything flows down, and no more than the current sources push up, so no node lies
        higher than that potential plus this current times the resistance of its way to a held node. Elsewhere: all
        sources, all levels, and all currents through all resistances."""
        held = {0: 0.0}
        for e in self.elements:
            if e["name"][0] == "V" and 0 in (e["from"], e["to"]):
                held[e["from"] + e["to"]] = abs(e["value"])
            elif e["name"][0] in "VL":
                return self.loose_bound()
        reach = self.resistance_to(held)
        if len(reach) <= self.nodes:
            return self.loose_bound()
        current = sum(abs(e["value"]) for e in self.elements if e["name"][0] == "I") * MILLI
        return 1.0 + max(held.values()) + current * max(reach.values())

    def resistance_to(self, held):
        """Kilohms of the best way along resistors from each node to a held one."""
        ways = {node: [] for node in range(self.nodes + 1)}
        for e in self.elements:
            if e["name"][0] == "R":
                ways[e["from"]].append((e["to"], e["value"] / MILLI))
                ways[e["to"]].append((e["from"], e["value"] / MILLI))
        reach, heap = {}, [(0.0, node) for node in held]
        while heap:
            ohms, node = heapq.heappop(heap)
            if node not in reach:
                reach[node] = ohms
                for other, step in ways[node]:
                    heapq.heappush(heap, (ohms + step, other))
        return reach

    def loose_bound(self):
        volts, ohms, current = 1.0, 0.0, 0.0
        for e in self.elements:
            letter = e["name"][0]
            if letter == "V":
                volts += abs(e["value"])
            elif letter == "I":
                current += abs(e["value"]) * MILLI
            elif letter == "R":
                ohms += e["value"] / MILLI
            elif letter == "D":
                volts += e["drop"] + (e["breakdown"] or 0.0)
                ohms += e["series"] / MILLI
        return volts + current * ohms

    def current_bound(self):
        """More milliamperes than any branch needs."""
        ohms = [e["value"] for e in self.elements if e["name"][0] == "R" and e["value"] > 0]
        ohms += [e["series"] for e in self.elements if e["name"][0] == "D" and e["series"] > 0]
        current = sum(abs(e["value"]) for e in self.elements if e["name"][0] == "I") * MILLI
        return 1.0 + current + self.voltage_bound() * sum(MILLI / r for r in ohms)
