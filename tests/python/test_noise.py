"""Channels, annotations and the noise file, drawn in `dense`.

Blocks as in test_gates.py: a generic state, one noisy statement, a generic
read-out. False-alarm rate 1e-6 a block; 200,000 shots catch a 1 % error of up
to three bits with probability 0.99.
"""

import unittest

import gate_matrices as gates
import goodness_of_fit as fit
import noise_channels as channels
import program
from circuit_builder import Circuit
from reference import distribution
from test_gates import Blocks


class Channels(unittest.TestCase):
    def test_one_qubit_channels(self):
        blocks = Blocks()
        for channel in (
            channels.depolarizing(0.2), channels.depolarizing_each(0.3),
            channels.dephasing(0.15), channels.bit_flip(0.12), channels.bit_phase_flip(0.2),
            channels.pauli(X=0.05, Y=0.1, Z=0.2), channels.pauli(Y=0.3),
            channels.amplitude_damping(0.3), channels.amplitude_damping(1.0),
            channels.relaxation("80us", "60us", "25us"),
            channels.relaxation("50us", "100us", "20us"),
            channels.over_rotation("x", 0.4), channels.over_rotation("y", -0.7),
            channels.over_rotation("z", 0.3), channels.depolarizing(1.0),
            channels.bit_flip(1.0),
        ):
            for place in ("noise", "before"):
                blocks.block(f"{place} {channel.text()}", 1, lambda c, q: c.gate(
                    "sx", q[0], **{place: [channel]}))
        blocks.check(self, 31)

    def test_two_qubit_channels(self):
        blocks = Blocks()
        for channel in (
            channels.depolarizing(0.3), channels.depolarizing_each(0.2),
            channels.pauli(XX=0.1, IZ=0.15, ZY=0.05), channels.pauli(ZI=0.4),
            channels.dephasing(0.2), channels.amplitude_damping(0.25),
            channels.over_rotation("x", 0.5),
        ):
            blocks.block(channel.text(), 2, lambda c, q: c.gate("cx", *q, noise=[channel]))
            blocks.block("reversed " + channel.text(), 2, lambda c, q: c.gate(
                "cry", *q[::-1], parameters=(0.6,), before=[channel]))
        blocks.check(self, 32)

    def test_three_qubit_channels(self):
        blocks = Blocks()
        for channel in (channels.depolarizing(0.4), channels.pauli(XIZ=0.2, IYI=0.1, ZZZ=0.1),
                        channels.depolarizing_each(0.1)):
            blocks.block(channel.text(), 3, lambda c, q: c.gate("ccx", *q, noise=[channel]))
        blocks.check(self, 33)

    def test_stacked_channels_keep_their_order(self):
        """Damping and bit flip do not commute."""
        blocks = Blocks()
        first, second = channels.amplitude_damping(0.4), channels.bit_flip(0.3)
        for order in ([first, second], [second, first]):
            for place in ("noise", "before"):
                blocks.block(f"{place} {order[0].text()}", 1, lambda c, q: c.gate(
                    "t", q[0], **{place: order}))
        blocks.check(self, 34)

    def test_channels_about_other_statements(self):
        """measure (the recorded bit is not touched by what comes after), reset,
        delay, barrier and a call of a defined gate."""
        blocks = Blocks()
        blocks.circuit.line("gate two a, b { cx a, b; t b; }")
        spare = blocks.circuit.bits("spare", 2)

        def measured(c, q):
            c.measure(q[0], spare[0], noise=[channels.bit_flip(0.2)],
                      before=[channels.bit_flip(0.1)])

        def read_wrong(c, q):
            c.measure(q[0], spare[1], noise=[channels.readout_flip(0.3)])

        def reset(c, q):
            c.reset(q[0], noise=[channels.bit_flip(0.2)])

        def delay(c, q):
            c.delay("3us", q[0], noise=[channels.relaxation("9us", "7us"),
                                        channels.depolarizing(0.05)])

        def called(c, q):
            with c.call("two", *q, noise=[channels.depolarizing(0.3)],
                        before=[channels.amplitude_damping(0.2)]):
                c.gate("cx", *q)
                c.gate("t", q[1])

        for name, fill in (("measure", measured), ("readout", read_wrong), ("reset", reset),
                           ("delay", delay)):
            blocks.block(name, 1, fill)
        blocks.block("defined gate", 2, called)
        blocks.check(self, 35)


class Readout(unittest.TestCase):
    def test_flips(self):
        """One and two arguments, two in a row, and noise on a measured record."""
        circuit = Circuit()
        q = circuit.qubits("q", 4)
        c = circuit.bits("c", 4)
        for qubit in q:
            circuit.gate("ry", qubit, parameters=(1.3,))
        flip = channels.readout_flip
        circuit.measure(q[0], c[0], noise=[flip(0.1)])
        circuit.measure(q[1], c[1], noise=[flip(0.03, 0.11)])
        circuit.measure(q[2], c[2], noise=[flip(0.2, 0.05), flip(0.1, 0.3)])
        circuit.measure(q[3], c[3], before=[channels.bit_flip(0.1)], noise=[flip(0.05)])
        out = program.run(circuit, 200_000, seed=36)
        self.assertGreater(fit.fit_p_value(out.counts(), distribution(circuit)),
                           fit.FALSE_ALARM)


class NoiseFile(unittest.TestCase):
    """Rules: names, groups, places, qubits, order, bodies of defined gates."""

    def check(self, circuit, seed):
        law = distribution(circuit)
        out = program.run(circuit, fit.shots_needed(len(law)), seed=seed)
        counts = out.counts()
        self.assertGreater(fit.fit_p_value(counts, law), fit.FALSE_ALARM,
                           f"{counts / counts.sum()} for {law}")
        return out

    def circuit(self, qubits=3):
        circuit = Circuit()
        q = circuit.qubits("q", qubits)
        c = circuit.bits("c", qubits)
        return circuit, q, c

    def finish(self, circuit, q, c):
        for qubit in q:
            circuit.gate("u3", qubit, parameters=(0.9, 0.2, 0.4))
        circuit.measure_all(q, c)

    def test_names_and_groups(self):
        circuit, q, c = self.circuit()
        circuit.rule(["h", "t"], channels.dephasing(0.1))
        circuit.rule(["one-qubit"], channels.depolarizing(0.03))
        circuit.rule(["two-qubit"], channels.depolarizing(0.1))
        circuit.rule(["three-qubit"], channels.pauli(XYZ=0.2))
        circuit.rule(["cx"], channels.over_rotation("x", 0.3), place="before")
        circuit.gate("h", q[0])
        circuit.gate("cx", q[0], q[1])
        circuit.gate("t", q[1])
        circuit.gate("ry", q[2], parameters=(0.8,))
        circuit.gate("cp", q[1], q[2], parameters=(0.8,))
        circuit.gate("ccx", *q)
        self.finish(circuit, q, c)
        self.check(circuit, 41)

    def test_only_some_qubits(self):
        """A rule with `qubits` acts where every qubit of the call is listed."""
        circuit, q, c = self.circuit()
        circuit.rule(["ry"], channels.bit_flip(0.2), qubits=[1, 2])
        circuit.rule(["cx"], channels.depolarizing(0.3), qubits=[0, 1])
        for qubit in q:
            circuit.gate("ry", qubit, parameters=(0.5,))
        circuit.gate("cx", q[0], q[1])
        circuit.gate("cx", q[1], q[2])
        circuit.measure_all(q, c)
        self.check(circuit, 42)

    def test_rules_after_annotations_in_file_order(self):
        circuit, q, c = self.circuit(1)
        circuit.rule(["x"], channels.amplitude_damping(0.3))
        circuit.rule(["x"], channels.over_rotation("y", 0.5))
        circuit.rule(["x"], channels.amplitude_damping(0.2), place="before")
        circuit.gate("ry", q[0], parameters=(1.0,))
        circuit.gate("x", q[0], noise=[channels.over_rotation("x", 0.7)],
                     before=[channels.bit_flip(0.1)])
        circuit.measure_all(q, c)
        self.check(circuit, 43)

    def test_measure_reset_and_delay(self):
        circuit, q, c = self.circuit(2)
        first = circuit.bits("first", 1)
        circuit.rule(["measure"], channels.readout_flip(0.05, 0.1))
        circuit.rule(["measure"], channels.bit_flip(0.07), place="before")
        circuit.rule(["reset"], channels.bit_flip(0.15))
        circuit.rule(["delay"], channels.relaxation("10us", "8us"))
        circuit.gate("ry", q[0], parameters=(1.0,))
        circuit.measure(q[0], first[0])
        circuit.gate("x", q[1])
        circuit.delay("2us", q[1])
        circuit.gate("cx", q[0], q[1])
        circuit.reset(q[0])
        circuit.measure_all(q, c)
        self.check(circuit, 44)

    def test_inside_defined_gates(self):
        """A rule matches library calls inside bodies and defined gates by name;
        the groups do not match defined gates."""
        circuit, q, c = self.circuit(2)
        circuit.line("gate mine a, b { h a; cx a, b; }")
        circuit.rule(["mine"], channels.depolarizing(0.2))
        circuit.rule(["cx"], channels.pauli(XI=0.1))
        circuit.rule(["two-qubit"], channels.pauli(IX=0.15))
        with circuit.call("mine", *q):
            circuit.gate("h", q[0])
            circuit.gate("cx", *q)
        circuit.measure_all(q, c)
        self.check(circuit, 45)

    def test_modified_calls_match_as_the_library_gate(self):
        circuit, q, c = self.circuit(3)
        circuit.rule(["cx"], channels.pauli(IX=0.2))
        circuit.rule(["tdg"], channels.bit_flip(0.1))
        circuit.rule(["ccx"], channels.pauli(IIX=0.3))
        circuit.rule(["x", "t"], channels.bit_flip(0.5))
        circuit.gate("h", q[0])
        circuit.gate("x", q[0], q[1], modifiers="ctrl @", called="cx",
                     matrix=gates.matrix("cx"))
        circuit.gate("t", q[0], modifiers="inv @", called="tdg", matrix=gates.matrix("tdg"))
        circuit.gate("x", *q, modifiers="ctrl(2) @", called="ccx", matrix=gates.matrix("ccx"))
        circuit.gate("h", q[0])
        circuit.gate("x", q[2])
        circuit.measure_all(q, c)
        self.check(circuit, 46)

    def test_broadcast_and_loops(self):
        """Each broadcast instance and each turn of a loop is a call of its own;
        annotation arguments may use the loop variable."""
        circuit, q, c = self.circuit(3)
        circuit.rule(["ry"], channels.depolarizing(0.1))
        with circuit.verbatim("@noise bit-flip(0.1)\nry(0.4) q;"):
            for qubit in q:
                circuit.gate("ry", qubit, parameters=(0.4,), noise=[channels.bit_flip(0.1)])
        text = ("for int i in [0:2] {\n  @noise depolarizing(0.05 * (i + 1))\n"
                "  ry(0.3 * i) q[i];\n}")
        with circuit.verbatim(text):
            for i, qubit in enumerate(q):
                circuit.gate("ry", qubit, parameters=(0.3 * i,),
                             noise=[channels.depolarizing(0.05 * (i + 1))])
        circuit.measure_all(q, c)
        self.check(circuit, 47)

    def test_noise_in_a_body_under_modifiers(self):
        """Under inv @ and pow @ the noise of a body stays after each inner call."""
        circuit, q, c = self.circuit(1)
        circuit.line("gate noisy a {\n  @noise amplitude-damping(0.2)\n  rx(0.5) a;\n"
                     "  @noise dephasing(0.1)\n  ry(0.7) a;\n}")
        damp, dephase = channels.amplitude_damping(0.2), channels.dephasing(0.1)

        def forward():
            circuit.gate("rx", q[0], parameters=(0.5,), noise=[damp])
            circuit.gate("ry", q[0], parameters=(0.7,), noise=[dephase])

        def backward():
            circuit.gate("ry", q[0], parameters=(-0.7,), noise=[dephase])
            circuit.gate("rx", q[0], parameters=(-0.5,), noise=[damp])

        circuit.gate("ry", q[0], parameters=(0.9,))
        with circuit.verbatim("pow(3) @ noisy q[0];"):
            for _ in range(3):
                forward()
        circuit.gate("rx", q[0], parameters=(0.4,))
        with circuit.verbatim("inv @ noisy q[0];"):
            backward()
        circuit.gate("ry", q[0], parameters=(0.3,))
        circuit.measure_all(q, c)
        self.check(circuit, 48)

    def test_a_rule_that_never_matched_is_a_warning(self):
        circuit, q, c = self.circuit(1)
        circuit.rule(["cswap"], channels.depolarizing(0.1))
        circuit.measure_all(q, c)
        self.assertIn("cswap", program.run(circuit, 10, seed=49, quiet=False).stderr)


if __name__ == "__main__":
    unittest.main()
