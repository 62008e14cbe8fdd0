package spec

import "anticlast/formfind/outline"

// The keys of outlines drawn elsewhere.

var layerWords = []string{"fixed", "arch", "seam", "hole", "point", "anchor", "mast", "guy", "ignore"}

var outlineArchSection = &section{id: "outline-arch", doc: "Arches over straight lines of the plan.", keys: []*key{
	{name: "rise", shape: quantity(Length), required: true, example: "2.4 m", doc: "Height of the middle of the arch over the middle of its ends."},
}}

var layerMastSection = &section{id: "outline-mast", doc: "Masts drawn as lines. With none of force, length and unstressed their forces are found.", keys: stayKeys("thrust")}

var layerGuySection = &section{id: "outline-guy", doc: "Guys drawn as lines. With none of force, length and unstressed their forces are found.", keys: stayKeys("tension")}

var layerSection = &section{id: "outline-layer", doc: "What the lines or points of a layer are. One of cable, ridge, valley, fixed, arch, seam, hole, point, anchor, mast and guy; hole also goes with cable.", keys: []*key{
	{name: "cable", shape: in(edgeCableSection), example: "{sag: 10 %}", doc: "Edge cables, one from corner to corner."},
	{name: "ridge", shape: in(edgeCableSection), example: "{force: 30 kN}", doc: "Ridge cables. Where they end inside the outline they are lines inside the fabric."},
	{name: "valley", shape: in(edgeCableSection), example: "{force: 30 kN}", doc: "Valley cables, like ridges."},
	{name: "fixed", shape: yesNo(), example: "true", doc: "Held along their whole length, straight or along the arcs drawn."},
	{name: "arch", shape: either(yesNo(), in(outlineArchSection)), example: "{rise: 2.4 m}", doc: "Arches: fixed lines with the load along them reported. true where they are drawn in space; with a rise where they are drawn in plan."},
	{name: "seam", shape: yesNo(), example: "true", doc: "Fabrics are joined along them, with no cable."},
	{name: "hole", shape: yesNo(), example: "true", doc: "Closed lines around openings: fixed, or with cable."},
	{name: "point", shape: yesNo(), example: "true", doc: "Points that are joined to the fabric they lie in, or name the corner they lie on."},
	{name: "anchor", shape: yesNo(), example: "true", doc: "Points outside the fabric, such as feet of masts and anchors of guys."},
	{name: "mast", shape: either(yesNo(), in(layerMastSection)), example: "true", doc: "Masts, drawn as lines in space; the lower end is the foot."},
	{name: "guy", shape: either(yesNo(), in(layerGuySection)), example: "{force: 12 kN}", doc: "Guys, drawn as lines in space; the lower end is the anchor."},
	{name: "height", shape: quantity(Length), deflt: "as drawn", example: "3 m", doc: "Height of all points that this layer names."},
}}

var heightSection = &section{id: "outline-height", doc: "The height of a point. It is named, or the one nearest to a place in plan.", keys: []*key{
	{name: "point", shape: name("point"), example: "RIM:1", doc: "Name of the point: its layer, a colon and its number along the layer."},
	{name: "at", shape: &shape{form: formPair, dim: Length}, example: "[0, 9.2]", doc: "A place in plan near the point, [x, y]."},
	{name: "z", shape: quantity(Length), required: true, example: "4.5 m", doc: "Its height."},
}}

var outlineFabricSection = &section{id: "outline-fabric", doc: "The fabric in every face of the outline.", keys: append([]*key{
	{name: "name", shape: text(), deflt: "fabric", example: "sail", doc: "What it is called; with a colon and a number where there are several."},
	{name: "prestress", shape: warpWeft("prestress", "Wanted stress per width.", ForcePerLength, "2.5 kN/m"), required: true, example: "2.5 kN/m",
		doc: "Wanted stress per width, both directions at once or {warp, weft}."},
	{name: "warp", shape: either(word("radial", "around"), &shape{form: formDirection}, in(warpBetweenSection)), deflt: "[1, 0, 0]; radial where there is a ring", example: "[1, 0, 0]",
		doc: "Warp direction: a direction in space (laid onto the surface), {from, to} of two points; radial or around where there is a ring."},
	{name: "pattern", shape: word("along sides", "free"), deflt: "along sides where a face allows that without thin triangles, else free", example: "free",
		doc: "How it is meshed. along sides: mesh lines follow the sides of the boundary, or run out from the ring. free: triangles of even size in any outline."},
	{name: "mesh", shape: quantity(Length).above(0), deflt: "that of the model", example: "300 mm",
		doc: "Wanted length of a mesh side."},
	{name: "volume", shape: quantity(Volume), example: "1250 m3",
		doc: "Volume of air shut in below all of it together, in place of pressure: its pressure is found. The plane of its boundary closes the volume, so that the boundary is level or tilted as a whole, and fixed."},
}, fabricMaterialKeys()...)}

var meshEdgeSection = &section{id: "outline-mesh-edge", doc: "The cables along the edges of a mesh, from corner to corner. Exactly one of force, force density and sag is given.",
	oneOf: []string{"force", "force density", "sag"}, keys: []*key{
		{name: "force", shape: quantity(Force).above(0), example: "25 kN", doc: "The tension."},
		{name: "force density", shape: quantity(ForcePerLength).above(0), example: "4 kN/m", doc: "Force over length of each of its sides."},
		{name: "sag", shape: quantity(Ratio).above(0).upTo(0.5), example: "10 %", doc: "Rise over chord; the force is found that gives it."},
		{name: "weight", shape: quantity(WeightPerLength).from(0), example: "1.2 kg/m", doc: "Self weight per length."},
		{name: "strength", shape: quantity(Force).above(0), example: "110 kN", doc: "Characteristic breaking force, for utilisation."},
	}}

var outlineSection = &section{id: "outline", doc: "An outline drawn elsewhere. Its points and edges are called by layer and number, RIM:1, RIM:2, …, in the order of the drawing, and may be used in the rest of the model; points of the role point or anchor come first. Seen from above, every face that its lines enclose becomes a fabric, or a net, except holes.", keys: []*key{
	{name: "file", shape: text(), required: true, example: "yard.dxf", doc: "The drawing (.dxf: ASCII DXF, release 12 to 2018; .csv: columns layer, x, y and z, a blank row between polylines) or mesh (.obj, .stl), in the model's folder."},
	{name: "units", shape: word(outline.UnitNames()...), deflt: "as the file states (DXF $INSUNITS, or x [mm] in a CSV header); needed where it states none", example: "mm", doc: "Unit of the coordinates in the file."},
	{name: "snap", shape: quantity(Length).from(0).upTo(10), deflt: "1 mm", example: "5 mm", doc: "Ends that are closer than this are one point."},
	{name: "corner", shape: quantity(Angle).from(0), deflt: "10 deg; 30 deg on the edge of a mesh", example: "15 deg", doc: "A cable has a corner where its line turns by more than this; elsewhere it runs through."},
	{name: "layers", shape: named("layer", either(word(layerWords...), in(layerSection))), example: "{RIM: {cable: {sag: 10 %}}, WALL: fixed, TREE: hole, MAST: point}",
		doc: "What each layer is. Short forms: fixed, arch, seam, hole (fixed along its rim), point, anchor, mast, guy, ignore. Layers that are not listed are left out, with a warning."},
	{name: "heights", shape: listOf(in(heightSection), 1), example: "[{point: RIM:1, z: 4.5 m}, {at: [9, 0], z: 3 m}]", doc: "Heights of points, for drawings in plan. They count more than heights of layers."},
	{name: "fabric", shape: in(outlineFabricSection), deflt: "none; list fabrics in the model", example: "{prestress: 2.5 kN/m}", doc: "The fabric that fills the outline, or the fabric of a mesh."},
	{name: "net", shape: in(outlineNetSection), deflt: "none; list nets in the model", example: "{families: [{spacing: 1 m, force: 5 kN}, {spacing: 1 m, force: 5 kN}]}", doc: "The cable net that fills the outline of a drawing, in place of a fabric."},
	{name: "edge", shape: either(word("fixed"), in(meshEdgeSection)), deflt: "fixed", example: "{force: 25 kN}", doc: "What the edges of an OBJ or STL mesh are. With cables the corners are anchored."},
}}
