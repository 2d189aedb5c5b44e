"""Random circuits on a line of qubits, as lists of layers of gates.

A gate is a tuple: name, then qubits. The seeds decide everything. The means of
output parities come from carrying each parity of Z backwards through the
circuit (Heisenberg picture), not from simulation.
"""

# One word for each way a one-qubit Clifford permutes the Pauli axes; a random
# Pauli in front makes it any of the 24.
CLIFFORD_WORDS = ([], ["s"], ["h"], ["h", "s"], ["s", "h"], ["s", "h", "s"])
PAULIS = ([], ["x"], ["y"], ["z"])
INVERSE = {"s": "sdg", "sdg": "s", "t": "tdg", "tdg": "t"}


def random_layers(rng, qubits, layers, t_count):
    """Layers of random one-qubit Cliffords, t gates and neighbouring cx."""
    places = [(layer, qubit) for layer in range(layers) for qubit in range(qubits)]
    t_places = set(rng.sample(places, t_count))
    result = []
    for layer in range(layers):
        gates = []
        for qubit in range(qubits):
            for name in rng.choice(PAULIS) + rng.choice(CLIFFORD_WORDS):
                gates.append((name, qubit))
            if (layer, qubit) in t_places:
                gates.append(("t", qubit))
        for left in range(layer % 2, qubits - 1, 2):
            pair = (left, left + 1) if rng.random() < 0.5 else (left + 1, left)
            gates.append(("cx",) + pair)
        result.append(gates)
    return result


def inverse(layers):
    """The same layers backwards, every gate inverted."""
    return [
        [(INVERSE.get(gate[0], gate[0]),) + gate[1:] for gate in reversed(gates)]
        for gates in reversed(layers)
    ]


def pull_back(gate, x, z):
    """Image of the Pauli (x, z) under U'. U: a list of (x, z, factor).

    Bit q of `x` and `z` says whether qubit q carries an X or Z part; both set
    is Y. S' X S = -Y, T' X T = (X - Y)/sqrt(2).
    """
    name, *on = gate
    if name == "cx":
        control, target = on
        x_control, z_control = x >> control & 1, z >> control & 1
        x_target, z_target = x >> target & 1, z >> target & 1
        sign = -1 if x_control and z_target and x_target == z_control else 1
        return [(x ^ x_control << target, z ^ z_target << control, sign)]
    (qubit,) = on
    has_x, has_z = x >> qubit & 1, z >> qubit & 1
    if name == "h":
        swap = (has_x ^ has_z) << qubit
        return [(x ^ swap, z ^ swap, -1 if has_x and has_z else 1)]
    if name == "x":
        return [(x, z, -1 if has_z else 1)]
    if name == "y":
        return [(x, z, -1 if has_x ^ has_z else 1)]
    if name == "z":
        return [(x, z, -1 if has_x else 1)]
    if not has_x:
        return [(x, z, 1)]
    turned = z ^ 1 << qubit
    other = 1 if has_z else -1
    if name in ("sdg", "tdg"):
        other = -other
    if name in ("s", "sdg"):
        return [(x, turned, other)]
    return [(x, z, 0.5**0.5), (x, turned, other * 0.5**0.5)]


def mean_of_parity(layers, qubits):
    """Mean of (-1)^parity of the measured bits `qubits`, |0...0> at the start."""
    terms = {(0, sum(1 << qubit for qubit in qubits)): 1.0}
    for gates in reversed(layers):
        for gate in reversed(gates):
            next_terms = {}
            for (x, z), value in terms.items():
                for new_x, new_z, factor in pull_back(gate, x, z):
                    key = (new_x, new_z)
                    next_terms[key] = next_terms.get(key, 0.0) + factor * value
            terms = {key: value for key, value in next_terms.items() if abs(value) > 1e-12}
    return sum(value for (x, _), value in terms.items() if x == 0)


def parities_without_t(layers, qubits):
    """Sets of bits whose parity is fixed once the t gates are left out.

    The X parts of the pulled-back Z of each qubit are the rows of a matrix over
    the two-element field; every combination of rows that gives zero is one set.
    """
    plain = [[gate for gate in gates if gate[0] not in ("t", "tdg")] for gates in layers]
    rows = []
    for qubit in range(qubits):
        x, z = 0, 1 << qubit
        for gates in reversed(plain):
            for gate in reversed(gates):
                ((x, z, _),) = pull_back(gate, x, z)
        rows.append((x, 1 << qubit))
    found, pivots = [], {}
    for x, members in rows:
        while x and x.bit_length() in pivots:
            pivot_x, pivot_members = pivots[x.bit_length()]
            x, members = x ^ pivot_x, members ^ pivot_members
        if x:
            pivots[x.bit_length()] = (x, members)
        else:
            found.append([qubit for qubit in range(qubits) if members >> qubit & 1])
    return found
