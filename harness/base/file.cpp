#include "harness/base/file.h"

#include <fmt/format.h>

#include <algorithm>
#include <atomic>
#include <cerrno>
#include <fcntl.h>
#include <sys/stat.h>
#include <system_error>
#include <unistd.h>
#include <utility>

namespace base {

namespace fs = std::filesystem;

namespace {

std::string reason(int code) {
  return std::generic_category().message(code);
}

[[noreturn]] void fail_output(const fs::path& path, std::string_view what, int code) {
  throw OutputError(fmt::format("{}: {}: {}", visible(path.string()), what, reason(code)));
}

void sync_folder(const fs::path& folder) {
  const int descriptor = ::open(folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
  if (descriptor < 0) fail_output(folder, "cannot be opened", errno);
  const int result = ::fsync(descriptor);
  const int code = errno;
  ::close(descriptor);
  // Some file systems cannot sync a folder; the rename itself has happened.
  if (result != 0 && code != EINVAL && code != EROFS) fail_output(folder, "cannot be synced", code);
}

bool is_within(const fs::path& root, const fs::path& path) {
  const auto [end, rest] = std::mismatch(root.begin(), root.end(), path.begin(), path.end());
  (void)rest;
  return end == root.end() || (std::next(end) == root.end() && end->empty());
}

}  // namespace

std::string read_file(const fs::path& path, const std::string& shown, std::uintmax_t largest) {
  const FileReader reader(path, shown);
  if (reader.size() > largest)
    throw InputError(
        fmt::format("is {} bytes long; files of more than {} are refused", reader.size(), largest),
        shown);
  std::string text(static_cast<std::size_t>(reader.size()), '\0');
  reader.read(0, std::as_writable_bytes(std::span(text)));
  return text;
}

JsonSource read_json_source(const fs::path& path, const std::string& shown,
                            std::uintmax_t largest) {
  return {shown, path.parent_path().string(), read_file(path, shown, largest)};
}

fs::path path_inside(const fs::path& root, const fs::path& folder, const std::string& relative) {
  const auto refuse = [&](std::string_view why) {
    throw InputError(
        fmt::format("the path '{}' {}; paths are relative to the file that names them, "
                    "written with '/', and stay inside the root folder",
                    relative, why),
        "");
  };
  if (relative.empty()) refuse("is empty");
  if (relative.find('\0') != std::string::npos) refuse("holds a zero byte");
  if (relative.find('\\') != std::string::npos) refuse("holds a backslash");
  if (relative.front() == '/') refuse("is absolute");
  const auto colon = relative.find(':');
  if (colon != std::string::npos && relative.find('/') > colon) refuse("has a scheme or drive");
  std::error_code error;
  const fs::path real_root = fs::weakly_canonical(root.empty() ? fs::path(".") : root, error);
  if (error) refuse("cannot be resolved: " + error.message());
  fs::path found =
      fs::weakly_canonical((folder.empty() ? fs::path(".") : folder) / relative, error);
  if (error) refuse("cannot be resolved: " + error.message());
  if (!is_within(real_root, found)) refuse("leaves the root folder");
  return found;
}

FileReader::FileReader(const fs::path& path, std::string shown) : shown_(std::move(shown)) {
  // Without O_NONBLOCK a named pipe would block for ever.
  descriptor_ = ::open(path.c_str(), O_RDONLY | O_CLOEXEC | O_NONBLOCK);
  if (descriptor_ < 0) {
    const int code = errno;
    throw InputError(code == ENOENT ? "no such file" : "cannot be read: " + reason(code), shown_);
  }
  struct stat status {};
  const bool known = ::fstat(descriptor_, &status) == 0;
  if (!known || !S_ISREG(status.st_mode)) {
    const bool folder = known && S_ISDIR(status.st_mode);
    ::close(descriptor_);
    throw InputError(folder ? "is a folder; a file was expected" : "is not a regular file", shown_);
  }
  size_ = static_cast<std::uintmax_t>(status.st_size);
}

FileReader::~FileReader() {
  if (descriptor_ >= 0) ::close(descriptor_);
}

FileReader::FileReader(FileReader&& other) noexcept
    : descriptor_(std::exchange(other.descriptor_, -1)),
      size_(other.size_),
      shown_(std::move(other.shown_)) {}

void FileReader::read(std::uintmax_t offset, std::span<std::byte> bytes) const {
  while (!bytes.empty()) {
    const ssize_t got =
        ::pread(descriptor_, bytes.data(), bytes.size(), static_cast<off_t>(offset));
    if (got < 0 && errno == EINTR) continue;
    if (got < 0) throw InputError("cannot be read: " + reason(errno), shown_);
    if (got == 0)
      throw InputError(
          fmt::format("ends after {} bytes; {} more were expected", offset, bytes.size()), shown_);
    bytes = bytes.subspan(static_cast<std::size_t>(got));
    offset += static_cast<std::uintmax_t>(got);
  }
}

FileWriter::FileWriter(fs::path path) : path_(std::move(path)) {
  static std::atomic<unsigned> counter{0};
  std::error_code error;
  const fs::path folder = path_.parent_path().empty() ? fs::path(".") : path_.parent_path();
  fs::create_directories(folder, error);
  if (error) fail_output(folder, "cannot be made", error.value());
  partial_ = folder / fmt::format(".{}.{}-{}.partial", path_.filename().string(), ::getpid(),
                                  counter.fetch_add(1));
  descriptor_ = ::open(partial_.c_str(), O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0644);
  if (descriptor_ < 0) fail_output(path_, "cannot be written", errno);
}

FileWriter::~FileWriter() {
  if (descriptor_ < 0) return;
  ::close(descriptor_);
  ::unlink(partial_.c_str());
}

void FileWriter::write(std::span<const std::byte> bytes) {
  while (!bytes.empty()) {
    const ssize_t put = ::write(descriptor_, bytes.data(), bytes.size());
    if (put < 0 && errno == EINTR) continue;
    if (put < 0) fail_output(path_, "cannot be written", errno);
    bytes = bytes.subspan(static_cast<std::size_t>(put));
  }
}

void FileWriter::write(std::string_view text) {
  write(std::as_bytes(std::span(text)));
}

void FileWriter::commit(const fs::path& path) {
  const fs::path target = path.empty() ? path_ : path;
  if (::fsync(descriptor_) != 0) fail_output(target, "cannot be synced", errno);
  const int descriptor = std::exchange(descriptor_, -1);
  if (::close(descriptor) != 0 || ::rename(partial_.c_str(), target.c_str()) != 0) {
    const int code = errno;
    ::unlink(partial_.c_str());
    fail_output(target, "cannot be written", code);
  }
  sync_folder(partial_.parent_path());
}

void write_file(const fs::path& path, std::string_view text) {
  FileWriter writer(path);
  writer.write(text);
  writer.commit();
}

bool glob_match(std::string_view glob, std::string_view name) {
  // Positions to return to when a later part fails: the last `*` and the last `**`.
  struct Star {
    std::size_t glob = std::string_view::npos, name = 0;
  } one, two;
  std::size_t g = 0;
  std::size_t n = 0;
  while (true) {
    if (g < glob.size() && glob[g] == '*') {
      const bool across = g + 1 < glob.size() && glob[g + 1] == '*';
      g += across ? 2 : 1;
      (across ? two : one) = {g, n};
      if (across) one = {};
      continue;
    }
    if (n == name.size() && g == glob.size()) return true;
    if (n < name.size() && g < glob.size() &&
        (glob[g] == name[n] || (glob[g] == '?' && name[n] != '/'))) {
      ++g, ++n;
      continue;
    }
    if (one.glob != std::string_view::npos && one.name < name.size() && name[one.name] != '/') {
      g = one.glob, n = ++one.name;
    } else if (two.glob != std::string_view::npos && two.name < name.size()) {
      one = {};
      g = two.glob, n = ++two.name;
    } else {
      return false;
    }
  }
}

}  // namespace base
