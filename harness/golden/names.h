#pragma once

#include <string>
#include <string_view>

namespace golden {

inline constexpr const char* kRecordName = "record.json";

/// Whether `text` is a SHA-256 as this program writes it: 64 lower-case hexadecimal digits.
bool is_sha256(std::string_view text);

/// "frames-<first 16 digits of `sha256`>.bin".
std::string frames_file_name(std::string_view sha256);

/// Whether `name` is of that form; no other file is ever opened or removed as a frames file.
bool is_frames_file_name(std::string_view name);

}  // namespace golden
