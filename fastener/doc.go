// Package fastener computes bolted and riveted joints by published methods:
// the sharing of a load among the fasteners of a pattern, the strength of each
// fastener and of the plates that it joins, and the practice of layout; and the
// transfer of loads through rows of fasteners between stacked members, with the
// published compliances, and the steps that even it.
//
// A pattern lies in the faying surface z = 0 with right-handed axes; forces and
// moments act on the attached member, the first plate. Everything is pure and in
// N, mm, MPa: PreparePattern does the geometry, the stiffnesses and the
// allowables once, after which a load case costs a few operations a fastener and
// allocates nothing. A splice is one line of members and rows: PrepareSplice
// factors its equations, with the loads as unknowns, once for all load cases.
package fastener
