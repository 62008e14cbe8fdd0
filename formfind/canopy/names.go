package canopy

import (
	"slices"
	"strconv"
)

// Names is a list of names in one slab of text, so that a million of them cost
// no more than their letters. The zero value is an empty list.
type Names struct {
	text []byte
	end  []int32 // end of name i in text
}

// Append adds a name at the end of the list.
func (n *Names) Append(name string) {
	n.text = append(n.text, name...)
	n.end = append(n.end, int32(len(n.text)))
}

// Grow makes room for names more names with letters letters in all.
func (n *Names) Grow(names, letters int) {
	n.text, n.end = slices.Grow(n.text, letters), slices.Grow(n.end, names)
}

// Len returns the number of names.
func (n *Names) Len() int { return len(n.end) }

// At returns name i, or its number in decimal (counted from 0) when the list
// has no name i or an empty one.
func (n *Names) At(i int) string {
	if i < 0 || i >= len(n.end) {
		return strconv.Itoa(i)
	}
	start := int32(0)
	if i > 0 {
		start = n.end[i-1]
	}
	if start == n.end[i] {
		return strconv.Itoa(i)
	}
	return string(n.text[start:n.end[i]])
}

// Bytes returns name i without copying, nil when there is none. The slice must
// not be changed.
func (n *Names) Bytes(i int) []byte {
	if i < 0 || i >= len(n.end) {
		return nil
	}
	start := int32(0)
	if i > 0 {
		start = n.end[i-1]
	}
	return n.text[start:n.end[i]:n.end[i]]
}
