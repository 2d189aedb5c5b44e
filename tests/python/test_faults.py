"""Recorded faults explain the outcomes, shot by shot.

A circuit of x and cx only has outcomes that follow exactly from the faults that
fired: the X parts are carried forward through the cx gates here, and readout
flips are added. No tolerance: one shot that disagrees fails. How often each Pauli
fires at each place is compared with its probability by exact binomial tests at
1e-6 (100,000 shots; an error of 0.7 percentage points at p = 0.1 is caught).
Codes of a recorded Pauli: two bits a qubit, 0 I, 1 X, 2 Y, 3 Z, qubit i of the
statement in bits 2i and 2i + 1.
"""

import unittest

import numpy as np

import goodness_of_fit as fit
import noise_channels as channels
import program
from circuit_builder import Circuit

SHOTS = 100_000
QUBITS = 4


def noisy_permutation(seed, calls):
    """Random x and cx with Pauli noise. Returns the circuit, the calls as (line,
    qubits, probabilities of Pauli words) and the readout flips by line."""
    random = np.random.default_rng(seed)
    circuit = Circuit()
    q = circuit.qubits("q", QUBITS)
    c = circuit.bits("c", QUBITS)
    placed, readout = [], []
    for _ in range(calls):
        width = int(random.integers(1, 3))
        qubits = [int(i) for i in random.permutation(QUBITS)[:width]]
        p = round(float(random.uniform(0.05, 0.3)), 3)
        words = channels.all_pauli_words(width)
        kind = random.integers(3)
        if kind == 0:
            channel, law = channels.depolarizing(p), {w: p / len(words) for w in words}
        elif kind == 1:
            chosen = [words[i] for i in random.permutation(len(words))[:2]]
            law = {chosen[0]: p, chosen[1]: round(p / 3, 4)}
            channel = channels.pauli(**law)
        else:
            channel, law = None, {}
        circuit.gate("x" if width == 1 else "cx", *(q[i] for i in qubits),
                     noise=[channel] if channel else [])
        placed.append((len(circuit.lines), qubits, law))
    for i in range(QUBITS):
        p01, p10 = (round(float(p), 3) for p in random.uniform(0.02, 0.2, 2))
        circuit.measure(q[i], c[i], noise=[channels.readout_flip(p01, p10)])
        readout.append((len(circuit.lines), p01, p10))
    return circuit, placed, readout


def letters(code, width):
    """The Pauli word of a code."""
    return "".join("IXYZ"[code >> 2 * i & 3] for i in range(width))


class Faults(unittest.TestCase):
    def check(self, seed, readout, terms=None):
        circuit, placed, reads = noisy_permutation(seed, 14)
        out = program.run(circuit, SHOTS, seed=500 + seed, readout=readout, terms=terms,
                          extra=["--faults"])
        line_of = out.locations["line"][out.faults["location"]]
        shot, code = out.faults["shot"], out.faults["pauli"].astype(np.int64)
        true = np.zeros((SHOTS, QUBITS), dtype=bool)
        used = 0
        for line, qubits, law in placed:
            if len(qubits) == 1:
                true[:, qubits[0]] ^= True
            else:
                true[:, qubits[1]] ^= true[:, qubits[0]]
            here = line_of == line
            used += here.sum()
            self.assertEqual(len(np.unique(shot[here])), here.sum(), "one event a place and shot")
            for value, count in zip(*np.unique(code[here], return_counts=True)):
                word = letters(int(value), len(qubits))
                self.assertIn(word, law, f"line {line}")
                p_value = fit.binomial_p_value(count, SHOTS, law[word])
                self.assertGreater(p_value, fit.FALSE_ALARM, f"line {line}: {word} {count}")
                for letter, qubit in zip(word, qubits):
                    if letter in "XY":
                        true[shot[here & (code == value)], qubit] ^= True
            self.assertEqual(len(np.unique(code[here])), len(law), f"line {line}")
        read = true.copy()
        for qubit, (line, p01, p10) in enumerate(reads):
            here = line_of == line
            used += here.sum()
            read[shot[here], qubit] ^= True
            for value, p in ((False, p01), (True, p10)):
                flipped = (read[:, qubit] != true[:, qubit])[true[:, qubit] == value]
                self.assertGreater(fit.binomial_p_value(flipped.sum(), max(len(flipped), 1), p),
                                   fit.FALSE_ALARM, f"readout of {qubit}, state {value}")
        self.assertEqual(used, len(shot), "every event has a place")
        self.assertTrue((read == out.shots["c"]).all())

    def test_faults_explain_the_outcomes(self):
        for seed in range(4):
            with self.subTest(seed=seed):
                self.check(seed, "dense")

    def test_faults_with_sparse_terms(self):
        self.check(7, "probe", terms=2)


if __name__ == "__main__":
    unittest.main()
