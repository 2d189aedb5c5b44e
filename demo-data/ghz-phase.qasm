OPENQASM 3.0;
include "stdgates.inc";

// Bench B, phase test: a GHZ state of five qubits, one noisy t on each, all
// measured in the X basis.
//
// The parity is even with probability (1 + cos(5 pi/4) (1 - 2 p)^5) / 2, where p
// is the dephasing of each t. A fault-free run has P(parity = 0) = 0.146446609,
// the noise below (p = 0.02) gives 0.211722218.

const float p = 0.02;
qubit[5] q;
output bit[5] out;
@logical
output bit[1] parity;

h q[0];
for int i in [1:4] {
  cx q[0], q[i];
}
for int i in [0:4] {
  @noise dephasing(p)
  t q[i];
}
h q;
out = measure q;
parity[0] = out[0] ^ out[1] ^ out[2] ^ out[3] ^ out[4];
