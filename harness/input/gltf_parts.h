#pragma once

#include "harness/input/gltf_document.h"
#include "harness/model/rig.h"

#include <span>
#include <string>
#include <vector>

/// The steps of read_gltf, in their order. Each fills its part of the rig.
namespace input::gltf {

/// Refuses other versions of glTF and extensions that change what a skin is.
void check_version(const Document& document);

/// Rig::nodes and Rig::walk.
void read_nodes(const Document& document, model::Rig& rig);

/// Skins that the addresses mean, in the order of the addresses: indices into the file's array.
std::vector<std::size_t> choose_skins(const Document& document,
                                      std::span<const std::string> addresses);

/// Rig::skins and Rig::joints. Precondition: nodes are read.
void read_skins(Document& document, std::span<const std::size_t> chosen, model::Rig& rig);

/// Vertices, faces, morph targets and influences of all nodes that carry a chosen skin, and notes
/// on what is left out. Precondition: skins are read.
void read_meshes(Document& document, std::span<const std::size_t> chosen, model::Rig& rig);

/// Rig::clips. Precondition: nodes are read.
void read_clips(Document& document, std::span<const std::size_t> chosen, model::Rig& rig);

}  // namespace input::gltf
