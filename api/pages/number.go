package pages

import (
	"html"
	"html/template"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"jointledger/service"
)

// Signs of typography.
const (
	minus     = "−"
	thinSpace = "\u202f" // narrow, and no line breaks at it
)

// number writes a value with five significant digits, its thousands apart, so
// that a column of them can be read.
func number(x float64) string {
	size := math.Abs(x)
	switch {
	case x == 0:
		return "0"
	case size >= 1e9 || size < 1e-4:
		mantissa, exponent, _ := strings.Cut(strconv.FormatFloat(x, 'e', 4, 64), "e")
		e, _ := strconv.Atoi(exponent)
		return signed(trimZeros(mantissa)) + "·10" + superscript(strconv.Itoa(e))
	}
	decimals := max(0, 4-int(math.Floor(math.Log10(size))))
	text := strconv.FormatFloat(x, 'f', decimals, 64)
	if decimals > 0 {
		text = trimZeros(text)
	}
	return signed(thousands(text))
}

func trimZeros(text string) string {
	if !strings.Contains(text, ".") {
		return text
	}
	return strings.TrimSuffix(strings.TrimRight(text, "0"), ".")
}

// signed puts the sign of typography in the place of a hyphen.
func signed(text string) string { return strings.Replace(text, "-", minus, 1) }

func thousands(text string) string {
	whole, fraction, found := strings.Cut(text, ".")
	sign := ""
	if strings.HasPrefix(whole, "-") {
		sign, whole = "-", whole[1:]
	}
	var parts []string
	for len(whole) > 3 && len(whole)+len(parts)*3 > 4 {
		parts = append([]string{whole[len(whole)-3:]}, parts...)
		whole = whole[:len(whole)-3]
	}
	text = sign + strings.Join(append([]string{whole}, parts...), thinSpace)
	if found {
		text += "." + fraction
	}
	return text
}

func superscript(text string) string {
	return strings.NewReplacer("-", "⁻", "0", "⁰", "1", "¹", "2", "²", "3", "³", "4", "⁴", "5", "⁵", "6", "⁶", "7", "⁷", "8", "⁸", "9", "⁹").Replace(text)
}

// margin writes a margin of safety to three decimals, cut and never rounded up:
// what is shown as +0.129 is at least that.
func margin(m *float64) string {
	if m == nil {
		return "—"
	}
	// What lies within a part in 10⁹ of a third decimal is that decimal.
	cut := math.Floor(*m*1000+1e-6) / 1000
	text := strconv.FormatFloat(cut, 'f', 3, 64)
	if math.Abs(cut) >= 1000 {
		text = strconv.FormatFloat(math.Floor(*m), 'f', 0, 64)
	}
	if cut >= 0 {
		return "+" + text
	}
	return signed(text)
}

// value writes an optional number.
func value(x *float64) string {
	if x == nil {
		return "—"
	}
	return number(*x)
}

// length writes a dimension with its limits.
func length(l *service.Length) string {
	switch {
	case l == nil:
		return "—"
	case l.Object != nil:
		return number(l.Object.Nominal) + " " + minus + number(l.Object.Minus) + " +" + number(l.Object.Plus)
	}
	return number(l.Plain)
}

// unit writes the name of a unit with its exponents raised; nothing for 1.
func unit(name string) string {
	if name == "1" {
		return ""
	}
	var b strings.Builder
	for i, r := range name {
		if r >= '2' && r <= '9' && i > 0 {
			b.WriteString(superscript(string(r)))
			continue
		}
		b.WriteRune(r)
	}
	return b.String()
}

// The names of units in a document's units.
func lengthUnit(u service.Units) string { return oneOf(u, "mm", "in") }
func forceUnit(u service.Units) string  { return oneOf(u, "N", "lbf") }
func stressUnit(u service.Units) string { return oneOf(u, "MPa", "psi") }
func momentUnit(u service.Units) string { return oneOf(u, "N·mm", "lbf·in") }

func oneOf(u service.Units, si, us string) string {
	if u == service.US {
		return us
	}
	return si
}

// words turns a word of the wire into plain words.
func words(s string) string { return strings.ReplaceAll(s, "-", " ") }

// symbol sets a symbol such as F_tu,cross with its index lowered.
func symbol(s string) template.HTML {
	name, index, found := strings.Cut(s, "_")
	if !found {
		return template.HTML("<i>" + escape(s) + "</i>")
	}
	return template.HTML("<i>" + escape(name) + "</i><sub>" + escape(index) + "</sub>")
}

// escape makes a text safe in HTML and in the attributes of SVG. Characters
// that XML does not know are replaced.
func escape(s string) string {
	s = strings.Map(func(r rune) rune {
		if r < 0x20 && r != '\t' && r != '\n' || r == utf8.RuneError || r >= 0x7f && r < 0xa0 {
			return '\ufffd'
		}
		return r
	}, s)
	return html.EscapeString(s)
}

// equation sets a formula of the workings: indices lowered, exponents raised,
// a minus for a hyphen between terms, a root sign for sqrt.
func equation(s string) template.HTML {
	var b strings.Builder
	runes := []rune(s)
	isWord := func(i int) bool {
		if i < 0 || i >= len(runes) {
			return false
		}
		r := runes[i]
		return r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || r > 0x37f && r < 0x400
	}
	// run returns the end of a run of word characters from i on, with points
	// and commas that stand between two of them.
	run := func(i int) int {
		for isWord(i) || i < len(runes) && (runes[i] == '.' || runes[i] == ',') && isWord(i-1) && isWord(i+1) {
			i++
		}
		return i
	}
	for i := 0; i < len(runes); {
		r := runes[i]
		switch {
		case r == '_' && isWord(i+1):
			end := run(i + 1)
			b.WriteString("<sub>" + escape(string(runes[i+1:end])) + "</sub>")
			i = end
		case r == '^' && (isWord(i+1) || i+1 < len(runes) && runes[i+1] == '-' && isWord(i+2)):
			start := i + 1
			end := run(start)
			if runes[start] == '-' {
				end = run(start + 1)
			}
			b.WriteString("<sup>" + escape(signed(string(runes[start:end]))) + "</sup>")
			i = end
		case r == '-':
			b.WriteString(minus)
			i++
		case isWord(i):
			end := i
			for isWord(end) {
				end++
			}
			switch word := string(runes[i:end]); word {
			case "sqrt":
				b.WriteString("√")
			default:
				b.WriteString(escape(word))
			}
			i = end
		default:
			b.WriteString(escape(string(r)))
			i++
		}
	}
	return template.HTML(b.String())
}
