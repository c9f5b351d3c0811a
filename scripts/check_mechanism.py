#!/usr/bin/python3
"""Check a Skymend mechanism file without the program, and print its rate coefficients.

    scripts/check_mechanism.py [FILE] [--temperature K] [--density CM3] [--water CM3]
                               [--tables DIR] [--reference CSV] [--quiet]

An independent reading of the format: atoms on both sides of every equation, unknown and unused
species, repeated names, keys each rate law wants, branching sums, sources. --tables names the
folder holding xs/ and yield/ and checks that every table named exists; --reference compares with
the rows k298-* of a CSV of published values (columns id, value, low, high).
Only the core of Python is used. Exit status 1 when anything is wrong.
"""

import math
import os
import re
import sys

REFERENCE_T = 298.0
LAWS = {  # required keys, optional keys
    "arrhenius": ({"A", "ER"}, {"n", "Tref"}),
    "termolecular": ({"A", "ER"}, {"n", "Tref"}),
    "falloff": ({"k0", "n0", "ki", "ni"}, {"Tref"}),
    "activated": ({"A", "ER", "k0", "n0", "ki", "ni"}, {"Tref"}),
    "equilibrium": ({"forward", "KA", "KB"}, set()),
    "HO2+HO2": ({"A1", "ER1", "A2", "ER2", "AW", "ERW"}, set()),
    "OH+HNO3": ({"AA", "ERA", "AB", "ERB", "AC", "ERC"}, set()),
    "sum2": ({"A1", "ER1", "A2", "ER2"}, set()),
}
COMMON_KEYS = {"id", "eq", "law", "branch", "f", "g", "source", "basis", "note"}
PHOTOLYSIS_KEYS = {"id", "eq", "xs", "yield", "yield_minus", "phi", "special", "f", "source",
                   "basis", "note"}
SURFACE_KEYS = {"id", "eq", "model", "gamma", "f", "source", "basis", "note"}
SPECIES_KEYS = {"name", "formula", "role", "share", "transport", "washout", "note"}
SURFACE_MODELS = {"constant", "ClONO2+H2O", "ClONO2+HCl", "HOCl+HCl", "BrONO2+H2O", "N2O5+H2O",
                  "NAT+H2O", "NAT+HCl"}
SURFACE_GAMMA = {"constant", "NAT+H2O", "NAT+HCl"}  # models whose probability stands in the file
SPECIALS = {"O2", "O2-O1D", "NO"}


# ---- reading ------------------------------------------------------------------------------------

TOKEN = re.compile(r'''(?P<skip>\s+|//[^\n]*|\#[^\n]*|/\*.*?\*/)
                     |(?P<string>"(?:\\.|[^"\\])*")
                     |(?P<number>[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?)
                     |(?P<word>[A-Za-z][A-Za-z0-9_*-]*)
                     |(?P<mark>[=:;,(){}\[\]])''', re.X | re.S)


def read_tokens(text):
    """List of (kind, text, line); the last one is ("end", "", line)."""
    tokens, at, line = [], 0, 1
    while at < len(text):
        match = TOKEN.match(text, at)
        if not match:
            sys.exit("line %d: cannot read %r" % (line, text[at:at + 20]))
        if match.lastgroup != "skip":
            tokens.append((match.lastgroup, match.group(), line))
        line += match.group().count("\n")
        at = match.end()
    tokens.append(("end", "", line))
    return tokens


class Reader:
    """Recursive descent over the tokens; groups become dicts that remember their line."""

    def __init__(self, tokens):
        self.tokens, self.at = tokens, 0

    def take(self, wanted=None):
        kind, text, line = self.tokens[self.at]
        if wanted and text != wanted:
            sys.exit("line %d: expected %s, found %r" % (line, wanted, text))
        self.at += 1
        return kind, text, line

    def peek(self):
        return self.tokens[self.at][1] if self.tokens[self.at][0] != "string" else "string"

    def read_settings(self, closing):
        group = {"": self.tokens[self.at][2]}
        while self.peek() != closing:
            kind, key, line = self.take()
            if kind != "word":
                sys.exit("line %d: expected a key, found %r" % (line, key))
            if key in group:
                sys.exit("line %d: key %s is given twice" % (line, key))
            if self.take()[1] not in "=:":
                sys.exit("line %d: expected = after %s" % (line, key))
            group[key] = self.read_value()
            if self.peek() in (";", ","):
                self.take()
        return group

    def read_value(self):
        kind, text, line = self.take()
        if kind == "string":
            parts = [text[1:-1]]
            while self.tokens[self.at][0] == "string":
                parts.append(self.take()[1][1:-1])
            return "".join(parts)
        if kind == "number":
            return float(text) if re.search(r"[.eE]", text) else int(text)
        if text in ("true", "false"):
            return text == "true"
        if text == "{":
            group = self.read_settings("}")
            self.take("}")
            return group
        if text in "([":
            closing, items = {"(": ")", "[": "]"}[text], []
            while self.peek() != closing:
                items.append(self.read_value())
                if self.peek() == ",":
                    self.take()
            self.take(closing)
            return items
        sys.exit("line %d: expected a value, found %r" % (line, text))


# ---- equations ----------------------------------------------------------------------------------

def count_atoms(formula):
    """{element: count} of a formula without brackets."""
    atoms = {}
    for element, count in re.findall(r"([A-Z][a-z]?)(\d*)", formula):
        atoms[element] = atoms.get(element, 0) + int(count or 1)
    return atoms


def read_side(text):
    """{name: count} of 'A + 2 B'."""
    side = {}
    for term in re.split(r"\s+\+\s+", text.strip()):
        match = re.fullmatch(r"(?:(\d+)\s+)?(\S+)", term.strip())
        if not match:
            raise ValueError("cannot read the term %r" % term)
        side[match.group(2)] = side.get(match.group(2), 0) + int(match.group(1) or 1)
    return side


def read_equation(text):
    """(reactants, taken up, products) of an equation; (+M) is dropped, hv is kept."""
    text = re.sub(r"\(\+M\)", "", text)
    left, arrow, right = text.partition("->")
    if not arrow:
        raise ValueError("no ->")
    braces = re.findall(r"\{\s*\+?\s*([^}]*)\}", left)
    left = re.sub(r"\{[^}]*\}", "", left)
    taken = {}
    for brace in braces:
        for name, count in read_side(brace).items():
            taken[name] = taken.get(name, 0) + count
    return read_side(left), taken, read_side(right)


# ---- rate coefficients --------------------------------------------------------------------------

def get_k(reaction, by_id, temperature, density, water):
    """Rate coefficient with its branching share, in cm3 s-1 (s-1 decomposition, cm6 s-1 with M)."""
    law, tref = reaction["law"], reaction.get("Tref", REFERENCE_T)

    def exponential(a, e):
        return reaction[a] * math.exp(-reaction[e] / temperature)

    def limits():
        ratio = temperature / tref
        low = reaction["k0"] * ratio ** -reaction["n0"] * density
        high = reaction["ki"] * ratio ** -reaction["ni"]
        broad = 0.6 ** (1.0 / (1.0 + math.log10(low / high) ** 2))
        return low / (1.0 + low / high) * broad, high

    if law in ("arrhenius", "termolecular"):
        k = exponential("A", "ER") * (temperature / tref) ** -reaction.get("n", 0.0)
    elif law == "falloff":
        k = limits()[0]
    elif law == "activated":
        association, high = limits()
        k = exponential("A", "ER") * (1.0 - association / high)
    elif law == "equilibrium":
        forward = get_k(by_id[reaction["forward"]], by_id, temperature, density, water)
        k = forward / (reaction["KA"] * math.exp(reaction["KB"] / temperature))
    elif law == "HO2+HO2":
        k = ((exponential("A1", "ER1") + density * exponential("A2", "ER2"))
             * (1.0 + water * exponential("AW", "ERW")))
    elif law == "OH+HNO3":
        third = density * exponential("AB", "ERB")
        k = exponential("AA", "ERA") + third / (1.0 + third / exponential("AC", "ERC"))
    else:
        k = exponential("A1", "ER1") + exponential("A2", "ER2")
    return k * reaction.get("branch", 1.0)


# ---- checks -------------------------------------------------------------------------------------

class Complaints:
    def __init__(self):
        self.count = 0

    def add(self, group, text):
        self.count += 1
        print("line %d: %s: %s" % (group.get("", 0), group.get("id", group.get("name", "?")), text))


def check_species(mechanism, bad):
    species = {}
    for entry in mechanism["species"]:
        name = entry["name"]
        if name in species:
            bad.add(entry, "given twice")
        species[name] = entry
        for key in set(entry) - SPECIES_KEYS - {""}:
            bad.add(entry, "unknown key %s" % key)
        role = entry.get("role", "active")
        if role not in ("active", "fixed", "inert"):
            bad.add(entry, "unknown role %s" % role)
        if (role == "fixed") != ("share" in entry):
            bad.add(entry, "share belongs to fixed species, and to each of them")
        if not 0.0 <= entry.get("washout", 0.0) <= 1.0:
            bad.add(entry, "washout outside 0..1")
        for element in count_atoms(entry["formula"]):
            if element not in mechanism["elements"]:
                bad.add(entry, "unknown element %s" % element)
    return species


def check_balance(entry, species, kind, bad):
    """Check one equation; return (reactants, taken up, products) or None."""
    try:
        sides = read_equation(entry["eq"])
    except ValueError as error:
        bad.add(entry, str(error))
        return None
    reactants, taken, products = sides
    if (kind == "photolysis") != (reactants.pop("hv", 0) == 1):
        bad.add(entry, "hv stands in photolysis equations only")
    unknown = [name for side in sides for name in side if name not in species]
    if unknown:
        bad.add(entry, "unknown species %s" % ", ".join(unknown))
        return None
    difference = {}
    for sign, side in ((1, reactants), (1, taken), (-1, products)):
        for name, count in side.items():
            for element, number in count_atoms(species[name]["formula"]).items():
                difference[element] = difference.get(element, 0) + sign * count * number
    wrong = {element: n for element, n in difference.items() if n}
    if wrong:
        bad.add(entry, "not balanced, left minus right: %s" % wrong)
    if sum(reactants.values()) > 3:
        bad.add(entry, "more than three reactants")
    for name in reactants:
        if species[name].get("role") == "inert":
            bad.add(entry, "the inert species %s reacts" % name)
    for name in taken:
        if species[name].get("role") != "fixed" or name == "M":
            bad.add(entry, "%s may not stand in braces" % name)
    if reactants.get("M", 0) != products.get("M", 0):
        bad.add(entry, "M on one side only")
    return sides


def check_thermal(entry, by_id, sides, bad):
    law = entry.get("law")
    if law not in LAWS:
        bad.add(entry, "unknown law %s" % law)
        return
    required, optional = LAWS[law]
    for key in required - set(entry):
        bad.add(entry, "%s is missing for law %s" % (key, law))
    for key in set(entry) - required - optional - COMMON_KEYS - {""}:
        bad.add(entry, "unknown key %s for law %s" % (key, law))
    if law == "equilibrium":
        forward = by_id.get(entry["forward"])
        if not forward or forward["law"] != "falloff":
            bad.add(entry, "forward names no fall-off reaction")
        else:
            start, _, end = read_equation(forward["eq"])
            if (start, end) != (sides[2], sides[0]):
                bad.add(entry, "is not the reverse of %s" % entry["forward"])
    if (law == "termolecular") != ("M" in sides[0]):
        bad.add(entry, "M as a reactant and law termolecular go together")
    if ("(+M)" in entry["eq"]) != (law in ("falloff", "equilibrium")):
        bad.add(entry, "(+M) and laws falloff, equilibrium go together")
    if not 0.0 <= entry.get("branch", 1.0) <= 1.0:
        bad.add(entry, "branch outside 0..1")


def check_photolysis(entry, tables, bad):
    for key in set(entry) - PHOTOLYSIS_KEYS - {""}:
        bad.add(entry, "unknown key %s" % key)
    if "special" in entry:
        if entry["special"] not in SPECIALS:
            bad.add(entry, "unknown special %s" % entry["special"])
        return
    if "xs" not in entry or sum(key in entry for key in ("yield", "yield_minus", "phi")) != 1:
        bad.add(entry, "wants xs and one of yield, yield_minus, phi")
    for folder, key in (("xs", "xs"), ("yield", "yield"), ("yield", "yield_minus")):
        if tables and key in entry:
            path = os.path.join(tables, folder, entry[key] + ".csv")
            if not os.path.exists(path):
                bad.add(entry, "no table %s" % path)


def check_shares(entries, sides_of, key, bad):
    """Constant shares of one reactant set and one coefficient must add to 1."""
    sums = {}
    for entry in entries:
        if key in entry and entry["id"] in sides_of:
            reactants = tuple(sorted(sides_of[entry["id"]][0].items()))
            label = (reactants, entry.get("A"), entry.get("ER"))
            sums.setdefault(label, []).append(entry)
    for group in sums.values():
        total = sum(entry[key] for entry in group)
        if abs(total - 1.0) > 1e-9:
            bad.add(group[0], "shares add to %.4g" % total)


def compare_reference(path, thermal, sides_of, by_id, bad):
    """Compare with the rows k298-A+B: all bimolecular channels of A + B together, at 298 K."""
    print("\n%-12s %10s %10s %10s %10s" % ("published", "here", "value", "low", "high"))
    with open(path, encoding="utf-8") as stream:
        rows = [[cell.strip('"') for cell in re.findall(r'"[^"]*"|[^,]+|(?<=,)(?=,)', line.strip())]
                for line in stream if not line.startswith("#")]
    columns = rows[0]
    for row in rows[1:]:
        cells = dict(zip(columns, row))
        if not cells["id"].startswith("k298-"):
            continue
        names = [n.replace("O1D", "O(1D)") for n in cells["id"][5:].split("+")]
        wanted = {}
        for name in names:
            wanted[name] = wanted.get(name, 0) + 1
        k = sum(get_k(r, by_id, REFERENCE_T, 2.46e19, 0.0) for r in thermal
                if r["law"] == "arrhenius" and sides_of[r["id"]][0] == wanted)
        inside = float(cells["low"]) <= k <= float(cells["high"])
        print("%-12s %10.3g %10s %10s %10s %s" % (cells["id"][5:], k, cells["value"], cells["low"],
                                                 cells["high"], "" if inside else "OUTSIDE"))
        if not inside:
            bad.add({"id": cells["id"]}, "outside the published range")


def main(arguments):
    options = {"--temperature": "298", "--density": "2.46e19", "--water": "0", "--tables": "",
               "--reference": ""}
    here = os.path.dirname(os.path.abspath(__file__))
    path, quiet = os.path.join(here, "..", "input", "data", "mechanism.cfg"), False
    while arguments:
        word = arguments.pop(0)
        if word == "--quiet":
            quiet = True
        elif word in options and arguments:
            options[word] = arguments.pop(0)
        elif word.startswith("-"):
            sys.exit(__doc__)
        else:
            path = word
    temperature, density, water = (float(options[key])
                                   for key in ("--temperature", "--density", "--water"))
    with open(path, encoding="utf-8") as stream:
        mechanism = Reader(read_tokens(stream.read())).read_settings("")

    bad = Complaints()
    species = check_species(mechanism, bad)
    keys = {source["key"] for source in mechanism["sources"]}
    thermal, photolysis, surface = (mechanism[k] for k in ("thermal", "photolysis", "surface"))
    by_id, sides_of, cited = {}, {}, set()
    for entry in thermal + photolysis + surface:
        if entry["id"] in by_id:
            bad.add(entry, "id given twice")
        by_id[entry["id"]] = entry
        key = entry.get("source", "").split(" ")[0]
        cited.add(key)
        if key not in keys:
            bad.add(entry, "unknown source %r" % key)
        if entry.get("f", 1.0) < 1.0 or entry.get("g", 0.0) < 0.0:
            bad.add(entry, "f below 1 or g below 0")
        for name, value in entry.items():
            if name and isinstance(value, int) and not isinstance(value, bool):
                bad.add(entry, "%s needs a decimal point" % name)
    for kind, entries in (("thermal", thermal), ("photolysis", photolysis), ("surface", surface)):
        for entry in entries:
            sides = check_balance(entry, species, kind, bad)
            if not sides:
                continue
            sides_of[entry["id"]] = sides
            if kind == "thermal":
                check_thermal(entry, by_id, sides, bad)
            elif kind == "photolysis":
                check_photolysis(entry, options["--tables"], bad)
            elif entry.get("model") not in SURFACE_MODELS or set(entry) - SURFACE_KEYS - {""}:
                bad.add(entry, "unknown model or key")
            elif ("gamma" in entry) != (entry["model"] in SURFACE_GAMMA):
                bad.add(entry, "gamma missing or not used by its model")
    check_shares(thermal, sides_of, "branch", bad)
    check_shares(photolysis, sides_of, "phi", bad)
    for key in keys - cited:
        bad.add({"id": key}, "source never cited")

    made = {n for sides in sides_of.values() for n in sides[2] if n not in sides[0]}
    lost = {n for sides in sides_of.values() for n in sides[0] if n not in sides[2]}
    for name, entry in species.items():
        role = entry.get("role", "active")
        if role == "active" and name not in lost:
            print("remark: nothing destroys %s" % name)
        if role == "inert" and name not in made or name not in made | lost | {"M"}:
            bad.add(entry, "unused")
    print("source gases (made by no reaction): %s"
          % ", ".join(n for n, e in species.items() if e.get("role", "active") == "active"
                      and n not in made))

    if not bad.count and not quiet:
        print("\nk at T = %g K, M = %g cm-3, branching included (cm3 s-1; s-1; cm6 s-1)"
              % (temperature, density))
        for reaction in thermal:
            print("%-24s %10.3e   %s" % (reaction["id"], get_k(reaction, by_id, temperature,
                                         density, water), reaction["eq"]))
    if not bad.count and options["--reference"]:
        compare_reference(options["--reference"], thermal, sides_of, by_id, bad)
    roles = [entry.get("role", "active") for entry in species.values()]
    print("\n%d species (%d active, %d fixed, %d inert); %d thermal, %d photolysis, %d surface "
          "reactions; %s" % (len(roles), roles.count("active"), roles.count("fixed"),
                             roles.count("inert"), len(thermal), len(photolysis), len(surface),
                             "%d complaints" % bad.count if bad.count else "nothing wrong"))
    return 1 if bad.count else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
