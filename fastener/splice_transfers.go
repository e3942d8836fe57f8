package fastener

import (
	"math"

	"jointledger/strength"
)

// Undetermined says why there is no sharing at all: the compliance formula has
// no form for this joint. It is empty otherwise.
func (p *PreparedSplice) Undetermined() strength.Message { return p.main.why }

// NewTransfers makes room for the transfers of a load case.
func (p *PreparedSplice) NewTransfers() Transfers {
	return Transfers{
		Interfaces: make([]InterfaceLoad, p.stack.interfaces()),
		Members:    make([]MemberLoad, len(p.stack.nodes)),
	}
}

// Transfers fills out, made by NewTransfers, with the loads of load case i at
// the level given, before factors. It allocates nothing. When the splice is
// Undetermined it leaves out as it is.
func (p *PreparedSplice) Transfers(i int, out *Transfers) {
	p.enter(i)
	if p.main.why.Empty() {
		p.main.transfers(&p.cases[i], out)
		p.stresses(out)
	}
}

// Compared lists the further compliances that were asked for.
func (p *PreparedSplice) Compared() []ComparedCompliance {
	all := make([]ComparedCompliance, len(p.compared))
	for k := range p.compared {
		all[k] = ComparedCompliance{p.compared[k].name, p.compared[k].why}
	}
	return all
}

// ComparedCompliance is a further compliance beside that of the splice.
type ComparedCompliance struct {
	Name string           // as asked
	Why  strength.Message // it has no form for this joint; empty otherwise
}

// ComparedTransfers fills out with the loads of load case i by further
// compliance k; one that has no form for this joint leaves out as it is.
func (p *PreparedSplice) ComparedTransfers(k, i int, out *Transfers) {
	if v := &p.compared[k].solver; v.why.Empty() {
		v.solve(&p.cases[i])
		v.transfers(&p.cases[i], out)
		p.stresses(out)
	}
}

// stresses turns the members' loads into nominal stresses.
func (p *PreparedSplice) stresses(out *Transfers) {
	for x, node := range p.stack.nodes {
		m, row, load := &p.splice.Members[node.member], &p.splice.Rows[node.row], &out.Members[x]
		thickness, width := m.rowThickness(node.row), m.rowWidth(node)
		if load.HasStress = thickness > 0 && width > 0; load.HasStress {
			thickness *= p.stack.layers(node.member)
			load.BearingStress = load.Bearing / (float64(row.Count) * row.Diameter * thickness)
			load.BypassStress = load.Bypass / (width * thickness)
		}
	}
}

// enter solves load case i unless it is the one solved last. It says why the
// case has no loads, nil where it has.
func (p *PreparedSplice) enter(i int) *strength.Message {
	if !p.main.why.Empty() {
		return &p.main.why
	}
	if p.solved != i {
		p.main.solve(&p.cases[i])
		if p.plastic != nil {
			p.plastic.share(p.stack, &p.cases[i])
		}
		p.solved = i
	}
	if p.main.contact != nil && p.main.contact.result.Ended == ContactStopped {
		p.unsettled = strength.Say("the contact of clearances did not settle in %d steps", p.main.contact.result.Steps)
		return &p.unsettled
	}
	return nil
}

// transfers writes the present solution down.
func (v *solver) transfers(c *preparedCase, out *Transfers) {
	k := v.stack
	out.Through, out.Contact = c.through, Contact{}
	if v.contact != nil {
		out.Contact = v.contact.result
	}
	largest := c.through
	for x, node := range k.nodes {
		left, right := v.sides(x, c)
		bearing, bypass := bearingBypass(left, right)
		out.Members[x] = MemberLoad{Row: node.row + 1, Member: node.member, Bearing: bearing, Bypass: bypass}
		if k.inner(x) {
			load := v.transfer[x-node.row]
			largest = max(largest, math.Abs(load))
			out.Interfaces[x-node.row] = InterfaceLoad{
				Row: node.row + 1, First: node.member, Second: k.nodes[x+1].member, Load: load,
			}
		}
	}
	out.Residual = 0
	if largest > 0 {
		out.Residual = v.residual / largest
	}
	if c.through > 0 {
		v.shares(out)
	}
}

// shares refers each interface's load to the load through the joint, positive
// the way that all rows between its two members carry together.
func (v *solver) shares(out *Transfers) {
	net := v.net
	clear(net)
	for i := range out.Interfaces {
		net[v.stack.pair[i]] += out.Interfaces[i].Load
	}
	for i := range out.Interfaces {
		f := &out.Interfaces[i]
		if f.Share = f.Load / out.Through; net[v.stack.pair[i]] < -strength.Within*out.Through {
			f.Share = -f.Share
		}
	}
}

// bearingBypass parts a member's loads left and right of a row into the load
// that passes the row and the load that the row's fasteners put on the member.
func bearingBypass(left, right float64) (bearing, bypass float64) {
	if math.Abs(left) < math.Abs(right) {
		left, right = right, left
	}
	return left - right, right
}
