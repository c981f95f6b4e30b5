#include "harness/base/error.h"
#include "harness/base/file.h"
#include "harness/base/sha256.h"
#include "harness/golden/golden.h"
#include "harness/golden/names.h"

#include <fmt/format.h>

#include <algorithm>
#include <cerrno>
#include <fcntl.h>
#include <sys/file.h>
#include <system_error>
#include <unistd.h>

namespace golden {

namespace fs = std::filesystem;

namespace {

[[noreturn]] void fail_output(const fs::path& path, std::string_view what, int code) {
  throw base::OutputError(fmt::format("{}: {}: {}", base::visible(path.string()), what,
                                      std::generic_category().message(code)));
}

/// Held by one sign-off at a time; the system lets go of it when the process ends, however it does.
class FolderLock {
 public:
  explicit FolderLock(const fs::path& folder)
      : descriptor_(::open(folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC)) {
    if (descriptor_ < 0) fail_output(folder, "cannot be opened", errno);
    int result = 0;
    do {
      result = ::flock(descriptor_, LOCK_EX);
    } while (result != 0 && errno == EINTR);
    if (result == 0) return;
    const int code = errno;
    ::close(descriptor_);
    fail_output(folder, "cannot be locked against other sign-offs", code);
  }
  ~FolderLock() { ::close(descriptor_); }
  FolderLock(const FolderLock&) = delete;
  FolderLock& operator=(const FolderLock&) = delete;

 private:
  int descriptor_;
};

// Hands the whole file to `take` in pieces.
template <typename Take>
void read_through(const base::FileReader& file, Take take) {
  std::vector<std::byte> buffer(std::size_t{1} << 20);
  for (std::uintmax_t at = 0; at < file.size(); at += buffer.size()) {
    const auto size =
        static_cast<std::size_t>(std::min<std::uintmax_t>(buffer.size(), file.size() - at));
    const std::span<std::byte> piece = std::span(buffer).first(size);
    file.read(at, piece);
    take(piece);
  }
}

std::string file_sha256(const fs::path& path) {
  base::Sha256 sha;
  read_through(base::FileReader(path, path.string()),
               [&](std::span<const std::byte> piece) { sha.add(piece); });
  return sha.hex();
}

bool holds(const fs::path& path, const std::string& sha256) {
  std::error_code error;
  if (!fs::is_regular_file(fs::symlink_status(path, error))) return false;
  return file_sha256(path) == sha256;
}

[[noreturn]] void fail_hash(const fs::path& path) {
  throw base::InputError(
      "is not the file that its record describes (another SHA-256); run the gate again",
      path.string());
}

// What is to become a golden must be one by itself.
void check_candidate(const fs::path& source, const model::Record& record) {
  const fs::path path = source / kRecordName;
  if (!record.signoffs.empty())
    throw base::InputError("is signed off already; the candidate of a gate was expected",
                           path.string());
  const fs::path frames = source / record.frames_file;
  if (file_sha256(frames) != record.frames_sha256) fail_hash(frames);
  const FramesReader reader(frames, frames.string());
  if (reader.frames() != record.frames || reader.rest().size() != record.vertices ||
      reader.faces().size() != record.faces)
    throw base::InputError(
        fmt::format("says {} frames, {} vertices, {} faces, but {} has {}, {}, {}; run the gate "
                    "again",
                    record.frames, record.vertices, record.faces, record.frames_file,
                    reader.frames(), reader.rest().size(), reader.faces().size()),
        path.string());
}

// The sign-offs that the new record carries: this one, then those of the golden it replaces.
std::vector<model::SignOff> chain(const fs::path& target, model::SignOff signoff) {
  signoff.predecessor.clear();
  const fs::path path = target / kRecordName;
  std::error_code error;
  if (fs::symlink_status(path, error).type() == fs::file_type::not_found) return {signoff};
  std::vector<model::SignOff> earlier;
  try {
    earlier = read_record(path, path.string()).signoffs;
  } catch (const base::InputError& damaged) {
    std::vector<base::Problem> problems = damaged.problems();
    problems.push_back(
        {"the golden to be replaced cannot be read, so its sign-offs would be lost; restore the "
         "record, or remove it by hand to begin anew",
         path.string(), 0, 0, ""});
    throw base::InputError(std::move(problems));
  }
  if (earlier.empty())
    throw base::InputError(
        "is signed off by nobody and so no golden; remove it by hand to begin anew", path.string());
  signoff.predecessor = file_sha256(path);
  earlier.insert(earlier.begin(), std::move(signoff));
  return earlier;
}

void copy_frames(const fs::path& from, const fs::path& to, const std::string& sha256) {
  base::FileWriter writer(to);
  base::Sha256 sha;
  read_through(base::FileReader(from, from.string()), [&](std::span<const std::byte> piece) {
    sha.add(piece);
    writer.write(piece);
  });
  if (sha.hex() != sha256) fail_hash(from);
  writer.commit();
}

// What a crash left behind, and frames files other than `kept`. What cannot be removed stays: it
// harms nobody, and the next sign-off tries again.
void remove_leftovers(const fs::path& target, bool (*is_left)(std::string_view),
                      const std::string& kept) {
  std::error_code error;
  std::vector<fs::path> left;
  for (fs::directory_iterator at(target, error), end; !error && at != end; at.increment(error)) {
    const std::string name = at->path().filename().string();
    if (name != kept && is_left(name)) left.push_back(at->path());
  }
  for (const fs::path& path : left) fs::remove(path, error);
}

bool is_partial(std::string_view name) {
  return base::glob_match(".record.json.*.partial", name) ||
         base::glob_match(".frames-*.bin.*.partial", name);
}

}  // namespace

// The nearest folder that exists must take new files.
void check_writable(const fs::path& target) {
  fs::path place = target.empty() ? fs::path(".") : target;
  std::error_code error;
  while (!fs::exists(place, error)) {
    if (error) fail_output(place, "cannot be looked at", error.value());
    place = place.has_parent_path() && place != place.parent_path() ? place.parent_path() : ".";
  }
  if (!fs::is_directory(place, error)) fail_output(place, "goldens cannot be written", ENOTDIR);
  if (::access(place.c_str(), W_OK | X_OK) != 0)
    fail_output(place, "goldens cannot be written", errno);
}

std::vector<fs::path> planned_writes(const fs::path& target, const model::Record& candidate) {
  std::vector<fs::path> paths;
  const fs::path frames = target / candidate.frames_file;
  if (!holds(frames, candidate.frames_sha256)) paths.push_back(frames);
  paths.push_back(target / kRecordName);
  return paths;
}

void sign(const fs::path& source, const fs::path& target, const model::SignOff& signoff) {
  model::Record record = read_record(source / kRecordName, (source / kRecordName).string());
  check_candidate(source, record);
  check_writable(target);
  chain(target, signoff);  // refuses before a folder is made

  std::error_code error;
  fs::create_directories(target, error);
  if (error) fail_output(target, "cannot be made", error.value());
  const FolderLock lock(target);
  record.signoffs = chain(target, signoff);
  remove_leftovers(target, is_partial, "");
  const fs::path frames = target / record.frames_file;
  if (!holds(frames, record.frames_sha256))
    copy_frames(source / record.frames_file, frames, record.frames_sha256);
  base::write_file(target / kRecordName, write_record(record));
  remove_leftovers(target, is_frames_file_name, record.frames_file);
}

}  // namespace golden
