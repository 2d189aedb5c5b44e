OPENQASM 3.0;
include "stdgates.inc";

// Bench B, small test: five t gates on four qubits, noise written in the file.
//
// Try it with the waiting noise of bench-b-idle.toml, or alone. Qubit q[3] waits
// before it meets the others, so decay and loss of phase become part of its
// starting state.
//
// A fault-free run (no annotations, no noise file) shows
//   P(out = 0000) = 0.164745683,  P(parity = 1) = 0.625.
// Use it to compare every read-out with a calculation by hand.

qubit[4] q;
output bit[4] out;
@logical
output bit[1] parity;

// Four starting states; the t gates lose phase, one of them also turns too far.
h q;
@noise dephasing(0.01)
t q[0];
@noise dephasing(0.01)
@noise over-rotation(z, 0.02)
t q[1];
@noise depolarizing(0.005)
sx q[2];
@noise dephasing(0.01)
t q[3];
@noise amplitude-damping(0.02)
ry(pi/5) q[3];
delay[2us] q[3];

cx q[0], q[1];
cx q[2], q[3];
h q[1];
@noise dephasing(0.02)
tdg q[1];
cx q[1], q[2];
@noise dephasing(0.02)
t q[2];
h q[2];
cx q[2], q[0];
h q[0];

@noise readout-flip(0.01, 0.02)
out = measure q;
parity[0] = out[0] ^ out[1] ^ out[2] ^ out[3];
