#include "harness/base/file.h"
#include "harness/input/formats.h"
#include "harness/input/gltf_parts.h"
#include "harness/input/input.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <utility>

namespace input {

namespace gltf {

namespace {

// Extensions that change how a surface looks and neither its shape nor how it moves.
constexpr std::array<std::string_view, 21> kAppearance = {
    "EXT_texture_avif",
    "EXT_texture_webp",
    "KHR_lights_punctual",
    "KHR_materials_anisotropy",
    "KHR_materials_clearcoat",
    "KHR_materials_diffuse_transmission",
    "KHR_materials_dispersion",
    "KHR_materials_emissive_strength",
    "KHR_materials_ior",
    "KHR_materials_iridescence",
    "KHR_materials_pbrSpecularGlossiness",
    "KHR_materials_sheen",
    "KHR_materials_specular",
    "KHR_materials_transmission",
    "KHR_materials_unlit",
    "KHR_materials_variants",
    "KHR_materials_volume",
    "KHR_texture_basisu",
    "KHR_texture_transform",
    "KHR_xmp",
    "KHR_xmp_json_ld",
};

std::string refusal_of(std::string_view extension) {
  if (extension == "KHR_mesh_quantization")
    return "KHR_mesh_quantization: not in this version; export with float positions "
           "(quantization off)";
  if (extension == "EXT_meshopt_compression" || extension == "KHR_meshopt_compression" ||
      extension == "KHR_draco_mesh_compression")
    return fmt::format(
        "{}: compressed meshes are not read; export again with mesh compression "
        "off",
        extension);
  return fmt::format(
      "the file requires the extension '{}', which this build does not know; "
      "export again without it",
      extension);
}

// Major and minor number of "2.0".
std::pair<int, int> version_of(const Object& asset, std::string_view key) {
  const std::string text = asset.text(key);
  int major = -1;
  int minor = -1;
  const char* const end = text.data() + text.size();
  const auto first = std::from_chars(text.data(), end, major);
  const bool dotted = first.ec == std::errc{} && first.ptr != end && *first.ptr == '.';
  const auto second = dotted ? std::from_chars(first.ptr + 1, end, minor) : first;
  if (!dotted || second.ec != std::errc{} || second.ptr != end || major < 0 || minor < 0)
    asset.fail(key, fmt::format("'{}' is no version such as '2.0' ({})", text, key));
  return {major, minor};
}

// A .glb has no lines that a person could look up.
base::InputError without_lines(const base::InputError& error, const std::string& file) {
  std::vector<base::Problem> problems = error.problems();
  for (base::Problem& problem : problems) {
    if (problem.file != file) continue;
    // Only bad syntax has a place and no pointer; the JSON as a whole begins at 1:1.
    if (problem.pointer.empty() && problem.line + problem.column > 2)
      problem.message +=
          fmt::format(" (column {} of line {} of the JSON chunk)", problem.column, problem.line);
    problem.line = problem.column = 0;
  }
  return base::InputError(std::move(problems));
}

model::Rig read(Container container, const std::filesystem::path& path, const std::string& shown,
                const std::filesystem::path& root, std::span<const std::string> skins) {
  Document document(std::move(container), shown, path.parent_path(), root);
  check_version(document);
  model::Rig rig;
  rig.file = shown;
  read_nodes(document, rig);
  const std::vector<std::size_t> chosen = choose_skins(document, skins);
  read_skins(document, chosen, rig);
  read_meshes(document, chosen, rig);
  read_clips(document, chosen, rig);
  return rig;
}

}  // namespace

void check_version(const Document& document) {
  const Object asset = document.top().child("asset");
  if (!asset.has("version")) asset.fail("the key 'version' is missing (a string)");
  const auto [major, minor] = version_of(asset, "version");
  if (major != 2)
    asset.fail("version", fmt::format("glTF {}.{}, and this build reads glTF 2", major, minor));
  if (asset.has("minVersion") && version_of(asset, "minVersion") > std::pair(2, 0))
    asset.fail("minVersion", fmt::format("the file needs a reader of glTF {}, and this build "
                                         "reads 2.0",
                                         asset.text("minVersion")));
  const std::vector<std::string> required = document.top().texts("extensionsRequired");
  for (const std::string& name : required)
    if (std::find(kAppearance.begin(), kAppearance.end(), name) == kAppearance.end())
      document.top().fail("extensionsRequired", refusal_of(name));
}

}  // namespace gltf

model::Rig read_gltf(const std::filesystem::path& path, const std::string& shown,
                     const std::filesystem::path& root, std::span<const std::string> skins) {
  gltf::Container container = gltf::open_container(base::read_file(path, shown), shown);
  const bool binary = container.binary;
  try {
    return gltf::read(std::move(container), path, shown, root, skins);
  } catch (const base::InputError& error) {
    if (!binary) throw;
    throw gltf::without_lines(error, shown);
  }
}

Format gltf_format() {
  return {.name = "gltf",
          .extensions = ".gltf .glb",
          .holds = "meshes, skeleton, weights, morph targets, clips",
          .limits =
              "no sparse accessors, no quantized or compressed meshes, no CUBICSPLINE, no "
              "normalized-integer keys, no animated morph weights; triangles only",
          .source = "glTF 2.0 specification, Khronos Group"};
}

}  // namespace input
