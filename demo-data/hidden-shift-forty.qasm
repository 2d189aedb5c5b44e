OPENQASM 3.0;
include "stdgates.inc";

// Bench B, wide algorithm test: the hidden shift of a bent function on 20 + 20
// bits, f(u, v) = u.v + g(u) and its dual u.v + g(v), with the cubic form
// g(u) = u0u1u2 + u2u3u4 + u5u6u7 + u7u8u9, so eight ccz (arXiv:0811.3208).
// No noise. Written by scripts/make-demo-circuits.
//
// An exact run shows every bit of mismatch 0; found is the shift, bit 0 first
// 00100001111100011000 11011010010100110011.

qubit[20] u;
qubit[20] v;
@logical
output bit[40] found;
@check
output bit[40] mismatch;

h u;
h v;
x u[{2, 7, 8, 9, 10, 11, 15, 16}];
x v[{0, 1, 3, 4, 6, 9, 11, 14, 15, 18, 19}];
cz u, v;
ccz u[0], u[1], u[2];
ccz u[2], u[3], u[4];
ccz u[5], u[6], u[7];
ccz u[7], u[8], u[9];
x u[{2, 7, 8, 9, 10, 11, 15, 16}];
x v[{0, 1, 3, 4, 6, 9, 11, 14, 15, 18, 19}];
h u;
h v;
cz u, v;
ccz v[0], v[1], v[2];
ccz v[2], v[3], v[4];
ccz v[5], v[6], v[7];
ccz v[7], v[8], v[9];
h u;
h v;

for int i in [0:19] {
  found[i] = measure u[i];
  found[20 + i] = measure v[i];
  mismatch[i] = found[i];
  mismatch[20 + i] = found[20 + i];
}
for int i in {2, 7, 8, 9, 10, 11, 15, 16, 20, 21, 23, 24, 26, 29, 31, 34, 35, 38, 39} {
  mismatch[i] = !found[i];
}
