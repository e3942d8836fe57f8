package service

import (
	"fmt"
	"strconv"

	"jointledger/strength"
)

// Units is what a document's numbers are in; it is never guessed.
type Units string

// The two choices: N, mm, MPa, N·mm and lbf, in, psi, lbf·in.
const (
	SI Units = "SI"
	US Units = "US"
)

// Words implements strictjson.Words.
func (Units) Words() []string { return []string{string(SI), string(US)} }

// Exact by definition: the international inch (1959) and the pound-force
// (0.45359237 kg at 9.80665 m/s²).
const (
	mmPerInch = 25.4
	nPerLbf   = 4.4482216152605
)

// scale returns how many of the program's own unit one of the caller's is.
func (u Units) scale(unit strength.Unit) float64 {
	if u != US {
		return 1
	}
	factor := 1.0
	for range unit.Length {
		factor *= mmPerInch
	}
	for range -unit.Length {
		factor /= mmPerInch
	}
	for range unit.Force {
		factor *= nPerLbf
	}
	for range -unit.Force {
		factor /= nPerLbf
	}
	return factor
}

// out turns a quantity into the caller's unit. Fifteen digits are kept: what
// was typed as 0.75 in comes back as 0.75, not as 0.7499999999999999.
func (u Units) out(value float64, unit strength.Unit) float64 {
	if unit == strength.None || unit.Angle {
		return value
	}
	return fifteen(value / u.scale(unit))
}

// fifteen keeps fifteen digits of a number.
func fifteen(x float64) float64 {
	var room [32]byte
	rounded, err := strconv.ParseFloat(string(strconv.AppendFloat(room[:0], x, 'e', 14, 64)), 64)
	if err != nil {
		return x // beyond float64 when rounded up
	}
	return rounded
}

var unitNames = map[Units]map[strength.Unit]string{
	SI: {strength.Stress: "MPa", strength.Moment: "N·mm"},
	US: {strength.Stress: "psi", strength.Moment: "lbf·in"},
}

// name writes a unit.
func (u Units) name(unit strength.Unit) string {
	if unit.Angle {
		return "°"
	}
	if unit == strength.None {
		return "1"
	}
	if name, ok := unitNames[u][unit]; ok {
		return name
	}
	force, length := "N", "mm"
	if u == US {
		force, length = "lbf", "in"
	}
	over, under := "", ""
	for _, part := range []struct {
		name  string
		power int8
	}{{force, unit.Force}, {length, unit.Length}} {
		side := &over
		if part.power < 0 {
			side, part.power = &under, -part.power
		}
		if part.power == 0 {
			continue
		}
		if *side != "" {
			*side += "·"
		}
		*side += part.name
		if part.power > 1 {
			*side += strconv.Itoa(int(part.power))
		}
	}
	switch {
	case under == "":
		return over
	case over == "":
		return "1/" + under
	}
	return over + "/" + under
}

// write puts a quantity into words.
func (u Units) write(q strength.Quantity) string {
	text := strconv.FormatFloat(u.out(q.Value, q.Unit), 'g', 6, 64)
	if q.Unit == strength.None {
		return text
	}
	if q.Unit.Angle {
		return text + "°"
	}
	return fmt.Sprintf("%s %s", text, u.name(q.Unit))
}

// say renders a message.
func (u Units) say(m strength.Message) string { return m.Render(u.write) }
