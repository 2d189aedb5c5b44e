"""Texts of the generated circuits that the benchmark also uses.

Each function returns OpenQASM 3 with its noise written in it. Seeds are fixed:
a call gives the same text every time.
"""

import random

from random_line import random_layers

FORTY_T = {"qubits": 50, "layers": 20, "t_count": 40, "seed": 40}
NOISY_T = {"qubits": 24, "layers": 12, "seed": 24}
T_DEPHASING = 0.01
CX_DEPOLARIZING = 0.001

# The hidden shift: halves of 20 bits, cubic terms in two pairs that share a bit.
HALF = 20
CUBIC = ((0, 1, 2), (2, 3, 4), (5, 6, 7), (7, 8, 9))
SEED_SHIFT = 811


def gate_text(gate):
    """One gate as OpenQASM."""
    return f"{gate[0]} " + ", ".join(f"q[{qubit}]" for qubit in gate[1:]) + ";"


def body_text(layers, titles):
    """All layers, a comment line before each."""
    lines = []
    for title, gates in zip(titles, layers):
        lines += ["", f"// {title}"]
        lines += [gate_text(gate) for gate in gates]
    return lines


def noisy_layers(qubits, layers, t_count, seed):
    """The layers of a line circuit; t and cx go by names that carry noise."""
    names = {"t": "noisy_t", "cx": "noisy_cx"}
    return [
        [(names.get(gate[0], gate[0]),) + gate[1:] for gate in gates]
        for gates in random_layers(random.Random(seed), qubits, layers, t_count)
    ]


def line_text(title, comment, qubits, layers):
    """A line circuit whose t and cx are noisy, all qubits measured."""
    head = [
        "OPENQASM 3.0;",
        'include "stdgates.inc";',
        "",
        *(f"// {line}" for line in comment),
        "// Written by scripts/make-demo-circuits.",
        "",
        f"const float t_dephasing = {T_DEPHASING};",
        f"const float cx_depolarizing = {CX_DEPOLARIZING};",
        "",
        "gate noisy_t a {",
        "  @noise dephasing(t_dephasing)",
        "  t a;",
        "}",
        "gate noisy_cx a, b {",
        "  @noise depolarizing(cx_depolarizing)",
        "  cx a, b;",
        "}",
        "",
        f"qubit[{qubits}] q;",
        f"output bit[{qubits}] {title};",
    ]
    titles = [f"layer {index}" for index in range(len(layers))]
    return "\n".join(head + body_text(layers, titles) + ["", f"{title} = measure q;"]) + "\n"


def forty_t():
    """Text of line-forty-t.qasm: far beyond any state vector."""
    comment = [
        "Bench B, long line: 50 qubits in a line, 20 layers of random one-qubit",
        "Clifford gates and neighbouring cx, 40 t gates at random places, each",
        "dephased, every cx depolarized, all qubits measured. No outcome is known;",
        "the circuit is there to be measured by scripts/bench.",
    ]
    return line_text("out", comment, FORTY_T["qubits"], noisy_layers(**FORTY_T))


def noisy_t(t_count):
    """Text of a line of 24 qubits with that many noisy t gates: small enough
    for a state vector to compare with."""
    comment = [
        "Bench B, short line: 24 qubits in a line, 12 layers of random one-qubit",
        f"Clifford gates and neighbouring cx, {t_count} t gates at random places, each",
        "dephased, every cx depolarized, all qubits measured. scripts/bench compares",
        "it with a plain state vector.",
    ]
    layers = noisy_layers(**NOISY_T, t_count=t_count)
    return line_text("out", comment, NOISY_T["qubits"], layers)


def hidden_shift():
    """The 40 shift bits: the u half, then the v half."""
    rng = random.Random(SEED_SHIFT)
    return [rng.randrange(2) for _ in range(2 * HALF)]


def hidden_shift_forty():
    """Text of hidden-shift-forty.qasm (arXiv:0811.3208)."""
    shift = hidden_shift()
    set_bits = [index for index, bit in enumerate(shift) if bit]
    low = ", ".join(str(index) for index in set_bits if index < HALF)
    high = ", ".join(str(index - HALF) for index in set_bits if index >= HALF)
    flips = [f"x u[{{{low}}}];", f"x v[{{{high}}}];"]

    def signs(half):
        """The function on both halves; its cubic part reads one of them."""
        cubic = [f"ccz {half}[{a}], {half}[{b}], {half}[{c}];" for a, b, c in CUBIC]
        return ["cz u, v;"] + cubic

    cubic_text = " + ".join("".join(f"u{index}" for index in triple) for triple in CUBIC)
    lines = [
        "OPENQASM 3.0;",
        'include "stdgates.inc";',
        "",
        "// Bench B, wide algorithm test: the hidden shift of a bent function on 20 + 20",
        "// bits, f(u, v) = u.v + g(u) and its dual u.v + g(v), with the cubic form",
        f"// g(u) = {cubic_text}, so eight ccz (arXiv:0811.3208).",
        "// No noise. Written by scripts/make-demo-circuits.",
        "//",
        "// An exact run shows every bit of mismatch 0; found is the shift, bit 0 first",
        "// " + "".join(map(str, shift[:HALF])) + " " + "".join(map(str, shift[HALF:])) + ".",
        "",
        f"qubit[{HALF}] u;",
        f"qubit[{HALF}] v;",
        "@logical",
        f"output bit[{2 * HALF}] found;",
        "@check",
        f"output bit[{2 * HALF}] mismatch;",
        "",
        "h u;",
        "h v;",
        *flips,
        *signs("u"),
        *flips,
        "h u;",
        "h v;",
        *signs("v"),
        "h u;",
        "h v;",
        "",
        f"for int i in [0:{HALF - 1}] {{",
        "  found[i] = measure u[i];",
        f"  found[{HALF} + i] = measure v[i];",
        "  mismatch[i] = found[i];",
        f"  mismatch[{HALF} + i] = found[{HALF} + i];",
        "}",
        f"for int i in {{{', '.join(map(str, set_bits))}}} {{",
        "  mismatch[i] = !found[i];",
        "}",
    ]
    return "\n".join(lines) + "\n"
