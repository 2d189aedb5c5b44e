"""Classical control and the shapes of statements, drawn in `dense`.

False-alarm rate 1e-6 a circuit, shots for a 1 % error at power 0.99.
"""

import unittest

import goodness_of_fit as fit
import noise_channels as channels
import program
import random_circuits
from circuit_builder import Circuit, Expression
from reference import distribution


class Drawn(unittest.TestCase):
    def check(self, circuit, seed, **options):
        law = distribution(circuit)
        shots = fit.shots_needed(max(int((law > 0).sum()), 2))
        out = program.run(circuit, shots, seed=seed, **options)
        counts = out.counts()
        self.assertGreater(fit.fit_p_value(counts, law), fit.FALSE_ALARM,
                           f"{circuit.text()}\n{counts / counts.sum()} for {law}")
        return out


class Conditions(Drawn):
    def prepared(self):
        """Two generic bits in m, one qubit to act on."""
        circuit = Circuit()
        q = circuit.qubits("q", 3)
        m, c = circuit.bits("m", 2), circuit.bits("c", 1)
        circuit.gate("ry", q[0], parameters=(1.1,))
        circuit.gate("ry", q[1], parameters=(1.8,))
        circuit.gate("cx", q[0], q[1])
        circuit.measure_all(q[:2], m)
        return circuit, q, m, c

    def test_every_kind_of_condition(self):
        _, _, m, _ = self.prepared()
        conditions = [
            m[0], ~m[1], m[0] ^ m[1], m[0] & m[1], m[0] | m[1], ~(m[0] & ~m[1]),
            *(m.compare(op, n) for op, n in (("==", 0), ("==", 2), ("!=", 3), ("<", 2),
                                             ("<=", 2), (">", 0), (">=", 3))),
            Expression("m[0] == 1 && m[1] == 0", lambda b: m[0].value(b) & (1 - m[1].value(b))),
            Expression("m[0] ^ m[1] & m[0]",
                       lambda b: m[0].value(b) ^ (m[1].value(b) & m[0].value(b))),
            Expression("m[0] | m[1] ^ m[0]",
                       lambda b: m[0].value(b) | (m[1].value(b) ^ m[0].value(b))),
            Expression("m[0] == m[1]", lambda b: int(m[0].value(b) == m[1].value(b))),
            Expression("m[0] != m[1]", lambda b: int(m[0].value(b) != m[1].value(b))),
            Expression("!(m == 1)", lambda b: int(m.number(b) != 1)),
            Expression("m == 1 || m == 2", lambda b: int(m.number(b) in (1, 2))),
        ]
        for i, condition in enumerate(conditions):
            with self.subTest(condition.text):
                circuit, q, m, c = self.prepared()
                with circuit.when(condition):
                    circuit.gate("ry", q[2], parameters=(2.0,))
                with circuit.otherwise():
                    circuit.gate("ry", q[2], parameters=(0.6,))
                circuit.measure(q[2], c[0])
                self.check(circuit, 100 + i)

    def test_nested_conditions(self):
        circuit, q, m, c = self.prepared()
        with circuit.when(m[0]):
            with circuit.when(m[1]):
                circuit.gate("x", q[2])
            with circuit.otherwise():
                circuit.gate("h", q[2])
                circuit.measure(q[2], m[1])
            circuit.gate("t", q[2])
            circuit.gate("h", q[2])
        with circuit.otherwise():
            circuit.reset(q[0])
            circuit.gate("cry", q[1], q[2], parameters=(0.9,))
        circuit.measure(q[2], c[0])
        self.check(circuit, 130)

    def test_the_condition_is_read_once(self):
        """A block that changes the bit of its own condition still runs whole, and
        the other block does not."""
        circuit, q, m, c = self.prepared()
        with circuit.when(m[0]):
            circuit.assign(m[0], ~m[0])
            circuit.gate("x", q[2])
        with circuit.otherwise():
            circuit.assign(m[0], ~m[0])
            circuit.gate("ry", q[2], parameters=(0.7,))
        circuit.measure(q[2], c[0])
        self.check(circuit, 131)

    def test_else_if(self):
        circuit, q, m, c = self.prepared()
        text = ("if (m == 0) { x q[2]; } else if (m == 1) { ry(0.7) q[2]; }\n"
                "else { ry(1.4) q[2]; }")
        with circuit.verbatim(text):
            with circuit.when(m.compare("==", 0)):
                circuit.gate("x", q[2])
            with circuit.otherwise():
                with circuit.when(m.compare("==", 1)):
                    circuit.gate("ry", q[2], parameters=(0.7,))
                with circuit.otherwise():
                    circuit.gate("ry", q[2], parameters=(1.4,))
        circuit.measure(q[2], c[0])
        self.check(circuit, 132)

    def test_noise_and_damping_under_a_condition(self):
        circuit, q, m, c = self.prepared()
        circuit.gate("ry", q[2], parameters=(0.8,))
        with circuit.when(m[0]):
            circuit.gate("t", q[2], noise=[channels.depolarizing(0.2)])
            circuit.gate("x", q[2], noise=[channels.amplitude_damping(0.3)])
            circuit.gate("cx", q[1], q[2], noise=[channels.over_rotation("x", 0.4)])
        with circuit.otherwise():
            circuit.gate("ccx", *q, noise=[channels.pauli(XIX=0.2)])
        circuit.gate("h", q[2])
        circuit.measure(q[2], c[0])
        self.check(circuit, 133)

    def test_measurement_under_a_condition(self):
        """Repeat until success, two tries, with readout error deciding."""
        circuit = Circuit()
        q = circuit.qubits("q", 2)
        m, c = circuit.bits("m", 2), circuit.bits("c", 1)
        for attempt in range(2):
            with circuit.when(~m[0] if attempt else ~m[1]):
                circuit.reset(q[1])
                circuit.gate("ry", q[0], parameters=(0.9,))
                circuit.gate("t", q[0])
                circuit.gate("h", q[1])
                circuit.gate("cry", q[0], q[1], parameters=(1.3,))
                circuit.measure(q[1], m[attempt], noise=[channels.readout_flip(0.1, 0.2)])
        circuit.gate("h", q[0])
        circuit.measure(q[0], c[0])
        self.check(circuit, 134)


class Shapes(Drawn):
    """Loops, aliases, ranges, sets, broadcasts, parities, output registers."""

    def test_loops_and_slices(self):
        circuit = Circuit()
        circuit.line("const int n = 5;")
        with circuit.verbatim("qubit[n] q;"):
            q = circuit.qubits("q", 5)
        c = circuit.bits("c", 5)
        text = """for int i in [0:n - 1] { ry(0.3 * (i + 1)) q[i]; }
for int i in {0, 2, 3} { t q[i]; h q[i]; }
let odd = q[1:2:4];
let ends = q[{0, 4}];
let joined = odd ++ ends;
h odd;
cx ends, odd;
rz(pi / 7) joined[2];
for uint k in [4:-2:0] { for int j in [0:1] { ry(0.1 * j + 0.2) q[k]; } }
cz q[0:1], q[3:4];
h q;
c[0:2] = measure q[0:2];
c[3] = measure q[-2];
measure q[4] -> c[4];"""
        with circuit.verbatim(text):
            for i in range(5):
                circuit.gate("ry", q[i], parameters=(0.3 * (i + 1),))
            for i in (0, 2, 3):
                circuit.gate("t", q[i])
                circuit.gate("h", q[i])
            for i in (1, 3):
                circuit.gate("h", q[i])
            circuit.gate("cx", q[0], q[1])
            circuit.gate("cx", q[4], q[3])
            circuit.gate("rz", q[0], parameters=(3.141592653589793 / 7,))
            for k in (4, 2, 0):
                for j in (0, 1):
                    circuit.gate("ry", q[k], parameters=(0.1 * j + 0.2,))
            circuit.gate("cz", q[0], q[3])
            circuit.gate("cz", q[1], q[4])
            for qubit in q:
                circuit.gate("h", qubit)
            circuit.measure_all(q, c)
        self.check(circuit, 201)

    def test_openqasm_2(self):
        circuit = Circuit(header=False)
        text = """OPENQASM 2.0;
include "qelib1.inc";
qreg q[3];
creg c[3];
creg f[1];
gate mine(a) x, y { u1(a) x; CX x, y; u3(a, -a/2, pi/4) y; }
h q;
mine(0.4) q[0], q[1];
measure q[2] -> f[0];
if (f == 1) u2(0.3, 0.9) q[0];
cu1(0.7) q[0], q[1];
h q[0];
barrier q;
measure q -> c;
"""
        with circuit.verbatim(text):
            q = circuit.qubits("q", 3)
            c, f = circuit.bits("c", 3), circuit.bits("f", 1)
            for qubit in q:
                circuit.gate("h", qubit)
            circuit.gate("u1", q[0], parameters=(0.4,))
            circuit.gate("CX", q[0], q[1])
            circuit.gate("u3", q[1], parameters=(0.4, -0.2, 3.141592653589793 / 4))
            circuit.measure(q[2], f[0])
            with circuit.when(f[0]):
                circuit.gate("u2", q[0], parameters=(0.3, 0.9))
            circuit.gate("cu1", q[0], q[1], parameters=(0.7,))
            circuit.gate("h", q[0])
            circuit.measure_all(q, c)
        self.check(circuit, 202)

    def test_output_registers_and_parities(self):
        """Only output registers are recorded; an unwritten bit reads 0."""
        circuit = Circuit()
        q = circuit.qubits("q", 4)
        m = circuit.bits("m", 4)
        s = circuit.bits("s", 3, role="check", output=True)
        v = circuit.bits("v", None, role="logical", output=True)
        for i, qubit in enumerate(q):
            circuit.gate("ry", qubit, parameters=(0.5 + 0.4 * i,))
        circuit.measure_all(q, m)
        circuit.assign(s[0], m[0] ^ m[1])
        circuit.assign(s[2], m[1] & m[2] | ~m[3])
        circuit.assign(v[0], m[3])
        circuit.assign(v[0], m[0] ^ m[2], "^=")
        out = self.check(circuit, 203)
        self.assertEqual(out.roles, {"s": "check", "v": "logical"})
        self.assertFalse(out.shots["s"][:, 1].any())

    def test_measure_again(self):
        """The second reading of a qubit repeats the first, its record does not have to."""
        circuit = Circuit()
        q, = circuit.qubits("q")
        c = circuit.bits("c", 3)
        circuit.gate("h", q)
        circuit.measure(q, c[0], noise=[channels.readout_flip(0.2)])
        circuit.measure(q, c[1])
        circuit.gate("sx", q)
        circuit.measure(q, c[1])
        circuit.measure(q, c[2], noise=[channels.readout_flip(0.1)])
        self.check(circuit, 204)

    def test_input_value(self):
        circuit = Circuit()
        circuit.line("input float turn;")
        q, = circuit.qubits("q")
        c = circuit.bits("c", 1)
        circuit.gate("rx", q, parameters=(("2 * turn", 1.4),))
        circuit.measure(q, c[0])
        self.check(circuit, 205, extra=["--set", "turn=0.7"])


class Random(Drawn):
    """Random circuits over everything."""

    def test_random_circuits(self):
        for seed in range(16):
            with self.subTest(seed=seed):
                circuit = random_circuits.build(seed, qubits=3, calls=18,
                                                measured_early=seed % 4)
                self.check(circuit, 400 + seed)


if __name__ == "__main__":
    unittest.main()
