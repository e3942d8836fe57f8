package strength

import (
	"fmt"
	"math"
)

// Unit says what a number measures, as powers of force and of length. Inside
// the program forces are N, lengths mm and stresses MPa; only the edge of the
// program turns them into what a caller asked for.
type Unit struct {
	Force, Length int8
	// Angle marks degrees, which no choice of units changes.
	Angle bool
}

// The units that joint calculations speak.
var (
	None       = Unit{}
	Force      = Unit{Force: 1}
	Length     = Unit{Length: 1}
	Area       = Unit{Length: 2}
	Volume     = Unit{Length: 3}
	Quartic    = Unit{Length: 4} // second moment of area
	Stress     = Unit{Force: 1, Length: -2}
	Moment     = Unit{Force: 1, Length: 1}
	Stiffness  = Unit{Force: 1, Length: -1}
	Compliance = Unit{Force: -1, Length: 1}
	Degrees    = Unit{Angle: true}
)

// Times returns the unit of a product.
func (u Unit) Times(v Unit) Unit {
	return Unit{Force: u.Force + v.Force, Length: u.Length + v.Length}
}

// Over returns the unit of a quotient.
func (u Unit) Over(v Unit) Unit {
	return Unit{Force: u.Force - v.Force, Length: u.Length - v.Length}
}

// Quantity is a number with what it measures, in N, mm, MPa or degrees.
type Quantity struct {
	Value float64
	Unit  Unit
}

// Of makes a quantity.
func (u Unit) Of(value float64) Quantity { return Quantity{value, u} }

// Message is a sentence whose quantities are written only at the edge, in the
// units of whoever asked.
type Message struct {
	format string
	args   []any
}

// Say makes a message; quantities stand in format as %v.
func Say(format string, args ...any) Message { return Message{format, args} }

// Empty reports whether there is nothing to say.
func (m Message) Empty() bool { return m.format == "" }

// Render writes the message; write turns each quantity into text.
func (m Message) Render(write func(Quantity) string) string {
	if len(m.args) == 0 {
		return m.format
	}
	args := make([]any, len(m.args))
	for i, a := range m.args {
		switch a := a.(type) {
		case Quantity:
			args[i] = write(a)
		case Message:
			args[i] = a.Render(write)
		default:
			args[i] = a
		}
	}
	return fmt.Sprintf(m.format, args...)
}

// Within is the relative tolerance with which a limit of range, a layout rule
// or a limit of geometry is met, so that 1.5 D typed in inches is 1.5 D.
const Within = 1e-9

// AtLeast reports whether x reaches limit, within the tolerance.
func AtLeast(x, limit float64) bool { return x >= limit-float64(Within*math.Abs(limit)) }

// AtMost reports whether x stays at or under limit, within the tolerance.
func AtMost(x, limit float64) bool { return x <= limit+float64(Within*math.Abs(limit)) }

// Less reports whether x is under limit by more than the tolerance.
func Less(x, limit float64) bool { return !AtLeast(x, limit) }

// More reports whether x is over limit by more than the tolerance.
func More(x, limit float64) bool { return !AtMost(x, limit) }
