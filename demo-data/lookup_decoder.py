#!/usr/bin/env python3
"""A decoder test on the Steane blocks, as small as it gets.

    python demo-data/lookup_decoder.py FILE.h5

FILE.h5 holds shots of steane-memory.qasm or steane-seven-t.qasm. The decoder
adds up the X checks of all rounds and the final readout, which leaves the
syndrome of the data readout against the first known value of the stabilisers.
One Z error on any data qubit gives a nonzero syndrome and flips the logical
readout, so the decoder flips the logical bit whenever that syndrome is nonzero.

The encoded state is a T-type state, so the logical bit is not 0 in every shot:
without faults its mean of (-1)^bit is cos(pi/4) = 0.7071.
"""

import sys

import h5py
import numpy as np


def x_syndrome(shots):
    """Three bits a shot: sum of the X checks of all rounds and the readout."""
    total = shots["final_check"][:]
    if "check_x" in shots:  # steane-seven-t: rounds 1 and 2, three bits each
        rounds = shots["check_x"][:].reshape(-1, 2, 3)
    else:  # steane-memory: X and Z stabilisers of three rounds
        rounds = shots["check"][:].reshape(-1, 3, 6)[:, :, :3]
    return total ^ np.logical_xor.reduce(rounds, axis=1)


def mean_and_error(bits):
    """Mean of (-1)^bit and its standard error."""
    signs = 1 - 2 * bits.astype(float)
    return signs.mean(), signs.std() / len(signs) ** 0.5


def logical_bits(shots):
    """The logical bit of every shot as read, and as the decoder says."""
    logical = shots["logical"][:, 0]
    return {"as read": logical, "decoded": logical ^ x_syndrome(shots).any(axis=1)}


def quiet(shots):
    """Which shots have every check 0."""
    names = [name for name in shots if shots[name].attrs["role"] == "check"]
    return ~np.concatenate([shots[name][:] for name in names], axis=1).any(axis=1)


def main():
    with h5py.File(sys.argv[1], "r") as file:
        shots, weight = file["shots"], file.attrs["mixing_weight"]
        for name, bits in logical_bits(shots).items():
            mean, error = mean_and_error(bits)
            print(f"{name:<26}{mean:8.4f} +- {error:.4f}")
            if weight > 0 and "companion" in file:
                # The drawn shots hold a share of companion shots; take it out.
                other, other_error = mean_and_error(logical_bits(file["companion"])[name])
                mean = (mean - weight * other) / (1 - weight)
                error = np.hypot(error, weight * other_error) / (1 - weight)
                print(f"{'  corrected':<26}{mean:8.4f} +- {error:.4f}")
        kept = quiet(shots)
        mean, error = mean_and_error(shots["logical"][:, 0][kept])
        print(f"{'only shots with no check':<26}{mean:8.4f} +- {error:.4f}   ({kept.mean():.1%} of them)")
    print(f"{'without faults':<26}{np.cos(np.pi / 4):8.4f}")


if __name__ == "__main__":
    main()
