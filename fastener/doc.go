// Package fastener computes bolted and riveted joints by published methods:
// the sharing of a load among the fasteners of a pattern, the strength of each
// fastener and of the plates that it joins, and the practice of layout.
//
// A pattern lies in the faying surface z = 0 with right-handed axes; forces and
// moments act on the attached member, the first plate. Everything is pure and in
// N, mm, MPa: PreparePattern does the geometry, the stiffnesses and the
// allowables once, after which a load case costs a few operations a fastener and
// allocates nothing.
package fastener
