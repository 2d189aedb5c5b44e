OPENQASM 3.0;
include "stdgates.inc";

// Bench B, feedback test: t gates made from prepared states, each corrected by
// an s gate that depends on a measurement.
//
// One injection: prepare (|0> + e^{i pi/4} |1>)/sqrt(2) on an ancilla, cx from the
// data qubit onto it, measure it; if it reads 1, apply s to the data qubit.
// Eight of them on `loop` make t^8 = 1. Three on `line`, with h gates between,
// make h t h t h t h.
//
// A fault-free run shows
//   closed = 0 always, each bit of outcome 0 or 1 with probability 1/2,
//   P(line_readout = 0) = 0.573223305.
// The noise is written in the file: a prepared state loses its phase with
// probability 1 %, a measured bit is wrong with probability 0.5 %, and a wrong
// bit leads to a wrong correction.

const float phase_loss = 0.01;
const float wrong_bit = 0.005;

qubit loop;
qubit line;
qubit ancilla;

output bit[11] outcome;
@check
output bit[1] closed;
@logical
output bit[1] line_readout;

gate prepare a {
  h a;
  @noise dephasing(phase_loss)
  t a;
}

h loop;
for int i in [0:7] {
  reset ancilla;
  prepare ancilla;
  cx loop, ancilla;
  @noise readout-flip(wrong_bit)
  outcome[i] = measure ancilla;
  if (outcome[i] == 1) {
    s loop;
  }
}
h loop;
closed[0] = measure loop;

h line;
for int i in [8:10] {
  reset ancilla;
  prepare ancilla;
  cx line, ancilla;
  @noise readout-flip(wrong_bit)
  outcome[i] = measure ancilla;
  if (outcome[i] == 1) s line;
  h line;
}
line_readout[0] = measure line;
