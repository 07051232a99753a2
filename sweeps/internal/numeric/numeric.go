// Package numeric holds the few numerical methods the sweeps need and gonum
// lacks: a bracketing root finder, the Wright omega function, and Gauss–Legendre
// rules kept ready for use in inner loops.
//
// Where gonum does the job, use it directly: integrate/quad for a one-off
// integral, interp.FritschButland for monotone (PCHIP) interpolation; its
// values outside the table are those of the nearest end.
package numeric
