"""The reference simulator is checked against published values, against the
definitions of the gates, and against a second, brute-force simulation.

No sampling here: every comparison is to 1e-12 or to the digits published.
"""

import itertools
import unittest

import numpy as np

import gate_matrices as gates
import known_circuits
import noise_channels as channels
from circuit_builder import Circuit
from reference import bloch_vector, distribution


def same_up_to_phase(a, b):
    """Whether two unitaries differ by a phase only."""
    return np.allclose(abs(np.trace(a.conj().T @ b)), len(a), atol=1e-12)


class Gates(unittest.TestCase):
    """The matrices against their definitions in U and cx (arXiv:2104.14722 and
    its library file, from memory)."""

    def test_all_unitary(self):
        for name, (width, count, matrix) in gates.LIBRARY.items():
            u = matrix(*(0.3 + 0.4 * i for i in range(count)))
            self.assertEqual(u.shape, (2 ** width,) * 2, name)
            np.testing.assert_allclose(u @ u.conj().T, np.eye(2 ** width), atol=1e-14)

    def test_one_qubit_gates_by_u(self):
        pi = np.pi
        for name, angles, parameters in (
            ("x", (pi, 0, pi), ()), ("y", (pi, pi / 2, pi / 2), ()), ("z", (0, 0, pi), ()),
            ("h", (pi / 2, 0, pi), ()), ("s", (0, 0, pi / 2), ()), ("t", (0, 0, pi / 4), ()),
            ("sx", (pi / 2, -pi / 2, pi / 2), ()), ("rx", (0.7, -pi / 2, pi / 2), (0.7,)),
            ("ry", (0.7, 0, 0), (0.7,)), ("rz", (0, 0, 0.7), (0.7,)),
            ("u2", (pi / 2, 0.3, 0.9), (0.3, 0.9)),
        ):
            self.assertTrue(same_up_to_phase(gates.matrix(name, parameters),
                                             gates.universal(*angles)), name)

    def test_cu3_by_its_definition(self):
        """u1 c, u1 t, cx, u3 t, cx, u3 t as in the OpenQASM 2 library."""
        theta, phi, lam = 0.5, 0.8, -1.3
        on_target = lambda u: gates.kron(gates.I, u)
        cx = gates.controlled(gates.X)
        built = (on_target(gates.universal(theta / 2, phi, 0)) @ cx
                 @ on_target(gates.universal(-theta / 2, 0, -(phi + lam) / 2)) @ cx
                 @ on_target(gates.phase((lam - phi) / 2))
                 @ gates.kron(gates.phase((lam + phi) / 2), gates.I))
        self.assertTrue(same_up_to_phase(built, gates.matrix("cu3", (theta, phi, lam))))

    def test_ch_by_a_conjugated_cx(self):
        """h = ry(π/4) z ry(−π/4), so ch is cz between two rotations. Arithmetic."""
        turn = gates.kron(gates.I, gates.rotation("Y", np.pi / 4))
        built = turn @ gates.controlled(gates.Z) @ turn.conj().T
        np.testing.assert_allclose(built, gates.matrix("ch"), atol=1e-14)

    def test_toffoli_permutation(self):
        for a, b, c in itertools.product((0, 1), repeat=3):
            column = gates.matrix("ccx")[:, 4 * a + 2 * b + c]
            self.assertEqual(np.argmax(abs(column)), 4 * a + 2 * b + (c ^ a & b))
            column = gates.matrix("cswap")[:, 4 * a + 2 * b + c]
            b2, c2 = (c, b) if a else (b, c)
            self.assertEqual(np.argmax(abs(column)), 4 * a + 2 * b2 + c2)


class Channels(unittest.TestCase):
    def test_joint_depolarizing_is_the_uniform_pauli_mixture(self):
        random = np.random.default_rng(1)
        for width in (1, 2, 3):
            size = 2 ** width
            a = random.normal(size=(size, size)) + 1j * random.normal(size=(size, size))
            density = (a @ a.conj().T).reshape((2,) * (2 * width))
            words = channels.all_pauli_words(width)
            listed = channels.kraus_sum(
                density, channels.pauli_kraus({w: 0.3 / len(words) for w in words}),
                range(width))
            np.testing.assert_allclose(
                channels.depolarize(density, range(width), 0.3), listed, atol=1e-12)

    def test_axes_of_a_joint_channel(self):
        """Letter i of a Pauli word acts on qubit i of the call."""
        density = np.zeros((2,) * 6, dtype=complex)
        density[(0,) * 6] = 1
        out = channels.pauli(XI=1.0).apply(density, [2, 0])
        self.assertAlmostEqual(out[0, 0, 1, 0, 0, 1].real, 1)

    def test_published_bloch_vectors(self):
        """Textbook forms; the values were computed from Kraus sums elsewhere."""
        damped = bloch_vector([channels.amplitude_damping(0.2)], (0.3, -0.4, 0.5))
        np.testing.assert_allclose(damped, (0.268328157300, -0.357770876400, 0.6), atol=1e-12)
        relaxed = bloch_vector([channels.relaxation("80us", "60us", "5us")], (1, 0, 0))
        np.testing.assert_allclose(relaxed, (0.920044414629, 0, 0.060586937187), atol=1e-12)
        depolarized = bloch_vector([channels.depolarizing(0.01)] * 10, (0, 0, 1))
        np.testing.assert_allclose(depolarized, (0, 0, 0.874388754238), atol=1e-12)
        dephased = bloch_vector([channels.dephasing(0.01)] * 3, (1, 0, 0))
        np.testing.assert_allclose(dephased, (1 - 2 * 0.029404, 0, 0), atol=1e-12)
        turned = bloch_vector([channels.over_rotation("x", 0.3)], (0, 0, 1))
        np.testing.assert_allclose(turned, (0, -np.sin(0.3), np.cos(0.3)), atol=1e-12)


class KnownAnswers(unittest.TestCase):
    def test_every_case_of_the_catalogue(self):
        for name, (circuit, law) in known_circuits.catalogue().items():
            with self.subTest(name):
                np.testing.assert_allclose(distribution(circuit), law, atol=1e-12)

    def test_published_digits(self):
        """The formulas give the published digits."""
        for law, digits in (
            (known_circuits.h_t_h()[1][0], 0.853553390593),
            (known_circuits.h_rz_h(1.1)[1][0], 0.726798060713),
            (known_circuits.ghz_parity(4, 3, 0.1)[1][0], 0.318980664016),
            (known_circuits.ghz_parity(5, 5, 0.02)[1][0], 0.211722218166),
            (known_circuits.bell_fidelity(0.1)[1][0], 0.92),
            (known_circuits.readout_in_condition(0.03, 0.11)[1].reshape(2, 2, 2)
             .sum(axis=(0, 1))[1], 0.374),
        ):
            self.assertAlmostEqual(law, digits, 11)


class BruteForce(unittest.TestCase):
    """Random circuits once more, by full matrices built with Kronecker products
    and with measured bits held as extra qubits (deferred measurement)."""

    def embed(self, matrix, places, count):
        order = list(places) + [i for i in range(count) if i not in places]
        full = np.kron(matrix, np.eye(2 ** (count - len(places))))
        permutation = np.arange(2 ** count).reshape((2,) * count).transpose(order).ravel()
        inverse = np.argsort(permutation)
        return full[np.ix_(inverse, inverse)]

    def test_random_circuits(self):
        random = np.random.default_rng(8)
        names = sorted(gates.LIBRARY)
        for _ in range(12):
            # Qubits 0–2 of the circuit; 3 and 4 hold the two recorded bits.
            circuit, count = Circuit(), 5
            q = circuit.qubits("q", 3)
            m, c = circuit.bits("m", 1), circuit.bits("c", 1)
            density = np.zeros((32, 32), dtype=complex)
            density[0, 0] = 1

            def apply(operators, places):
                nonlocal density
                full = [self.embed(k, places, count) for k in operators]
                density = sum(k @ density @ k.conj().T for k in full)

            def some_gates(number):
                for _ in range(number):
                    name = str(random.choice(names))
                    width, parameters, matrix = gates.LIBRARY[name]
                    places = [int(i) for i in random.permutation(3)[:width]]
                    angles = tuple(float(a) for a in random.uniform(-3, 3, parameters))
                    p = float(random.uniform(0, 0.2))
                    kind = random.integers(3)
                    noise = [channels.depolarizing_each(p), channels.amplitude_damping(p),
                             channels.over_rotation("y", p)][kind]
                    circuit.gate(name, *(q[i] for i in places), parameters=angles,
                                 noise=[noise])
                    apply([matrix(*angles)], places)
                    operators = [
                        channels.pauli_kraus({w: p / 3 for w in "XYZ"}),
                        channels.damping_kraus(p),
                        [gates.rotation("Y", p)],
                    ][kind]
                    for place in places:
                        apply(operators, [place])

            some_gates(8)
            circuit.measure(q[1], m[0])
            apply([gates.controlled(gates.X)], [1, 3])
            apply([gates.kron(a, gates.I) for a in (np.diag([1, 0]), np.diag([0, 1]))], [1, 3])
            with circuit.when(m[0]):
                circuit.gate("ry", q[2], parameters=(0.6,))
            with circuit.otherwise():
                circuit.gate("cx", q[2], q[0])
            apply([gates.controlled(gates.rotation("Y", 0.6))], [3, 2])
            apply([gates.controlled(gates.controlled(gates.X), on=0)], [3, 2, 0])
            some_gates(5)
            circuit.reset(q[0])
            apply([np.array([[1, 0], [0, 0]]), np.array([[0, 1], [0, 0]])], [0])
            some_gates(4)
            circuit.measure(q[2], c[0])
            apply([gates.controlled(gates.X)], [2, 4])
            diagonal = np.diag(density).real.reshape((2,) * 5).sum(axis=(0, 1, 2))
            # Axis 0 is m, axis 1 is c; the law counts m as bit 0.
            np.testing.assert_allclose(distribution(circuit), diagonal.T.ravel(), atol=1e-12)


if __name__ == "__main__":
    unittest.main()
