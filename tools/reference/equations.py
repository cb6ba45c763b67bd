"""A network's nodal equations as an ordinary differential equation in capacitor voltages.

With v the free node potentials, C and G the capacitance and conductance matrices, b the currents from the fixed
potentials through resistors, and i(v) what the triodes draw: C dv/dt + G v + i(v) = b(t).

C is singular: a node without a capacitor has no state, and capacitors that reach ground only through resistors move
together. So the capacitors' graph is cut into connected groups; in each, a spanning tree of capacitors carries the
states x (voltages across them or along the tree), and one potential z is common to the group. v = P x + N z with C N = 0. Every triode has its three
terminals in one group (its own capacitances tie them), so its currents cancel in the sum over a group, and
N' G v = N' b gives z by linear algebra alone. What is left, P' C P dx/dt = P' (b - G v - i), is an explicit ODE.
"""

import numpy as np
from scipy import linalg, optimize

from network import GROUND, SIGNAL

SMALL_CAPACITANCE = 1e-9  # F: above what tubes and wiring have, below any coupling capacitor


class Equations:
    """dx/dt = f(x, u) of a network, with u the potential of node `in` in volts."""

    def __init__(self, network):
        self.network = network
        self.nodes = network.nodes()
        self.index = {name: k for k, name in enumerate(self.nodes)}
        self._resistances()
        plates = self._incidence([(a, b) for a, b, _ in network.capacitors])
        self.capacitance = plates * [farads for _, _, farads in network.capacitors] @ plates.T
        self._reduce()

    def _incidence(self, branches):
        """A column a branch: +1 in the row of its first node, -1 in that of its second; fixed nodes have no row."""
        matrix = np.zeros((len(self.nodes), len(branches)))
        for column, (a, b) in enumerate(branches):
            for node, sign in ((a, 1.0), (b, -1.0)):
                if node in self.index:
                    matrix[self.index[node], column] += sign
        return matrix

    def _resistances(self):
        fixed = self.network.fixed
        branches = [(a, b) for a, b, _ in self.network.resistors]
        self.branch = self._incidence(branches)
        self.siemens = np.array([1 / ohms for _, _, ohms in self.network.resistors])
        # What the fixed potentials, and the signal per volt, add to each resistor's voltage.
        self.branch_fixed = np.array([(fixed.get(a) or 0.0) - (fixed.get(b) or 0.0) for a, b in branches])
        self.branch_signal = np.array([float(a == SIGNAL) - float(b == SIGNAL) for a, b in branches])
        self.conductance = self.branch * self.siemens @ self.branch.T
        self.from_fixed = -self.branch @ (self.siemens * self.branch_fixed)
        self.from_signal = -self.branch @ (self.siemens * self.branch_signal)

    def _groups(self):
        """Grows trees of capacitors, largest first, from ground and then from every node not yet reached.

        Returns for each node its group (0: tied to ground), and its potential against the group's root as a row over
        the states. A node reached through a large capacitor has that capacitor's voltage for a state; one reached
        through a small capacitor (a tube's, or wiring) has its own potential, because a sum of plate-sized voltages
        would drown the millivolts across a bypass capacitor's series resistance in rounding.
        """
        largest_first = sorted(self.network.capacitors, key=lambda part: -part[2])
        group, rows, states = {GROUND: 0}, {GROUND: {}}, 0
        for root in [GROUND, *self.nodes]:
            if root not in group:
                group[root], rows[root] = max(group.values()) + 1, {}
            elif root != GROUND:
                continue
            while step := self._next_step(largest_first, group):
                node, other, farads = step
                group[other] = group[node]
                rows[other] = {**(rows[node] if farads > SMALL_CAPACITANCE else {}), states: 1.0}
                states += 1
        return group, {node: [row.get(k, 0.0) for k in range(states)] for node, row in rows.items()}, states

    @staticmethod
    def _next_step(largest_first, group):
        """The largest capacitor with one end reached: (reached end, other end, farads), or None."""
        for a, b, farads in largest_first:
            if (a in group) != (b in group):
                return (a, b, farads) if a in group else (b, a, farads)
        return None

    def _reduce(self):
        group, rows, states = self._groups()
        free = max(group[node] for node in self.nodes)
        self.P = np.array([rows[node] for node in self.nodes])
        self.N = np.array([[float(group[node] == k + 1) for k in range(free)] for node in self.nodes])
        for grid, plate, cathode, _ in self.network.triodes:
            if len({group[grid], group[plate], group[cathode]}) != 1:
                raise ValueError("a triode without all its capacitances")
        # z by linear algebra: v = node_x x + node_fixed + node_signal u
        common = self.N @ np.linalg.solve(self.N.T @ self.conductance @ self.N, self.N.T)
        self.node_x = self.P - common @ self.conductance @ self.P
        self.node_fixed, self.node_signal = common @ self.from_fixed, common @ self.from_signal
        mass = linalg.cho_factor(self.P.T @ self.capacitance @ self.P)
        self.per_current = linalg.cho_solve(mass, self.P.T)
        # Columns: each triode's grid and plate current, out of grid or plate and into the cathode.
        self.draw = self._incidence([(end, cathode) for grid, plate, cathode, _ in self.network.triodes
                                     for end in (grid, plate)])
        self.port = self.draw.T @ self.P  # grid-to-cathode and plate-to-cathode voltage of each triode, from x alone
        self.states = states

    def _currents(self, ports):
        out = np.empty(len(ports))
        for k, (_, _, _, tube) in enumerate(self.network.triodes):
            out[2 * k], out[2 * k + 1] = tube.currents(ports[2 * k], ports[2 * k + 1])
        return out

    def _slopes(self, ports):
        out = np.zeros((len(ports), len(ports)))
        for k, (_, _, _, tube) in enumerate(self.network.triodes):
            out[2 * k : 2 * k + 2, 2 * k : 2 * k + 2] = tube.slopes(ports[2 * k], ports[2 * k + 1])
        return out

    def rate(self, x, u):
        """dx/dt, V/s.

        By way of every branch's own current, not by one matrix on x: the rounding of a current through a small resistor
        then leaves one node and enters the other alike, and disturbs nothing but what that resistor settles at once.
        """
        v = self.node_x @ x + self.node_fixed + self.node_signal * u
        volts = self.branch.T @ v + self.branch_fixed + self.branch_signal * u
        return -self.per_current @ (self.branch @ (self.siemens * volts) + self.draw @ self._currents(self.port @ x))

    def jacobian(self, x):
        """d(dx/dt)/dx, 1/s."""
        return -self.per_current @ (self.conductance @ self.node_x + self.draw @ self._slopes(self.port @ x) @ self.port)

    def node(self, name, x, u):
        """Potential of a node, V."""
        k = self.index[name]
        return self.node_x[k] @ x + self.node_fixed[k] + self.node_signal[k] * u

    def operating_point(self):
        """Free node potentials at rest, V: no current flows in any capacitor and the signal is 0 V.

        The supply rises in steps, so that each solution starts near the last.
        """
        v = np.zeros(len(self.nodes))
        for part in np.linspace(0.05, 1.0, 20):
            found = optimize.root(self._imbalance, v, args=(part,), jac=self._imbalance_slope, method="lm",
                                  options={"xtol": 1e-15, "ftol": 1e-15})
            v = found.x
        for _ in range(5):
            v = v - np.linalg.solve(self._imbalance_slope(v, 1.0), self._imbalance(v, 1.0))
        if np.abs(self._imbalance(v, 1.0)).max() > 1e-12:
            raise ArithmeticError("no operating point found")
        return v

    def _imbalance(self, v, part):
        return self.conductance @ v + self.draw @ self._currents(self.draw.T @ v) - part * self.from_fixed

    def _imbalance_slope(self, v, _part):
        return self.conductance + self.draw @ self._slopes(self.draw.T @ v) @ self.draw.T

    def state_at(self, v):
        """The states that go with node potentials `v`."""
        x, *_ = np.linalg.lstsq(np.hstack([self.P, self.N]), v, rcond=None)
        return x[: self.states]

    def gain(self, frequency, v):
        """Complex small-signal gain from `in` to `o` around node potentials `v`, by nodal analysis."""
        admittance = self._imbalance_slope(v, 1.0) + 2j * np.pi * frequency * self.capacitance
        return np.linalg.solve(admittance, self.from_signal)[self.index["o"]]
