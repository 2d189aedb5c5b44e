"""Exact distribution of a circuit's recorded bits, by density matrices.

The state is a list of branches, one for every value of the classical bits and
of the qubits in a known computational state; a branch holds the unnormalised
density tensor of its other qubits. A measurement splits a branch, a Pauli or
Kraus channel does not, so the answer is exact up to rounding (about 1e-13).
Nothing here knows stabilisers, sites or sampling.

Cost: 4^live complex numbers a branch; meant for at most about 8 live qubits and
a few thousand branches.
"""

import numpy as np

import noise_channels
from noise_channels import kraus_sum, operate

NEGLIGIBLE = 1e-15


class Reference:
    """Simulation of a circuit, done when it is made."""

    def __init__(self, circuit):
        self.circuit = circuit
        count = len(circuit.qubit_names)
        self.branches = {(0, (0,) * count): np.ones((), dtype=complex)}
        self._block(circuit.statements)

    def distribution(self, registers=None):
        """Probability of every value of the recorded registers, the first
        register's bit 0 least significant."""
        registers = self.circuit.recorded() if registers is None else registers
        width = sum(r.width for r in registers)
        result = np.zeros(2 ** width)
        for (bits, values), density in self.branches.items():
            number, shift = 0, 0
            for register in registers:
                number |= register.number(bits) << shift
                shift += register.width
            result[number] += weight(density)
        return result

    # Branches.

    def _collect(self, branches):
        merged = {}
        for key, density in branches:
            if weight(density) > NEGLIGIBLE:
                merged[key] = merged[key] + density if key in merged else density
        self.branches = merged

    def _with_live(self, qubits):
        """Every branch with these qubits live: (bits, values, density, axes)."""
        for (bits, values), density in self.branches.items():
            for qubit in qubits:
                if values[qubit] is not None:
                    values, density = enliven(values, density, qubit)
            yield bits, values, density, [axis_of(values, q) for q in qubits]

    def _map(self, qubits, action):
        self._collect([
            ((bits, values), action(density, axes))
            for bits, values, density, axes in list(self._with_live(qubits))
        ])

    # Statements.

    def _block(self, statements):
        for statement in statements:
            if statement.kind == "if":
                self._if(statement)
                continue
            before, after = self._noise(statement)
            self._channels(statement, before)
            getattr(self, "_" + statement.kind)(statement)
            self._channels(statement, after)

    def _noise(self, statement):
        """Channels before and after: annotations, then rules in file order."""
        before, after = list(statement.before), list(statement.after)
        for rule in self.circuit.rules:
            if rule.matches(statement):
                (before if rule.place == "before" else after).append(rule.channel)
        return before, after

    def _channels(self, statement, channels):
        for channel in channels:
            if not channel.is_readout:
                self._map(statement.qubits, lambda density, axes: channel.apply(
                    density, axes, statement.duration))

    def _gate(self, statement):
        self._map(statement.qubits,
                  lambda density, axes: operate(density, statement.matrix, axes))

    def _kraus(self, statement):
        self._map(statement.qubits,
                  lambda density, axes: kraus_sum(density, statement.value, axes))

    def _call(self, statement):
        self._block(statement.body)

    def _delay(self, statement):
        pass

    def _if(self, statement):
        all_branches = self.branches
        parts = []
        for wanted, block in ((1, statement.body), (0, statement.otherwise)):
            self.branches = {key: density for key, density in all_branches.items()
                             if statement.condition(key[0]) == wanted}
            self._block(block)
            parts += self.branches.items()
        self._collect(parts)

    def _split(self, qubit):
        """Every branch with the qubit measured: (bits, values, density, outcome)."""
        for (bits, values), density in self.branches.items():
            if values[qubit] is not None:
                yield bits, values, density, values[qubit]
                continue
            axis, rank = axis_of(values, qubit), density.ndim // 2
            for outcome in (0, 1):
                part = density.take(outcome, axis=rank + axis).take(outcome, axis=axis)
                known = values[:qubit] + (outcome,) + values[qubit + 1:]
                yield bits, known, part, outcome

    def _measure(self, statement):
        zero_to_one, one_to_zero = 0.0, 0.0
        before, after = self._noise(statement)
        for channel in before + after:
            if channel.is_readout:
                p01, p10 = channel.flips()
                zero_to_one, one_to_zero = (
                    zero_to_one * (1 - p10) + (1 - zero_to_one) * p01,
                    one_to_zero * (1 - p01) + (1 - one_to_zero) * p10,
                )
        parts = []
        for bits, values, density, outcome in self._split(statement.qubits[0]):
            if statement.bit is None:
                parts.append(((bits, values), density))
                continue
            flip = one_to_zero if outcome else zero_to_one
            for recorded, p in ((outcome, 1 - flip), (1 - outcome, flip)):
                if p > 0:
                    key = (with_bit(bits, statement.bit.index, recorded), values)
                    parts.append((key, p * density))
        self._collect(parts)

    def _reset(self, statement):
        qubit = statement.qubits[0]
        self._collect([
            ((bits, values[:qubit] + (0,) + values[qubit + 1:]), density)
            for bits, values, density, _ in self._split(qubit)
        ])

    def _assign(self, statement):
        self._collect([
            ((with_bit(bits, statement.bit.index, statement.value(bits)), values), density)
            for (bits, values), density in self.branches.items()
        ])


def weight(density):
    """Trace of a density tensor."""
    size = 2 ** (density.ndim // 2)
    return float(np.trace(density.reshape(size, size)).real)


def axis_of(values, qubit):
    """Row axis of a live qubit."""
    return sum(value is None for value in values[:qubit])


def enliven(values, density, qubit):
    """A known qubit made part of the density tensor."""
    value = values[qubit]
    values = values[:qubit] + (None,) + values[qubit + 1:]
    axis, rank = axis_of(values, qubit), density.ndim // 2
    grown = np.zeros((2,) * (density.ndim + 2), dtype=complex)
    place = [slice(None)] * grown.ndim
    place[axis] = place[rank + 1 + axis] = value
    grown[tuple(place)] = density
    return values, grown


def with_bit(bits, index, value):
    """The word with one bit set to a value."""
    return bits & ~(1 << index) | value << index


def distribution(circuit, registers=None):
    """Exact distribution of the recorded bits; see `Reference.distribution`."""
    return Reference(circuit).distribution(registers)


def bloch_vector(channels, vector):
    """Bloch vector after channels on one qubit, for tests of the channels."""
    paulis = [noise_channels.PAULI[letter] for letter in "XYZ"]
    density = (np.eye(2) + sum(v * p for v, p in zip(vector, paulis))) / 2
    for channel in channels:
        density = channel.apply(density, [0])
    return np.array([np.trace(density @ p).real for p in paulis])
