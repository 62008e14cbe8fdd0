// Reads an IFC file with npm web-ifc and prints what it holds as JSON:
//
//   node read_ifc.mjs FILE
//
// ANTICLAST_NODE_MODULES names the folder in which "npm install web-ifc" was run.
import { createRequire } from "node:module";
import { readFileSync } from "node:fs";
import { join, resolve } from "node:path";

const home = resolve(process.env.ANTICLAST_NODE_MODULES || ".");
const ifc = createRequire(join(home, "package.json"))("web-ifc");
const api = new ifc.IfcAPI();
await api.Init();
api.SetLogLevel(4);
const model = api.OpenModel(new Uint8Array(readFileSync(process.argv[2])));
const all = (type) => { const v = api.GetLineIDsWithType(model, type), out = []; for (let i = 0; i < v.size(); i++) out.push(api.GetLine(model, v.get(i))); return out; };
const line = (ref) => api.GetLine(model, ref.value);
const coordinates = (vertex) => line(line(vertex).VertexGeometry).Coordinates.map((c) => c.value);
const out = { schema: api.GetModelSchema(model), nodes: 0, supports: 0, members: 0, surfaces: 0, length: 0, force: 0, guids: 0, lo: [1e300, 1e300, 1e300], hi: [-1e300, -1e300, -1e300] };
const guids = new Set();
for (const n of all(ifc.IFCSTRUCTURALPOINTCONNECTION)) {
  out.nodes++; guids.add(n.GlobalId.value);
  if (n.AppliedCondition) out.supports++;
  const p = coordinates(line(line(n.Representation).Representations[0]).Items[0]);
  for (let k = 0; k < 3; k++) { out.lo[k] = Math.min(out.lo[k], p[k]); out.hi[k] = Math.max(out.hi[k], p[k]); }
}
for (const m of all(ifc.IFCSTRUCTURALCURVEMEMBER)) {
  out.members++; guids.add(m.GlobalId.value);
  const e = line(line(line(m.Representation).Representations[0]).Items[0]);
  const a = coordinates(e.EdgeStart), b = coordinates(e.EdgeEnd);
  out.length += Math.hypot(a[0] - b[0], a[1] - b[1], a[2] - b[2]);
}
for (const s of all(ifc.IFCSTRUCTURALSURFACEMEMBER)) { out.surfaces++; guids.add(s.GlobalId.value); }
for (const p of all(ifc.IFCPROPERTYSINGLEVALUE)) if (p.Name.value === "PrestressForce") out.force += p.NominalValue.value;
out.guids = guids.size;
out.project = all(ifc.IFCPROJECT)[0].Name.value;
out.ends = all(ifc.IFCRELCONNECTSSTRUCTURALMEMBER).length;
out.grouped = all(ifc.IFCRELASSIGNSTOGROUP)[0].RelatedObjects.length;
console.log(JSON.stringify(out));
