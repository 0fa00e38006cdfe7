// Package sweep lays out the points of a parameter sweep: which values the varied
// keys of a scenario take together.
//
// A Design has one Axis a key. The full factorial design of axes with n_1 … n_k
// values has Π n_j points, the last axis varying fastest. The other designs place
// N points in the unit cube [0, 1)^k and read coordinate j through axis j:
//
//   - Latin hypercube (McKay, Beckman and Conover 1979, Technometrics 21,
//     239–245): every axis is cut into N equal slices and each slice holds one
//     point, its place drawn at random;
//   - Halton (1960, Numerische Mathematik 2, 84–90): coordinate j is the radical
//     inverse in the j-th prime base, its digits permuted at random (Owen 2017,
//     arXiv:1706.02808), so that any first N points are spread evenly.
//
// A range is read linearly, from + u·(to − from), or in logs,
// from·(to/from)^u; a list of n values is cut into n equal parts.
//
// A point is a list of texts, one an axis, written as a scenario file would: a
// point means the same on every machine, and its texts are its identity.
package sweep
