package spec

import (
	"fmt"
	"strconv"
	"strings"

	"go.yaml.in/yaml/v4"
)

// applySets changes the tree by the entries of Options.Set.
func (r *reader) applySets(root *yaml.Node) *yaml.Node {
	if len(r.options.Set) == 0 {
		return root
	}
	// A change of one value must not change its aliases.
	budget := maxSetNodes
	whole := expand(root, 0, &budget)
	if whole == nil {
		r.fail(root, nil, "the model's aliases hold too many values", "write the values themselves")
		return root
	}
	root = whole
	for i, s := range r.options.Set {
		r.applySet(root, i, s)
	}
	return root
}

const maxSetNodes = 1000000

// setLabel stands where messages have a file name.
func setLabel(s string) string { return "--set " + clip(s) }

func (r *reader) failSet(s string, path, message, hint string) {
	r.add(Diagnostic{File: setLabel(s), Path: clip(path), Text: clip(path), Message: message, Hint: hint}, -1000)
}

func (r *reader) applySet(root *yaml.Node, index int, s string) {
	path, text, ok := strings.Cut(s, "=")
	path = strings.TrimSpace(path)
	if !ok || path == "" {
		r.failSet(s, path, fmt.Sprintf("%q is not path=value", clip(s)), "for example points.M1.z=7.5")
		return
	}
	if len(text) > 1<<16 {
		r.failSet(s, path, "the value is longer than 65536 bytes", "")
		return
	}
	var doc yaml.Node
	if err := safeLoad([]byte(text), &doc); err != nil || len(doc.Content) != 1 || hasAlias(&doc) {
		r.failSet(s, path, fmt.Sprintf("%q is not a value", clip(text)), "write it as in the model file, for example points.M1.z=7.5")
		return
	}
	value := doc.Content[0]
	mark(value, index)
	n, sh := root, in(modelSection)
	parts := strings.Split(path, ".")
	for k, part := range parts {
		last := k == len(parts)-1
		done := strings.Join(parts[:k], ".")
		where := "the model"
		if done != "" {
			where = done
		}
		next, nextShape, c := r.step(n, sh, part, last, value, index, where)
		if c != nil {
			r.failSet(s, path, c.message, c.hint)
			return
		}
		n, sh = next, nextShape
	}
}

// step goes one part of a path down from n, or sets the value there.
func (r *reader) step(n *yaml.Node, sh *shape, part string, last bool, value *yaml.Node, index int, where string) (*yaml.Node, *shape, *complaint) {
	part = strings.TrimSpace(part)
	switch n.Kind {
	case yaml.MappingNode:
		sec, elem := sh.mapping()
		var have []string
		for i := 0; i+1 < len(n.Content); i += 2 {
			have = append(have, n.Content[i].Value)
		}
		if i := index2(have, part, sec != nil); i >= 0 {
			child := elem
			if sec != nil {
				child = nil
				if key := sec.get(have[i]); key != nil {
					child = key.shape
				}
			}
			if last {
				n.Content[2*i+1] = value
				return value, child, nil
			}
			if v := n.Content[2*i+1]; isNull(v) && child != nil && child.canHold(yaml.MappingNode) {
				n.Content[2*i+1] = &yaml.Node{Kind: yaml.MappingNode, Tag: "!!map", Line: -index - 1}
			}
			return n.Content[2*i+1], child, nil
		}
		if sec != nil {
			if i := index2(sec.names(), part, true); i >= 0 {
				k := sec.keys[i]
				kn := &yaml.Node{Kind: yaml.ScalarNode, Tag: "!!str", Value: k.name, Line: -index - 1}
				v := value
				if !last {
					v = &yaml.Node{Kind: yaml.MappingNode, Tag: "!!map", Line: -index - 1}
				}
				n.Content = append(n.Content, kn, v)
				return v, k.shape, nil
			}
			have = append(have, sec.names()...)
		}
		hint := ""
		if near := nearest(part, have); near != "" {
			hint = fmt.Sprintf("did you mean %q?", near)
		} else if len(have) > 0 && len(have) <= 16 {
			hint = fmt.Sprintf("%s has %s", where, list(unique(have), "and"))
		}
		return nil, nil, &complaint{fmt.Sprintf("there is no %q in %s", clip(part), where), hint}
	case yaml.SequenceNode:
		i, err := strconv.Atoi(part)
		if err != nil {
			i = -1
			if len(n.Content) == 3 && (sh == nil || sh.hasTriple()) {
				for d, w := range directionWords {
					if part == w {
						i = d
					}
				}
			}
		}
		if i < 0 || i >= len(n.Content) {
			hint := fmt.Sprintf("positions are counted from 0 to %d", len(n.Content)-1)
			if len(n.Content) == 0 {
				hint = "the list is empty"
			} else if len(n.Content) == 3 && sh != nil && sh.hasTriple() {
				hint = "write x, y or z"
			}
			return nil, nil, &complaint{fmt.Sprintf("there is no %q in the list %s", clip(part), where), hint}
		}
		if last {
			n.Content[i] = value
		}
		var child *shape
		if sh != nil {
			child = sh.listElem()
		}
		return n.Content[i], child, nil
	}
	return nil, nil, &complaint{fmt.Sprintf("%s is a single value and has no %q", where, clip(part)), "set it as a whole"}
}

// mapping returns what a mapping of this shape holds: known keys, or names of
// elem.
func (s *shape) mapping() (sec *section, elem *shape) {
	if s == nil {
		return nil, nil
	}
	switch s.form {
	case formSection:
		return s.sec, nil
	case formNamed:
		return nil, s.elem
	case formEither:
		for _, o := range s.of {
			if sec, elem := o.mapping(); sec != nil || elem != nil {
				return sec, elem
			}
		}
	}
	return nil, nil
}

func (s *shape) canHold(yaml.Kind) bool {
	sec, elem := s.mapping()
	return sec != nil || elem != nil
}

func (s *shape) hasTriple() bool {
	switch s.form {
	case formTriple, formDirection:
		return true
	case formEither:
		for _, o := range s.of {
			if o.hasTriple() {
				return true
			}
		}
	}
	return false
}

func (s *shape) listElem() *shape {
	switch s.form {
	case formList:
		return s.elem
	case formTable:
		return in(s.sec)
	case formRegion:
		return &shape{form: formPair, dim: s.dim}
	case formEither:
		for _, o := range s.of {
			if e := o.listElem(); e != nil {
				return e
			}
		}
	}
	return nil
}

// index2 finds a word, folding case and separators when loose.
func index2(words []string, w string, loose bool) int {
	for i, x := range words {
		if x == w {
			return i
		}
	}
	if loose {
		for i, x := range words {
			if fold(x) == fold(w) {
				return i
			}
		}
	}
	return -1
}

func unique(s []string) []string {
	seen := map[string]bool{}
	out := s[:0:0]
	for _, w := range s {
		if !seen[w] {
			seen[w] = true
			out = append(out, w)
		}
	}
	return out
}

// mark notes on all nodes of a tree that they came from entry index of
// Options.Set.
func mark(n *yaml.Node, index int) {
	n.Line, n.Column = -index-1, 0
	for _, c := range n.Content {
		mark(c, index)
	}
}

func hasAlias(n *yaml.Node) bool {
	if n.Kind == yaml.AliasNode || n.Anchor != "" {
		return true
	}
	for _, c := range n.Content {
		if hasAlias(c) {
			return true
		}
	}
	return false
}

// expand copies the tree below n with every alias replaced by what it stands
// for. It returns nil when that takes more nodes than the budget.
func expand(n *yaml.Node, depth int, budget *int) *yaml.Node {
	for hop := 0; n.Kind == yaml.AliasNode; hop++ {
		if hop > 10 || n.Alias == nil {
			return nil
		}
		n = n.Alias
	}
	*budget--
	if *budget < 0 || depth > 2*maxDepth {
		return nil
	}
	dup := *n
	dup.Anchor = ""
	dup.Content = make([]*yaml.Node, len(n.Content))
	for i, c := range n.Content {
		if dup.Content[i] = expand(c, depth+1, budget); dup.Content[i] == nil {
			return nil
		}
	}
	return &dup
}
