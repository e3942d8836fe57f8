package strictjson

import (
	"slices"
	"sync"
)

// inOrder writes JSON that is in the form of RFC 8785 but for the order of
// members, as Encode writes it, with the members in order. It reads the data
// once. ok is false where something else is not in that form.
func inOrder(data []byte) (canonicalForm []byte, ok bool) {
	o := orderers.Get().(*orderer)
	o.canonical, o.out, o.members = canonical{data: data}, make([]byte, 0, len(data)), o.members[:0]
	ok = o.value(0) && o.at == len(data)
	canonicalForm = o.out
	if o.canonical, o.out = (canonical{}), nil; cap(o.spare) <= mostSpare {
		clear(o.members[:cap(o.members)]) // their names are parts of data
		orderers.Put(o)
	}
	return canonicalForm, ok
}

// orderers are used again, with the shapes that they know.
var orderers = sync.Pool{New: func() any { return new(orderer) }}

// mostSpare is what an orderer may keep for the next document.
const mostSpare = 1 << 20

// orderer reads with canonical, and writes.
type orderer struct {
	canonical
	out     []byte
	members []member // of the objects that are being written
	spare   []byte
	shapes  []shape
	oldest  int // of shapes, when there is no room for more
}

// shape is the names of the members of an object as they came, and the places
// where they stand in order: the objects of a list have one shape as a rule,
// and documents of one kind a few, each of which is sorted once.
type shape struct {
	names  []string
	places []int
}

// How many shapes are remembered, and of how many bytes of names at most.
const (
	mostShapes = 32
	mostNames  = 1 << 10
)

// member is one of an object: its name as it is written, and where it stands in
// out.
type member struct {
	name     []byte
	from, to int
}

func (o *orderer) put(b byte) { o.out = append(o.out, b) }

func (o *orderer) value(depth int) bool {
	if o.at >= len(o.data) || depth > deepest {
		return false
	}
	switch o.data[o.at] {
	case '{':
		return o.object(depth)
	case '[':
		return o.array(depth)
	}
	start := o.at
	if !o.canonical.value(depth) {
		return false
	}
	o.out = append(o.out, o.data[start:o.at]...)
	return true
}

func (o *orderer) array(depth int) bool {
	o.at++
	o.put('[')
	for first := true; !o.next(']'); first = false {
		if !first {
			if !o.next(',') {
				return false
			}
			o.put(',')
		}
		if !o.value(depth + 1) {
			return false
		}
	}
	o.put(']')
	return true
}

func (o *orderer) object(depth int) bool {
	o.at++
	o.put('{')
	start, base := len(o.out), len(o.members)
	ordered := true
	for !o.next('}') {
		if len(o.members) > base {
			if !o.next(',') {
				return false
			}
			o.put(',')
		}
		m := member{from: len(o.out)}
		begin := o.at
		if !o.text() {
			return false
		}
		m.name = o.data[begin+1 : o.at-1]
		o.out = append(o.out, o.data[begin:o.at]...)
		if !o.next(':') {
			return false
		}
		o.put(':')
		if !o.value(depth + 1) {
			return false
		}
		m.to = len(o.out)
		if n := len(o.members); n > base && order(o.members[n-1].name, m.name) >= 0 {
			ordered = false
		}
		o.members = append(o.members, m)
	}
	mine := o.members[base:]
	if !ordered && !o.reorder(mine, start) {
		return false
	}
	o.members = o.members[:base]
	o.put('}')
	return true
}

// reorder puts the members of an object, which begin at start, in order. Two of
// one name are refused.
func (o *orderer) reorder(members []member, start int) bool {
	places, ok := o.places(members)
	if !ok {
		return false
	}
	o.spare = append(o.spare[:0], o.out[start:]...)
	o.out = o.out[:start]
	for i, place := range places {
		if i > 0 {
			o.put(',')
		}
		m := &members[place]
		o.out = append(o.out, o.spare[m.from-start:m.to-start]...)
	}
	return true
}

// places returns the members in order, by their places; ok is false where two
// have one name.
func (o *orderer) places(members []member) (places []int, ok bool) {
	for i := range o.shapes {
		if s := &o.shapes[i]; slices.EqualFunc(s.names, members, func(name string, m member) bool { return name == string(m.name) }) {
			return s.places, true
		}
	}
	places, size := make([]int, len(members)), 0
	for i, m := range members {
		places[i] = i
		size += len(m.name)
	}
	slices.SortFunc(places, func(a, b int) int { return order(members[a].name, members[b].name) })
	for i := range places[1:] {
		if order(members[places[i]].name, members[places[i+1]].name) == 0 {
			return nil, false
		}
	}
	if size <= mostNames {
		o.remember(members, places)
	}
	return places, true
}

// remember keeps a shape, in the place of the oldest when there are many.
func (o *orderer) remember(members []member, places []int) {
	s := shape{make([]string, len(members)), places}
	for i, m := range members {
		s.names[i] = string(m.name)
	}
	if len(o.shapes) < mostShapes {
		o.shapes = append(o.shapes, s)
		return
	}
	o.shapes[o.oldest] = s
	o.oldest = (o.oldest + 1) % mostShapes
}
