#pragma once

#include "harness/base/json.h"

#include <filesystem>
#include <string>

namespace input {

/// A file found inside `root`, as messages name it: the path from the root, with '/'.
std::string shown_path(const std::filesystem::path& path, const std::filesystem::path& root);

/// Text of a JSON file, refused when it may hold more values than fit in reasonable memory.
base::JsonSource read_json_text(const std::filesystem::path& path, const std::string& shown);

}  // namespace input
