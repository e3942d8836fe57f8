package strictjson

import (
	"bytes"
	"math"
	"slices"
	"strconv"
	"unicode/utf16"
	"unicode/utf8"
)

// IsCanonical reports whether data is one JSON value in the form of RFC 8785.
// It reads data once and writes nothing: a long log is checked as fast as it
// comes from the disk.
func IsCanonical(data []byte) bool {
	c := canonical{data: data}
	return c.value(0) && c.at == len(data)
}

// deepest is the deepest nesting that IsCanonical takes.
const deepest = 1000

// canonical reads canonical JSON from a position on.
type canonical struct {
	data []byte
	at   int
}

func (c *canonical) next(b byte) bool {
	if c.at < len(c.data) && c.data[c.at] == b {
		c.at++
		return true
	}
	return false
}

func (c *canonical) value(depth int) bool {
	if c.at >= len(c.data) || depth > deepest {
		return false
	}
	switch c.data[c.at] {
	case '{':
		return c.object(depth)
	case '[':
		return c.array(depth)
	case '"':
		return c.text()
	case 't':
		return c.word("true")
	case 'f':
		return c.word("false")
	case 'n':
		return c.word("null")
	}
	return c.number()
}

func (c *canonical) word(w string) bool {
	if !bytes.HasPrefix(c.data[c.at:], []byte(w)) {
		return false
	}
	c.at += len(w)
	return true
}

func (c *canonical) array(depth int) bool {
	c.at++
	if c.next(']') {
		return true
	}
	for c.value(depth + 1) {
		if c.next(']') {
			return true
		}
		if !c.next(',') {
			return false
		}
	}
	return false
}

// object reads members whose names ascend (RFC 8785 section 3.2.3).
func (c *canonical) object(depth int) bool {
	c.at++
	if c.next('}') {
		return true
	}
	var before []byte
	for {
		start := c.at
		if !c.text() {
			return false
		}
		name := c.data[start+1 : c.at-1]
		if before != nil && order(before, name) >= 0 {
			return false
		}
		before = name
		if !c.next(':') || !c.value(depth+1) {
			return false
		}
		if c.next('}') {
			return true
		}
		if !c.next(',') {
			return false
		}
	}
}

// order compares two names, as they are written, by their UTF-16 code units:
// negative, 0 or positive as of cmp.Compare.
func order(a, b []byte) int {
	for i := 0; i < len(a) && i < len(b); i++ {
		if a[i] >= utf8.RuneSelf || b[i] >= utf8.RuneSelf || a[i] == '\\' || b[i] == '\\' {
			return slices.Compare(units(a), units(b))
		}
		if a[i] != b[i] {
			return int(a[i]) - int(b[i])
		}
	}
	return len(a) - len(b)
}

// units returns the UTF-16 code units of a name.
func units(name []byte) []uint16 {
	quoted := append(append([]byte{'"'}, name...), '"')
	var text string
	if err := Decode(quoted, &text); err != nil {
		return nil // not reached: text has read it
	}
	return utf16.Encode([]rune(text))
}

// text reads a string with the escapes of RFC 8785 section 3.2.2.2 and no
// others.
func (c *canonical) text() bool {
	if !c.next('"') {
		return false
	}
	for c.at < len(c.data) {
		switch b := c.data[c.at]; {
		case b == '"':
			c.at++
			return true
		case b == '\\':
			if !c.escape() {
				return false
			}
		case b < ' ':
			return false
		case b < utf8.RuneSelf:
			c.at++
		default:
			r, size := utf8.DecodeRune(c.data[c.at:])
			if r == utf8.RuneError && size == 1 {
				return false
			}
			c.at += size
		}
	}
	return false
}

func (c *canonical) escape() bool {
	rest := c.data[c.at+1:]
	if len(rest) == 0 {
		return false
	}
	switch rest[0] {
	case '"', '\\', 'b', 't', 'n', 'f', 'r':
		c.at += 2
		return true
	}
	// A control character without a letter of its own: \u00 and two digits.
	if len(rest) < 5 || string(rest[:3]) != "u00" {
		return false
	}
	high, low := rest[3], rest[4]
	if high != '0' && high != '1' || (low < '0' || low > '9') && (low < 'a' || low > 'f') {
		return false
	}
	if high == '0' && bytes.IndexByte([]byte("89acd"), low) >= 0 {
		return false // \b, \t, \n, \f, \r
	}
	c.at += 6
	return true
}

// number reads a number as ECMAScript writes it (RFC 8785 section 3.2.2.3).
func (c *canonical) number() bool {
	start := c.at
	digits, point := 0, -1
loop:
	for ; c.at < len(c.data); c.at++ {
		switch b := c.data[c.at]; {
		case b >= '0' && b <= '9':
			digits++
		case b == '.':
			if point >= 0 {
				return false
			}
			point = c.at - start
		case b == 'e' || b == 'E' || b == '+' || b == '-' && c.at > start:
			digits = math.MaxInt32 // not a short one
		case b != '-':
			break loop
		}
	}
	text := c.data[start:c.at]
	if digits <= 15 {
		return short(text, point)
	}
	f, err := strconv.ParseFloat(string(text), 64)
	if err != nil || f == 0 {
		return false // zero is short
	}
	var room [32]byte
	return bytes.Equal(appendNumber(room[:0], f), text)
}

// short reports whether a decimal without an exponent, of at most 15 digits, is
// written as ECMAScript does. Two such decimals are never the same float64, so
// that none of them has a shorter form but by dropping zeros.
func short(text []byte, point int) bool {
	text, negative := bytes.CutPrefix(text, []byte("-"))
	if negative {
		point--
	}
	whole, fraction := text, []byte(nil)
	if point >= 0 {
		whole, fraction = text[:point], text[point+1:]
		if len(fraction) == 0 || fraction[len(fraction)-1] == '0' {
			return false
		}
	}
	switch {
	case len(whole) == 0:
		return false
	case whole[0] != '0':
		return true
	case len(whole) > 1:
		return false
	case fraction == nil:
		return !negative // zero has no sign
	}
	// Below 1e-6 there is an exponent.
	return !bytes.HasPrefix(fraction, []byte("000000"))
}

// appendNumber writes a finite number other than zero as ECMAScript does.
func appendNumber(b []byte, f float64) []byte {
	if abs := math.Abs(f); abs >= 1e-6 && abs < 1e21 {
		return strconv.AppendFloat(b, f, 'f', -1, 64)
	}
	b = strconv.AppendFloat(b, f, 'e', -1, 64)
	// e-07 is written e-7.
	if n := len(b); n >= 4 && b[n-4] == 'e' && b[n-2] == '0' {
		b[n-2] = b[n-1]
		b = b[:n-1]
	}
	return b
}
