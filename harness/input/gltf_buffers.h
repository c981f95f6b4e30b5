#pragma once

#include "harness/input/gltf_document.h"

#include <string>
#include <string_view>

namespace input::gltf {

bool is_data_uri(std::string_view uri);

/// Bytes of "data:TYPE;base64,TEXT". The text must be strict RFC 4648: padded, nothing else in it,
/// unused bits zero. `buffer` is blamed.
std::string decode_data_uri(std::string_view uri, const Object& buffer);

/// `uri` with every %XX (RFC 3986) replaced by its byte.
std::string decode_percent(std::string_view uri, const Object& buffer);

}  // namespace input::gltf
