#pragma once

#include "harness/base/json.h"

#include <cstdint>
#include <filesystem>
#include <functional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

namespace base {

/// Largest file that is read whole, in bytes.
inline constexpr std::uintmax_t kLargestFile = std::uintmax_t{2} << 30;

/// Whole contents. Throws InputError naming `shown`: missing, a folder, unreadable, larger than
/// `largest` bytes.
std::string read_file(const std::filesystem::path& path, const std::string& shown,
                      std::uintmax_t largest = kLargestFile);

/// read_file() and the folder that paths in it are relative to, ready for parse_json().
JsonSource read_json_source(const std::filesystem::path& path, const std::string& shown,
                            std::uintmax_t largest = kLargestFile);

/// `relative` (written with '/') as found from `folder`, links resolved, if it stays inside `root`.
/// Throws InputError: absolute, has a scheme or a backslash, or leaves the root.
std::filesystem::path path_inside(const std::filesystem::path& root,
                                  const std::filesystem::path& folder, const std::string& relative);

/// Random access to a file for several threads at once; never loads it whole.
class FileReader {
 public:
  FileReader(const std::filesystem::path& path, std::string shown);  ///< throws InputError
  ~FileReader();
  FileReader(FileReader&& other) noexcept;
  FileReader& operator=(FileReader&&) = delete;

  std::uintmax_t size() const { return size_; }
  const std::string& shown() const { return shown_; }
  /// Fills `bytes` from `offset`. Throws InputError when the file ends before.
  void read(std::uintmax_t offset, std::span<std::byte> bytes) const;

 private:
  int descriptor_ = -1;
  std::uintmax_t size_ = 0;
  std::string shown_;
};

/// A new file that appears under its name whole or not at all: written beside it, synced, renamed
/// over, the folder synced. The destructor removes what was not committed. Throws OutputError.
class FileWriter {
 public:
  explicit FileWriter(std::filesystem::path path);  ///< makes missing folders
  ~FileWriter();
  FileWriter(const FileWriter&) = delete;
  FileWriter& operator=(const FileWriter&) = delete;

  void write(std::span<const std::byte> bytes);
  void write(std::string_view text);
  /// Makes it appear, under another name than planned when `path` is given (same folder).
  void commit(const std::filesystem::path& path = {});

 private:
  std::filesystem::path path_;
  std::filesystem::path partial_;
  int descriptor_ = -1;
};

/// Writes one whole file as FileWriter does.
void write_file(const std::filesystem::path& path, std::string_view text);

/// Tells whether `name` matches `glob`: `*` within a name, `**` across '/', `?` one character but
/// '/'.
bool glob_match(std::string_view glob, std::string_view name);

}  // namespace base
