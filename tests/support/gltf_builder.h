#pragma once

#include <filesystem>
#include <string>
#include <string_view>
#include <vector>

namespace tests {

/// A folder of its own, gone with the object.
class TemporaryFolder {
 public:
  TemporaryFolder();
  ~TemporaryFolder();
  TemporaryFolder(const TemporaryFolder&) = delete;
  TemporaryFolder& operator=(const TemporaryFolder&) = delete;

  const std::filesystem::path& path() const { return path_; }
  /// Writes `bytes` under a name with '/', making folders on the way.
  std::filesystem::path write(const std::string& name, std::string_view bytes) const;

 private:
  std::filesystem::path path_;
};

/// Values of "componentType".
enum class Component { I8 = 5120, U8 = 5121, I16 = 5122, U16 = 5123, U32 = 5125, F32 = 5126 };

/// How an accessor is stored.
struct Packing {
  bool normalized = false;
  std::size_t stride = 0;  ///< 0: tightly, and the file does not say so
};

/// A glTF file in the making: JSON with one buffer behind it. Values are given as JSON text and
/// placed by JSON pointer (RFC 6901), so that a test can break a valid file at one place.
class GltfBuilder {
 public:
  GltfBuilder();

  /// A view and an accessor that hold `values`, rounded to the component; returns its index.
  int add(const std::string& type, Component component, const std::vector<double>& values,
          Packing packing = {});
  void set(const std::string& pointer, const std::string& json);    ///< replaces or adds
  int append(const std::string& pointer, const std::string& json);  ///< to an array; the index
  void remove(const std::string& pointer);
  int count(const std::string& pointer) const;  ///< entries of an array, 0 when absent
  const std::string& bytes() const { return bytes_; }
  std::string& bytes() { return bytes_; }  ///< of the buffer

  std::string glb() const;                              ///< buffer 0 as BIN chunk
  std::string gltf(const std::string& uri = {}) const;  ///< buffer 0 under `uri`; empty: as set
  std::string embedded() const;                         ///< a .gltf with buffer 0 as data: URI

 private:
  std::string json_;
  std::string bytes_;
};

/// A .glb of any JSON text and BIN chunk, padded as glTF says.
std::string make_glb(std::string json, std::string chunk);

/// `value` as 4 bytes, little-endian.
std::string u32_bytes(std::size_t value);

std::string base64(std::string_view bytes);

/// An arm: nodes 0 "root" > 1 "upper" > 2 "lower", and 3 "body" with mesh 0 and skin 0. A square of
/// 4 vertices and 2 faces, accessors 0 POSITION, 1 JOINTS_0 (u8), 2 WEIGHTS_0 (f32), 3 indices
/// (u16), 4 inverse binds; animation 0 "wave": upper moves (LINEAR), lower turns (STEP), accessors
/// 5 to 7.
GltfBuilder arm();

}  // namespace tests
