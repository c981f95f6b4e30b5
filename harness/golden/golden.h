#pragma once

#include "harness/base/file.h"
#include "harness/model/golden.h"
#include "metrics/surface.h"

#include <filesystem>
#include <memory>
#include <string>
#include <vector>

/// Record and frames files of goldens, and of the candidates that a gate writes for sign-off.
namespace golden {

/// SHA-256 of positions as they are, before any rounding: little-endian doubles, -0 as +0.
std::string frame_sha256(const metrics::Points& positions);

/// Appends frames to a new frames file, a block at a time; memory is one block.
class FramesWriter {
 public:
  /// `folder` is made if missing. `grain` > 0: positions are stored as multiples of it.
  FramesWriter(std::filesystem::path folder, const metrics::Points& rest,
               const std::vector<metrics::Face>& faces, double grain);
  ~FramesWriter();  ///< removes an uncommitted file
  void add(double time, const metrics::Points& positions);
  /// Completes the file, names it by its hash and returns the name.
  struct Written {
    std::string file, sha256;
    std::vector<std::string> frame_sha256;
    std::size_t frames = 0, non_finite = 0;
    double largest_coordinate = 0;  ///< of the finite ones
  };
  Written commit();

 private:
  struct State;
  std::unique_ptr<State> state_;
};

/// A frames file, checked as it is read: any fault is an InputError that names the file.
/// Safe to read from several threads.
class FramesReader {
 public:
  FramesReader(const std::filesystem::path& path, std::string shown);
  ~FramesReader();
  FramesReader(FramesReader&&) noexcept;
  const metrics::Points& rest() const;
  const std::vector<metrics::Face>& faces() const;
  const std::vector<double>& times() const;
  double grain() const;
  std::size_t frames() const;
  /// Positions of one frame; NaN where a coordinate was no finite number.
  void read(std::size_t frame, metrics::Points& out) const;

 private:
  struct State;
  std::unique_ptr<State> state_;
};

/// record.json. read_record() throws InputError: damaged, another version, fields that contradict.
model::Record read_record(const std::filesystem::path& path, const std::string& shown);
std::string write_record(const model::Record& record);  ///< JSON text with sorted keys

/// Where a case's golden or candidate stands below DIR/<suite>.
std::filesystem::path case_folder(const std::filesystem::path& folder, const std::string& suite,
                                  const std::string& case_name);

/// Paths that signing `candidate` into `target` would write, in order.
std::vector<std::filesystem::path> planned_writes(const std::filesystem::path& target,
                                                  const model::Record& candidate);

/// Throws OutputError unless goldens could be written into `target`, which need not exist yet.
void check_writable(const std::filesystem::path& target);

/// Makes the candidate in `source` the golden in `target`: frames file copied, checked against the
/// record's hash and synced, record renamed over, then frames files no record names removed.
/// Throws InputError (candidate damaged) or OutputError (target not writable; nothing changed).
void sign(const std::filesystem::path& source, const std::filesystem::path& target,
          const model::SignOff& signoff);

}  // namespace golden
