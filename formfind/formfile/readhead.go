package formfile

import (
	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

func (d *reader) program() error {
	p := &d.result.Program
	return d.object(func(key []byte) error {
		switch string(key) {
		case "name":
			return d.setString(&p.Name)
		case "version":
			return d.setString(&p.Version)
		case "engines":
			return d.setStrings(&p.Engines)
		}
		return d.skip()
	})
}

func (d *reader) form() error {
	f := d.result.Form
	return d.object(func(key []byte) error {
		switch string(key) {
		case "converged":
			return d.setBool(&f.Converged)
		case "why":
			return d.setString(&f.Why)
		case "steps":
			return d.setStrings(&f.Steps)
		case "engines":
			return d.setStrings(&f.Engines)
		}
		return d.skip()
	})
}

func (d *reader) model() error {
	r := d.result
	return d.object(func(key []byte) error {
		switch string(key) {
		case "title":
			return d.setString(&r.Title)
		case "file":
			return d.setString(&r.File)
		case "digest":
			return d.setString(&r.Digest)
		case "north":
			r.North = nil
			if d.null() {
				return nil
			}
			r.North = new(float64)
			return d.setNumber(r.North)
		case "limits":
			return d.limits()
		case "factors":
			return d.object(func(key []byte) error {
				switch string(key) {
				case "load":
					return d.setGiven(&r.Factors.Load)
				case "fabric":
					return d.setGiven(&r.Factors.Fabric)
				case "cable":
					return d.setGiven(&r.Factors.Cable)
				}
				return d.skip()
			})
		}
		return d.skip()
	})
}

func (d *reader) limits() error {
	l := &d.result.Limits
	bound := func(p **float64) error {
		*p = nil
		if d.null() {
			return nil
		}
		*p = new(float64)
		return d.setNumber(*p)
	}
	bounds := func(p **[2]float64) error {
		*p = nil
		if d.null() {
			return nil
		}
		*p = new([2]float64)
		return d.tuple(2, func(i int) error { return d.setNumber(&(**p)[i]) })
	}
	return d.object(func(key []byte) error {
		switch string(key) {
		case "achieved":
			return bounds(&l.Achieved)
		case "ratio":
			return bounds(&l.Ratio)
		case "stress_min":
			return bound(&l.StressMin)
		case "stress_max":
			return bound(&l.StressMax)
		case "cable_max":
			return bound(&l.CableMax)
		case "slope_min":
			return bound(&l.SlopeMin)
		case "reaction_max":
			return bound(&l.ReactionMax)
		case "utilisation":
			return bound(&l.Utilisation)
		case "headroom":
			l.Headroom = nil
			return d.array(func(int) error {
				var h canopy.Headroom
				err := d.object(func(key []byte) error {
					switch string(key) {
					case "name":
						return d.setString(&h.Name)
					case "height":
						return d.setNumber(&h.Height)
					case "region":
						h.Region = nil
						return d.array(func(int) error {
							var v r3.Vec
							err := d.setVec(&v)
							h.Region = append(h.Region, v)
							return err
						})
					}
					return d.skip()
				})
				l.Headroom = append(l.Headroom, h)
				return err
			})
		}
		return d.skip()
	})
}

// spreads appends a spread; null appends nothing.
func (d *reader) spread(p *[]canopy.Spread) error {
	if d.null() {
		return nil
	}
	var v canopy.Spread
	err := d.object(func(key []byte) error {
		switch string(key) {
		case "min":
			return d.setKnown(&v.Min)
		case "p5":
			return d.setKnown(&v.P5)
		case "mean":
			return d.setKnown(&v.Mean)
		case "p95":
			return d.setKnown(&v.P95)
		case "max":
			return d.setKnown(&v.Max)
		}
		return d.skip()
	})
	*p = append(*p, v)
	return err
}

func (d *reader) minMeanMax(lo, mean, hi *float64) error {
	return d.object(func(key []byte) error {
		switch string(key) {
		case "min":
			return d.setKnown(lo)
		case "mean":
			return d.setKnown(mean)
		case "max":
			return d.setKnown(hi)
		}
		return d.skip()
	})
}

func (d *reader) quantities() error {
	q := &d.result.Summary
	return d.object(func(key []byte) error {
		switch string(key) {
		case "fabrics":
			return d.array(func(int) error {
				var area, utilisation float64
				err := d.object(func(key []byte) error {
					switch string(key) {
					case "area":
						return d.setKnown(&area)
					case "warp_achieved":
						return d.spread(&q.WarpAchieved)
					case "weft_achieved":
						return d.spread(&q.WeftAchieved)
					case "major_achieved":
						return d.spread(&q.MajorAchieved)
					case "minor_achieved":
						return d.spread(&q.MinorAchieved)
					case "ratio":
						return d.spread(&q.Ratio)
					case "shear":
						return d.spread(&q.Shear)
					case "utilisation":
						return d.setGiven(&utilisation)
					}
					return d.skip()
				})
				q.FabricArea = append(q.FabricArea, area)
				q.FabricUtilisation = append(q.FabricUtilisation, utilisation)
				return err
			})
		case "cables":
			q.Cables = nil
			return d.array(func(int) error {
				var c canopy.CableReport
				err := d.object(func(key []byte) error {
					switch string(key) {
					case "length":
						return d.setKnown(&c.Length)
					case "chord":
						return d.setKnown(&c.Chord)
					case "sag":
						return d.setKnown(&c.Sag)
					case "force":
						return d.minMeanMax(&c.ForceMin, &c.ForceMean, &c.ForceMax)
					case "evenness":
						return d.setKnown(&c.Evenness)
					case "utilisation":
						return d.setGiven(&c.Utilisation)
					}
					return d.skip()
				})
				q.Cables = append(q.Cables, c)
				return err
			})
		case "lines":
			q.Lines = nil
			return d.array(func(int) error {
				var l canopy.LineReport
				err := d.object(func(key []byte) error {
					switch string(key) {
					case "length":
						return d.setKnown(&l.Length)
					case "per_metre":
						return d.minMeanMax(&l.Min, &l.Mean, &l.Max)
					case "total":
						return d.setVec(&l.Total)
					}
					return d.skip()
				})
				q.Lines = append(q.Lines, l)
				return err
			})
		case "lengths":
			return d.object(func(key []byte) error {
				if k, ok := canopy.ParseKind(string(key)); ok {
					return d.setKnown(&q.KindLength[k])
				}
				return d.skip()
			})
		}
		return d.skip()
	})
}

func (d *reader) audit() error {
	a := &d.result.Audit
	var seen fields
	err := d.object(func(key []byte) error {
		switch string(key) {
		case "trusted":
			seen |= 1
			return d.setBool(&a.Trusted)
		case "reasons":
			return d.setStrings(&a.Reasons)
		case "residual_rms":
			return d.setKnown(&a.ResidualRMS)
		case "residual_worst":
			return d.setKnown(&a.ResidualWorst)
		case "residual_node":
			return d.setIndex(&a.ResidualNode)
		case "residual_largest":
			return d.setKnown(&a.ResidualLargest)
		case "force_balance":
			return d.setKnown(&a.ForceBalance)
		case "moment_balance":
			return d.setKnown(&a.MomentBalance)
		case "virial":
			return d.setKnown(&a.Virial)
		case "reaction_mismatch":
			return d.setKnown(&a.ReactionMismatch)
		case "force_mismatch":
			return d.setKnown(&a.ForceMismatch)
		case "volume_mismatch":
			return d.setKnown(&a.VolumeMismatch)
		case "stability_known":
			return d.setBool(&a.StabilityKnown)
		case "unstable":
			return d.setInt(&a.Unstable)
		case "softest":
			return d.setKnown(&a.Softest)
		case "softest_node":
			return d.setIndex(&a.SoftestNode)
		case "stability_note":
			return d.setString(&a.StabilityNote)
		case "slack_cables":
			return d.setInt(&a.SlackCables)
		case "pushed_cables":
			return d.setInt(&a.PushedCables)
		case "compressed_triangles":
			return d.setInt(&a.CompressedTriangles)
		case "min_angle":
			return d.setKnown(&a.MinAngle)
		case "min_angle_triangle":
			return d.setIndex(&a.MinAngleTri)
		case "mean_min_angle":
			return d.setKnown(&a.MeanAngleMin)
		case "shortest_over_mean":
			return d.setKnown(&a.ShortestOver)
		case "discretisation":
			return d.setKnown(&a.Discretisation)
		}
		return d.skip()
	})
	if err != nil {
		return err
	}
	return d.want(seen, "trusted")
}

var severities = [...]string{canopy.Note.String(), canopy.Warning.String(), canopy.Broken.String()}

func (d *reader) findings() error {
	return d.array(func(i int) error {
		d.item = i
		var f canopy.Finding
		err := d.object(func(key []byte) error {
			switch string(key) {
			case "id":
				return d.setString(&f.ID)
			case "severity":
				v, err := d.enum(severities[:])
				f.Severity = canopy.Severity(v)
				return err
			case "text":
				return d.setString(&f.Text)
			case "value":
				return d.setKnown(&f.Value)
			case "limit":
				return d.setKnown(&f.Limit)
			case "source":
				return d.setString(&f.Source)
			case "count":
				return d.setInt(&f.Count)
			case "places":
				f.Places = nil
				return d.array(func(int) error {
					var p canopy.Place
					err := d.object(func(key []byte) error {
						switch string(key) {
						case "kind":
							return d.setString(&p.Kind)
						case "index":
							return d.setIndex(&p.Index)
						case "name":
							return d.setString(&p.Name)
						case "at":
							return d.setVec(&p.At)
						}
						return d.skip()
					})
					f.Places = append(f.Places, p)
					return err
				})
			}
			return d.skip()
		})
		d.result.Findings = append(d.result.Findings, f)
		return err
	})
}
