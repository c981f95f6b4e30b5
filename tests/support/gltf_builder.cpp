#include "tests/support/gltf_builder.h"

#include <nlohmann/json.hpp>

#include <atomic>
#include <bit>
#include <cmath>
#include <cstdint>
#include <fstream>
#include <stdexcept>
#include <unistd.h>

namespace tests {

namespace {

using Json = nlohmann::ordered_json;

constexpr std::string_view kDigits =
    "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";

void put(std::string& bytes, std::uint64_t value, std::size_t size) {
  for (std::size_t i = 0; i < size; ++i)
    bytes += static_cast<char>(static_cast<unsigned char>((value >> (8 * i)) & 0xFF));
}

std::size_t size_of(Component component) {
  if (component == Component::I8 || component == Component::U8) return 1;
  return component == Component::I16 || component == Component::U16 ? 2 : 4;
}

std::size_t components_of(const std::string& type) {
  if (type == "SCALAR") return 1;
  return type == "MAT4" ? 16 : static_cast<std::size_t>(type.back() - '0');
}

// Indented, so that values stand on lines of their own.
std::string text_of(const Json& json) {
  return json.dump(1) + "\n";
}

}  // namespace

TemporaryFolder::TemporaryFolder() {
  static std::atomic<int> counter{0};
  path_ = std::filesystem::temp_directory_path() /
          ("skinfold-" + std::to_string(::getpid()) + "-" + std::to_string(counter++));
  std::filesystem::create_directories(path_);
}

TemporaryFolder::~TemporaryFolder() {
  std::error_code ignored;
  std::filesystem::remove_all(path_, ignored);
}

std::filesystem::path TemporaryFolder::write(const std::string& name,
                                             std::string_view bytes) const {
  const std::filesystem::path path = path_ / name;
  std::filesystem::create_directories(path.parent_path());
  std::ofstream file(path, std::ios::binary);
  file.write(bytes.data(), static_cast<std::streamsize>(bytes.size()));
  if (!file.flush()) throw std::runtime_error("cannot write " + path.string());
  return path;
}

GltfBuilder::GltfBuilder()
    : json_(text_of({{"asset", {{"version", "2.0"}}}, {"buffers", {{{"byteLength", 0}}}}})) {}

int GltfBuilder::add(const std::string& type, Component component,
                     const std::vector<double>& values, Packing packing) {
  const std::size_t size = size_of(component);
  const std::size_t components = components_of(type);
  const std::size_t element = size * components;
  bytes_.resize((bytes_.size() + 3) / 4 * 4);
  const std::size_t begin = bytes_.size();
  for (std::size_t i = 0; i < values.size(); ++i) {
    if (component == Component::F32)
      put(bytes_, std::bit_cast<std::uint32_t>(static_cast<float>(values[i])), size);
    else
      put(bytes_, static_cast<std::uint64_t>(static_cast<std::int64_t>(values[i])), size);
    // Bytes between elements are not zero: a reader that takes them for data shall be caught.
    if (packing.stride > element && (i + 1) % components == 0 && i + 1 < values.size())
      bytes_.append(packing.stride - element, '\x5A');
  }
  Json json = Json::parse(json_);
  Json view = {{"buffer", 0}, {"byteOffset", begin}, {"byteLength", bytes_.size() - begin}};
  if (packing.stride > 0) view["byteStride"] = packing.stride;
  json["bufferViews"].push_back(view);
  Json accessor = {{"bufferView", json["bufferViews"].size() - 1},
                   {"componentType", static_cast<int>(component)},
                   {"count", values.size() / components},
                   {"type", type}};
  if (packing.normalized) accessor["normalized"] = true;
  json["accessors"].push_back(accessor);
  json["buffers"][0]["byteLength"] = bytes_.size();
  json_ = text_of(json);
  return static_cast<int>(json["accessors"].size()) - 1;
}

void GltfBuilder::set(const std::string& pointer, const std::string& value) {
  Json json = Json::parse(json_);
  json[Json::json_pointer(pointer)] = Json::parse(value);
  json_ = text_of(json);
}

int GltfBuilder::append(const std::string& pointer, const std::string& value) {
  Json json = Json::parse(json_);
  Json& array = json[Json::json_pointer(pointer)];
  array.push_back(Json::parse(value));
  const int index = static_cast<int>(array.size()) - 1;
  json_ = text_of(json);
  return index;
}

void GltfBuilder::remove(const std::string& pointer) {
  Json json = Json::parse(json_);
  const Json::json_pointer place(pointer);
  Json& parent = json.at(place.parent_pointer());
  if (parent.is_array())
    parent.erase(static_cast<std::size_t>(std::stoul(place.back())));
  else
    parent.erase(place.back());
  json_ = text_of(json);
}

int GltfBuilder::count(const std::string& pointer) const {
  const Json json = Json::parse(json_);
  const Json::json_pointer place(pointer);
  return json.contains(place) ? static_cast<int>(json.at(place).size()) : 0;
}

std::string GltfBuilder::glb() const {
  return make_glb(json_, bytes_);
}

std::string GltfBuilder::gltf(const std::string& uri) const {
  Json json = Json::parse(json_);
  if (!uri.empty()) json["buffers"][0]["uri"] = uri;
  return text_of(json);
}

std::string GltfBuilder::embedded() const {
  return gltf("data:application/octet-stream;base64," + base64(bytes_));
}

std::string u32_bytes(std::size_t value) {
  std::string out;
  put(out, value, 4);
  return out;
}

std::string make_glb(std::string json, std::string chunk) {
  json.resize((json.size() + 3) / 4 * 4, ' ');
  chunk.resize((chunk.size() + 3) / 4 * 4, '\0');
  std::string out = "glTF" + u32_bytes(2) + u32_bytes(28 + json.size() + chunk.size());
  out += u32_bytes(json.size()) + "JSON" + json;
  return out + u32_bytes(chunk.size()) + std::string("BIN\0", 4) + chunk;
}

std::string base64(std::string_view bytes) {
  std::string out;
  for (std::size_t i = 0; i < bytes.size(); i += 3) {
    std::uint32_t bits = 0;
    for (std::size_t k = 0; k < 3; ++k)
      bits = (bits << 8) | (i + k < bytes.size() ? static_cast<unsigned char>(bytes[i + k]) : 0u);
    for (std::size_t k = 0; k < 4; ++k)
      out += i + k > bytes.size() ? '=' : kDigits[(bits >> (18 - 6 * k)) & 63];
  }
  return out;
}

GltfBuilder arm() {
  GltfBuilder file;
  const double h = std::sqrt(0.5);
  file.add("VEC3", Component::F32, {0, 0, 0, 1, 0, 0, 1, 2, 0, 0, 2, 0.25});
  file.add("VEC4", Component::U8, {0, 0, 0, 0, 0, 1, 0, 0, 1, 0, 0, 0, 1, 0, 1, 0});
  file.add("VEC4", Component::F32, {1, 0, 0, 0, 0.75, 0.25, 0, 0, 1, 0, 0, 0, 0.5, 0.25, 0.25, 0});
  file.add("SCALAR", Component::U16, {0, 1, 2, 0, 2, 3});
  file.add("MAT4", Component::F32, {1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0, 0,  -1, 0, 1,
                                    1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0, -1, -3, 0, 1});
  file.add("SCALAR", Component::F32, {0, 0.5, 2});
  file.add("VEC3", Component::F32, {0, 1, 0, 0, 1.5, 0, 3, 1, 0});
  file.add("VEC4", Component::F32, {0, 0, 0, 1, h, 0, 0, h, 0, 0, 0, -2});
  file.set("/nodes", R"([{"name": "root", "children": [1, 3]},
      {"name": "upper", "translation": [0, 1, 0], "children": [2]},
      {"name": "lower", "translation": [0, 2, 0.5], "rotation": [0, 0, 0, 2], "scale": [1, 2, 3]},
      {"name": "body", "mesh": 0, "skin": 0}])");
  file.set("/meshes", R"([{"primitives": [{"indices": 3,
      "attributes": {"POSITION": 0, "JOINTS_0": 1, "WEIGHTS_0": 2}}]}])");
  file.set("/skins", R"([{"name": "Arm", "joints": [1, 2], "inverseBindMatrices": 4}])");
  file.set("/animations", R"([{"name": "wave",
      "samplers": [{"input": 5, "output": 6}, {"input": 5, "output": 7, "interpolation": "STEP"}],
      "channels": [{"sampler": 0, "target": {"node": 1, "path": "translation"}},
                   {"sampler": 1, "target": {"node": 2, "path": "rotation"}}]}])");
  return file;
}

}  // namespace tests
