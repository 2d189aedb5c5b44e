"""Seeded random circuits over all library gates, channels, measurement, reset,
delay, feedback on bits and registers, and noise-file rules."""

import numpy as np

import gate_matrices
import noise_channels as channels
from circuit_builder import Circuit

PLAIN = sorted(gate_matrices.LIBRARY)
COMPARISONS = ("==", "!=", "<", "<=", ">", ">=")


class Generator:
    """Fills a circuit with random statements."""

    def __init__(self, seed, qubits, measured_early, damping, interrupted):
        self.damping, self.interrupted = damping, interrupted
        self.random = np.random.default_rng(seed)
        self.circuit = Circuit()
        self.q = self.circuit.qubits("q", qubits)
        self.early = self.circuit.bits("early", max(measured_early, 1))
        self.parity = self.circuit.bits("parity", 1, role="check")
        self.final = self.circuit.bits("final", qubits, role="logical")
        self.measured = 0
        self.to_measure = measured_early

    def number(self, low, high):
        """A number with few digits, so that the text says it exactly."""
        return round(float(self.random.uniform(low, high)), 4)

    def channel(self, width):
        """A channel for a call on that many qubits."""
        p = self.number(0.005, 0.12)
        words = channels.all_pauli_words(width)
        chosen = self.random.choice(len(words), size=min(3, len(words)), replace=False)
        kinds = [
            lambda: channels.depolarizing(p),
            lambda: channels.depolarizing_each(p),
            lambda: channels.dephasing(p),
            lambda: channels.bit_flip(p),
            lambda: channels.bit_phase_flip(p),
            lambda: channels.pauli(**{words[i]: round(p / (2 + j), 5)
                                      for j, i in enumerate(chosen)}),
            lambda: channels.over_rotation(str(self.random.choice(list("xyz"))),
                                           self.number(-0.5, 0.5)),
            lambda: channels.amplitude_damping(p),
            lambda: channels.relaxation("80us", "60us", f"{self.number(1, 20)}us"),
        ]
        return kinds[self.random.integers(9 if self.damping else 7)]()

    def some_noise(self, width):
        """No channel mostly, else one or two."""
        count = self.random.choice([0, 0, 0, 1, 1, 2])
        return [self.channel(width) for _ in range(count)]

    def gate(self):
        """A library gate with random angles and noise."""
        name = PLAIN[self.random.integers(len(PLAIN))]
        width, parameters, _ = gate_matrices.LIBRARY[name]
        qubits = [self.q[i] for i in self.random.permutation(len(self.q))[:width]]
        angles = tuple(self.number(-3.2, 3.2) for _ in range(parameters))
        before = self.some_noise(width) if self.random.random() < 0.2 else []
        self.circuit.gate(name, *qubits, parameters=angles, noise=self.some_noise(width),
                          before=before)

    def some_qubit(self):
        """Any qubit."""
        return self.q[self.random.integers(len(self.q))]

    def condition(self):
        """A condition on what was measured."""
        bits = list(self.early)
        return [
            lambda: bits[self.random.integers(len(bits))],
            lambda: ~bits[0],
            lambda: bits[0] ^ bits[-1],
            lambda: bits[0] & ~bits[-1],
            lambda: bits[-1] | self.parity[0],
            lambda: self.early.compare(COMPARISONS[self.random.integers(6)],
                                       int(self.random.integers(2 ** len(bits)))),
        ][self.random.integers(6)]()

    def feedback(self):
        """if … else … with gates, sometimes a reset, sometimes an assignment."""
        with self.circuit.when(self.condition()):
            self.gate()
            if self.random.random() < 0.2:
                self.circuit.reset(self.some_qubit())
        if self.random.random() < 0.5:
            with self.circuit.otherwise():
                self.gate()
                self.circuit.assign(self.parity[0], self.condition(), "^=")

    def measure_early(self):
        """A measurement with readout error, then feedback."""
        noise = [channels.readout_flip(self.number(0, 0.1), self.number(0, 0.1))]
        self.circuit.measure(self.some_qubit(), self.early[self.measured],
                             noise=noise[:self.random.integers(2)])
        self.measured += 1
        self.circuit.assign(self.parity[0], self.condition())
        self.feedback()

    def statement(self):
        """Any statement."""
        kind = self.random.random() if self.interrupted else 0
        if kind < 0.85:
            self.gate()
        elif kind < 0.9:
            self.circuit.reset(self.some_qubit(), noise=self.some_noise(1))
        elif kind < 0.95:
            self.circuit.delay("300ns", self.some_qubit(),
                               noise=[channels.relaxation("9us", "2us")]
                               if self.damping else [])
        else:
            self.circuit.measure(self.some_qubit())

    def rules(self):
        """Rules of a noise file."""
        self.circuit.rule(["t", "tdg", "h"], self.channel(1))
        self.circuit.rule(["two-qubit"], self.channel(2))
        self.circuit.rule(["one-qubit", "reset"], channels.depolarizing(0.004), "before",
                          [self.q[0], self.q[1]])
        self.circuit.rule(["measure"], channels.readout_flip(0.01, 0.02))


def build(seed, qubits=3, calls=16, measured_early=2, damping=True,
          interrupted=True):
    """A random circuit. Without `damping` it has no amplitude damping and no
    relaxation, which sparse terms cannot do on entangled qubits. Not
    `interrupted`, there is no reset, delay or discarded measurement among the
    gates."""
    generator = Generator(seed, qubits, measured_early, damping, interrupted)
    for qubit in generator.q:
        generator.circuit.gate("u3", qubit, parameters=tuple(
            generator.number(-3, 3) for _ in range(3)))
    generator.rules()
    for _ in range(measured_early):
        for _ in range(calls // (measured_early + 1)):
            generator.statement()
        generator.measure_early()
    for _ in range(calls // (measured_early + 1)):
        generator.statement()
    generator.circuit.measure_all(generator.q, generator.final)
    return generator.circuit
