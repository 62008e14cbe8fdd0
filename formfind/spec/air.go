package spec

import (
	"errors"
	"fmt"

	"anticlast/formfind/canopy"

	"go.yaml.in/yaml/v4"
)

// volumeKeys are what a fabric says of the air below it.
func volumeKeys() []*key {
	return []*key{
		{name: "volume", shape: quantity(Volume), example: "60 m3",
			doc: "Volume of air shut in below the fabric, or behind the positive side of listed triangles, in place of pressure: its pressure is found. The fabric closes it with the plane of its boundary, which is fixed in that plane, or with the fabrics named in volume with. A negative one bulges the other way."},
		{name: "volume with", shape: names("fabric", 1), deflt: "none: the plane of its boundary closes the volume", example: "[lower]",
			doc: "The other fabrics around the same air: the lower film of a cushion, or the neighbours that complete a roof. Only the fabric that has the volume names them."},
	}
}

// air is the volume that a fabric asks for.
type air struct {
	fabric string
	volume float64
	at     *yaml.Node // key of the volume
	p      *place
	with   []ref
}

// air reads the volume of a fabric; ok is false when it has none.
func (r *reader) air(g *fields, fabric string) (a air, ok bool) {
	a = air{fabric: fabric, at: g.keyNode("volume"), p: g.p.down("volume")}
	a.volume, ok = g.quantity("volume")
	a.with, _ = g.refs("volume with")
	if !g.has("volume") {
		if g.has("volume with") {
			r.fail(g.keyNode("volume with"), g.p.down("volume with"), fmt.Sprintf("fabric %q names fabrics around its volume but has no volume", fabric), "add volume, for example volume: 60 m3, or remove volume with")
		}
		return a, false
	}
	if g.has("pressure") {
		r.fail(a.at, a.p, fmt.Sprintf("fabric %q has a volume and a pressure: the pressure is what follows from the volume", fabric), "keep one of them")
		return a, false
	}
	return a, ok
}

// airs checks the volumes against each other. pressed says which fabrics have a
// pressure of their own.
func (r *reader) airs(all []air, fabrics []string, pressed func(fabric string) bool) {
	known := map[string]bool{}
	for _, f := range fabrics {
		known[f] = true
	}
	owner := map[string]string{} // fabric → the one whose volume it bounds
	for _, a := range all {
		owner[a.fabric] = a.fabric
	}
	for _, a := range all {
		for _, q := range a.with {
			switch by, twice := owner[q.name]; {
			case !known[q.name]:
				hint := "define it under fabrics"
				if near := nearest(q.name, fabrics); near != "" {
					hint = fmt.Sprintf("did you mean %q?", near)
				}
				r.fail(q.n, q.p, fmt.Sprintf("fabric %q is not defined", clip(q.name)), hint)
			case q.name == a.fabric:
				r.fail(q.n, q.p, fmt.Sprintf("fabric %q cannot enclose a volume with itself", q.name), "name the other fabrics around the air, or remove volume with")
			case by == q.name:
				r.fail(q.n, q.p, fmt.Sprintf("fabric %q has a volume of its own, and bounds that of fabric %q", q.name, a.fabric), "a fabric bounds one volume; give the volume at one of its fabrics only")
			case twice:
				r.fail(q.n, q.p, fmt.Sprintf("fabric %q already bounds the volume of fabric %q", q.name, by), "a fabric bounds one volume; give the volume at one of its fabrics only")
			case pressed(q.name):
				r.fail(q.n, q.p, fmt.Sprintf("fabric %q has a pressure of its own, and bounds the volume of fabric %q", q.name, a.fabric), "remove its pressure: it follows from the volume")
			default:
				owner[q.name] = a.fabric
			}
		}
	}
}

// outlineVolume reads the volume of the fabric of an outline.
func (r *reader) outlineVolume(g *fields) (float64, bool) {
	v, ok := g.quantity("volume")
	if ok && g.has("pressure") {
		r.fail(g.keyNode("volume"), g.p.down("volume"), "the fabric has a volume and a pressure: the pressure is what follows from the volume", "keep one of them")
		return 0, false
	}
	return v, ok
}

// outlineAir reads the volume below the last faces of the model, which share it.
func (d *drawn) outlineAir(g *fields, faces int) {
	if !g.has("volume") || faces == 0 {
		return
	}
	all := d.m.Fabrics[len(d.m.Fabrics)-faces:]
	a := air{fabric: all[0].Name, at: g.keyNode("volume"), p: g.p.down("volume")}
	var ok bool
	if a.volume, ok = d.r.outlineVolume(g); !ok {
		return
	}
	for _, f := range all[1:] {
		a.with = append(a.with, ref{f.Name, a.at, a.p})
	}
	d.air = append(d.air, a)
}

// drawnAir checks the volumes of drawn fabrics and hands them to the model.
func (d *drawn) drawnAir() {
	if len(d.air) == 0 {
		return
	}
	var names []string
	pressed := map[string]bool{}
	index := map[string]int{}
	for i, f := range d.m.Fabrics {
		names = append(names, f.Name)
		pressed[f.Name] = f.Properties.Pressure != 0
		index[f.Name] = i
	}
	d.r.airs(d.air, names, func(f string) bool { return pressed[f] })
	for _, a := range d.air {
		f := &d.m.Fabrics[index[a.fabric]]
		f.Volume, f.HasVolume = a.volume, true
		for _, q := range a.with {
			f.VolumeWith = append(f.VolumeWith, q.name)
		}
	}
}

// enclose makes the enclosures of a listed structure.
func (l *lister) enclose() {
	if len(l.air) == 0 {
		return
	}
	var names []string
	for _, f := range l.s.Fabrics {
		names = append(names, f.Name)
	}
	l.r.airs(l.air, names, func(f string) bool { return l.s.Fabrics[l.fabric[f]].Pressure != 0 })
	if l.r.diags.failed() {
		return
	}
	for _, a := range l.air {
		fabrics := []int32{int32(l.fabric[a.fabric])}
		for _, q := range a.with {
			fabrics = append(fabrics, int32(l.fabric[q.name]))
		}
		e, err := l.s.Enclose(a.fabric, fabrics, 1, a.volume)
		var wrong *canopy.EnclosureError
		if errors.As(err, &wrong) {
			l.r.fail(a.at, a.p, fmt.Sprintf("fabric %q cannot have a volume: %s", a.fabric, wrong.Problem), wrong.WayOut)
			continue
		}
		l.s.Enclosures = append(l.s.Enclosures, e)
	}
}
