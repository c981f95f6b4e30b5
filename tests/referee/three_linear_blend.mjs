// Holds our linear blending of the demo creature against three.js: its own glTF reader, animation
// mixer and SkinnedMesh.applyBoneTransform.
//
// Usage: THREE_FOLDER=FOLDER node three_linear_blend.mjs SKINFOLD SUITE GLB, with three installed
// by npm in FOLDER. Tolerance 1e-6 D: three.js keeps positions in single precision.
// Catches: a clip sampled at other times or the long way round, weights or joints paired wrongly,
// bind matrices transposed, an order of multiplication turned around.
import { execFileSync } from "node:child_process";
import { mkdtempSync, readFileSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join, resolve } from "node:path";
import { pathToFileURL } from "node:url";

const [skinfold, suite, glb] = process.argv.slice(2);
const folder = resolve(process.env.THREE_FOLDER, "node_modules/three");
const THREE = await import(pathToFileURL(join(folder, "build/three.module.js")));
const { GLTFLoader } = await import(pathToFileURL(join(folder, "examples/jsm/loaders/GLTFLoader.js")));
globalThis.self ??= globalThis;  // the loader asks a browser for it

// Double array of a .npy file (version 1, little-endian, C order) and its shape.
function readNpy(path) {
  const bytes = readFileSync(path);
  const length = bytes.readUInt16LE(8);
  const shape = /'shape': \(([^)]*)\)/.exec(bytes.toString("latin1", 10, 10 + length))[1].split(",").map(Number);
  const data = new Float64Array(bytes.buffer.slice(bytes.byteOffset + 10 + length, bytes.byteOffset + bytes.length));
  return { shape, data };
}

const file = readFileSync(glb);

// A fresh scene: a clip must not find what another left in joints that it does not move.
async function loaded() {
  const bytes = file.buffer.slice(file.byteOffset, file.byteOffset + file.length);
  const { scene, animations } = await new GLTFLoader().parseAsync(bytes, "");
  let mesh;
  scene.traverse((object) => { if (object.isSkinnedMesh) mesh = object; });
  return { scene, animations, mesh };
}

const temporary = mkdtempSync(join(tmpdir(), "skinfold-three-"));
let failed = false;
for (const [motion, name, rate] of [["wade", "Wade", 8], ["startle", "Startle", 8]]) {
  const out = join(temporary, `${motion}.npy`);
  execFileSync(skinfold, ["export", suite, "--case", `strider/${motion}/ship`, "--to", out]);
  const { shape: [frames, vertices], data } = readNpy(out);
  const { scene, animations, mesh } = await loaded();
  const box = new THREE.Box3().setFromBufferAttribute(mesh.geometry.attributes.position);
  const diagonal = box.getSize(new THREE.Vector3()).length();
  const clip = animations.find((one) => one.name === name);
  const mixer = new THREE.AnimationMixer(scene);
  const action = mixer.clipAction(clip);
  action.setLoop(THREE.LoopOnce);
  action.clampWhenFinished = true;
  action.play();
  let worst = 0;
  for (let frame = 0; frame < frames; ++frame) {
    mixer.setTime(Math.min(frame / rate, clip.duration));
    scene.updateMatrixWorld(true);
    const point = new THREE.Vector3();
    for (let v = 0; v < vertices; ++v) {
      point.fromBufferAttribute(mesh.geometry.attributes.position, v);
      mesh.applyBoneTransform(v, point).applyMatrix4(mesh.matrixWorld);
      const at = 3 * (frame * vertices + v);
      worst = Math.max(worst, Math.hypot(point.x - data[at], point.y - data[at + 1], point.z - data[at + 2]));
    }
  }
  console.log(`${name}: ${frames} frames of ${vertices} vertices, worst ${(worst / diagonal).toExponential(2)} D`);
  failed ||= !(worst / diagonal <= 1e-6);
}
rmSync(temporary, { recursive: true });
process.exit(failed ? 1 : 0);
