package strength

import (
	"strconv"
	"strings"
)

// Mark says how a value is known. The zero Mark is Given.
type Mark struct {
	kind    markKind
	percent int    // of FromMemory
	set     string // of FromCurveSet
}

type markKind uint8

const (
	given markKind = iota
	seen
	curveSet
	derived
	commonPractice
	memory
)

// The marks without a parameter.
var (
	Given          = Mark{kind: given}          // the caller's own value
	Seen           = Mark{kind: seen}           // read in the source that is named
	Derived        = Mark{kind: derived}        // derived or computed for this project
	CommonPractice = Mark{kind: commonPractice} // a habit of the trade without a source
)

// FromMemory marks a value remembered from its source, percent sure.
func FromMemory(percent int) Mark { return Mark{kind: memory, percent: percent} }

// FromCurveSet marks a value read from a curve set, named as id@version.
func FromCurveSet(name string) Mark { return Mark{kind: curveSet, set: name} }

// Weaker reports whether m says less for its value than n.
func (m Mark) Weaker(n Mark) bool {
	if m.kind != n.kind {
		return m.kind > n.kind
	}
	return m.percent < n.percent
}

// Weakest returns the weakest of the marks; of none, Given.
func Weakest(marks ...Mark) Mark {
	w := Given
	for _, m := range marks {
		if m.Weaker(w) {
			w = m
		}
	}
	return w
}

// String writes a mark as answers carry it.
func (m Mark) String() string {
	switch m.kind {
	case seen:
		return "seen"
	case curveSet:
		return "curve set " + m.set
	case derived:
		return "derived"
	case commonPractice:
		return "common practice"
	case memory:
		return memoryTexts[min(max(m.percent, 0), len(memoryTexts)-1)]
	default:
		return "given"
	}
}

// memoryTexts are written once: every step of an answer has a mark.
var memoryTexts = func() (texts [101]string) {
	for percent := range texts {
		texts[percent] = "memory " + strconv.Itoa(percent) + "%"
	}
	return texts
}()

// ParseMark reads what String wrote, but for the marks of curve sets, which no
// value of a material or a fastener can have.
func ParseMark(s string) (Mark, bool) {
	for _, m := range []Mark{Given, Seen, Derived, CommonPractice} {
		if s == m.String() {
			return m, true
		}
	}
	digits, ok := strings.CutPrefix(s, "memory ")
	if !ok {
		return Mark{}, false
	}
	percent, err := strconv.Atoi(strings.TrimSuffix(digits, "%"))
	if err != nil || percent < 1 || percent > 99 || s != FromMemory(percent).String() {
		return Mark{}, false
	}
	return FromMemory(percent), true
}
