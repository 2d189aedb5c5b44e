"""Matrices of the library gates, as the OpenQASM 3 language document defines them.

The first qubit of a call is the first tensor factor (the most significant bit
of the row index), controls come before targets. A matrix is exact up to a
global phase, except where a gate is controlled: there the phase of the inner
gate is the one the language document gives it.

Source: arXiv:2104.14722, the standard gate library; from memory.
"""

import numpy as np

I = np.eye(2, dtype=complex)
X = np.array([[0, 1], [1, 0]], dtype=complex)
Y = np.array([[0, -1j], [1j, 0]], dtype=complex)
Z = np.diag([1, -1]).astype(complex)
PAULI = {"I": I, "X": X, "Y": Y, "Z": Z}
H = (X + Z) / np.sqrt(2)


def kron(*factors):
    """Tensor product, first factor most significant."""
    product = np.eye(1, dtype=complex)
    for factor in factors:
        product = np.kron(product, factor)
    return product


def pauli_word(word):
    """Matrix of a word such as "XZ"."""
    return kron(*(PAULI[letter] for letter in word))


def rotation(word, angle):
    """exp(-i·angle·P/2) for the Pauli word P."""
    matrix = pauli_word(word)
    return np.cos(angle / 2) * np.eye(len(matrix)) - 1j * np.sin(angle / 2) * matrix


def phase(angle):
    """diag(1, e^{i·angle})."""
    return np.diag([1, np.exp(1j * angle)])


def controlled(matrix, controls=1, on=1):
    """The matrix applied where every control reads `on`."""
    size = len(matrix)
    total = size << controls
    result = np.eye(total, dtype=complex)
    start = total - size if on else 0
    result[start:start + size, start:start + size] = matrix
    return result


def universal(theta, phi, lam):
    """The three-angle gate with real upper left entry (u3 of OpenQASM 2)."""
    c, s = np.cos(theta / 2), np.sin(theta / 2)
    return np.array([
        [c, -np.exp(1j * lam) * s],
        [np.exp(1j * phi) * s, np.exp(1j * (phi + lam)) * c],
    ])


SX = np.array([[1 + 1j, 1 - 1j], [1 - 1j, 1 + 1j]]) / 2
SWAP = np.eye(4, dtype=complex)[[0, 2, 1, 3]]
ISWAP = np.array([[1, 0, 0, 0], [0, 0, 1j, 0], [0, 1j, 0, 0], [0, 0, 0, 1]])

# name: (number of qubits, number of parameters, matrix from parameters)
LIBRARY = {
    "id": (1, 0, lambda: I),
    "x": (1, 0, lambda: X),
    "y": (1, 0, lambda: Y),
    "z": (1, 0, lambda: Z),
    "h": (1, 0, lambda: H),
    "s": (1, 0, lambda: phase(np.pi / 2)),
    "sdg": (1, 0, lambda: phase(-np.pi / 2)),
    "t": (1, 0, lambda: phase(np.pi / 4)),
    "tdg": (1, 0, lambda: phase(-np.pi / 4)),
    "sx": (1, 0, lambda: SX),
    "sxdg": (1, 0, lambda: SX.conj().T),
    "p": (1, 1, phase),
    "phase": (1, 1, phase),
    "u1": (1, 1, phase),
    "rx": (1, 1, lambda a: rotation("X", a)),
    "ry": (1, 1, lambda a: rotation("Y", a)),
    "rz": (1, 1, lambda a: rotation("Z", a)),
    "u2": (1, 2, lambda phi, lam: universal(np.pi / 2, phi, lam)),
    "u3": (1, 3, universal),
    "U": (1, 3, universal),
    "cx": (2, 0, lambda: controlled(X)),
    "CX": (2, 0, lambda: controlled(X)),
    "cy": (2, 0, lambda: controlled(Y)),
    "cz": (2, 0, lambda: controlled(Z)),
    "ch": (2, 0, lambda: controlled(H)),
    "swap": (2, 0, lambda: SWAP),
    "iswap": (2, 0, lambda: ISWAP),
    "cp": (2, 1, lambda a: controlled(phase(a))),
    "cphase": (2, 1, lambda a: controlled(phase(a))),
    "cu1": (2, 1, lambda a: controlled(phase(a))),
    "crx": (2, 1, lambda a: controlled(rotation("X", a))),
    "cry": (2, 1, lambda a: controlled(rotation("Y", a))),
    "crz": (2, 1, lambda a: controlled(rotation("Z", a))),
    "cu3": (2, 3, lambda *a: controlled(universal(*a))),
    "cu": (2, 4, lambda t, f, l, g: controlled(np.exp(1j * g) * universal(t, f, l))),
    "rxx": (2, 1, lambda a: rotation("XX", a)),
    "ryy": (2, 1, lambda a: rotation("YY", a)),
    "rzz": (2, 1, lambda a: rotation("ZZ", a)),
    "ccx": (3, 0, lambda: controlled(X, 2)),
    "ccz": (3, 0, lambda: controlled(Z, 2)),
    "cswap": (3, 0, lambda: controlled(SWAP)),
}


def matrix(name, parameters=()):
    """Matrix of a library gate."""
    return LIBRARY[name][2](*parameters)
