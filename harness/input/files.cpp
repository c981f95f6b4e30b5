#include "harness/input/files.h"

#include "harness/base/file.h"

#include <fmt/format.h>

#include <algorithm>
#include <system_error>

namespace input {

namespace fs = std::filesystem;

namespace {

constexpr std::ptrdiff_t kMostValues = std::ptrdiff_t{1} << 23;

}  // namespace

std::string shown_path(const fs::path& path, const fs::path& root) {
  std::error_code error;
  const fs::path base = fs::weakly_canonical(root.empty() ? fs::path(".") : root, error);
  const fs::path relative = path.lexically_relative(base);
  return error || relative.empty() ? path.filename().generic_string() : relative.generic_string();
}

base::JsonSource read_json_text(const fs::path& path, const std::string& shown) {
  base::JsonSource source = base::read_json_source(path, shown);
  // Every value but the first follows a comma or an opening bracket.
  const auto values = std::count_if(source.text.begin(), source.text.end(),
                                    [](char c) { return c == ',' || c == '[' || c == '{'; });
  if (values > kMostValues)
    throw base::InputError(
        fmt::format("holds up to {} values, more than the {} that are read as JSON; write the "
                    "numbers as .npy",
                    values, kMostValues),
        shown);
  return source;
}

}  // namespace input
