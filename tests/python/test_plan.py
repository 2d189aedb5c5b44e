"""`plan`: its JSON document, what it says of hopeless circuits, limits, pictures.

Numbers that follow from the theory are recomputed here: k = ceil(1 + xi(2/delta - 1))
and xi as a product of extents (PRX Quantum 2, 010345 (2021); the extent of a t is
1/cos^2(pi/8), Quantum 3, 181 (2019)). Times are those of the machine, so only their
order and sign are checked here; `scripts/bench --only plan` compares them with runs.
"""

import json
import math
import pathlib
import re
import tempfile
import time
import unittest
import xml.etree.ElementTree as ElementTree

import h5py

from program import ROOT, command

DEMO = ROOT / "demo-data"
WIDE = [DEMO / "wide-layers.qasm", "--noise", DEMO / "bench-b-gates.toml"]
T_EXTENT = 1 / math.cos(math.pi / 8) ** 2
SVG = "{http://www.w3.org/2000/svg}"


def plan(*arguments, check=True):
    """The document of a call, and the call itself."""
    result = command("plan", *arguments, "--json", check=check, timeout=120)
    return json.loads(result.stdout), result


def magic_states(qubits, count):
    """`count` prepared T-type states among `qubits` qubits, entangled and measured
    across: no two of them merge, and every one bears on the outcomes."""
    lines = ["OPENQASM 3.0;", 'include "stdgates.inc";', f"qubit[{qubits}] q;",
             f"bit[{qubits}] c;", "h q;", f"t q[0:{count - 1}];",
             f"for int i in [0:{qubits - 2}] {{ cz q[i], q[i + 1]; }}", "h q;", "c = measure q;"]
    return "\n".join(lines) + "\n"


def terms(extent, delta):
    """k = ceil(1 + xi (2/delta - 1))."""
    return 1 + math.ceil(extent * (2 / delta - 1))


class Document(unittest.TestCase):
    @classmethod
    def setUpClass(cls):
        cls.document, cls.result = plan(*WIDE, "--shots", 500)

    def test_keys_and_types(self):
        number, whole = (int, float), int
        expected = {
            "program_version": str, "circuit": str, "noise": str, "title": str,
            "qubits": whole, "shots": whole, "companion_shots": whole, "threads": whole,
            "sites": dict, "costliest": list, "active": dict, "inner_measurements": whole,
            "measured": dict, "limits": dict, "dense": dict, "rows": list, "curve": list,
            "choice": type(None), "refused": type(None), "blocked": type(None),
        }
        self.assertEqual(set(self.document), set(expected))
        for name, kind in expected.items():
            self.assertIsInstance(self.document[name], kind, name)
        for name in ("as_written", "merged", "deterministic", "unobservable", "kept",
                     "log10_extent_as_written", "log10_extent_after_noise", "log10_extent",
                     "extent"):
            self.assertIsInstance(self.document["sites"][name], number, name)
        for name in ("seconds", "start_seconds", "end_seconds", "companion_seconds",
                     "write_seconds", "write_companion_seconds", "memory_base",
                     "bytes_per_term"):
            self.assertGreaterEqual(self.document["measured"][name], 0, name)
        for point in self.document["measured"]["walk"]:
            self.assertGreater(point["seconds_a_shot"], 0)
            self.assertGreaterEqual(point["attempts"], 1)
            self.assertGreater(point["shots"], 0)
        self.assertEqual(len(self.document["rows"]), 7)
        for row in self.document["rows"]:
            for readout in ("walk", "probe"):
                estimate = row[readout]
                self.assertIsInstance(estimate["terms"], int)
                self.assertGreater(estimate["seconds_a_shot"], 0)
                self.assertGreater(estimate["seconds"], 499 * estimate["seconds_a_shot"])
                self.assertIsInstance(estimate["extrapolated"], bool)
            self.assertIn(row["readout"], ("walk", "dense"))
        self.assertEqual(self.result.stderr, "")

    def test_it_answers_in_seconds(self):
        self.assertLess(self.document["measured"]["seconds"], 30)

    def test_terms_follow_the_law(self):
        """k and lambda = xi/(k - 1 + xi) from xi and delta."""
        extent = self.document["sites"]["extent"]
        for row in self.document["rows"]:
            if row["average"]:
                self.assertIsNone(row["delta"])
                # k = 1 + (xi + sqrt(xi^2 + 8 xi))/2, least for corrected averages.
                expected = 1 + math.ceil((extent + math.sqrt(extent**2 + 8 * extent)) / 2)
            else:
                expected = terms(extent, row["delta"])
            self.assertEqual(row["walk"]["terms"], expected)
            self.assertAlmostEqual(row["mixing_weight"], extent / (expected - 1 + extent))
            self.assertAlmostEqual(row["log10_terms"], math.log10(expected), places=6)

    def test_smaller_errors_cost_more(self):
        rows = [row for row in self.document["rows"] if not row["average"]]
        self.assertEqual([row["delta"] for row in rows], [0.5, 0.2, 0.1, 0.05, 0.02, 0.01])
        curve = self.document["curve"]
        for before, after in zip(curve, curve[1:]):
            self.assertGreater(before["delta"], after["delta"])
            self.assertLessEqual(before["seconds"], after["seconds"])
            self.assertLessEqual(before["memory_bytes"], after["memory_bytes"] * 1.0001)
        for before, after in zip(rows, rows[1:]):
            for field in ("terms", "seconds", "seconds_a_shot"):
                self.assertLessEqual(before["walk"][field], after["walk"][field], field)
        # From 0.5 to 0.01 the number of terms grows by 65; a shot by nearly that.
        self.assertGreater(rows[-1]["walk"]["seconds_a_shot"],
                           10 * rows[0]["walk"]["seconds_a_shot"])

    def test_active_qubits_are_those_of_a_run(self):
        active = self.document["active"]
        self.assertEqual(active["peak"], len(active["steps"]) - 1)
        with tempfile.TemporaryDirectory() as folder:
            path = pathlib.Path(folder) / "out.h5"
            command("run", *WIDE, "--shots", 4, "--readout", "walk", "--out", path, "-q")
            with h5py.File(path) as file:
                self.assertEqual(active["peak"], int(file["audit/peak_active"][:].max()))
                self.assertAlmostEqual(self.document["sites"]["extent"], file.attrs["extent"])

    def test_rows_are_those_asked_for(self):
        document, _ = plan(DEMO / "five-t.qasm", "--delta", 0.3, 0.7, "--readout", "walk")
        self.assertEqual([row["delta"] for row in document["rows"]], [0.7, 0.3, None])
        self.assertEqual({row["readout"] for row in document["rows"]}, {"walk"})


class EveryReadOut(unittest.TestCase):
    """Circuits whose few-term sums are mostly refused in a run: a measurement keeps
    them all, or plans would wait for shots that never come."""

    def test_large_extents_with_few_terms(self):
        for name in ("hidden-shift.qasm", "hidden-shift-forty.qasm", "t-injection.qasm"):
            with self.subTest(name):
                document, _ = plan(DEMO / name, "--shots", 1000, "--delta", 0.1)
                [row] = [row for row in document["rows"] if row["delta"] is not None]
                for readout in ("walk", "probe"):
                    self.assertGreater(row[readout]["seconds"], 0.0)
                self.assertGreater(document["dense"]["seconds"], 0.0)


class Hopeless(unittest.TestCase):
    def ask(self, qubits, count, *arguments):
        with tempfile.TemporaryDirectory() as folder:
            path = pathlib.Path(folder) / "circuit.qasm"
            path.write_text(magic_states(qubits, count))
            start = time.perf_counter()
            result = command("plan", path, *arguments, timeout=120, check=False)
            return result, time.perf_counter() - start

    def test_three_hundred_t_gates_on_a_thousand_qubits(self):
        result, seconds = self.ask(1000, 300, "--json")
        self.assertEqual(result.returncode, 0, result.stderr)
        self.assertLess(seconds, 30)
        document = json.loads(result.stdout)
        log10 = 300 * math.log10(T_EXTENT)
        self.assertAlmostEqual(document["sites"]["log10_extent"], log10, places=6)
        self.assertIn("active qubits", document["blocked"])
        for row in document["rows"]:
            self.assertIsNone(row["readout"])
            if row["average"]:
                continue
            self.assertAlmostEqual(row["log10_terms"], log10 + math.log10(2 / row["delta"] - 1),
                                   places=6)
            self.assertIsNone(row["walk"]["terms"])
            self.assertTrue(row["walk"]["extrapolated"])
            # At the very least a nanosecond and a hundred bytes a term.
            least = 10 ** row["log10_terms"]
            self.assertGreater(row["walk"]["seconds"], 1e-9 * least)
            self.assertGreater(row["walk"]["memory_bytes"], 100 * least)

    def test_the_text_says_so(self):
        result, _ = self.ask(1000, 300)
        self.assertEqual(result.returncode, 0, result.stderr)
        self.assertRegex(result.stdout, r"cannot be run here .* 10\^21\.\d terms, .* years and")

    def test_compiled_but_far_too_large(self):
        result, seconds = self.ask(200, 200, "--json")
        self.assertLess(seconds, 60)
        document = json.loads(result.stdout)
        self.assertIsNone(document["blocked"])
        self.assertTrue(all(row["readout"] is None for row in document["rows"]))
        self.assertTrue(all(row["walk"]["seconds"] > 1e9 for row in document["rows"]))
        self.assertIn("active qubits", document["dense"]["refused"])


class Limits(unittest.TestCase):
    def test_a_budget_chooses_the_smallest_error(self):
        document, _ = plan(*WIDE, "--shots", 20_000, "--budget", "60s", "--readout", "walk")
        choice = document["choice"]
        self.assertLessEqual(choice["seconds"], 60)
        self.assertGreaterEqual(choice["seconds"], 20)
        self.assertEqual(choice["readout"], "walk")
        self.assertEqual(choice["terms"], terms(document["sites"]["extent"], choice["delta"]))
        # Two significant digits.
        self.assertEqual(float(f"{choice['delta']:.1e}"), choice["delta"])

    def test_more_time_buys_less_error(self):
        found = [plan(*WIDE, "--shots", 20_000, "--budget", budget, "--readout", "walk")[0]
                 ["choice"]["delta"] for budget in ("20s", "200s")]
        self.assertGreater(found[0], 3 * found[1])

    def test_the_exact_read_out_counts_as_the_smallest_error(self):
        document, _ = plan(DEMO / "steane-memory.qasm", "--budget", "10min")
        self.assertEqual(document["choice"]["readout"], "dense")
        self.assertIsNone(document["choice"]["delta"])

    def test_memory_chooses(self):
        document, _ = plan(*WIDE, "--memory", "150MB", "--readout", "walk")
        choice = document["choice"]
        self.assertLessEqual(choice["memory_bytes"], 150e6)
        self.assertGreater(choice["memory_bytes"], 75e6)
        self.assertEqual(document["limits"]["memory_bytes"], 150_000_000)

    def test_a_refusal_says_what_costs_and_what_helps(self):
        document, result = plan(*WIDE, "--shots", 100_000_000, "--budget", "10s", check=False)
        self.assertEqual(result.returncode, 2)
        self.assertIsNone(document["choice"])
        for text in (result.stderr, document["refused"]):
            for words in ("nothing fits", "δ = 1", "costly: ", "extent 1.1", "fewer shots help",
                          "noise on a gate lowers its extent", "ccz"):
                self.assertIn(words, text)

    def test_run_takes_the_same_choice(self):
        with tempfile.TemporaryDirectory() as folder:
            path = pathlib.Path(folder) / "out.h5"
            start = time.perf_counter()
            result = command("run", *WIDE, "--shots", 1000, "--budget", "8s", "--readout", "walk",
                             "--out", path)
            seconds = time.perf_counter() - start
            match = re.search(r"within the limits: δ = (\S+) \(read-out walk, k = (\d+)\)",
                              result.stderr)
            self.assertIsNotNone(match, result.stderr)
            with h5py.File(path) as file:
                self.assertEqual(file.attrs["delta"], float(match[1]))
                self.assertEqual(file.attrs["terms"], int(match[2]))
                self.assertEqual(file["shots"].attrs.get("shots", 1000), 1000)
            # The measurement itself comes on top; a loaded machine has its moods.
            self.assertLess(seconds, 40)

    def test_run_refuses_before_anything_is_written(self):
        with tempfile.TemporaryDirectory() as folder:
            path = pathlib.Path(folder) / "out.h5"
            result = command("run", *WIDE, "--shots", 100_000_000, "--budget", "2s",
                             "--out", path, check=False)
            self.assertEqual(result.returncode, 2)
            self.assertIn("nothing fits", result.stderr)
            self.assertEqual(list(pathlib.Path(folder).iterdir()), [])

    def test_options_that_contradict_are_refused(self):
        for words in (["--budget", "10"], ["--budget", "-3s"], ["--memory", "8G"],
                      ["--budget", "10min", "--delta", "0.1"],
                      ["--budget", "10min", "--terms", "7"],
                      ["--budget", "10min", "--part", "1/2"]):
            result = command("run", DEMO / "five-t.qasm", "--shots", 10, "--out", "no.h5", *words,
                             check=False)
            self.assertEqual(result.returncode, 2, words)
        self.assertFalse(pathlib.Path("no.h5").exists())


class Pictures(unittest.TestCase):
    def parsed(self, path):
        """The picture as a tree: well-formed XML, text as text, both colour schemes."""
        root = ElementTree.parse(path).getroot()
        self.assertEqual(root.tag, SVG + "svg")
        style = root.find(SVG + "style").text
        self.assertIn("prefers-color-scheme:dark", style)
        width, height = float(root.get("width")), float(root.get("height"))
        for text in root.iter(SVG + "text"):
            self.assertTrue(text.text)
            if text.get("transform") is None:
                self.assertTrue(0 <= float(text.get("x")) <= width, text.text)
                self.assertTrue(0 <= float(text.get("y")) <= height, text.text)
        used = {word for element in root.iter() for word in (element.get("class") or "").split()}
        for word in used:
            self.assertTrue(re.search(rf"\.{word}\b", style), word)
        return root

    def texts(self, root):
        return [text.text for text in root.iter(SVG + "text")]

    def test_plan(self):
        with tempfile.TemporaryDirectory() as folder:
            path = pathlib.Path(folder) / "plan.svg"
            plan(*WIDE, "--shots", 20_000, "--budget", "60s", "--memory", "100MB", "--readout",
                 "walk", "--figure", path)
            texts = self.texts(self.parsed(path))
            self.assertIn("trace-norm error δ", texts)
            self.assertIn("time allowed", texts)
            self.assertTrue(any(text.startswith("chosen: δ = ") for text in texts))
            self.assertTrue(any("95.4 MiB" in text for text in texts))

    def test_plan_of_a_name_with_markup_in_it(self):
        with tempfile.TemporaryDirectory() as folder:
            source = pathlib.Path(folder) / "a<b>&\"c\".qasm"
            source.write_text((DEMO / "five-t.qasm").read_text())
            path = pathlib.Path(folder) / "plan.svg"
            plan(source, "--figure", path)
            self.assertTrue(any('a<b>&"c".qasm' in text for text in self.texts(self.parsed(path))))

    def test_shots(self):
        with tempfile.TemporaryDirectory() as folder:
            folder = pathlib.Path(folder)
            for name, readout in (("hidden-shift", "walk"), ("five-t", "walk"),
                                  ("ghz-phase", "dense")):
                command("run", DEMO / f"{name}.qasm", "--shots", 400, "--readout", readout,
                        "--seed", 4, "--out", folder / "out.h5", "-q", "--force")
                command("show", folder / "out.h5", "--figure", folder / "out.svg", "--force")
                texts = self.texts(self.parsed(folder / "out.svg"))
                self.assertIn("as drawn", texts)
                self.assertEqual("corrected" in texts, readout == "walk")
                self.assertEqual("companion" in texts, readout == "walk")

    def test_pictures_are_not_overwritten_unasked(self):
        with tempfile.TemporaryDirectory() as folder:
            path = pathlib.Path(folder) / "old.svg"
            path.write_text("old")
            result = command("plan", DEMO / "five-t.qasm", "--figure", path, check=False)
            self.assertEqual(result.returncode, 2)
            self.assertEqual(path.read_text(), "old")
            result = command("plan", DEMO / "five-t.qasm", "--figure",
                             pathlib.Path(folder) / "none" / "a.svg", check=False)
            self.assertEqual(result.returncode, 2)


if __name__ == "__main__":
    unittest.main()
