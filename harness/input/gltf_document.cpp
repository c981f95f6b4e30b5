#include "harness/input/gltf_document.h"

#include "harness/base/file.h"
#include "harness/input/gltf_buffers.h"

#include <fmt/format.h>

#include <algorithm>
#include <utility>

namespace input::gltf {

namespace {

// What `ask` reads from a view of the object; throws what the view complains about.
template <typename Ask>
auto asked(const Object& object, Ask ask) {
  std::vector<base::Problem> problems;
  base::JsonView view(object.json(), object.pointer(), problems);
  auto answer = ask(view);
  if (!problems.empty()) throw base::InputError(std::move(problems));
  return answer;
}

base::Json parse(const base::JsonSource& source) {
  const auto values = std::count_if(source.text.begin(), source.text.end(),
                                    [](char c) { return c == ',' || c == '[' || c == '{'; });
  if (static_cast<std::size_t>(values) > kMostValues)
    throw base::InputError(
        fmt::format("the JSON holds more than {} values; glTF keeps bulk data in buffers",
                    kMostValues),
        source.file);
  return base::parse_json(source);
}

}  // namespace

Object::Object(const base::Json& json, std::string pointer)
    : json_(&json), pointer_(std::move(pointer)) {
  if (json.kind != base::Json::Kind::Object)
    fail(fmt::format("an object was expected, not {}", base::kind_name(json.kind)));
}

std::string Object::text(std::string_view key) const {
  return asked(*this, [&](base::JsonView& view) { return view.text(key); });
}

bool Object::flag(std::string_view key) const {
  return asked(*this, [&](base::JsonView& view) { return view.boolean(key, false); });
}

std::size_t Object::whole(std::string_view key, std::size_t least) const {
  if (!has(key)) fail(fmt::format("the key '{}' is missing (a whole number)", key));
  return whole_or(key, 0, least);
}

std::size_t Object::whole_or(std::string_view key, std::size_t fallback, std::size_t least) const {
  if (!has(key)) return fallback;
  const std::int64_t value =
      asked(*this, [&](base::JsonView& view) { return view.integer(key, 0); });
  if (value < 0 || static_cast<std::uint64_t>(value) < least)
    fail(key, fmt::format("'{}' must be at least {}, not {}", key, least, value));
  return static_cast<std::size_t>(value);
}

std::vector<double> Object::numbers(std::string_view key, std::size_t size) const {
  return asked(*this, [&](base::JsonView& view) { return view.numbers(key, size); });
}

std::vector<std::string> Object::texts(std::string_view key) const {
  return asked(*this, [&](base::JsonView& view) { return view.texts(key); });
}

Object Object::child(std::string_view key) const {
  const base::Json* value = asked(
      *this, [&](base::JsonView& view) { return view.required(key, base::Json::Kind::Object); });
  return {*value, base::child_pointer(pointer_, key)};
}

std::vector<Object> Object::children(std::string_view key) const {
  const base::Json* value =
      asked(*this, [&](base::JsonView& view) { return view.member(key, base::Json::Kind::Array); });
  std::vector<Object> out;
  if (value == nullptr) return out;
  const std::string pointer = base::child_pointer(pointer_, key);
  for (std::size_t i = 0; i < value->items.size(); ++i)
    out.emplace_back(value->items[i], base::child_pointer(pointer, i));
  return out;
}

void Object::fail(std::string message) const {
  throw base::InputError(base::problem_at(*json_, pointer_, std::move(message)));
}

void Object::fail(std::string_view key, std::string message) const {
  const base::Json* value = json_->find(key);
  if (value == nullptr) fail(std::move(message));
  throw base::InputError(
      base::problem_at(*value, base::child_pointer(pointer_, key), std::move(message)));
}

Document::Document(Container container, std::string shown, std::filesystem::path folder,
                   std::filesystem::path root)
    : source_{std::move(shown), folder.string(), std::move(container.json)},
      json_(parse(source_)),
      chunk_(std::move(container.chunk)),
      binary_(container.binary),
      folder_(std::move(folder)),
      root_(std::move(root)) {
  top_.emplace(json_, "");
  buffers_.resize(count("buffers"));
}

const base::Json* Document::array(std::string_view name) const {
  const base::Json* value = json_.find(name);
  if (value != nullptr && value->kind != base::Json::Kind::Array)
    top_->fail(name, fmt::format("an array was expected, not {}", base::kind_name(value->kind)));
  return value;
}

std::size_t Document::count(std::string_view array_name) const {
  const base::Json* value = array(array_name);
  return value == nullptr ? 0 : value->items.size();
}

Object Document::at(std::string_view array_name, std::size_t index) const {
  return {array(array_name)->items.at(index), fmt::format("/{}/{}", array_name, index)};
}

std::string Document::label(std::string_view array_name, std::size_t index) const {
  const std::string name = at(array_name, index).text("name");
  return name.empty() ? fmt::format("#{}", index) : fmt::format("'{}' (#{})", name, index);
}

std::size_t Document::reference(const Object& user, std::string_view key,
                                std::string_view array_name) const {
  const std::size_t index = user.whole(key);
  if (index >= count(array_name))
    user.fail(key, fmt::format("there is no #{} in '{}', which has {} entries", index, array_name,
                               count(array_name)));
  return index;
}

std::vector<std::size_t> Document::references(const Object& user, std::string_view key,
                                              std::string_view array_name) const {
  std::vector<std::size_t> out;
  const std::size_t entries = count(array_name);
  for (const double value : user.numbers(key)) {
    const base::Json& item = user.json().find(key)->items[out.size()];
    if (!item.integer || value < 0 || value >= static_cast<double>(entries))
      throw base::InputError(base::problem_at(
          item, base::child_pointer(base::child_pointer(user.pointer(), key), out.size()),
          fmt::format("an index into '{}', which has {} entries, was expected, not {}", array_name,
                      entries, value)));
    out.push_back(static_cast<std::size_t>(value));
  }
  return out;
}

void Document::charge(const Object& accessor, std::uint64_t numbers) {
  // A small file can name the same accessor thousands of times.
  if (numbers > kMostNumbers - decoded_)
    accessor.fail(
        fmt::format("the accessors in use hold more than {} numbers together, counted "
                    "at every use; split the file",
                    kMostNumbers));
  decoded_ += numbers;
}

std::string_view Document::buffer(std::size_t index) {
  const Object object = at("buffers", index);
  const std::size_t length = object.whole("byteLength", 1);
  if (!object.has("uri") && binary_ && index == 0) {
    // The chunk is padded to a multiple of 4.
    if (!chunk_) object.fail("a buffer without 'uri' is the BIN chunk of the file, which has none");
    if (chunk_->size() < length || chunk_->size() - length > 3)
      object.fail("byteLength", fmt::format("the BIN chunk has {} bytes, not {} and up to 3 more",
                                            chunk_->size(), length));
    return std::string_view(*chunk_).substr(0, length);
  }
  std::optional<std::string>& bytes = buffers_[index];
  if (!bytes) bytes = load(object, length);
  return std::string_view(*bytes).substr(0, length);
}

std::string Document::load(const Object& object, std::size_t length) {
  const std::string uri = object.text("uri");
  if (uri.empty())
    object.fail(
        "the buffer has no 'uri', and only the first buffer of a .glb can do without; "
        "compressed files have such buffers: export without compression");
  std::string bytes;
  if (is_data_uri(uri)) {
    bytes = decode_data_uri(uri, object);
  } else {
    try {
      const std::string name = decode_percent(uri, object);
      const std::string shown =
          (std::filesystem::path(source_.file).parent_path() / name).generic_string();
      const std::filesystem::path path = base::path_inside(root_, folder_, name);
      const base::FileReader reader(path, shown);
      if (reader.size() > base::kLargestFile - loaded_)
        object.fail("uri", fmt::format("the buffers together are longer than {} bytes",
                                       base::kLargestFile));
      bytes = base::read_file(path, shown);
    } catch (const base::InputError& error) {
      const base::Problem& problem = error.problems().front();
      if (!problem.pointer.empty()) throw;
      object.fail("uri", fmt::format("buffer '{}': {}", uri, problem.message));
    }
  }
  loaded_ += bytes.size();
  if (bytes.size() < length)
    object.fail("byteLength", fmt::format("the buffer has {} bytes, not {}", bytes.size(), length));
  return bytes;
}

}  // namespace input::gltf
