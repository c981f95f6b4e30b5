#pragma once

#include "harness/base/json.h"

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

/// The parts of the glTF reader. Everything here throws base::InputError at the first thing wrong.
namespace input::gltf {

/// One JSON object of the file; knows where it stands.
class Object {
 public:
  Object(const base::Json& json, std::string pointer);

  const base::Json& json() const { return *json_; }
  const std::string& pointer() const { return pointer_; }
  bool has(std::string_view key) const { return json_->find(key) != nullptr; }

  std::string text(std::string_view key) const;                          ///< empty when absent
  bool flag(std::string_view key) const;                                 ///< false when absent
  std::size_t whole(std::string_view key, std::size_t least = 0) const;  ///< must be there
  std::size_t whole_or(std::string_view key, std::size_t fallback, std::size_t least = 0) const;
  std::vector<double> numbers(std::string_view key, std::size_t size = 0) const;
  std::vector<std::string> texts(std::string_view key) const;
  Object child(std::string_view key) const;  ///< must be there
  std::vector<Object> children(
      std::string_view key) const;  ///< an array of objects; empty when absent
  [[noreturn]] void fail(std::string message) const;
  [[noreturn]] void fail(std::string_view key, std::string message) const;

 private:
  const base::Json* json_;
  std::string pointer_;
};

/// The two parts of a file, whichever way it is packed.
struct Container {
  std::string json;
  bool binary = false;               ///< a .glb
  std::optional<std::string> chunk;  ///< its BIN chunk
};

/// Takes a .glb apart, or hands a .gltf through.
Container open_container(std::string bytes, const std::string& shown);

/// A parsed file: its arrays, and the bytes of its buffers, which are loaded when first asked for.
class Document {
 public:
  /// `folder`: of the file; buffers named by URI are found from there and stay inside `root`.
  Document(Container container, std::string shown, std::filesystem::path folder,
           std::filesystem::path root);
  Document(const Document&) = delete;
  Document& operator=(const Document&) = delete;

  const Object& top() const { return *top_; }
  const std::string& shown() const { return source_.file; }
  /// Entries of a top-level array, 0 when it is absent.
  std::size_t count(std::string_view array) const;
  Object at(std::string_view array, std::size_t index) const;
  /// "'Hip' (#5)", or "#5" for an entry without a name.
  std::string label(std::string_view array, std::size_t index) const;
  /// Index held by a member that must be there, checked against a top-level array.
  std::size_t reference(const Object& user, std::string_view key, std::string_view array) const;
  /// The same for an array of indices.
  std::vector<std::size_t> references(const Object& user, std::string_view key,
                                      std::string_view array) const;
  /// The `byteLength` bytes of a buffer.
  std::string_view buffer(std::size_t index);
  /// Counts numbers about to be decoded. Throws when a file wants more than kMostNumbers in all.
  void charge(const Object& accessor, std::uint64_t numbers);

 private:
  const base::Json* array(std::string_view name) const;
  std::string load(const Object& object, std::size_t length);

  base::JsonSource source_;
  base::Json json_;
  std::optional<Object> top_;
  std::optional<std::string> chunk_;
  bool binary_ = false;
  std::filesystem::path folder_, root_;
  std::vector<std::optional<std::string>> buffers_;
  std::uint64_t loaded_ = 0;   // bytes of buffers outside the file itself
  std::uint64_t decoded_ = 0;  // numbers
};

/// Most JSON values of a file, and most numbers that all its accessors in use may hold together.
inline constexpr std::size_t kMostValues = std::size_t{1} << 22;
inline constexpr std::uint64_t kMostNumbers = std::uint64_t{1} << 28;

}  // namespace input::gltf
