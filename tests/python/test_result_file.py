"""The result file as h5py sees it, and what becomes of it when things go wrong.

The circuit is small enough to know every relation between its bits: the middle
qubit always reads 1, the last one reads 1 exactly where its bit flip fired, and
the other registers repeat bits of the first. Extent of a t gate dephased by p:
(1 - p)/cos^2(pi/8), PRX Quantum 2, 010345 (2021). The weight of the companion
circuit is xi/(k - 1 + xi) with k = ceil(1 + xi (2/delta - 1)) (one line of
algebra from the second moment of the drawn state).
"""

import hashlib
import json
import math
import os
import pathlib
import resource
import signal
import subprocess
import tempfile
import time
import unittest

import h5py
import numpy as np

import program

CIRCUIT = """OPENQASM 3.0;
include "stdgates.inc";
// Grüße: not only ASCII.
qubit[3] q;
output bit[3] out;
@check
output bit[2] syn;
@logical
output bit answer;
h q[0];
t q[0];
h q[0];
x q[1];
@noise bit-flip(0.25)
id q[2];
out = measure q;
syn[0] = !out[1];
syn[1] = out[2];
answer = out[0];
"""
NOISE = """title = "bench B"

[[rule]]
on = ["t"]
channel = "dephasing(0.05)"
"""
SHOTS, COMPANION, SEED, DELTA = 3000, 500, 5, 0.5
# zlib's deflate and the byte shuffle, which every HDF5 library contains.
PLAIN_FILTERS = {h5py.h5z.FILTER_DEFLATE, h5py.h5z.FILTER_SHUFFLE}


def draw(folder, name="out.h5", *extra, check=True, shots=SHOTS, **options):
    """One run in `folder`."""
    (folder / "circuit.qasm").write_text(CIRCUIT)
    (folder / "noise.toml").write_text(NOISE)
    return program.command("run", folder / "circuit.qasm", "--noise", folder / "noise.toml",
                           "--shots", shots, "--seed", SEED, "--delta", DELTA,
                           "--readout", "probe", "--companion", COMPANION, "--faults",
                           "--out", folder / name, "--quiet", *extra, check=check, **options)


class ResultFile(unittest.TestCase):
    """One file, looked at from all sides."""

    @classmethod
    def setUpClass(cls):
        cls.temporary = tempfile.TemporaryDirectory()
        cls.addClassCleanup(cls.temporary.cleanup)
        cls.folder = pathlib.Path(cls.temporary.name)
        draw(cls.folder)
        cls.file = h5py.File(cls.folder / "out.h5")
        cls.addClassCleanup(cls.file.close)

    def test_texts_are_str(self):
        attributes = self.file.attrs
        self.assertEqual(attributes["format"], "shot record")
        self.assertEqual(attributes["circuit"], CIRCUIT)
        self.assertEqual(attributes["noise"], NOISE)
        self.assertEqual(attributes["title"], "bench B")
        self.assertEqual(attributes["readout"], "probe")
        self.assertEqual(attributes["circuit_sha256"],
                         hashlib.sha256(CIRCUIT.encode()).hexdigest())
        for name in ("format", "program_version", "circuit", "circuit_name", "noise", "readout"):
            self.assertIs(type(attributes[name]), str, name)
        self.assertTrue(all(type(line) is str and "=" in line for line in attributes["settings"]))

    def test_numbers_follow_their_formulas(self):
        attributes = self.file.attrs
        extent = 0.95 / math.cos(math.pi / 8) ** 2
        terms = math.ceil(1 + extent * (2 / DELTA - 1))
        self.assertAlmostEqual(attributes["extent"], extent, delta=1e-9)
        self.assertAlmostEqual(attributes["log_extent"], math.log(extent), delta=1e-9)
        self.assertGreaterEqual(attributes["terms"], terms)
        kept = attributes["terms"] - 1 + extent
        self.assertAlmostEqual(attributes["mixing_weight"], extent / kept, delta=1e-9)
        self.assertEqual(attributes["seed"], SEED)
        self.assertEqual(attributes["delta"], DELTA)
        self.assertEqual(attributes["shots"], SHOTS)
        self.assertEqual(attributes["shots_total"], SHOTS)
        self.assertEqual(attributes["companion_shots"], COMPANION)
        self.assertEqual(attributes["format_version"], 1)
        self.assertEqual(list(attributes["part"]), [1, 1])

    def test_registers_are_numpy_bool_in_order(self):
        widths = {"out": 3, "syn": 2, "answer": 1}
        roles = {"out": "record", "syn": "check", "answer": "logical"}
        for group, rows in (("shots", SHOTS), ("companion", COMPANION)):
            self.assertEqual(list(self.file[group]), ["out", "syn", "answer"])
            for name, data in self.file[group].items():
                self.assertEqual(data.dtype, np.dtype(np.bool_))
                self.assertEqual(data.shape, (rows, widths[name]))
                self.assertEqual(data.attrs["role"], roles[name])

    def test_bits_are_where_they_belong(self):
        for group in ("shots", "companion"):
            out, syn, answer = (self.file[group][name][()] for name in ("out", "syn", "answer"))
            self.assertTrue(out[:, 1].all())
            self.assertFalse(syn[:, 0].any())
            self.assertTrue((syn[:, 1] == out[:, 2]).all())
            self.assertTrue((answer[:, 0] == out[:, 0]).all())
            # Neither constant: 0.25 and about 0.18 or 0.5 of the shots.
            self.assertTrue(0 < out[:, 2].sum() < len(out))
            self.assertTrue(0 < out[:, 0].sum() < len(out))

    def test_faults_explain_the_flips(self):
        faults = self.file["faults"]
        locations = faults["locations"][()]
        self.assertEqual(h5py.check_string_dtype(locations.dtype["kind"]).encoding, "utf-8")
        flip_line = CIRCUIT.splitlines().index("id q[2];") + 1
        flips = {row for row, place in enumerate(locations)
                 if abs(place["probability"] - 0.25) < 1e-12}
        self.assertEqual([(place["line"], place["qubits"].decode())
                          for row, place in enumerate(locations) if row in flips],
                         [(flip_line, "q[2]")])
        shots, where, pauli = (faults[name][()] for name in ("shot", "location", "pauli"))
        at_flip = np.isin(where, list(flips))
        self.assertTrue((pauli[at_flip] == 1).all(), "the Pauli X has the number 1")
        fired = np.zeros(SHOTS, dtype=bool)
        fired[shots[at_flip]] = True
        self.assertTrue((fired == self.file["shots"]["out"][:, 2]).all())

    def test_sites_are_a_table(self):
        sites = self.file["sites"]
        self.assertEqual(h5py.check_string_dtype(sites.dtype["qubits"]).encoding, "utf-8")
        (site,) = sites[()]
        self.assertEqual(site["qubits"].decode(), "q[0]")
        self.assertIs(type(site["kept"]), np.bool_)
        self.assertTrue(site["kept"])
        self.assertEqual(site["members"], 2)
        self.assertAlmostEqual(site["extent_without_noise"], 1 / math.cos(math.pi / 8) ** 2,
                               delta=1e-9)
        self.assertAlmostEqual(site["extent"], 0.95 / math.cos(math.pi / 8) ** 2, delta=1e-9)

    def test_audit_has_one_entry_a_shot(self):
        audit = self.file["audit"]
        for name, kind in (("attempts", np.uint32), ("peak_active", np.uint16),
                           ("terms_left", np.uint32)):
            self.assertEqual(audit[name].dtype, kind)
            self.assertEqual(audit[name].shape, (SHOTS,))
        self.assertGreaterEqual(audit["attempts"][()].min(), 1)
        self.assertLessEqual(audit["terms_left"][()].max(), self.file.attrs["terms"])
        self.assertGreaterEqual(audit.attrs["clipped"], 0)

    def test_norm_audit(self):
        """The one site is met before the only measurement of an active qubit: the
        mean of the estimates is 1 + (xi - 1)/k, here with so few of them that 6
        standard deviations of one estimate (at most its own mean) are allowed."""
        norms = self.file["audit/norm"]
        extent, terms = self.file.attrs["extent"], self.file.attrs["terms"]
        self.assertAlmostEqual(norms.attrs["expected"], 1 + (extent - 1) / terms, delta=1e-12)
        self.assertAlmostEqual(norms.attrs["log_extent"], math.log(extent), delta=1e-12)
        self.assertEqual(norms.attrs["terms"], terms)
        shots, estimates = norms["shot"][()], norms["estimate"][()]
        self.assertEqual((shots.dtype, estimates.dtype), (np.uint64, np.float64))
        self.assertEqual(shots.shape, estimates.shape)
        self.assertGreater(len(shots), 0)
        self.assertTrue((np.diff(shots.astype(int)) > 0).all() and shots[-1] < SHOTS)
        self.assertTrue((estimates >= 0).all())
        expected = norms.attrs["expected"]
        self.assertLess(abs(estimates.mean() - expected), 6 * expected / math.sqrt(len(shots)))
        shown = program.command("show", self.folder / "out.h5", "--json")
        norm = json.loads(shown.stdout)["norm"]
        self.assertEqual(norm["estimates"], len(shots))
        self.assertAlmostEqual(norm["mean"], estimates.mean(), delta=1e-12)
        error = estimates.std(ddof=1) / math.sqrt(len(shots))
        self.assertAlmostEqual(norm["standard_error"], error, delta=1e-12)

    def test_the_file_says_how_to_correct(self):
        text = self.file.attrs["correction"]
        for word in ("mixing_weight", "/companion", "standard error"):
            self.assertIn(word, text)

    def test_no_plugin_is_needed(self):
        seen = []

        def look(name, item):
            if isinstance(item, h5py.Dataset):
                plist = item.id.get_create_plist()
                filters = {plist.get_filter(i)[0] for i in range(plist.get_nfilters())}
                self.assertLessEqual(filters, PLAIN_FILTERS, name)
                seen.append(name)

        self.file.visititems(look)
        self.assertIn("shots/out", seen)
        out = self.file["shots/out"]
        self.assertEqual(out.compression, "gzip")
        self.assertIsNotNone(out.chunks)

    def test_summary_agrees_with_the_bits(self):
        shown = program.command("show", self.folder / "out.h5", "--json")
        summary = json.loads(shown.stdout)
        weight = self.file.attrs["mixing_weight"]
        registers = {register["name"]: register for register in summary["registers"]}

        def close(quantity, raw, companion):
            def estimate(bits):
                return bits.mean(), bits.std() / math.sqrt(len(bits))

            (p, p_error), (c, c_error) = estimate(raw), estimate(companion)
            self.assertAlmostEqual(quantity["raw"]["value"], p, delta=1e-12)
            self.assertAlmostEqual(quantity["raw"]["standard_error"], p_error, delta=1e-12)
            self.assertAlmostEqual(quantity["companion"]["value"], c, delta=1e-12)
            corrected = quantity["corrected"]
            self.assertAlmostEqual(corrected["value"], (p - weight * c) / (1 - weight),
                                   delta=1e-12)
            error = math.hypot(p_error, weight * c_error) / (1 - weight)
            self.assertAlmostEqual(corrected["standard_error"], error, delta=1e-12)

        shots, companion = self.file["shots"], self.file["companion"]
        close(registers["answer"]["bits"][0], shots["answer"][:, 0], companion["answer"][:, 0])
        close(registers["syn"]["any_nonzero"], shots["syn"][()].any(axis=1),
              companion["syn"][()].any(axis=1))
        close(registers["syn"]["mean_weight"], shots["syn"][()].sum(axis=1),
              companion["syn"][()].sum(axis=1))
        for outcome in registers["out"]["outcomes"]:
            word = np.array([bit == "1" for bit in reversed(outcome["bits"])])
            close(outcome["frequency"], (shots["out"][()] == word).all(axis=1),
                  (companion["out"][()] == word).all(axis=1))
        self.assertEqual(sum(round(outcome["frequency"]["raw"]["value"] * SHOTS)
                             for outcome in registers["out"]["outcomes"]), SHOTS)
        text = program.command("show", self.folder / "out.h5").stdout
        self.assertLessEqual(max(map(len, text.splitlines())), 100)

    def test_same_seed_same_file(self):
        draw(self.folder, "again.h5", "--threads", 1)
        first = (self.folder / "out.h5").read_bytes()
        self.assertEqual(first, (self.folder / "again.h5").read_bytes())


class Trouble(unittest.TestCase):
    """What must not happen to files."""

    def setUp(self):
        temporary = tempfile.TemporaryDirectory()
        self.addCleanup(temporary.cleanup)
        self.folder = pathlib.Path(temporary.name)

    def names(self):
        """Files beside the inputs."""
        inputs = {"circuit.qasm", "noise.toml"}
        return sorted(path.name for path in self.folder.iterdir() if path.name not in inputs)

    def test_existing_output_is_kept(self):
        (self.folder / "out.h5").write_text("precious")
        result = draw(self.folder, check=False)
        self.assertEqual(result.returncode, 2)
        self.assertIn("--force", result.stderr)
        self.assertIn("out.h5", result.stderr)
        self.assertEqual((self.folder / "out.h5").read_text(), "precious")
        self.assertEqual(self.names(), ["out.h5"])
        draw(self.folder, "out.h5", "--force")
        self.assertEqual(self.names(), ["out.h5"])
        with h5py.File(self.folder / "out.h5") as file:
            self.assertEqual(file.attrs["shots"], SHOTS)

    def test_missing_directory_fails_at_once(self):
        result = draw(self.folder, "none/out.h5", check=False, shots=10**12)
        self.assertEqual(result.returncode, 2)
        self.assertIn("none", result.stderr)
        self.assertEqual(self.names(), [])

    def test_a_device_is_not_replaced(self):
        (self.folder / "circuit.qasm").write_text(CIRCUIT)
        result = program.command("run", self.folder / "circuit.qasm", "--shots", 10,
                                 "--out", "/dev/full", "--force", check=False)
        self.assertEqual(result.returncode, 2)
        self.assertTrue(pathlib.Path("/dev/full").is_char_device())

    def test_file_size_limit_is_reported(self):
        """A full disk, as far as a test without its own disk can have one."""
        draw(self.folder, "whole.h5")
        size = (self.folder / "whole.h5").stat().st_size
        (self.folder / "whole.h5").unlink()
        for limit in (100, size // 4, size // 2, size - 100):
            result = subprocess.run(
                [program.binary(), "run", self.folder / "circuit.qasm", "--noise",
                 self.folder / "noise.toml", "--shots", str(SHOTS), "--seed", str(SEED),
                 "--delta", str(DELTA), "--readout", "probe", "--companion", str(COMPANION),
                 "--faults", "--out", self.folder / "out.h5", "--quiet"],
                capture_output=True, text=True, timeout=120,
                preexec_fn=lambda limit=limit: resource.setrlimit(
                    resource.RLIMIT_FSIZE, (limit, limit)))
            self.assertIn(result.returncode, (1, 2), f"limit {limit}: {result}")
            self.assertIn("out.h5", result.stderr)
            self.assertEqual(self.names(), [], f"limit {limit}")

    def test_a_killed_run_leaves_no_result(self):
        (self.folder / "circuit.qasm").write_text(CIRCUIT)
        process = subprocess.Popen(
            [program.binary(), "run", self.folder / "circuit.qasm", "--shots", str(10**9),
             "--out", self.folder / "out.h5", "--quiet"],
            stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        try:
            deadline = time.monotonic() + 60
            while not self.names() and process.poll() is None and time.monotonic() < deadline:
                time.sleep(0.05)
            self.assertTrue(self.names(), "the output is prepared at the start")
            self.assertIsNone(process.poll())
        finally:
            os.kill(process.pid, signal.SIGKILL)
            process.wait()
        self.assertNotIn("out.h5", self.names())

    def test_show_tells_files_apart(self):
        def refused(name):
            result = program.command("show", self.folder / name, check=False)
            self.assertIn(result.returncode, (1, 2))
            self.assertIn(name, result.stderr)
            self.assertEqual(result.stdout, "")
            return result.stderr

        self.assertIn("not exist", refused("none.h5"))
        (self.folder / "text.h5").write_text("OPENQASM 3.0;")
        self.assertIn("not an HDF5 file", refused("text.h5"))
        with h5py.File(self.folder / "other.h5", "w") as file:
            file["shots"] = [1, 2, 3]
        self.assertIn("not a shot record", refused("other.h5"))
        draw(self.folder, "good.h5")
        whole = (self.folder / "good.h5").read_bytes()
        (self.folder / "cut.h5").write_bytes(whole[:len(whole) // 2])
        refused("cut.h5")
        (self.folder / "newer.h5").write_bytes(whole)
        with h5py.File(self.folder / "newer.h5", "a") as file:
            file.attrs.modify("format_version", np.uint64(2))
        self.assertIn("newer", refused("newer.h5"))
        (self.folder / "short.h5").write_bytes(whole)
        with h5py.File(self.folder / "short.h5", "a") as file:
            file["shots/out"].resize((7, 3))
        self.assertIn("damaged", refused("short.h5"))


if __name__ == "__main__":
    unittest.main()
