"""`verify`: exact laws, tests and exit status.

The exact laws it reports on are compared with those of reference.py and
law_circuits.py, which are computed with numpy and know nothing of the program:
the distance between the mixing law and the ideal one is a number with no
statistics in it. p-values are recomputed with scipy from the reported statistic.
Everything drawn has a fixed seed; a true law is rejected with probability 1e-6.
"""

import json
import pathlib
import tempfile
import unittest

import numpy as np
from scipy import stats

import goodness_of_fit as fit
import law_cases
import program
import random_circuits
from law_circuits import LawCircuit, mixing_weight
from reference import Reference

DEMO = program.ROOT / "demo-data"


def verify(path, *options, check=True):
    """(report, result) of one call."""
    result = program.command("verify", path, *options, "--json", check=check)
    return (json.loads(result.stdout) if result.stdout else None), result


def verify_circuit(circuit, *options, check=True):
    """The same for a circuit made here."""
    with tempfile.TemporaryDirectory() as folder:
        folder = pathlib.Path(folder)
        (folder / "circuit.qasm").write_text(circuit.text())
        if circuit.rules:
            (folder / "noise.toml").write_text(circuit.noise_text())
            options = ("--noise", folder / "noise.toml", *options)
        return verify(folder / "circuit.qasm", *options, check=check)


class Laws(unittest.TestCase):
    def check_tests(self, report):
        """Every p-value belongs to its statistic, and was accepted."""
        tests = [report["law"]]
        tests += [report[name]["test"] for name in ("companion", "corrected") if report[name]]
        for test in tests:
            expected = stats.chi2.sf(test["statistic"], test["degrees_of_freedom"]) \
                if test["degrees_of_freedom"] else 1.0
            self.assertAlmostEqual(test["p_value"], expected, delta=1e-9)
            self.assertTrue(test["accepted"])
            self.assertEqual(test["impossible"], 0)
        self.assertTrue(report["accepted"])

    def test_predicted_distances(self):
        for index, (name, (build, all_terms)) in enumerate(law_cases.CASES.items()):
            circuits = [LawCircuit(companion) for companion in (False, True)]
            for circuit in circuits:
                build(circuit)
            ideal, companion = (Reference(circuit).distribution() for circuit in circuits)
            for terms in all_terms:
                with self.subTest(name, terms=terms):
                    share = mixing_weight(circuits[0].extent, terms)
                    law = (1 - share) * ideal + share * companion
                    report, _ = verify_circuit(
                        circuits[0], "--shots", 20000, "--terms", terms, "--readout", "walk",
                        "--seed", 300 + index)
                    self.assertAlmostEqual(report["extent"], circuits[0].extent, 8)
                    self.assertAlmostEqual(report["mixing_weight"], share, 8)
                    self.assertAlmostEqual(report["distance"]["predicted"],
                                           fit.total_variation(law, ideal), 9)
                    self.assertEqual(report["outcomes"], int((law > 1e-12).sum()))
                    # Half the mean absolute deviations of binomial laws.
                    deviations = [abs(np.arange(20001) / 20000 - p)
                                  @ stats.binom.pmf(np.arange(20001), 20000, p) for p in law]
                    self.assertAlmostEqual(report["distance"]["statistical"],
                                           sum(deviations) / 2, 8)
                    self.check_tests(report)

    def test_random_circuits(self):
        """Adaptive circuits with all channels, half of them with damping, exact and
        with few terms. The number of possible outcomes is that of the reference.
        Where the companion differs from path to path it is refused."""
        refused = 0
        for seed in range(16):
            circuit = random_circuits.build(500 + seed, damping=seed % 2 == 0)
            outcomes = int((Reference(circuit).distribution() > 1e-12).sum())
            report, _ = verify_circuit(circuit, "--shots", 20000, "--readout", "dense",
                                       "--seed", seed)
            self.assertEqual(report["outcomes"], outcomes, circuit.text())
            self.assertEqual(report["distance"]["predicted"], 0)
            self.check_tests(report)
            report, result = verify_circuit(circuit, "--shots", 20000, "--readout", "walk",
                                            "--terms", 2 + seed % 7, "--seed", seed, check=False)
            if result.returncode == 2:
                self.assertIn("path to path", result.stderr)
                refused += 1
                continue
            self.assertEqual(result.returncode, 0, f"{result.stderr}\n{circuit.text()}")
            self.check_tests(report)
        self.assertLess(refused, 12)

    def test_demo_circuits(self):
        noise = {"five-t": ("--noise", DEMO / "bench-b-idle.toml")}
        for name in ("five-t", "ghz-phase", "t-injection", "hidden-shift"):
            for terms in range(2, 9):
                with self.subTest(name, terms=terms):
                    report, _ = verify(DEMO / f"{name}.qasm", *noise.get(name, ()), "--shots",
                                       20000, "--terms", terms, "--readout", "walk", "--seed",
                                       terms)
                    self.check_tests(report)
            with self.subTest(name, readout="probe"):
                report, _ = verify(DEMO / f"{name}.qasm", *noise.get(name, ()), "--shots", 3000,
                                   "--terms", 4, "--readout", "probe", "--seed", 1)
                self.assertTrue(report["accepted"])
                self.assertGreater(report["distance"]["allowed_bias"], 0)

    def test_shots_are_those_of_run(self):
        """Same seed, same bits: the distance to the ideal law agrees."""
        circuit = LawCircuit(False)
        law_cases.dephased_t(circuit)
        ideal = Reference(circuit).distribution()
        drawn = program.run(circuit, 5000, seed=9, readout="walk", terms=3)
        report, _ = verify_circuit(circuit, "--shots", 5000, "--terms", 3, "--readout", "walk",
                                   "--seed", 9)
        self.assertAlmostEqual(report["distance"]["to_ideal"],
                               fit.total_variation(drawn.counts() / 5000, ideal), 9)


class Refusals(unittest.TestCase):
    def refused(self, name, *words, options=("--shots", 100)):
        report, result = verify(name, *options, check=False)
        self.assertEqual(result.returncode, 2, result.stderr)
        self.assertIsNone(report)
        for word in words:
            self.assertIn(word, result.stderr)

    def test_too_large(self):
        self.refused(DEMO / "wide-layers.qasm", "36 qubits", "at most 12")
        self.refused(DEMO / "steane-memory.qasm", "13 qubits", "at most 12")

    def test_too_many_outcomes(self):
        with tempfile.TemporaryDirectory() as folder:
            path = pathlib.Path(folder) / "coins.qasm"
            path.write_text("OPENQASM 3.0;\ninclude \"stdgates.inc\";\nqubit q;\nbit[40] c;\n"
                            "for int i in [0:39] { h q; c[i] = measure q; }\n")
            self.refused(path, "bits that are recorded")

    def test_bad_input(self):
        self.refused("none.qasm", "none.qasm")
        self.refused(DEMO / "five-t.qasm", "--shots", options=("--shots", 0))
        self.refused(DEMO / "five-t.qasm", "--delta", options=("--shots", 10, "--delta", 3))

    def test_quiet(self):
        result = program.command("verify", DEMO / "five-t.qasm", "--shots", 1000, "--seed", 1,
                                 "--quiet")
        self.assertEqual((result.stdout, result.stderr), ("", ""))

    def test_text(self):
        result = program.command("verify", DEMO / "five-t.qasm", "--shots", 1000, "--seed", 1,
                                 "--terms", 3, "--readout", "walk")
        for word in ("mixing law", "companion", "corrected", "accepted", "k = 3 terms"):
            self.assertIn(word, result.stdout)
        self.assertLessEqual(max(map(len, result.stdout.splitlines())), 80)


if __name__ == "__main__":
    unittest.main()
