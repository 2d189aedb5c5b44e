OPENQASM 3.0;
include "stdgates.inc";

// Bench B, algorithm test: the hidden shift of a bent function on 4 + 4 bits.
//
// f(u, v) = u.v + g(u) and its dual u.v + g(v), with the cubic form
// g(u) = u0 u1 u2 + u1 u2 u3, so four doubly controlled z gates
// (arXiv:0811.3208). h on all qubits, signs of f shifted by s (u part 1011, v
// part 0110), h on all qubits, signs of the dual, h on all qubits: the readout
// is s.
//
// A fault-free run shows found = 1011 0110 (bit 0 first) and every bit of
// mismatch 0. The noise is written in the file: each ctrl(2) @ z dephases its
// qubits, each cz depolarizes its two.

const float three_qubit_phase = 0.004;
const float two_qubit = 0.002;

qubit[4] u;
qubit[4] v;

@logical
output bit[8] found;
@check
output bit[8] mismatch;

// The part of f that both functions share.
gate pair_signs u0, u1, u2, u3, v0, v1, v2, v3 {
  @noise depolarizing(two_qubit)
  cz u0, v0;
  @noise depolarizing(two_qubit)
  cz u1, v1;
  @noise depolarizing(two_qubit)
  cz u2, v2;
  @noise depolarizing(two_qubit)
  cz u3, v3;
}

gate cubic_signs a, b, c, d {
  @noise dephasing(three_qubit_phase)
  ctrl(2) @ z a, b, c;
  @noise dephasing(three_qubit_phase)
  ctrl(2) @ z b, c, d;
}

// The shift s, as x gates on both sides of f.
gate shift u0, u1, u2, u3, v0, v1, v2, v3 {
  x u0;
  x u2;
  x u3;
  x v1;
  x v2;
}

h u;
h v;
shift u[0], u[1], u[2], u[3], v[0], v[1], v[2], v[3];
pair_signs u[0], u[1], u[2], u[3], v[0], v[1], v[2], v[3];
cubic_signs u[0], u[1], u[2], u[3];
shift u[0], u[1], u[2], u[3], v[0], v[1], v[2], v[3];
h u;
h v;
pair_signs u[0], u[1], u[2], u[3], v[0], v[1], v[2], v[3];
cubic_signs v[0], v[1], v[2], v[3];
h u;
h v;

for int i in [0:3] {
  @noise readout-flip(0.005)
  found[i] = measure u[i];
  @noise readout-flip(0.005)
  found[4 + i] = measure v[i];
  mismatch[i] = found[i];
  mismatch[4 + i] = found[4 + i];
}
for int i in {0, 2, 3, 5, 6} {
  mismatch[i] = !found[i];
}
