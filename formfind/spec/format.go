package spec

// FormatVersion is the version of the model format that this package reads.
const FormatVersion = 1

// This file is the table of keys: every key of a model file with its meaning,
// unit, bounds, default and example.

const (
	nameRule = "letters, digits, spaces, - and _, at most 64"
)

var modelSection = &section{id: "model", doc: "A model says what the designer wants: points, edges, fabrics, nets, rings, masts, guys and limits; or a listed structure.", keys: []*key{
	{name: "anticlast", shape: &shape{form: formVersion}, required: true, example: "1",
		doc: "Version of the model format. Always the number 1 for now."},
	{name: "title", shape: text(), example: "Sail over the ferry steps",
		doc: "One line that names the project; it appears in every output."},
	{name: "description", shape: &shape{form: formTexts}, example: "Shade for the waiting passengers.",
		doc: "Free text about the project."},
	{name: "north", shape: quantity(Angle), deflt: "not known", example: "15 deg",
		doc: "Where north is, turned clockwise from the y axis seen from above (-180 deg to 180 deg); plans then have a north arrow."},
	{name: "mesh", shape: quantity(Length).above(0), deflt: "chosen from the size of the model", example: "400 mm",
		doc: "Wanted length of a mesh side."},
	{name: "self weight", shape: yesNo(), deflt: "false", example: "true",
		doc: "Whether the weights given for fabrics, cables and rings act while the shape is found."},
	{name: "points", shape: named("point", either(triple(Length), in(pointSection))), unless: "listed or outline", example: "{A: [0, 0, 4.5], B: [9, 0, 3]}",
		doc: "Named places. Short form: [x, y, z]."},
	{name: "edges", shape: named("edge", in(edgeSection)), example: "{AB: {from: A, to: B, cable: {force: 25 kN}}}",
		doc: "Lines from one point to another, by name. They bound fabrics and nets or stand alone as cables."},
	{name: "cables", shape: named("cable", in(cableSection)), example: "{K: {edges: [AB, BC], force: 20 kN}}",
		doc: "Cables that run along several edges in a row."},
	{name: "fabrics", shape: named("fabric", in(fabricSection)), example: "{sail: {boundary: [AB, BC, CD, DA], prestress: 2.5 kN/m}}",
		doc: "Pieces of fabric, each inside a closed loop of edges."},
	{name: "nets", shape: named("net", in(netSection)), example: "{roof: {boundary: [AB, BC, CD, DA], families: [{spacing: 1 m, force: 5 kN}, {spacing: 1 m, force: 5 kN}]}}",
		doc: "Cable nets of two or three families of lines, each inside a closed loop of edges."},
	{name: "rings", shape: named("ring", in(ringSection)), example: "{top: {at: P, radius: 600 mm}}",
		doc: "Rings of high and low points."},
	{name: "masts", shape: named("mast", in(mastSection)), example: "{M: {foot: F, head: P}}",
		doc: "Masts: straight members that push."},
	{name: "guys", shape: named("guy", in(guySection)), example: "{G: {from: A, to: GA, force: 12 kN}}",
		doc: "Guys: straight cables that stay a point."},
	{name: "outline", shape: in(outlineSection), example: "{file: yard.dxf, layers: {RIM: {cable: {sag: 10 %}}, WALL: fixed}, fabric: {prestress: 2 kN/m}}",
		doc: "Points, edges and fabrics taken from a DXF drawing or a CSV table of points, beside those of the model file; or the triangles of an OBJ or STL mesh."},
	{name: "limits", shape: in(limitsSection), example: "{achieved: [0.9, 1.1], slope min: 3 deg}",
		doc: "What the designer does not want exceeded. A limit that is not met makes the command exit with 3 and says where."},
	{name: "factors", shape: in(factorsSection), example: "{load: 1.5, fabric: 4, cable: 1.5}",
		doc: "Partial factors from your own code of practice; needed for utilisation. None are assumed."},
	{name: "listed", shape: in(listedSection), example: "{nodes: nodes.csv, members: members.csv, supports: supports.csv}",
		doc: "A structure with its own topology, as tables in the file or as CSV files beside it. Takes the place of points, edges, cables, fabrics, nets, rings, masts and guys."},
}}

var directionWords = []string{"x", "y", "z"}

var pointSection = &section{id: "point", doc: "A named place.", keys: []*key{
	{name: "x", shape: quantity(Length), required: true, example: "0", doc: "Coordinate x."},
	{name: "y", shape: quantity(Length), required: true, example: "9.2", doc: "Coordinate y."},
	{name: "z", shape: quantity(Length), required: true, example: "4500 mm", doc: "Height."},
	{name: "hold", shape: word("anchored", "held", "free"), deflt: "held at the head of a mast or guy whose force is to be found, free at a head where all forces are given, else anchored", example: "held",
		doc: "What keeps the point in place. anchored: a support. held: the place is given, and the masts and guys that meet there balance it. free: the place is found, the one given is only the start."},
	{name: "support", shape: wordList(directionWords...), deflt: "[x, y, z]", example: "[x, y]",
		doc: "Directions in which the support of an anchored point reacts; it may move in the others."},
	{name: "load", shape: triple(Force), example: "[0, 0, -2 kN]",
		doc: "A constant load on the point: [x, y, z]."},
}}

// ruleKeys are the ways to say what force a cable has.
var cableRules = []string{"force", "force density", "mean force", "sag", "length", "unstressed"}

func cableKeys() []*key {
	return []*key{
		{name: "force", shape: quantity(Force).from(0), example: "25 kN",
			doc: "The tension, the same all along (in the mean where fabric shears along the cable)."},
		{name: "force density", shape: quantity(ForcePerLength).from(0), example: "4 kN/m",
			doc: "Force over length of each of its mesh sides."},
		{name: "mean force", shape: quantity(Force).above(0), example: "25 kN",
			doc: "About the tension, for a cable to which the lines of a net are clamped, however oblique: each of its sides has the force density that gives it this force where it starts. A cable of one force lets such lines slide along it."},
		{name: "sag", shape: quantity(Ratio).above(0).upTo(0.5), example: "10 %",
			doc: "Rise over chord; the force is found that gives it."},
		{name: "length", shape: quantity(Length).above(0), example: "9.86 m",
			doc: "Length under tension; the force is found that gives it."},
		{name: "unstressed", shape: quantity(Length).above(0), example: "9.8 m",
			doc: "Length without tension, for an elastic cable. Needs stiffness."},
		{name: "stiffness", shape: quantity(Force).above(0), example: "12 MN",
			doc: "Axial stiffness EA. With unstressed it decides the force; beside another rule it is only used for the cutting length."},
		{name: "weight", shape: quantity(WeightPerLength).from(0), example: "1.2 kg/m",
			doc: "Self weight per length."},
		{name: "strength", shape: quantity(Force).above(0), example: "110 kN",
			doc: "Characteristic breaking force, for utilisation."},
	}
}

var edgeCableSection = &section{id: "edge-cable", doc: "A cable along one edge. Exactly one of force, force density, mean force, sag, length and unstressed (with stiffness) is given.",
	oneOf: cableRules, keys: cableKeys()}

var fixedSection = &section{id: "fixed-arc", doc: "A circular arc.", keys: []*key{
	{name: "through", shape: either(triple(Length), name("point")), required: true, example: "[4.5, 0, 6]",
		doc: "A place on the arc between its ends: [x, y, z] or the name of a point."},
}}

var edgeSection = &section{id: "edge", doc: "A line from one point to another: a cable, fixed, or a seam.",
	keys: []*key{
		{name: "from", shape: name("point"), required: true, example: "A", doc: "Point at its start."},
		{name: "to", shape: name("point"), required: true, example: "B", doc: "Point at its end."},
		{name: "cable", shape: in(edgeCableSection), example: "{force: 25 kN}",
			doc: "A cable along this edge alone. An edge of a cable listed under cables has none of cable, fixed and seam."},
		{name: "fixed", shape: either(word("straight"), in(fixedSection)), example: "{through: [4.5, 0, 6]}",
			doc: "Held along its whole length: straight, or on the circular arc through a place."},
		{name: "seam", shape: yesNo(), example: "true",
			doc: "Two fabrics are joined along it, with no cable."},
		{name: "role", shape: word("edge", "ridge", "valley"), deflt: "edge when it bounds a fabric or net, else a plain cable", example: "ridge",
			doc: "What a cable does in the canopy."},
		{name: "arch", shape: yesNo(), deflt: "false", example: "true",
			doc: "A fixed edge that is an arch: the load along it is reported in kN/m."},
		{name: "segments", shape: count(1, 10000), deflt: "from the mesh size", example: "16",
			doc: "Number of mesh sides along it, kept even where the outline is narrower than they are long."},
	}}

var cableSection = &section{id: "cable", doc: "A cable along several edges in a row. Exactly one of force, force density, mean force, sag, length and unstressed (with stiffness) is given.",
	oneOf: cableRules, keys: append([]*key{
		{name: "edges", shape: names("edge", 1), required: true, example: "[AB, BC]",
			doc: "The edges in order from one end to the other."},
		{name: "clamped", shape: names("point", 0), deflt: "none: it slides at the points between", example: "[B]",
			doc: "Points between its ends at which it is clamped, so that the forces on the two sides may differ."},
		{name: "role", shape: word("edge", "ridge", "valley"), deflt: "that of its edges", example: "ridge",
			doc: "What the cable does in the canopy, for those of its edges that do not say it themselves."},
	}, cableKeys()...)}

func warpWeft(id, doc string, d *Dimension, ex string) *shape {
	return either(
		quantity(d).above(0),
		in(&section{id: id, doc: doc, keys: []*key{
			{name: "warp", shape: quantity(d).above(0), required: true, example: ex, doc: "In the warp direction, per width."},
			{name: "weft", shape: quantity(d).above(0), required: true, example: ex, doc: "In the weft direction, per width."},
		}}))
}

var warpBetweenSection = &section{id: "warp-between", doc: "The direction from one point to another.", keys: []*key{
	{name: "from", shape: name("point"), required: true, example: "A", doc: "Point at its start."},
	{name: "to", shape: name("point"), required: true, example: "C", doc: "Point at its end."},
}}

var fabricStiffnessSection = &section{id: "fabric-stiffness", doc: "Moduli of the fabric per width.", keys: []*key{
	{name: "warp", shape: quantity(ForcePerLength).above(0), required: true, example: "600 kN/m", doc: "Modulus in warp."},
	{name: "weft", shape: quantity(ForcePerLength).above(0), required: true, example: "500 kN/m", doc: "Modulus in weft."},
	{name: "shear", shape: quantity(ForcePerLength).above(0), deflt: "not given", example: "30 kN/m", doc: "Shear modulus."},
	{name: "poisson", shape: quantity(Ratio).from(0).below(2), deflt: "0", example: "0.3",
		doc: "Contraction in weft caused by stress in warp. Its square times weft/warp modulus stays below 1."},
}}

func fabricMaterialKeys() []*key {
	return []*key{
		{name: "strength", shape: warpWeft("fabric-strength", "Characteristic strip strength per width.", ForcePerLength, "60 kN/m"), example: "{warp: 84 kN/m, weft: 80 kN/m}",
			doc: "Characteristic strip strength, both directions at once or {warp, weft}."},
		{name: "weight", shape: quantity(WeightPerArea).from(0), deflt: "0", example: "10.5 N/m2",
			doc: "Self weight per area."},
		{name: "stiffness", shape: in(fabricStiffnessSection), example: "{warp: 600 kN/m, weft: 500 kN/m, shear: 30 kN/m, poisson: 0.3}",
			doc: "Elastic moduli, handed on to analysis and used for the cutting sizes."},
		{name: "pressure", shape: quantity(Pressure), deflt: "0", example: "300 Pa",
			doc: "Internal pressure on the fabric, normal to it wherever it moves; positive pushes up, or an upright fabric towards x, and listed triangles towards their positive side."},
	}
}

var fabricSection = &section{id: "fabric", doc: "One piece of fabric inside a closed loop of edges.", keys: append([]*key{
	{name: "boundary", shape: names("edge", 2), required: true, example: "[AB, BC, CD, DA]",
		doc: "The edges in order around it, each in either direction."},
	{name: "prestress", shape: warpWeft("prestress", "Wanted stress per width.", ForcePerLength, "2.5 kN/m"), required: true, example: "{warp: 2.5 kN/m, weft: 2.5 kN/m}",
		doc: "Wanted stress per width, both directions at once or {warp, weft}."},
	{name: "warp", shape: either(word("radial", "around"), &shape{form: formDirection}, in(warpBetweenSection)), deflt: "along the first edge of the boundary; radial with a ring", example: "[1, 0, 0]",
		doc: "Warp direction: a direction in space (laid onto the surface), {from, to} of two points, radial (in the planes through the axis of the ring), or around it."},
	{name: "ring", shape: name("ring"), example: "top",
		doc: "The ring inside it."},
	{name: "holes", shape: listOf(names("edge", 2), 1), example: "[[PQ, QR, RP]]",
		doc: "Openings in it: closed loops of edges inside the boundary."},
	{name: "lines", shape: names("edge", 1), example: "[ridge]",
		doc: "Edges inside it that bound no fabric: ridges, valleys, arches, seams. They may end at points of the boundary, or freely inside."},
	{name: "inside", shape: names("point", 1), example: "[P]",
		doc: "Points inside it that are joined to the fabric: its mesh has a node there."},
	{name: "pattern", shape: word("along sides", "free"), deflt: "along sides where its shape allows that without thin triangles, else free", example: "free",
		doc: "How it is meshed. along sides: mesh lines follow the sides of the boundary, or run out from the ring. free: triangles of even size in any outline."},
	{name: "plane", shape: &shape{form: formDirection}, deflt: "chosen so that no part of it hides another", example: "[0, 0, 1]",
		doc: "Direction at right angles to the plane in which a free mesh is laid out; the outline must not overlap itself seen along it."},
	{name: "mesh", shape: quantity(Length).above(0), deflt: "that of the model", example: "300 mm",
		doc: "Wanted length of a mesh side in this fabric."},
}, append(fabricMaterialKeys(), volumeKeys()...)...)}

// familyRules are the ways to say what force the links of a family have.
var familyRules = []string{"force", "force density", "mean force"}

var familySection = &section{id: "net-family", doc: "One family of net lines. Exactly one of force, force density and mean force is given.",
	oneOf: familyRules, keys: []*key{
		{name: "name", shape: text(), deflt: "its number", example: "hanging", doc: "What the lines of the family are called."},
		{name: "spacing", shape: quantity(Length).above(0), deflt: "the mesh length of an equal-mesh net", example: "1 m", doc: "Distance between lines: along the sides, measured along the boundary they start from; of straight lines, at right angles to them in plan; of radial lines, along the boundary. Needed, except in the third family and in an equal-mesh net."},
		{name: "angle", shape: quantity(Angle), deflt: "0 for the first family, 90 deg for the second, or 60 deg where there is a third", example: "60 deg", doc: "Direction of straight lines: turned from the direction of the net, counter-clockwise in plan."},
		{name: "force", shape: quantity(Force).above(0), example: "5 kN", doc: "Tension of every link."},
		{name: "force density", shape: quantity(ForcePerLength).above(0), example: "4 kN/m", doc: "Force over length of every link."},
		{name: "mean force", shape: quantity(Force).above(0), example: "5 kN", doc: "About the tension of every link: it has the force density that gives it this force where it starts. The safe choice where nothing else is wanted."},
		{name: "stiffness", shape: quantity(Force).above(0), example: "8 MN", doc: "Axial stiffness EA, for the cutting lengths."},
		{name: "weight", shape: quantity(WeightPerLength).from(0), example: "0.6 kg/m", doc: "Self weight per length."},
		{name: "strength", shape: quantity(Force).above(0), example: "60 kN", doc: "Characteristic breaking force."},
	}}

var equalMeshSection = &section{id: "equal-mesh", doc: "What all meshes of an equal-mesh net have in common.", keys: []*key{
	{name: "length", shape: quantity(Length).above(0), required: true, example: "600 mm", doc: "Length of every link between two crossings."},
	{name: "at tension", shape: quantity(Force).above(0), deflt: "none: the length is without stress", example: "5 kN", doc: "Tension at which the crossings are marked on the cables."},
}}

var netSection = &section{id: "net", doc: "A cable net inside a closed loop of edges.", keys: []*key{
	{name: "boundary", shape: names("edge", 3), required: true, example: "[AB, BC, CD, DA]", doc: "The edges in order around it, each in either direction."},
	{name: "holes", shape: listOf(names("edge", 2), 1), example: "[[PQ, QR, RP]]", doc: "Closed loops of edges inside the boundary, in which there is no net. A radial net has one."},
	{name: "pattern", shape: word("along sides", "straight", "radial"), deflt: "along sides where the boundary is a fair patch of three or four sides without holes and no direction, angle, third family or equal mesh is given; else straight", example: "straight",
		doc: "How the lines are laid. along sides: two families along the sides of a patch of three or four. straight: parallel lines in plan on any outline. radial: lines from the one hole to the boundary, and rings."},
	{name: "direction", shape: either(&shape{form: formDirection}, in(warpBetweenSection)), deflt: "along the first edge of the boundary", example: "[1, 0, 0]", doc: "Direction of straight lines in plan, from which angles are turned: [x, y, z] or {from, to} of two points."},
	{name: "families", shape: listOf(in(familySection), 2).atMost(3), required: true, example: "[{spacing: 1 m, force: 5 kN}, {spacing: 1 m, force: 5 kN}]",
		doc: "Two or three families of lines. Along the sides, the first runs along the first side of the boundary, the second along the second. A third family joins the crossings of straight lines along the shorter diagonals. In a radial net the first are the radial lines, the second the rings."},
	{name: "equal mesh", shape: either(quantity(Length).above(0), in(equalMeshSection)), example: "{length: 600 mm, at tension: 5 kN}", doc: "Makes every link between two crossings equally long, without stress or at the tension at which they are marked, so that the net comes out of one length of cable. Only links at the boundary are cut to fit; they carry the force of their family. Families need stiffness. Two families of straight lines."},
}}

var ringSection = &section{id: "ring", doc: "The ring of a high or low point.", keys: []*key{
	{name: "at", shape: name("point"), required: true, example: "P", doc: "Point at its centre."},
	{name: "radius", shape: quantity(Length).above(0), required: true, example: "600 mm", doc: "Radius."},
	{name: "axis", shape: &shape{form: formDirection}, deflt: "[0, 0, 1]", example: "[0, 0, 1]", doc: "Normal of its plane."},
	{name: "rigid", shape: yesNo(), deflt: "true", example: "false", doc: "Whether it is a rigid ring; otherwise it is a cable and needs force."},
	{name: "free", shape: wordList(directionWords...), deflt: "none", example: "[z]", doc: "Directions in which it may move: as one piece when rigid, each of its nodes when a cable."},
	{name: "weight", shape: quantity(Weight).from(0), deflt: "0", example: "1.2 kN", doc: "Weight of the whole ring."},
	{name: "force", shape: quantity(Force).above(0), example: "18 kN", doc: "Tension of a cable ring."},
	{name: "hangers", shape: count(0, 10000), deflt: "0", example: "6", doc: "Number of hangers from a cable ring to its point."},
	{name: "hanger force", shape: quantity(Force).above(0), example: "4 kN", doc: "Tension of each hanger."},
	{name: "strength", shape: quantity(Force).above(0), example: "90 kN", doc: "Characteristic breaking force of the ring cable."},
}}

func stayKeys(what string) []*key {
	return []*key{
		{name: "force", shape: quantity(Force).from(0), deflt: "found so that the held point is in balance", example: "12 kN", doc: "Its " + what + ", a positive number."},
		{name: "length", shape: quantity(Length).above(0), example: "6.5 m", doc: "Its length; the force is found that gives it."},
		{name: "unstressed", shape: quantity(Length).above(0), example: "6.48 m", doc: "Its length without force. Needs stiffness."},
		{name: "stiffness", shape: quantity(Force).above(0), example: "90 MN", doc: "Axial stiffness EA."},
		{name: "weight", shape: quantity(WeightPerLength).from(0), example: "20 kg/m", doc: "Self weight per length."},
		{name: "strength", shape: quantity(Force).above(0), example: "300 kN", doc: "Characteristic resistance, for utilisation."},
	}
}

var mastSection = &section{id: "mast", doc: "A mast. At most one of force, length and unstressed (with stiffness) is given; with none its force is found so that its held head is in balance.", keys: append([]*key{
	{name: "foot", shape: name("point"), required: true, example: "F", doc: "Point it stands on: an anchor or a point of a cable."},
	{name: "head", shape: name("point"), required: true, example: "P", doc: "Point it carries."},
}, stayKeys("thrust")...)}

var guySection = &section{id: "guy", doc: "A guy. At most one of force, length and unstressed (with stiffness) is given; with none its force is found so that the held point it stays is in balance.", keys: append([]*key{
	{name: "from", shape: name("point"), required: true, example: "A", doc: "Point it stays."},
	{name: "to", shape: name("point"), required: true, example: "GA", doc: "Its anchor."},
}, stayKeys("tension")...)}

var headroomSection = &section{id: "headroom", doc: "Free height over a region of the plan.", keys: []*key{
	{name: "name", shape: text(), deflt: "its number", example: "doorway", doc: "What the region is called."},
	{name: "height", shape: quantity(Length), required: true, example: "2.5 m", doc: "Lowest permitted z of the canopy over the region."},
	{name: "region", shape: &shape{form: formRegion, dim: Length, least: 3}, deflt: "everywhere", example: "[[0, 0], [4, 0], [4, 3], [0, 3]]", doc: "Corners of the region in plan, as [x, y]."},
}}

var limitsSection = &section{id: "limits", doc: "Limits. Those not given are not checked, except for warnings of common practice.", keys: []*key{
	{name: "achieved", shape: rangeOf(Ratio).from(0), example: "[0.9, 1.1]", doc: "Stress achieved over specified, warp and weft: [least, greatest]."},
	{name: "ratio", shape: rangeOf(Ratio).from(0), example: "[0.8, 1.25]", doc: "Stress in warp over stress in weft: [least, greatest]."},
	{name: "stress min", shape: quantity(ForcePerLength), example: "1 kN/m", doc: "Least principal stress."},
	{name: "stress max", shape: quantity(ForcePerLength).above(0), example: "6 kN/m", doc: "Greatest principal stress."},
	{name: "cable max", shape: quantity(Force).above(0), example: "80 kN", doc: "Greatest cable force."},
	{name: "slope min", shape: quantity(Slope).from(0).below(1.5707963267948966), example: "3 deg", doc: "Least slope for drainage."},
	{name: "reaction max", shape: quantity(Force).above(0), example: "120 kN", doc: "Greatest reaction at one support."},
	{name: "utilisation", shape: quantity(Ratio).above(0), example: "100 %", doc: "Greatest utilisation (prestress only)."},
	{name: "headroom", shape: listOf(in(headroomSection), 1), example: "[{name: doorway, height: 2.5 m, region: [[0, 0], [4, 0], [4, 3], [0, 3]]}]", doc: "Free heights over regions of the plan."},
}}

var factorsSection = &section{id: "factors", doc: "Partial factors.", keys: []*key{
	{name: "load", shape: quantity(Ratio).above(0), example: "1.5", doc: "On the effects of prestress."},
	{name: "fabric", shape: quantity(Ratio).above(0), example: "4", doc: "On the strength of fabric."},
	{name: "cable", shape: quantity(Ratio).above(0), example: "1.5", doc: "On the strength of cables, masts and guys."},
}}

var memberKinds = []string{"cable", "edge cable", "ridge cable", "valley cable", "net cable", "ring cable", "guy", "mast", "strut"}

var nodeColumns = &section{id: "listed-node", table: true, doc: "One node per row.", keys: []*key{
	{name: "name", shape: text(), deflt: "its number, counted from 0", example: "n17", doc: "Name by which the other tables refer to the node."},
	{name: "x", shape: quantity(Length), required: true, example: "0", doc: "Coordinate x."},
	{name: "y", shape: quantity(Length), required: true, example: "9.2", doc: "Coordinate y."},
	{name: "z", shape: quantity(Length), required: true, example: "4.5", doc: "Height. The place of a free node is the start of the search."},
}}

var supportColumns = &section{id: "listed-support", table: true, doc: "One supported node per row.", keys: []*key{
	{name: "node", shape: name("node"), required: true, example: "n17", doc: "The node."},
	{name: "directions", shape: word("xyz", "xy", "xz", "yz", "x", "y", "z"), deflt: "xyz", example: "xyz", doc: "Directions in which the support reacts."},
}}

var memberColumns = &section{id: "listed-member", table: true, oneOf: []string{"force density", "force", "unstressed"},
	doc: "One member per row. Exactly one of force density, force and unstressed (with stiffness) is filled.", keys: []*key{
		{name: "name", shape: text(), deflt: "its number, counted from 0", example: "m3", doc: "Name of the member."},
		{name: "from", shape: name("node"), required: true, example: "n17", doc: "Node at its start."},
		{name: "to", shape: name("node"), required: true, example: "n18", doc: "Node at its end."},
		{name: "kind", shape: word(memberKinds...), deflt: "cable", example: "edge cable", doc: "What it is. Only masts and struts may push (negative force or force density)."},
		{name: "force density", shape: quantity(ForcePerLength), example: "4", doc: "Force over length."},
		{name: "force", shape: quantity(Force), example: "12", doc: "Force, tension positive."},
		{name: "unstressed", shape: quantity(Length).above(0), example: "0.98", doc: "Length without force. Needs stiffness."},
		{name: "stiffness", shape: quantity(Force).above(0), example: "12000", doc: "Axial stiffness EA."},
		{name: "weight", shape: quantity(WeightPerLength).from(0), example: "0.01", doc: "Self weight per length."},
		{name: "strength", shape: quantity(Force).above(0), example: "110", doc: "Characteristic breaking force."},
		{name: "group", shape: text(), example: "hanging", doc: "Name of a group it is reported with."},
		{name: "cable", shape: text(), example: "K1", doc: "Name of the cable it is part of; the rows of a cable follow each other from one end to the other."},
	}}

var triangleColumns = &section{id: "listed-triangle", table: true, doc: "One fabric triangle per row. What is not filled is that of its fabric.", keys: []*key{
	{name: "a", shape: name("node"), required: true, example: "n1", doc: "First corner; counter-clockwise seen from the positive side."},
	{name: "b", shape: name("node"), required: true, example: "n2", doc: "Second corner."},
	{name: "c", shape: name("node"), required: true, example: "n3", doc: "Third corner."},
	{name: "fabric", shape: text(), deflt: "the only fabric", example: "sail", doc: "Fabric it belongs to, see listed.fabrics."},
	{name: "warp", shape: quantity(ForcePerLength).above(0), deflt: "that of its fabric", example: "2.5", doc: "Wanted stress in warp, per width."},
	{name: "weft", shape: quantity(ForcePerLength).above(0), deflt: "that of its fabric", example: "2.5", doc: "Wanted stress in weft, per width."},
	{name: "warp x", shape: quantity(Ratio), deflt: "that of its fabric", example: "1", doc: "Warp direction, x."},
	{name: "warp y", shape: quantity(Ratio), deflt: "that of its fabric", example: "0", doc: "Warp direction, y."},
	{name: "warp z", shape: quantity(Ratio), deflt: "that of its fabric", example: "0", doc: "Warp direction, z."},
}}

var loadColumns = &section{id: "listed-load", table: true, doc: "One loaded node per row; several rows of one node add up.", keys: []*key{
	{name: "node", shape: name("node"), required: true, example: "n17", doc: "The node."},
	{name: "fx", shape: quantity(Force), deflt: "0", example: "0", doc: "Load along x."},
	{name: "fy", shape: quantity(Force), deflt: "0", example: "0", doc: "Load along y."},
	{name: "fz", shape: quantity(Force), deflt: "0", example: "-2", doc: "Load along z, up positive."},
}}

var listedFabricSection = &section{id: "listed-fabric", doc: "What the triangles of one fabric have in common.", keys: append([]*key{
	{name: "prestress", shape: warpWeft("prestress", "Wanted stress per width.", ForcePerLength, "2.5 kN/m"), example: "{warp: 2.5 kN/m, weft: 2.5 kN/m}",
		doc: "Wanted stress per width of triangles that do not give it themselves."},
	{name: "warp", shape: &shape{form: formDirection}, example: "[1, 0, 0]",
		doc: "Warp direction, laid onto the surface, of triangles that do not give it themselves. Needed where warp and weft differ."},
}, append(fabricMaterialKeys(), volumeKeys()...)...)}

var listedSection = &section{id: "listed", doc: "A structure with its own topology. Each table is a CSV file beside the model file (\"nodes.csv\"), or rows in the model file, or CSV text in a block that starts with |. Nodes are referred to by name, or by number counted from 0 when they have no names.", keys: []*key{
	{name: "nodes", shape: table(nodeColumns), required: true, example: "nodes.csv", doc: "The nodes."},
	{name: "supports", shape: table(supportColumns), required: true, example: "[{node: A}, {node: B, directions: z}]", doc: "The supported nodes."},
	{name: "members", shape: table(memberColumns), example: "members.csv", doc: "Cables and struts."},
	{name: "triangles", shape: table(triangleColumns), example: "triangles.csv", doc: "Fabric triangles."},
	{name: "loads", shape: table(loadColumns), example: "[{node: A, fz: -2 kN}]", doc: "Loads on nodes."},
	{name: "fabrics", shape: named("fabric", in(listedFabricSection)), example: "{sail: {prestress: 2.5 kN/m}}", doc: "Fabrics of the triangles."},
}}

// sections lists every section once, in the order of the reference page.
func sections() []*section {
	var out []*section
	seen := map[string]bool{}
	var walkShape func(s *shape)
	walk := func(s *section) {
		if seen[s.id] {
			return
		}
		seen[s.id] = true
		out = append(out, s)
		for _, k := range s.keys {
			walkShape(k.shape)
		}
	}
	walkShape = func(s *shape) {
		if s.sec != nil {
			walk(s.sec)
		}
		if s.elem != nil {
			walkShape(s.elem)
		}
		for _, o := range s.of {
			walkShape(o)
		}
	}
	walk(modelSection)
	return out
}
