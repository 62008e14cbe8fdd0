// Validates GLB files with the Khronos validator (npm gltf-validator):
//
//   node validate_glb.mjs FILE...
//
// The package is looked for in ANTICLAST_NODE_MODULES (a folder in which
// "npm install gltf-validator" was run) or in the working directory. Prints one
// JSON line per file and ends with 1 if there is any error, warning, info or hint.
import { readFileSync } from "node:fs";
import { createRequire } from "node:module";
import { join, resolve } from "node:path";

const home = resolve(process.env.ANTICLAST_NODE_MODULES || ".");
const validator = createRequire(join(home, "package.json"))("gltf-validator");

let bad = 0;
for (const name of process.argv.slice(2)) {
  const report = await validator.validateBytes(new Uint8Array(readFileSync(name)), { uri: name, maxIssues: 20 });
  const { numErrors, numWarnings, numInfos, numHints, messages } = report.issues;
  bad += numErrors + numWarnings + numInfos + numHints;
  const { totalTriangleCount, totalVertexCount, materialCount, drawCallCount } = report.info;
  console.log(JSON.stringify({
    errors: numErrors, warnings: numWarnings, infos: numInfos, hints: numHints,
    triangles: totalTriangleCount, vertices: totalVertexCount, materials: materialCount, draws: drawCallCount,
    messages: messages.map((m) => `${m.code} ${m.pointer ?? ""} ${m.message}`),
  }));
}
process.exit(bad ? 1 : 0);
