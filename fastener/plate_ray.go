package fastener

import (
	"math"

	"jointledger/strength"
)

// ray is where a line from a point first meets the outline.
type ray struct {
	length float64
	side   side
}

// cast follows a unit direction from a point inside the outline to the first
// side that it meets.
func cast(all []side, x, y, ux, uy float64) ray {
	found := ray{length: math.Inf(1)}
	for _, s := range all {
		ex, ey := s.x2-s.x1, s.y2-s.y1
		across := float64(ux*ey) - float64(uy*ex)
		if across == 0 {
			continue
		}
		ax, ay := s.x1-x, s.y1-y
		length := (float64(ax*ey) - float64(ay*ex)) / across
		along := (float64(ax*uy) - float64(ay*ux)) / across
		if length > 0 && length < found.length && along >= -1e-12 && along <= 1+1e-12 {
			found = ray{length, s}
		}
	}
	return found
}

// steps write the length of a ray from (x, y) named by their symbols, along the
// direction u_x, u_y.
func (r ray) steps(a *allowable, symbol, x, y string) {
	const given = "input: plates.outline, the side met"
	a.add("x_1", r.side.x1, strength.Length, "", given, strength.Given)
	a.add("y_1", r.side.y1, strength.Length, "", given, strength.Given)
	a.add("x_2", r.side.x2, strength.Length, "", given, strength.Given)
	a.add("y_2", r.side.y2, strength.Length, "", given, strength.Given)
	a.add(symbol, r.length, strength.Length,
		"((x_1 - "+x+") (y_2 - y_1) - (y_1 - "+y+") (x_2 - x_1)) / (u_x (y_2 - y_1) - u_y (x_2 - x_1))",
		"along the load to the outline", strength.Derived)
}

// push is the unit direction in which a fastener pushes plate k: the attached
// member pulls the fastener by its share, so that it pushes back there and on
// in the other plates. ok is false without a share.
func push(k int, s *Share) (ux, uy float64, ok bool) {
	if !(s.Resultant > 0) {
		return 0, 0, false
	}
	ux, uy = s.Shear[0]/s.Resultant, s.Shear[1]/s.Resultant
	if k == 0 {
		return -ux, -uy, true
	}
	return ux, uy, true
}

// pushSteps write that direction.
func pushSteps(a *allowable, k int, ux, uy float64) {
	x, y, source := "V_x / V", "V_y / V", "the fastener pushes this plate the way of its share"
	if k == 0 {
		x, y, source = "- V_x / V", "- V_y / V", "the fastener pushes the attached member back against its share"
	}
	a.add("u_x", ux, strength.None, x, source, strength.Derived)
	a.add("u_y", uy, strength.None, y, source, strength.Derived)
}
