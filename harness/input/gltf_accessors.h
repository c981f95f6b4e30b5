#pragma once

#include "harness/input/gltf_document.h"
#include "metrics/surface.h"

#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

namespace input::gltf {

/// How one component is stored; a set of them is a sum.
using Storage = unsigned;
inline constexpr Storage kF32 = 1;
inline constexpr Storage kU8 = 2;
inline constexpr Storage kU16 = 4;
inline constexpr Storage kU32 = 8;
inline constexpr Storage kI8 = 16;
inline constexpr Storage kI16 = 32;
inline constexpr Storage kUnormU8 = 64;
inline constexpr Storage kUnormU16 = 128;
inline constexpr Storage kSnormI8 = 256;
inline constexpr Storage kSnormI16 = 512;
inline constexpr Storage kNormalized = kUnormU8 | kUnormU16 | kSnormI8 | kSnormI16;

/// What an accessor is used for decides what it may be.
struct Use {
  std::string_view type;  ///< "SCALAR", "VEC3", "VEC4" or "MAT4"
  Storage allowed = 0;    ///< sum of those it may have
  bool vertex = false;    ///< a vertex attribute: may be interleaved, elements on 4-byte boundaries
};

/// A checked accessor: every element lies within its buffer.
struct Accessor {
  Object object;
  std::string what;  ///< "accessor #3 (POSITION of /meshes/0/primitives/0)", for messages
  Storage storage = kF32;
  std::size_t components = 1;
  std::size_t count = 0;   ///< elements, at least 1
  std::size_t stride = 0;  ///< bytes from element to element
  std::string_view bytes;  ///< from the first element on
};

/// The accessor that a member of `user` names; `use` says what it may be.
Accessor open_accessor(Document& document, const Object& user, std::string_view key,
                       const Use& use);

/// All components of all elements, normalized integers as c/255 or c/65535. All finite.
/// Precondition: storage kF32, kUnormU8 or kUnormU16.
std::vector<double> decode_numbers(const Accessor& accessor);

/// The same for unsigned integers. Precondition: storage kU8, kU16 or kU32.
std::vector<metrics::Index> decode_indices(const Accessor& accessor);

}  // namespace input::gltf
