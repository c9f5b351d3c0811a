#!/usr/bin/python3
"""The solver's chemistry of a day against SciPy, from the equations as text.

    tests/check_chemistry.py [TEST_CHEMISTRY]

Has the program test_chemistry (default: tests/test_chemistry beside $SKYMEND) write five layers'
reactions as equations with their coefficients, reads the equations itself, integrates them with
SciPy's Radau at relative tolerance 1e-9 and compares noon and midnight. Prints "ok NAME" or
"not ok NAME" per check; exit status 1 when one is not ok.
"""

import csv
import os
import re
import subprocess
import sys
import tempfile

import numpy as np
from scipy.integrate import solve_ivp

ASKED = 1e-6  # relative tolerance of the solver in write_case of test_chemistry.c
BOUND = 100 * ASKED  # ten times asked, times some e-folds of what decays after dusk
SMALL = 1.0  # cm-3: 100 times the solver's absolute tolerance
LANES = {0: 15, 2: 25, 4: 35, 5: 45, 7: 60}  # lane of the pack in test_chemistry.c: altitude, km
FIXED = {"M", "O2", "N2", "hv"}  # no rows of the state: folded into the coefficient
UNFOLLOWED = {"Fx", "CH3OH", "(washout)"}  # products without a row


def read_side(text, index):
    """Species numbers, repeated by their coefficients, of one side of an equation."""
    found = []
    for term in re.split(r"\s\+\s", text.strip()):
        match = re.fullmatch(r"(?:(\d+)\s+)?(\S+)", term.strip())
        if not match:
            raise ValueError(f"cannot read {term!r}")
        count, name = int(match.group(1) or 1), match.group(2)
        if name in index:
            found += [index[name]] * count
        elif name not in FIXED | UNFOLLOWED:
            raise ValueError(f"no species {name!r}")
    return found


def read_equation(name, equation, index):
    """What the rate multiplies, and net change [species], of an equation."""
    plain = re.sub(r"\{[^}]*\}|\(\+M\)", "", equation)  # {+ O2} and (+M) set no rate here
    left, right = re.sub(r"\s+", " ", plain).split("->")
    reactants, products = read_side(left, index), read_side(right, index)
    change = np.zeros(len(index))
    np.add.at(change, products, 1.0)
    np.add.at(change, reactants, -1.0)
    if name.startswith("het-"):  # uptake: the particle's water is in the coefficient
        reactants = [s for s in reactants if s != index["H2O"]]
    return reactants, change


class Chemistry:
    def __init__(self, folder):
        with open(os.path.join(folder, "states.csv"), encoding="utf-8") as file:
            rows = list(csv.reader(file, delimiter=";"))[1:]
        self.name = [row[0] for row in rows]
        self.start, self.noon, self.midnight = np.array([row[1:] for row in rows], dtype=float).T
        index = {name: s for s, name in enumerate(self.name)}
        with open(os.path.join(folder, "reactions.csv"), encoding="utf-8") as file:
            rows = list(csv.reader(file, delimiter=";"))
        self.time = np.array(rows[0][2:], dtype=float).reshape(-1, 2)  # [segment] start, end
        self.coefficient = np.array([row[2:] for row in rows[1:]], dtype=float)
        parsed = [read_equation(row[0], row[1], index) for row in rows[1:]]
        self.change = np.array([change for _, change in parsed]).T  # [species][reaction]
        ones = len(self.name)  # the row that stands in where there is no second or third reactant
        self.reactant = np.full((len(parsed), 3), ones)
        for r, (reactants, _) in enumerate(parsed):
            self.reactant[r, : len(reactants)] = reactants

    def coefficients(self, segment, t):
        first, last = self.coefficient[:, 2 * segment], self.coefficient[:, 2 * segment + 1]
        start, end = self.time[segment]
        return first + (last - first) * (t - start) / (end - start)

    def tendency(self, segment, t, y):
        reactants = np.append(y, 1.0)[self.reactant]
        return self.change @ (self.coefficients(segment, t) * reactants.prod(axis=1))

    def jacobian(self, segment, t, y):
        reactants, k = np.append(y, 1.0)[self.reactant], self.coefficients(segment, t)
        slope = np.zeros((len(k), len(y) + 1))  # d(rate)/d(species)
        for i in range(3):
            others = np.delete(reactants, i, axis=1).prod(axis=1)
            np.add.at(slope, (np.arange(len(k)), self.reactant[:, i]), k * others)
        return self.change @ slope[:, :-1]

    def integrate(self, y, first, last):
        for segment in range(first, last):
            start, end = self.time[segment]
            done = solve_ivp(lambda t, y: self.tendency(segment, start + t, y), (0, end - start), y,
                             method="Radau", jac=lambda t, y: self.jacobian(segment, start + t, y),
                             rtol=1e-9, atol=1e-5, first_step=1e-8)
            if not done.success:
                raise RuntimeError(f"SciPy: {done.message}")
            y = done.y[:, -1]
        return y


def compare(what, chemistry, got, want):
    error = np.abs(got - want) / (np.abs(want) + SMALL / BOUND)
    worst = int(np.argmax(np.where(np.isnan(error), np.inf, error)))
    good = bool(np.all(error <= BOUND))
    print(f"{'ok' if good else 'not ok'} {what} (worst {chemistry.name[worst]}: {got[worst]:.8g}, "
          f"SciPy {want[worst]:.8g}, {error[worst]:.1e})")
    return good


def main(arguments):
    beside = os.path.join(os.path.dirname(os.environ.get("SKYMEND", "")), "tests", "test_chemistry")
    program = arguments[0] if arguments else beside
    good = True
    for lane, altitude in LANES.items():
        with tempfile.TemporaryDirectory(dir=os.environ.get("TEST_DIR")) as folder:
            subprocess.run([os.path.abspath(program)], check=True, timeout=600,
                           env={**os.environ, "SKYMEND_CHEMISTRY_CASE": folder, "SKYMEND_CHEMISTRY_LANE": str(lane)})
            chemistry = Chemistry(folder)
        half = len(chemistry.time) // 2
        noon = chemistry.integrate(chemistry.start, 0, half)
        midnight = chemistry.integrate(noon, half, len(chemistry.time))
        good &= compare(f"{altitude} km, chemistry at noon", chemistry, chemistry.noon, noon)
        good &= compare(f"{altitude} km, chemistry at midnight", chemistry, chemistry.midnight, midnight)
        changed = np.abs(chemistry.noon - chemistry.start) > 0.1 * (np.abs(chemistry.start) + 1.0)
        enough = changed.sum() > 15  # else the comparison says little
        print(f"{'ok' if enough else 'not ok'} {altitude} km, something happened ({changed.sum()} species changed by a tenth)")
        good &= enough
    return 0 if good else 1


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
