#include "harness/input/gltf_accessors.h"

#include <fmt/format.h>

#include <array>
#include <bit>
#include <cmath>

namespace input::gltf {

namespace {

struct Component {
  std::size_t code = 0, size = 0;
  Storage plain = kF32, normalized = kF32;
  std::string_view name;
};

constexpr std::array kComponents = {
    Component{5120, 1, kI8, kSnormI8, "signed byte"},
    Component{5121, 1, kU8, kUnormU8, "unsigned byte"},
    Component{5122, 2, kI16, kSnormI16, "signed short"},
    Component{5123, 2, kU16, kUnormU16, "unsigned short"},
    Component{5125, 4, kU32, kU32, "unsigned int"},
    Component{5126, 4, kF32, kF32, "float"},
};

std::string storage_names(Storage allowed) {
  std::string out;
  for (const Component& component : kComponents)
    for (const bool normalized : {false, true}) {
      const Storage storage = normalized ? component.normalized : component.plain;
      if ((allowed & storage) == 0 || (normalized && component.normalized == component.plain))
        continue;
      out += fmt::format("{}{}{}", out.empty() ? "" : " or ", normalized ? "normalized " : "",
                         component.name);
    }
  return out;
}

const Component& component_of(const Accessor& accessor) {
  const std::size_t code = accessor.object.whole("componentType");
  for (const Component& component : kComponents)
    if (component.code == code) return component;
  accessor.object.fail("componentType",
                       fmt::format("{}: {} is no component type of glTF", accessor.what, code));
}

std::size_t components_of(std::string_view type) {
  if (type == "SCALAR") return 1;
  if (type == "VEC3") return 3;
  return type == "VEC4" ? 4 : 16;
}

void check_type(const Accessor& accessor, const Component& component, const Use& use) {
  const Object& object = accessor.object;
  if (object.has("sparse"))
    object.fail("sparse", fmt::format("{} is sparse: not in this version; export without sparse "
                                      "accessors",
                                      accessor.what));
  if (object.text("type") != use.type)
    object.fail("type", fmt::format("{} must be of type {}, not '{}'", accessor.what, use.type,
                                    object.text("type")));
  const bool normalized = object.flag("normalized");
  if (normalized && component.plain == component.normalized)
    object.fail("normalized",
                fmt::format("{}: {} numbers cannot be normalized", accessor.what, component.name));
  if ((use.allowed & accessor.storage) != 0) return;
  const bool quantized = use.vertex && use.allowed == kF32;
  object.fail(
      "componentType",
      fmt::format("{} must hold {} numbers, not {}{}{}", accessor.what, storage_names(use.allowed),
                  normalized ? "normalized " : "", component.name,
                  quantized ? "; quantized meshes: not in this version" : ""));
}

// Sets stride and bytes: the elements within the view, the view within the buffer.
void find_bytes(Document& document, Accessor& accessor, std::size_t size, bool vertex) {
  const Object& object = accessor.object;
  if (!object.has("bufferView"))
    object.fail(
        fmt::format("{} has no 'bufferView': compressed or all zeros, not in this "
                    "version; export without compression",
                    accessor.what));
  const std::size_t index = document.reference(object, "bufferView", "bufferViews");
  const Object view = document.at("bufferViews", index);
  const std::string_view buffer = document.buffer(document.reference(view, "buffer", "buffers"));
  const std::size_t view_offset = view.whole_or("byteOffset", 0);
  const std::size_t view_length = view.whole("byteLength", 1);
  if (view_offset > buffer.size() || view_length > buffer.size() - view_offset)
    view.fail(fmt::format("{} bytes from byte {} do not fit the buffer, which has {}", view_length,
                          view_offset, buffer.size()));

  const std::size_t element = size * accessor.components;
  const std::size_t stride = view.whole_or("byteStride", element);
  const bool fits_stride = vertex ? stride % 4 == 0 && stride >= 4 && stride <= 252 : true;
  if (view.has("byteStride") && (!fits_stride || stride < element || stride % size != 0))
    view.fail("byteStride", fmt::format("{} is no byte stride for elements of {} bytes (a "
                                        "multiple of 4, from the size of an element to 252)",
                                        stride, element));
  if (!vertex && stride != element)
    view.fail("byteStride",
              fmt::format("{} is no vertex attribute and may not be interleaved", accessor.what));
  accessor.stride = stride;

  const std::size_t offset = object.whole_or("byteOffset", 0);
  const std::size_t unit = vertex ? 4 : size;
  if (offset % unit != 0 || view_offset % size != 0 || stride % unit != 0)
    object.fail("byteOffset",
                fmt::format("{} begins at byte {} of a view at byte {} with {} bytes an element; "
                            "its elements must stand on multiples of {}",
                            accessor.what, offset, view_offset, stride, unit));
  const std::size_t available = offset > view_length ? 0 : view_length - offset;
  if (available < element || accessor.count - 1 > (available - element) / stride)
    object.fail(
        fmt::format("{} does not fit buffer view #{}: {} elements of {} bytes, {} apart, "
                    "in {} bytes",
                    accessor.what, index, accessor.count, element, stride, available));
  accessor.bytes = buffer.substr(view_offset + offset, available);
}

// Little-endian, as glTF says, on any host.
template <typename Integer>
Integer load(const char* at) {
  Integer value = 0;
  for (std::size_t i = 0; i < sizeof(Integer); ++i)
    value = static_cast<Integer>(
        value |
        static_cast<Integer>(static_cast<Integer>(static_cast<unsigned char>(at[i])) << (8 * i)));
  return value;
}

template <typename Number, typename Convert>
std::vector<Number> decode(const Accessor& accessor, std::size_t size, Convert convert) {
  std::vector<Number> out(accessor.count * accessor.components);
  for (std::size_t i = 0; i < accessor.count; ++i)
    for (std::size_t c = 0; c < accessor.components; ++c)
      out[i * accessor.components + c] =
          convert(accessor.bytes.data() + i * accessor.stride + c * size);
  return out;
}

}  // namespace

Accessor open_accessor(Document& document, const Object& user, std::string_view key,
                       const Use& use) {
  const std::size_t index = document.reference(user, key, "accessors");
  Accessor accessor{.object = document.at("accessors", index),
                    .what = fmt::format("accessor #{} ({} of {})", index, key, user.pointer()),
                    .components = components_of(use.type),
                    .bytes = {}};
  const Component& component = component_of(accessor);
  accessor.storage = accessor.object.flag("normalized") ? component.normalized : component.plain;
  check_type(accessor, component, use);
  accessor.count = accessor.object.whole("count", 1);
  find_bytes(document, accessor, component.size, use.vertex);
  document.charge(accessor.object, std::uint64_t{accessor.count} * accessor.components);
  return accessor;
}

std::vector<double> decode_numbers(const Accessor& accessor) {
  if (accessor.storage == kUnormU8)
    return decode<double>(accessor, 1,
                          [](const char* at) { return load<std::uint8_t>(at) / 255.0; });
  if (accessor.storage == kUnormU16)
    return decode<double>(accessor, 2,
                          [](const char* at) { return load<std::uint16_t>(at) / 65535.0; });
  std::vector<double> out = decode<double>(accessor, 4, [](const char* at) {
    return static_cast<double>(std::bit_cast<float>(load<std::uint32_t>(at)));
  });
  for (std::size_t i = 0; i < out.size(); ++i)
    if (!std::isfinite(out[i]))
      accessor.object.fail(fmt::format("{}: component {} of element {} is not a finite number",
                                       accessor.what, i % accessor.components,
                                       i / accessor.components));
  return out;
}

std::vector<metrics::Index> decode_indices(const Accessor& accessor) {
  if (accessor.storage == kU8)
    return decode<metrics::Index>(accessor, 1,
                                  [](const char* at) { return load<std::uint8_t>(at); });
  if (accessor.storage == kU16)
    return decode<metrics::Index>(accessor, 2,
                                  [](const char* at) { return load<std::uint16_t>(at); });
  return decode<metrics::Index>(accessor, 4,
                                [](const char* at) { return load<std::uint32_t>(at); });
}

}  // namespace input::gltf
