package export

import (
	"context"
	"crypto/sha256"
	"fmt"
	"io"
	"strconv"
	"strings"
	"unicode/utf16"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// writeIFC writes a structural analysis model in IFC4 (ISO 16739-1) as STEP text
// (ISO 10303-21): nodes with their supports and reactions, members and fabric
// with their prestress in property sets. Experimental: programs differ in what
// they read of it.
func writeIFC(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	f := &ifc{text: newText(ctx, w), seed: r.Digest + r.Title}
	f.str("ISO-10303-21;\nHEADER;\n")
	f.printf("FILE_DESCRIPTION(('ViewDefinition [StructuralAnalysisView]',%s),'2;1');\n", stepText(canopy.Caution))
	// The format asks for a time; none is told, so that the same result makes
	// the same file.
	f.printf("FILE_NAME('form.ifc','1970-01-01T00:00:00',(''),(''),%s,%s,'');\n", stepText(r.Program.Name), stepText(oneLine(r.Program.Name+" "+r.Program.Version)))
	f.str("FILE_SCHEMA(('IFC4'));\nENDSEC;\nDATA;\n")
	f.head(r)
	nodes := f.nodes(r)
	f.members(r, nodes)
	f.surfaces(r, nodes)
	f.group()
	f.str("ENDSEC;\nEND-ISO-10303-21;\n")
	return f.close()
}

type ifc struct {
	*text
	last      int
	seed      string
	reference int // representation context of topology
	placement int
	model     int
	zAxis     int
	// waiting are parts that are not yet said to belong to the model; it takes
	// them in groups, so that they need not all be remembered.
	waiting []int
	groups  int
}

// belongs notes that a part belongs to the model.
func (f *ifc) belongs(n int) {
	if f.waiting = append(f.waiting, n); len(f.waiting) == 4096 {
		f.group()
	}
}

// group says that the parts that wait belong to the model.
func (f *ifc) group() {
	if len(f.waiting) > 0 {
		f.add("IFCRELASSIGNSTOGROUP(%s,$,$,$,%s,$,#%d)", f.guid("group", f.groups), list(f.waiting), f.model)
		f.waiting = f.waiting[:0]
		f.groups++
	}
}

// add writes an instance and returns its number.
func (f *ifc) add(format string, args ...any) int {
	f.last++
	f.str("#").int(f.last).str("=").printf(format, args...).str(";")
	f.line()
	return f.last
}

func list(numbers []int) string {
	var b strings.Builder
	b.WriteByte('(')
	for i, n := range numbers {
		if i > 0 {
			b.WriteByte(',')
		}
		b.WriteByte('#')
		b.WriteString(strconv.Itoa(n))
	}
	b.WriteByte(')')
	return b.String()
}

// guid is an identifier of 128 bits in the 64 letters of the standard, the same
// for the same thing of the same model.
func (f *ifc) guid(kind string, i int) string {
	const letters = "0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz_$"
	h := sha256.Sum256([]byte(f.seed + "\x00" + kind + "\x00" + strconv.Itoa(i)))
	// 132 bits in 22 letters, the first four of them zero.
	out := []byte{'\'', letters[h[0]>>6]}
	bits, n := uint(h[0]&0x3f), 6
	for k := 1; len(out) < 23; {
		if n < 6 {
			bits, n = bits<<8|uint(h[k]), n+8
			k++
		}
		out = append(out, letters[bits>>(n-6)&0x3f])
		n -= 6
	}
	return string(append(out, '\''))
}

// stepText quotes a string of ISO 10303-21.
func stepText(s string) string {
	var b strings.Builder
	b.WriteByte('\'')
	for _, r := range oneLine(s) {
		switch {
		case r == '\'' || r == '\\':
			b.WriteRune(r)
			b.WriteRune(r)
		case r >= ' ' && r < 0x7f:
			b.WriteRune(r)
		default:
			b.WriteString(`\X2\`)
			for _, u := range utf16.Encode([]rune{r}) {
				fmt.Fprintf(&b, "%04X", u)
			}
			b.WriteString(`\X0\`)
		}
	}
	b.WriteByte('\'')
	return b.String()
}

// real writes a number as the format wants it: with a point.
func real(v float64) string {
	s := strconv.FormatFloat(v, 'E', -1, 64)
	if !strings.Contains(s, ".") {
		s = strings.Replace(s, "E", ".E", 1)
	}
	return s
}

func (f *ifc) point(v r3.Vec) int {
	return f.add("IFCCARTESIANPOINT((%s,%s,%s))", real(v.X), real(v.Y), real(v.Z))
}

func (f *ifc) direction(v r3.Vec) int {
	return f.add("IFCDIRECTION((%s,%s,%s))", real(v.X), real(v.Y), real(v.Z))
}

func (f *ifc) head(r *canopy.Result) {
	unit := func(kind, name string) int { return f.add("IFCSIUNIT(*,.%s.,$,.%s.)", kind, name) }
	length := unit("LENGTHUNIT", "METRE")
	force := unit("FORCEUNIT", "NEWTON")
	units := []int{length, unit("AREAUNIT", "SQUARE_METRE"), unit("VOLUMEUNIT", "CUBIC_METRE"), unit("PLANEANGLEUNIT", "RADIAN"), force, unit("PRESSUREUNIT", "PASCAL")}
	a, b := f.add("IFCDERIVEDUNITELEMENT(#%d,1)", force), f.add("IFCDERIVEDUNITELEMENT(#%d,-1)", length)
	units = append(units, f.add("IFCDERIVEDUNIT((#%d,#%d),.LINEARFORCEUNIT.,$)", a, b))
	assigned := f.add("IFCUNITASSIGNMENT(%s)", list(units))
	axes := f.add("IFCAXIS2PLACEMENT3D(#%d,$,$)", f.point(r3.Vec{}))
	model := f.add("IFCGEOMETRICREPRESENTATIONCONTEXT($,'Model',3,1.E-6,#%d,$)", axes)
	f.reference = f.add("IFCGEOMETRICREPRESENTATIONSUBCONTEXT('Reference','Model',*,*,*,*,#%d,$,.GRAPH_VIEW.,$)", model)
	f.placement = f.add("IFCLOCALPLACEMENT($,#%d)", axes)
	f.zAxis = f.direction(r3.Vec{Z: 1})
	project := f.add("IFCPROJECT(%s,$,%s,%s,$,$,$,(#%d),#%d)", f.guid("project", 0), stepText(r.Title), stepText(canopy.Caution), model, assigned)
	f.model = f.add("IFCSTRUCTURALANALYSISMODEL(%s,$,%s,%s,$,.LOADING_3D.,$,$,$,#%d)", f.guid("model", 0), stepText(r.Title), stepText(canopy.Caution), f.placement)
	f.add("IFCRELDECLARES(%s,$,$,$,#%d,(#%d))", f.guid("declares", 0), project, f.model)
}

// shape is the product definition shape of one topological item.
func (f *ifc) shape(kind string, item int) int {
	rep := f.add("IFCTOPOLOGYREPRESENTATION(#%d,'Reference','%s',(#%d))", f.reference, kind, item)
	return f.add("IFCPRODUCTDEFINITIONSHAPE($,$,(#%d))", rep)
}

// property is a value of a property set.
type property struct {
	name, measure string
	value         float64
}

func (f *ifc) properties(kind string, i, of int, name string, list0 ...property) {
	var numbers []int
	for _, p := range list0 {
		numbers = append(numbers, f.add("IFCPROPERTYSINGLEVALUE('%s',$,%s(%s),$)", p.name, p.measure, real(p.value)))
	}
	set := f.add("IFCPROPERTYSET(%s,$,'%s',$,%s)", f.guid(kind+" set", i), name, list(numbers))
	f.add("IFCRELDEFINESBYPROPERTIES(%s,$,$,$,(#%d),#%d)", f.guid(kind+" has", i), of, set)
}

// ifcNodes are the numbers of what stands for each node.
type ifcNodes struct {
	vertex     []int32 // one more than its point
	connection []int32
}

func (f *ifc) nodes(r *canopy.Result) ifcNodes {
	s := r.Structure
	out := ifcNodes{make([]int32, 0, len(s.Position)), make([]int32, 0, len(s.Position))}
	for i, p := range r.Form.Position {
		point := f.point(p)
		vertex := f.add("IFCVERTEXPOINT(#%d)", point)
		out.vertex = append(out.vertex, int32(vertex))
		condition := "$"
		if fixed := s.Fixed[i]; fixed != 0 {
			var held [3]string
			for d := range held {
				held[d] = "IFCBOOLEAN(.F.)"
				if fixed.Has(d) {
					held[d] = "IFCBOOLEAN(.T.)"
				}
			}
			condition = "#" + strconv.Itoa(f.add("IFCBOUNDARYNODECONDITION('support',%s,IFCBOOLEAN(.F.),IFCBOOLEAN(.F.),IFCBOOLEAN(.F.))", strings.Join(held[:], ",")))
		}
		n := f.add("IFCSTRUCTURALPOINTCONNECTION(%s,$,%s,$,$,#%d,#%d,%s,$)", f.guid("node", i), stepText(s.NodeName.At(i)), f.placement, f.shape("Vertex", vertex), condition)
		out.connection = append(out.connection, int32(n))
		f.belongs(n)
		if s.Fixed[i] != 0 {
			v := r.Form.Reaction[i]
			f.properties("node", i, n, "Anticlast_Reaction", property{"ReactionX", "IFCFORCEMEASURE", v.X}, property{"ReactionY", "IFCFORCEMEASURE", v.Y}, property{"ReactionZ", "IFCFORCEMEASURE", v.Z})
		}
		if f.err != nil {
			break
		}
	}
	return out
}

func (f *ifc) members(r *canopy.Result, nodes ifcNodes) {
	s := r.Structure
	for i, e := range s.Ends {
		if f.err != nil {
			break
		}
		kind := "CABLE"
		if s.Kind[i].Pushes() {
			kind = "PIN_JOINED_MEMBER"
		}
		d := r3.Sub(r.Form.Position[e[1]], r.Form.Position[e[0]])
		axis := f.zAxis
		if l := r3.Norm(d); l > 0 && r3.Norm(r3.Cross(d, r3.Vec{Z: 1})) < 1e-3*l {
			axis = f.direction(r3.Vec{X: 1}) // z of the section must not run along the member
		}
		edge := f.add("IFCEDGE(#%d,#%d)", nodes.vertex[e[0]], nodes.vertex[e[1]])
		n := f.add("IFCSTRUCTURALCURVEMEMBER(%s,$,%s,$,%s,#%d,#%d,.%s.,#%d)", f.guid("member", i), stepText(s.MemberName.At(i)), stepText(s.Kind[i].String()), f.placement, f.shape("Edge", edge), kind, axis)
		f.belongs(n)
		values := []property{{"PrestressForce", "IFCFORCEMEASURE", r.Form.Force[i]}, {"Length", "IFCLENGTHMEASURE", memberLength(r, i)}}
		if l := unstressedLength(r, i); l > 0 {
			values = append(values, property{"UnstressedLength", "IFCLENGTHMEASURE", l}, property{"AxialStiffness", "IFCFORCEMEASURE", optional(s.Stiffness, i)})
		}
		f.properties("member", i, n, "Anticlast_Prestress", values...)
		for k, v := range e {
			f.add("IFCRELCONNECTSSTRUCTURALMEMBER(%s,$,$,$,#%d,#%d,$,$,$,$)", f.guid("end", 2*i+k), n, nodes.connection[v])
		}
	}
}

func (f *ifc) surfaces(r *canopy.Result, nodes ifcNodes) {
	s := r.Structure
	for i, c := range s.Corners {
		if f.err != nil {
			break
		}
		normal, area := triangleNormal(r, i)
		if area == 0 {
			continue
		}
		var points []int
		for _, v := range c {
			points = append(points, int(nodes.vertex[v]-1))
		}
		bound := f.add("IFCFACEOUTERBOUND(#%d,.T.)", f.add("IFCPOLYLOOP(%s)", list(points)))
		plane := f.add("IFCPLANE(#%d)", f.add("IFCAXIS2PLACEMENT3D(#%d,#%d,#%d)", points[0], f.direction(normal), f.direction(r.Form.Warp[i])))
		face := f.add("IFCFACESURFACE((#%d),#%d,.T.)", bound, plane)
		n := f.add("IFCSTRUCTURALSURFACEMEMBER(%s,$,%s,$,%s,#%d,#%d,.MEMBRANE_ELEMENT.,$)", f.guid("triangle", i), stepText(strconv.Itoa(i)), stepText(s.Fabrics[s.FabricOf[i]].Name), f.placement, f.shape("Face", face))
		f.belongs(n)
		t := r.Form.Stress[i]
		f.properties("triangle", i, n, "Anticlast_Prestress", property{"PrestressWarp", "IFCLINEARFORCEMEASURE", t.Warp}, property{"PrestressWeft", "IFCLINEARFORCEMEASURE", t.Weft}, property{"PrestressShear", "IFCLINEARFORCEMEASURE", t.Shear})
	}
}
