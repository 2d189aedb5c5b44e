"""Runs the program and reads its result files with h5py.

The binary is the one named by the environment variable SHOTTOWER, or else the
newest of target/release and target/debug.
"""

import os
import pathlib
import subprocess
import tempfile
from dataclasses import dataclass

import h5py
import numpy as np

ROOT = pathlib.Path(__file__).resolve().parents[2]


def binary():
    """Path of the program under test."""
    named = os.environ.get("SHOTTOWER")
    if named:
        return named
    built = [ROOT / "target" / kind / "shottower" for kind in ("release", "debug")]
    built = [path for path in built if path.exists()]
    if not built:
        raise FileNotFoundError(
            "no binary: run `cargo build --release`, or name one in SHOTTOWER")
    return str(max(built, key=lambda path: path.stat().st_mtime))


def command(*arguments, timeout=900, check=True):
    """One call of the program."""
    result = subprocess.run([binary(), *map(str, arguments)], capture_output=True,
                            text=True, timeout=timeout)
    if check and result.returncode != 0:
        raise AssertionError(f"{' '.join(map(str, arguments))}\nexit {result.returncode}\n"
                             f"{result.stdout}\n{result.stderr}")
    return result


@dataclass
class Outcome:
    """What a result file holds."""

    attributes: dict
    shots: dict
    companion: dict
    roles: dict
    sites: np.ndarray
    faults: dict
    locations: np.ndarray
    stderr: str = ""
    stdout: str = ""

    def counts(self, names=None, companion=False):
        """How often each value of the registers came, the first register's bit 0
        least significant."""
        tables = self.companion if companion else self.shots
        columns = np.concatenate([tables[n] for n in names or tables], axis=1)
        values = columns.astype(np.int64) @ (1 << np.arange(columns.shape[1]))
        return np.bincount(values, minlength=2 ** columns.shape[1])


def run(circuit, shots, seed, readout="dense", delta=0.1, terms=None, companion=None,
        extra=(), quiet=True):
    """Draws shots of a `Circuit` and reads the result."""
    with tempfile.TemporaryDirectory() as folder:
        folder = pathlib.Path(folder)
        (folder / "circuit.qasm").write_text(circuit.text())
        arguments = ["run", folder / "circuit.qasm", "--shots", shots, "--seed", seed,
                     "--delta", delta, "--readout", readout, "--out", folder / "out.h5",
                     *extra]
        if quiet:
            arguments.append("--quiet")
        if circuit.rules:
            (folder / "noise.toml").write_text(circuit.noise_text())
            arguments += ["--noise", folder / "noise.toml"]
        if terms is not None:
            arguments += ["--terms", terms]
        if companion is not None:
            arguments += ["--companion", companion]
        try:
            result = command(*arguments)
        except AssertionError as failure:
            raise AssertionError(f"{failure}\n{circuit.text()}\n{circuit.noise_text()}") from None
        outcome = read(folder / "out.h5")
    outcome.stderr, outcome.stdout = result.stderr, result.stdout
    names = [r.name for r in circuit.recorded()]
    if set(outcome.shots) != set(names):
        raise AssertionError(f"recorded {sorted(outcome.shots)}, expected {sorted(names)}")
    outcome.shots = {n: outcome.shots[n] for n in names}
    outcome.companion = {n: outcome.companion[n] for n in names if n in outcome.companion}
    for register in circuit.recorded():
        if outcome.shots[register.name].shape != (shots, register.width):
            raise AssertionError(f"{register.name}: {outcome.shots[register.name].shape}")
        if outcome.roles[register.name] != register.role:
            raise AssertionError(f"{register.name} has role {outcome.roles[register.name]}")
    return outcome


def read(path):
    """The content of a result file."""
    with h5py.File(path) as file:
        roles = {}
        tables = {"shots": {}, "companion": {}}
        for group, table in tables.items():
            for name, data in file.get(group, {}).items():
                if data.dtype != np.bool_:
                    raise AssertionError(f"{group}/{name} reads as {data.dtype}, not bool")
                table[name] = data[()]
                if group == "shots":
                    roles[name] = data.attrs["role"]
        faults = {name: data[()] for name, data in file.get("faults", {}).items()}
        return Outcome(dict(file.attrs), tables["shots"], tables["companion"], roles,
                       file["sites"][()], faults, faults.pop("locations", None))
