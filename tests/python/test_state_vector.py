"""The benchmark's plain state vector against exact density matrices, so that
the benchmark compares with something right. False-alarm rate 1e-6."""

import sys
import unittest

import numpy as np

import goodness_of_fit as fit
import program
from circuit_builder import Circuit
from known_circuits import fill_hidden_shift
from law_circuits import LawCircuit
from noise_channels import dephasing, depolarizing
from reference import distribution

sys.path.insert(0, str(program.ROOT / "scripts"))

import line_circuits  # noqa: E402
from benchmark import hidden_shift, state_vector  # noqa: E402

QUBITS = 4


def small_line(t_noise, cx_noise):
    """(layers, the same as a circuit) of a short noisy line."""
    layers = line_circuits.noisy_layers(QUBITS, 6, 8, seed=3)
    circuit = Circuit()
    q = circuit.qubits("q", QUBITS)
    c = circuit.bits("c", QUBITS)
    for name, *on in (gate for gates in layers for gate in gates):
        noise = {"noisy_t": [dephasing(t_noise)], "noisy_cx": [depolarizing(cx_noise)]}
        circuit.gate(name.removeprefix("noisy_"), *(q[i] for i in on),
                     noise=noise.get(name, ()))
    # The state vector puts qubit 0 first, the law bit 0 last.
    circuit.measure_all(q[::-1], c)
    return layers, circuit


class StateVector(unittest.TestCase):
    def setUp(self):
        self.saved = line_circuits.T_DEPHASING, line_circuits.CX_DEPOLARIZING

    def tearDown(self):
        line_circuits.T_DEPHASING, line_circuits.CX_DEPOLARIZING = self.saved

    def test_noisy_shots(self):
        line_circuits.T_DEPHASING, line_circuits.CX_DEPOLARIZING = 0.2, 0.15
        layers, circuit = small_line(0.2, 0.15)
        rng = np.random.default_rng(5)
        counts = np.zeros(2 ** QUBITS, dtype=int)
        faulty = 0
        for _ in range(3000):
            bits, fault = state_vector.shot(layers, QUBITS, rng)
            counts[int("".join(map(str, bits)), 2)] += 1
            faulty += fault
        self.assertGreater(faulty, 2000)
        law = distribution(circuit)
        self.assertGreater(fit.distinguishing_power(
            law, distribution(small_line(0, 0)[1]), 3000), 0.99)
        self.assertGreater(fit.fit_p_value(counts, law), fit.FALSE_ALARM)


class HiddenShift(unittest.TestCase):
    def test_one_block(self):
        """The companion's success of a block with two ccz, against a density
        matrix with each ccz replaced by the even mixture of its diagonals."""
        companion = LawCircuit(True)
        fill_hidden_shift(companion, 3, 0b110101, [(0, 1, 2)], companion.three_qubit)
        shift = [0] * (2 * line_circuits.HALF)
        for half in (0, 1):
            for bit in range(3):
                shift[half * line_circuits.HALF + bit] = 0b110101 >> 3 * half + bit & 1
        self.assertAlmostEqual(hidden_shift.block_success([(0, 1, 2)], shift),
                               distribution(companion)[0b110101], 12)


if __name__ == "__main__":
    unittest.main()
