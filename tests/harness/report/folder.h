#pragma once

#include "harness/base/file.h"

#include <atomic>
#include <filesystem>
#include <string>
#include <string_view>
#include <unistd.h>

namespace sample {

/// A folder of its own that goes with the object.
class Folder {
 public:
  Folder() {
    static std::atomic<int> counter{0};
    path_ = std::filesystem::temp_directory_path() /
            ("report_test_" + std::to_string(::getpid()) + "_" + std::to_string(counter++));
    std::filesystem::create_directories(path_);
  }
  ~Folder() {
    std::error_code ignored;
    std::filesystem::remove_all(path_, ignored);
  }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;

  std::filesystem::path operator/(const std::string& name) const { return path_ / name; }
  std::filesystem::path file(const std::string& name, std::string_view text) const {
    base::write_file(path_ / name, text);
    return path_ / name;
  }

 private:
  std::filesystem::path path_;
};

}  // namespace sample
