#pragma once

#include "harness/model/result.h"

#include <map>
#include <optional>
#include <string>
#include <vector>

namespace model {

struct SignOff {
  std::string by, role, when, why;  ///< when: ISO 8601, UTC
  std::string predecessor;  ///< SHA-256 of the record this one replaced; empty for the first
};

/// Worst value of a statistic over the frames of a golden, for people who read the record.
struct RecordedWorst {
  double value = 0;
  std::size_t frame = 0;
};

/// record.json of a golden; of a candidate (a gate's output) `signoffs` is empty.
struct Record {
  std::string suite, name;  ///< name: rig/motion/method
  std::string program;      ///< version that computed it
  std::string frames_file;  ///< frames-<16 hex digits>.bin
  std::string frames_sha256;
  std::size_t frames = 0, vertices = 0, faces = 0;
  double diagonal = 0;   ///< D
  double grain = 0;      ///< file units
  double magnitude = 0;  ///< M of the contract's floor, file units
  double weld = 0;
  std::map<std::string, double> bind_scale;  ///< per skin, where it is not 1
  Fingerprints inputs;
  std::map<std::string, RecordedWorst> worst;  ///< per statistic
  std::vector<std::string> frame_sha256;       ///< of the unrounded positions
  std::size_t non_finite = 0;                  ///< coordinates that are no finite number
  std::vector<SignOff> signoffs;               ///< newest first
};

}  // namespace model
