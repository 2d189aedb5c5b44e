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


def show(name, bits):
    """Print the mean of (-1)^bit and its standard error."""
    signs = 1 - 2 * bits.astype(float)
    error = signs.std() / max(len(signs), 1) ** 0.5
    print(f"{name:<28}{signs.mean():8.4f} +- {error:.4f}   ({len(signs)} shots)")


def main():
    with h5py.File(sys.argv[1], "r") as file:
        for group in ("shots", "companion"):
            if group not in file:
                continue
            shots = file[group]
            logical = shots["logical"][:, 0]
            syndrome = x_syndrome(shots)
            names = [name for name in shots if shots[name].attrs["role"] == "check"]
            quiet = ~np.concatenate([shots[name][:] for name in names], axis=1).any(axis=1)
            print(group)
            show("  as read", logical)
            show("  decoded", logical ^ syndrome.any(axis=1))
            show("  only shots with no check", logical[quiet])
    print(f"without faults              {np.cos(np.pi / 4):8.4f}")


if __name__ == "__main__":
    main()
