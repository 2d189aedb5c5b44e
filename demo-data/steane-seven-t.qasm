OPENQASM 3.0;
include "stdgates.inc";

// Bench B, gate test: seven noisy t gates, one on every qubit of a Steane
// [[7,1,3]] block in the logical + state, then three rounds of syndrome
// measurement and a logical readout in the X basis.
//
// Run it with bench-b.toml. The t gates commute with the Z stabilisers and take
// the block out of the +1 space of the X stabilisers. The first round projects
// it back: with probability 9/16 all three X stabilisers read 0, with 1/16 each
// of the seven other patterns, and in every case the seven gates have acted as a
// logical tdg up to a known Z on the data.
//
// A fault-free run shows
//   every bit of check, check_x and final_check 0: check holds the Z stabilisers
//     of the three rounds, bit 3 r + i, each compared with the round before
//     (round 0 with 0); check_x compares the X stabilisers of rounds 1 and 2 with
//     the round before, bit 3 (r - 1) + i; final_check compares those of the
//     final data readout with the last round;
//   first_x, the X stabilisers of round 0: 000 with probability 9/16 = 0.5625;
//   P(logical = 0) = cos^2(pi/8) = 0.853553391, whatever first_x is.

qubit[7] data;
qubit[6] ancilla;   // 0 to 2 read the X stabilisers, 3 to 5 the Z stabilisers

output bit[18] syndrome;
output bit[7] readout;
output bit[3] first_x;
@check
output bit[9] check;
@check
output bit[6] check_x;
@check
output bit[3] final_check;
@logical
output bit[1] logical;

// d2 carries the state, the other six are in |0>.
gate encode d0, d1, d2, d3, d4, d5, d6 {
  h d3;
  h d4;
  h d5;
  cx d2, d0;
  cx d4, d6;
  cx d2, d1;
  cx d4, d0;
  cx d5, d6;
  cx d4, d2;
  cx d5, d1;
  cx d3, d0;
  cx d5, d2;
  cx d3, d1;
  cx d3, d6;
}

// The three X stabilisers onto a0, a1, a2, which are in |0>. In each line of
// three no data qubit is used twice.
gate x_stabilisers d0, d1, d2, d3, d4, d5, d6, a0, a1, a2 {
  h a0; h a1; h a2;
  cx a0, d6; cx a1, d2; cx a2, d4;
  cx a0, d2; cx a1, d6; cx a2, d5;
  cx a0, d4; cx a1, d5; cx a2, d6;
  cx a0, d0; cx a1, d1; cx a2, d3;
  h a0; h a1; h a2;
}

gate z_stabilisers d0, d1, d2, d3, d4, d5, d6, a0, a1, a2 {
  cx d6, a0; cx d2, a1; cx d4, a2;
  cx d2, a0; cx d6, a1; cx d5, a2;
  cx d4, a0; cx d5, a1; cx d6, a2;
  cx d0, a0; cx d1, a1; cx d3, a2;
}

h data[2];
encode data[0], data[1], data[2], data[3], data[4], data[5], data[6];
t data;

for int r in [0:2] {
  reset ancilla;
  x_stabilisers data[0], data[1], data[2], data[3], data[4], data[5], data[6], ancilla[0], ancilla[1], ancilla[2];
  z_stabilisers data[0], data[1], data[2], data[3], data[4], data[5], data[6], ancilla[3], ancilla[4], ancilla[5];
  delay[1us] data;
  for int i in [0:5] {
    syndrome[6 * r + i] = measure ancilla[i];
  }
}

h data;
readout = measure data;

for int i in [0:2] {
  first_x[i] = syndrome[i];
  check[i] = syndrome[3 + i];
  for int r in [1:2] {
    check[3 * r + i] = syndrome[6 * r + 3 + i] ^ syndrome[6 * r - 3 + i];
    check_x[3 * r - 3 + i] = syndrome[6 * r + i] ^ syndrome[6 * r - 6 + i];
  }
}
final_check[0] = readout[0] ^ readout[2] ^ readout[4] ^ readout[6] ^ syndrome[12];
final_check[1] = readout[1] ^ readout[2] ^ readout[5] ^ readout[6] ^ syndrome[13];
final_check[2] = readout[3] ^ readout[4] ^ readout[5] ^ readout[6] ^ syndrome[14];
logical[0] = readout[0] ^ readout[1] ^ readout[2] ^ readout[3] ^ readout[4] ^ readout[5] ^ readout[6];
