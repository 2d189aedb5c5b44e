"""Every library gate, modifier and gate definition, drawn in `dense`.

Each gate acts on fresh qubits in a generic entangled state and is read in a
generic basis; one file holds many gates, each with a register of its own.
False-alarm rate 1e-6 a gate; 150,000 shots catch a 1 % error of one or two bits
with probability 0.99, and of three bits at 200,000.
"""

import unittest

import numpy as np

import gate_matrices as gates
import goodness_of_fit as fit
import program
from circuit_builder import Circuit
from reference import distribution

SHOTS = 200_000
ANGLES = (0.9, -0.4, 1.7, 0.6)
# Words of an expression and its value, in place of plain numbers.
EXPRESSIONS = (("pi/3", np.pi / 3), ("-2*pi/5", -2 * np.pi / 5),
               ("sqrt(2)/2 + 0.1", np.sqrt(2) / 2 + 0.1), ("3*(0.2 - 0.5)", -0.9))


class Blocks:
    """A circuit of independent blocks, one law for each."""

    def __init__(self):
        self.circuit = Circuit()
        self.blocks = {}

    def block(self, name, width, fill, before=None):
        """One block: generic state, `fill(circuit, qubits)`, generic read-out."""
        c = self.circuit
        label = f"b{len(self.blocks)}"
        q = c.qubits(f"q_{label}", width)
        register = c.bits(f"c_{label}", width)
        for i, qubit in enumerate(q):
            c.gate("u3", qubit, parameters=(0.8 + 0.3 * i, 0.5 - 0.2 * i, 1.1))
        for a, b in zip(q, q[1:]):
            c.gate("cx", a, b)
        fill(c, q)
        for i, qubit in enumerate(q):
            c.gate("u3", qubit, parameters=(1.2 - 0.4 * i, 0.3, 0.7 + 0.2 * i))
        c.measure_all(q, register)
        self.blocks[name] = (register, c.statements[:])
        c.statements.clear()

    def check(self, test, seed, shots=SHOTS):
        """Draws the file and compares every block."""
        out = program.run(self.circuit, shots, seed=seed)
        for name, (register, statements) in self.blocks.items():
            with test.subTest(name):
                self.circuit.statements[:] = statements
                law = distribution(self.circuit, [register])
                counts = out.counts([register.name])
                test.assertGreater(fit.fit_p_value(counts, law), fit.FALSE_ALARM,
                                   f"{counts / shots} for {law}")


class Library(unittest.TestCase):
    def check(self, width, angles, seed):
        blocks = Blocks()
        for name, (qubits, parameters, _) in gates.LIBRARY.items():
            if qubits == width:
                blocks.block(name, width, lambda c, q: c.gate(
                    name, *q, parameters=angles[:parameters]))
                if width > 1:
                    blocks.block(name + " reversed", width, lambda c, q: c.gate(
                        name, *q[::-1], parameters=angles[:parameters]))
        blocks.check(self, seed)

    def test_one_qubit_gates(self):
        self.check(1, ANGLES, 1)

    def test_two_qubit_gates(self):
        self.check(2, ANGLES, 2)

    def test_three_qubit_gates(self):
        self.check(3, ANGLES, 3)

    def test_expressions_as_angles(self):
        self.check(1, EXPRESSIONS, 4)
        self.check(2, EXPRESSIONS, 5)


class Modifiers(unittest.TestCase):
    """inv, pow, ctrl and negctrl, alone and nested."""

    def test_modifiers(self):
        blocks = Blocks()
        c1, g = gates.controlled, gates.matrix
        cases = [
            ("inv @", "t", (), g("tdg")),
            ("inv @", "s", (), g("sdg")),
            ("inv @", "sx", (), g("sxdg")),
            ("inv @", "rx", (0.7,), g("rx", (-0.7,))),
            ("inv @", "u3", (0.7, 0.2, -0.9), g("u3", (0.7, 0.2, -0.9)).conj().T),
            ("inv @", "u2", (0.2, -0.9), g("u2", (0.2, -0.9)).conj().T),
            ("inv @", "iswap", (), g("iswap").conj().T),
            ("inv @", "cu", (0.9, -0.4, 1.7, 0.6), g("cu", (0.9, -0.4, 1.7, 0.6)).conj().T),
            ("inv @", "crz", (0.8,), g("crz", (-0.8,))),
            ("pow(2) @", "t", (), g("s")),
            ("pow(3) @", "t", (), g("t") @ g("s")),
            ("pow(-1) @", "t", (), g("tdg")),
            ("pow(0) @", "h", (), np.eye(2)),
            ("pow(2) @", "rx", (0.4,), g("rx", (0.8,))),
            ("pow(3) @", "u3", (0.3, 0.5, 0.1),
             np.linalg.matrix_power(g("u3", (0.3, 0.5, 0.1)), 3)),
            ("inv @ pow(2) @", "sx", (), g("x")),
            ("ctrl @", "x", (), g("cx")),
            ("ctrl @", "y", (), g("cy")),
            ("ctrl @", "z", (), g("cz")),
            ("ctrl @", "h", (), g("ch")),
            ("ctrl @", "s", (), c1(g("s"))),
            ("ctrl @", "p", (0.7,), g("cp", (0.7,))),
            ("ctrl @", "rx", (0.7,), g("crx", (0.7,))),
            ("ctrl @", "ry", (-0.7,), g("cry", (-0.7,))),
            ("ctrl @", "rz", (0.7,), g("crz", (0.7,))),
            ("ctrl @ inv @", "rz", (0.7,), g("crz", (-0.7,))),
            ("inv @ ctrl @", "ry", (0.7,), g("cry", (-0.7,))),
            ("negctrl @", "x", (), c1(gates.X, on=0)),
            ("negctrl @", "rx", (0.9,), c1(g("rx", (0.9,)), on=0)),
            ("ctrl @", "cx", (), g("ccx")),
            ("ctrl @", "cz", (), g("ccz")),
            ("ctrl @", "swap", (), g("cswap")),
            ("ctrl(2) @", "x", (), g("ccx")),
            ("ctrl(2) @", "z", (), g("ccz")),
            ("negctrl(2) @", "x", (), c1(gates.X, 2, on=0)),
            ("ctrl @ negctrl @", "x", (), c1(c1(gates.X, on=0))),
            ("negctrl @", "swap", (), c1(gates.SWAP, on=0)),
        ]
        for modifiers, name, parameters, matrix in cases:
            width = int(np.log2(len(matrix)))
            blocks.block(f"{modifiers} {name}{parameters}", width, lambda c, q: c.gate(
                name, *q, parameters=parameters, modifiers=modifiers, matrix=matrix))
        blocks.check(self, 11)

    def test_global_phase_matters_under_control(self):
        """ctrl @ gphase(a) is p(a) on the control; arXiv:2104.14722."""
        blocks = Blocks()

        def controlled_phase(c, q):
            with c.verbatim(f"ctrl @ gphase(0.9) {c.qubit_names[q[0]]};"):
                c.gate("p", q[0], parameters=(0.9,))
            c.line("gphase(0.3);")

        def twice(c, q):
            names = ", ".join(c.qubit_names[i] for i in q)
            with c.verbatim(f"ctrl(2) @ gphase(0.7) {names};"):
                c.gate("cp", *q, parameters=(0.7,))

        blocks.block("ctrl @ gphase", 1, controlled_phase)
        blocks.block("ctrl(2) @ gphase", 2, twice)
        blocks.check(self, 12)


DEFINITIONS = """gate half(turn) a { rz(turn / 2) a; sx a; }
gate pair(x, y) a, b { half(x) a; cx a, b; inv @ half(y) b; }
gate nothing a { }
gate majority a, b, c { cx c, b; cx c, a; ccx a, b, c; }"""


class Definitions(unittest.TestCase):
    """Gates defined in the file, nested and under modifiers. cx t ladders: the
    meaning is written out by hand."""

    def half(self, c, angle, qubit):
        c.gate("rz", qubit, parameters=(angle / 2,))
        c.gate("sx", qubit)

    def inverse_half(self, c, angle, qubit):
        c.gate("sxdg", qubit)
        c.gate("rz", qubit, parameters=(-angle / 2,))

    def test_definitions(self):
        blocks = Blocks()
        blocks.circuit.line(DEFINITIONS)

        def simple(c, q):
            with c.call("half", q[0], parameters=(1.3,)):
                self.half(c, 1.3, q[0])

        def pair(c, q):
            with c.call("pair", *q, parameters=(0.7, ("pi/5", np.pi / 5))):
                self.half(c, 0.7, q[0])
                c.gate("cx", *q)
                self.inverse_half(c, np.pi / 5, q[1])

        def inverse_pair(c, q):
            names = ", ".join(c.qubit_names[i] for i in q)
            with c.verbatim(f"inv @ pair(0.7, 0.4) {names};"):
                self.half(c, 0.4, q[1])
                c.gate("cx", *q)
                self.inverse_half(c, 0.7, q[0])

        def power(c, q):
            with c.verbatim(f"pow(3) @ half(0.5) {c.qubit_names[q[0]]};"):
                for _ in range(3):
                    self.half(c, 0.5, q[0])

        def empty(c, q):
            c.line(f"nothing {c.qubit_names[q[0]]};")

        def majority(c, q):
            with c.call("majority", *q):
                c.gate("cx", q[2], q[1])
                c.gate("cx", q[2], q[0])
                c.gate("ccx", *q)

        blocks.block("half", 1, simple)
        blocks.block("pair", 2, pair)
        blocks.block("inv @ pair", 2, inverse_pair)
        blocks.block("pow(3) @ half", 1, power)
        blocks.block("nothing", 1, empty)
        blocks.block("majority", 3, majority)
        blocks.check(self, 21)


if __name__ == "__main__":
    unittest.main()
