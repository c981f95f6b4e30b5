#include "harness/base/file.h"

#include <catch2/catch.hpp>

#include <fstream>
#include <stdlib.h>
#include <sys/stat.h>

namespace fs = std::filesystem;

namespace {

struct Folder {
  fs::path path;
  Folder() {
    std::string name = (fs::temp_directory_path() / "skinfold-file-XXXXXX").string();
    path = mkdtemp(name.data());
  }
  ~Folder() { fs::remove_all(path); }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;
};

std::size_t entries(const fs::path& folder) {
  return static_cast<std::size_t>(std::distance(fs::directory_iterator(folder), {}));
}

}  // namespace

// Catches: a file that appears half written, or a temporary file that stays behind.
TEST_CASE("a written file appears whole or not at all") {
  const Folder folder;
  {
    base::FileWriter writer(folder.path / "sub" / "a.txt");
    writer.write(std::string_view("half"));
    CHECK_FALSE(fs::exists(folder.path / "sub" / "a.txt"));
  }
  CHECK(entries(folder.path / "sub") == 0);
  base::write_file(folder.path / "sub" / "a.txt", "one");
  base::write_file(folder.path / "sub" / "a.txt", "two");
  CHECK(base::read_file(folder.path / "sub" / "a.txt", "a.txt") == "two");
  CHECK(entries(folder.path / "sub") == 1);
  CHECK_THROWS_AS(base::write_file("/dev/null/x/y", "z"), base::OutputError);
}

// Catches: a message without the reason, a folder or pipe read as a file (a pipe would hang).
TEST_CASE("what cannot be read is said") {
  const Folder folder;
  const auto fault = [&](const fs::path& path) {
    try {
      base::read_file(path, "shown");
    } catch (const base::InputError& error) {
      return std::string(error.what());
    }
    return std::string();
  };
  CHECK(fault(folder.path / "absent") == "shown: no such file");
  CHECK(fault(folder.path) == "shown: is a folder; a file was expected");
  REQUIRE(mkfifo((folder.path / "pipe").c_str(), 0600) == 0);
  CHECK(fault(folder.path / "pipe") == "shown: is not a regular file");
}

// Catches: an asset that reads files it has no business with, by dots, links, schemes or drives.
TEST_CASE("paths stay inside the root") {
  const Folder folder;
  const fs::path root = folder.path / "root";
  fs::create_directories(root / "a");
  std::ofstream(folder.path / "secret") << "x";
  fs::create_symlink(folder.path / "secret", root / "a" / "link");
  fs::create_directory_symlink(folder.path, root / "a" / "up");
  CHECK(base::path_inside(root, root / "a", "../b.txt") == fs::canonical(root) / "b.txt");
  for (const char* bad :
       {"../../secret", "/etc/passwd", "link", "up/secret", "http://x/y", "c:/x", "a\\b", ""})
    CHECK_THROWS_AS(base::path_inside(root, root / "a", bad), base::InputError);
  fs::create_directories(folder.path / "rootless");
  CHECK_THROWS_AS(base::path_inside(root, root, "../rootless/x"), base::InputError);
}

// Catches: `*` that crosses a '/', `**` that does not, backtracking that gives up or never ends.
TEST_CASE("globs") {
  CHECK(base::glob_match("*/walk/*", "lod0/walk/ship"));
  CHECK_FALSE(base::glob_match("*", "lod0/walk/ship"));
  CHECK(base::glob_match("**", "lod0/walk/ship"));
  CHECK(base::glob_match("**/ship", "lod0/walk/ship"));
  CHECK(base::glob_match("l?d0/**", "lod0/walk/ship"));
  CHECK_FALSE(base::glob_match("lod0?walk/ship", "lod0/walk/ship"));
  CHECK(base::glob_match("*o*0/*k/s*p", "lod0/walk/ship"));
  CHECK_FALSE(base::glob_match("*/*", "lod0/walk/ship"));
  CHECK(base::glob_match("", ""));
  CHECK_FALSE(base::glob_match("", "a"));
  CHECK_FALSE(base::glob_match("*a*a*a*a*a*a*a*a*a*b", std::string(2000, 'a')));
}
