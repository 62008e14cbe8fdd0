package relax

import (
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// Frozen returns an engine that keeps the field of tension of a form: the
// force density of every member and, with the found shape as reference, the
// second Piola-Kirchhoff stress of every triangle, and the loads as they act
// on the found shape. Every direction then has stiffness and, with tension
// everywhere, there is exactly one equilibrium: relaxation from disturbed
// nodes must return to the form's own nodes if, and only if, the form is in
// balance. This is the second opinion on fabric.
//
// The engine is for the structure the form belongs to; its Find relaxes all
// directions whatever the settings say.
func Frozen(form *canopy.Form) *Engine { return &Engine{form: form} }

// freezeLoads makes the loads on the form's shape dead.
func (p *problem) freezeLoads(form *canopy.Form) {
	s := p.s.Carrying(form)
	for t, c := range s.Corners {
		fab := &s.Fabrics[s.FabricOf[t]]
		weight := fab.Weight
		if !s.SelfWeight {
			weight = 0
		}
		if fab.Pressure == 0 && weight == 0 {
			continue
		}
		a := form.Position[c[0]]
		twice := r3.Cross(r3.Sub(form.Position[c[1]], a), r3.Sub(form.Position[c[2]], a))
		load := r3.Scale(fab.Pressure/6, twice)
		load.Z -= weight / 6 * r3.Norm(twice)
		for _, i := range c {
			p.lead[i] = r3.Add(p.lead[i], load)
		}
	}
	p.addWeights()
	for m, k := range p.src {
		if p.hang == nil {
			break
		}
		e := s.Ends[k]
		w := p.hang[m] * r3.Norm(r3.Sub(form.Position[e[1]], form.Position[e[0]])) / 2
		p.lead[e[0]].Z -= w
		p.lead[e[1]].Z -= w
	}
	p.hang = nil
}

// Disturb returns a copy of the form with every free direction of every node
// moved by up to amplitude (m), by numbers that follow from seed alone. Nodes
// of rigid rings move with their centre. Only positions are changed.
func Disturb(s *canopy.Structure, form *canopy.Form, seed uint64, amplitude float64) *canopy.Form {
	out := *form
	out.Position = append([]r3.Vec(nil), form.Position...)
	move := make([]r3.Vec, len(out.Position))
	for i := range move {
		// SplitMix64 (Steele, Lea & Flood 2014): the numbers of a node do not
		// depend on the others.
		state := seed*0x9e3779b97f4a7c15 + uint64(i)*0xd1342543de82ef95
		next := func() float64 {
			state += 0x9e3779b97f4a7c15
			z := state
			z = (z ^ z>>30) * 0xbf58476d1ce4e5b9
			z = (z ^ z>>27) * 0x94d049bb133111eb
			z ^= z >> 31
			return amplitude * (float64(z>>11)/(1<<52) - 1)
		}
		move[i] = r3.Vec{X: next(), Y: next(), Z: next()}
	}
	for i := range move {
		m := move[i]
		if c := s.MasterOf(i); c >= 0 {
			m = masked(move[c], canopy.DirAll&^s.FixedAt(int(c)))
		}
		out.Position[i] = r3.Add(out.Position[i], masked(m, canopy.DirAll&^s.FixedAt(i)))
	}
	return &out
}
