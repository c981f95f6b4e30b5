"""Writes the creature as glTF 2.0."""
import json
import struct

import numpy as np

from strider.motion import as_rotations


COMPONENT = {"float32": 5126, "uint16": 5123, "uint8": 5121}


class Gltf:
    """Accessors, views and the bytes behind them, in the order they are added."""

    def __init__(self):
        self.accessors, self.views, self.data = [], [], b""

    def view(self, data, target=None, stride=None):
        self.data += b"\0" * (-len(self.data) % 4)
        view = {"buffer": 0, "byteOffset": len(self.data), "byteLength": len(data)}
        if stride:
            view["byteStride"] = stride
        if target:
            view["target"] = target
        self.views.append(view)
        self.data += data
        return len(self.views) - 1

    def accessor(self, view, array, kind, offset=0, bounds=False, normalized=False):
        entry = {"bufferView": view, "byteOffset": offset,
                 "componentType": COMPONENT[str(array.dtype)], "count": len(array), "type": kind}
        if normalized:
            entry["normalized"] = True
        if bounds:
            columns = array.reshape(len(array), -1)
            entry["min"] = [float(v) for v in columns.min(axis=0)]
            entry["max"] = [float(v) for v in columns.max(axis=0)]
        self.accessors.append(entry)
        return len(self.accessors) - 1

    def add(self, array, kind, target=None, bounds=False, normalized=False):
        return self.accessor(self.view(array.tobytes(), target), array, kind, 0, bounds, normalized)

    def interleaved(self, attributes):
        """One view for several (array, kind, bounds, normalized), vertex by vertex."""
        rows = [np.frombuffer(entry[0].tobytes(), np.uint8).reshape(len(entry[0]), -1)
                for entry in attributes]
        block = np.concatenate(rows, axis=1)
        view = self.view(block.tobytes(), 34962, block.shape[1])
        offset, found = 0, []
        for (array, kind, bounds, normalized), row in zip(attributes, rows):
            found.append(self.accessor(view, array, kind, offset, bounds, normalized))
            offset += row.shape[1]
        return found


def creature_document(mesh, skeleton, clips, weights, interleaved=False):
    gltf = Gltf()
    attributes = [(mesh["positions"], "VEC3", True, False), (mesh["normals"], "VEC3", False, False),
                  (mesh["joints"], "VEC4", False, False),
                  (weights, "VEC4", False, weights.dtype != np.float32)]
    if interleaved:
        numbers = gltf.interleaved(attributes)
    else:
        numbers = [gltf.add(array, kind, 34962, bounds, normalized)
                   for array, kind, bounds, normalized in attributes]
    faces = gltf.add(mesh["triangles"].astype(np.uint16).reshape(-1), "SCALAR", 34963)
    names = [name for name, _, _ in skeleton]
    place = {name: at for name, _, at in skeleton}
    nodes = []
    for name, parent, at in skeleton:
        origin = place[parent] if parent else (0, 0, 0)
        node = {"name": name, "translation": [round(at[i] - origin[i], 6) + 0.0 for i in range(3)]}
        children = [i for i, (_, p, _) in enumerate(skeleton) if p == name]
        if children:
            node["children"] = children
        nodes.append(node)
    nodes.append({"name": "Strider", "mesh": 0, "skin": 0})
    inverse = np.array([[1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0, -at[0], -at[1], -at[2], 1]
                        for _, _, at in skeleton], dtype=np.float32) + np.float32(0)
    document = {
        "asset": {"version": "2.0", "generator": "make_demo"},
        "scene": 0,
        "scenes": [{"name": "Marsh", "nodes": [0, len(names)]}],
        "nodes": nodes,
        "meshes": [{"name": "Strider", "primitives": [{
            "attributes": dict(zip(("POSITION", "NORMAL", "JOINTS_0", "WEIGHTS_0"), numbers)),
            "indices": faces, "material": 0}]}],
        "materials": [{"name": "Hide", "pbrMetallicRoughness": {
            "baseColorFactor": [.33, .42, .34, 1.0], "metallicFactor": 0.0,
            "roughnessFactor": .65}}],
        "skins": [{"name": "Strider", "skeleton": 0, "joints": list(range(len(names))),
                   "inverseBindMatrices": gltf.add(inverse, "MAT4")}],
        "animations": [animation(gltf, clip, names) for clip in clips],
    }
    document["accessors"], document["bufferViews"] = gltf.accessors, gltf.views
    return document, gltf.data + b"\0" * (-len(gltf.data) % 4)


def animation(gltf, clip, names):
    samplers, channels, inputs = [], [], {}
    for joint, path, interpolation, keys, values in clip["tracks"]:
        if tuple(keys) not in inputs:
            times = (np.array(keys, dtype=float) / 24.0).astype(np.float32)
            inputs[tuple(keys)] = gltf.add(times, "SCALAR", bounds=True)
        if path == "rotation":
            kind, values = "VEC4", as_rotations(values)
        else:
            kind, values = "VEC3", np.rint(np.array(values) * 1e6) / 1e6 + 0.0
        target = {"node": names.index(joint), "path": path}
        channels.append({"sampler": len(samplers), "target": target})
        samplers.append({"input": inputs[tuple(keys)], "interpolation": interpolation,
                         "output": gltf.add(values.astype(np.float32), kind)})
    return {"name": clip["name"], "channels": channels, "samplers": samplers}


def glb(document, data):
    document["buffers"] = [{"byteLength": len(data)}]
    text = json.dumps(document, separators=(",", ":")).encode()
    text += b" " * (-len(text) % 4)
    return (struct.pack("<4sII", b"glTF", 2, 28 + len(text) + len(data))
            + struct.pack("<I4s", len(text), b"JSON") + text
            + struct.pack("<I4s", len(data), b"BIN\0") + data)
