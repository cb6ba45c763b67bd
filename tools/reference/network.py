"""A stage file as a network of resistors, capacitors, triodes and fixed potentials, nodes by name.

Reads the stage file by itself (tomllib), so that a slip in the program's reader or network shows as a disagreement.
Handles what the reference stages use; anything else is an error, never a guess.
"""

import tomllib

from tubes import Triode

GROUND = "0"
SIGNAL = "in"
PREFIXES = {"p": 1e-12, "n": 1e-9, "u": 1e-6, "m": 1e-3, "R": 1.0, "k": 1e3, "M": 1e6}


def value(entry):
    """A number, an IEC 60062 string such as "4k7", or a part table's `value`, in SI units."""
    if isinstance(entry, dict):
        return value(entry["value"])
    if isinstance(entry, str):
        for letter, factor in PREFIXES.items():
            if letter in entry:
                return float(entry.replace(letter, ".").rstrip(".")) * factor
    return float(entry)


class Network:
    """Parts between named nodes; `fixed` maps a node to its potential in volts, `None` for the signal."""

    def __init__(self):
        self.resistors = []
        self.capacitors = []
        self.triodes = []  # (grid, plate, cathode, Triode)
        self.fixed = {GROUND: 0.0}

    def resistor(self, a, b, ohms):
        if not ohms > 0:
            raise ValueError(f"resistor from {a} to {b}: {ohms} ohms; merge the nodes instead")
        self.resistors.append((a, b, ohms))

    def capacitor(self, a, b, farads):
        if not farads > 0:
            raise ValueError(f"capacitor from {a} to {b}: {farads} F")
        self.capacitors.append((a, b, farads))

    def triode(self, grid, plate, cathode, tube):
        capacitance = tube["capacitance"]
        self.capacitor(grid, cathode, capacitance["grid_cathode"])
        self.capacitor(grid, plate, capacitance["grid_plate"])
        self.capacitor(plate, cathode, capacitance["plate_cathode"])
        self.triodes.append((grid, plate, cathode, Triode(tube["model"], tube["parameters"])))

    def nodes(self):
        """Every node whose potential is to be found, in the order of first mention."""
        names = {}
        for a, b, _ in self.resistors + self.capacitors:
            names[a] = names[b] = True
        return [name for name in names if name not in self.fixed]


def read(path):
    """The network of the stage file at `path`."""
    with open(path, "rb") as file:
        stage = tomllib.load(file)
    tubes = {tube["type"]: tube for tube in stage["tube"]}
    net = Network()
    net.fixed[SIGNAL] = None
    net.fixed["supply"] = value(stage["supply"]["voltage"])
    net.resistor("supply", "B", value(stage["supply"]["resistance"]))
    net.capacitor("B", GROUND, value(stage["supply"]["reservoir"]))
    _input(net, stage)
    _gain(net, stage["gain"], tubes)
    _output(net, stage, _follower(net, stage, tubes))
    return net


def _input(net, stage):
    net.resistor(SIGNAL, "a", value(stage["source"]["resistance"]))
    wiper = "a"
    pot = stage["input"].get("pot")
    if pot:
        if pot.get("taper", "linear") != "linear":
            raise ValueError(f"taper {pot['taper']}")
        wiper = "w"
        net.resistor("a", wiper, (1 - pot["position"]) * value(pot["resistance"]))
        net.resistor(wiper, GROUND, pot["position"] * value(pot["resistance"]))
    if "grid_leak" in stage["input"]:
        net.resistor(wiper, GROUND, value(stage["input"]["grid_leak"]))
    net.resistor(wiper, "g1", value(stage["input"]["grid_stopper"]))


def _gain(net, gain, tubes):
    net.resistor("B", "p1", value(gain["plate_resistor"]))
    net.resistor("k1", GROUND, value(gain["cathode_resistor"]))
    net.triode("g1", "p1", "k1", tubes[gain["tube"]])
    bypass = gain.get("bypass")
    if bypass and (bypass["engaged"] or "trickle_resistor" in bypass):
        series = value(bypass["esr"]) + (0.0 if bypass["engaged"] else value(bypass["trickle_resistor"]))
        net.capacitor("k1", "bypass", value(bypass["capacitance"]))
        net.resistor("bypass", GROUND, series)


def _follower(net, stage, tubes):
    """Adds the follower, where there is one, and returns the node that the output is taken from."""
    if "follower" not in stage:
        return "p1"
    follower, coupling = stage["follower"], stage["coupling"]
    junction = "j" if "bias_resistor" in follower else "k2"
    if junction == "j":
        net.resistor("k2", "j", value(follower["bias_resistor"]))
    net.resistor(junction, GROUND, value(follower["tail_resistor"]))
    if coupling["kind"] == "direct":
        net.resistor("p1", "g2", value(coupling["grid_stopper"]))
    else:
        net.capacitor("p1", "x", value(coupling["capacitor"]))
        net.resistor("x", "g2", value(coupling["grid_stopper"]))
        leak_end = {"ground": GROUND, "bias-junction": junction}[coupling["returns_to"]]
        net.resistor("x", leak_end, value(coupling["grid_leak"]))
    net.triode("g2", "B", "k2", tubes[follower["tube"]])
    return "k2"


def _output(net, stage, source):
    output = stage["output"]
    net.capacitor(source, "o", value(output["capacitor"]))
    net.resistor("o", GROUND, value(output["bleed"]))
    net.resistor("o", GROUND, value(output["load"]["resistance"]))
    if "capacitance" in output["load"]:
        net.capacitor("o", GROUND, value(output["load"]["capacitance"]))
