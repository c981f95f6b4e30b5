#pragma once

#include "harness/base/error.h"

#include <filesystem>
#include <map>
#include <optional>
#include <string>
#include <variant>
#include <vector>

namespace model {

/// A file named in a suite: the path as written, and where the writing file stands.
struct FileRef {
  std::string path;              ///< as written, with '/'
  std::filesystem::path folder;  ///< of the file that names it
  base::Problem place;           ///< of the name; message empty
};

enum class WeightRule { AsIs, Normalize, Refuse };

struct RigSpec {
  std::string name;
  std::optional<FileRef> file;           ///< a glTF file, or
  std::optional<FileRef> mesh, binding;  ///< an OBJ, with or without a binding
  std::vector<std::string> skins;        ///< addresses; empty: the only one
  base::Problem place;
};

struct SweepEntrySpec {
  std::string joint;  ///< address
  std::vector<double> axis;
  double from = 0, to = 0;
  base::Problem place;
};

struct MotionSpec {
  enum class Kind { Sweep, Clip, Poses, Frames } kind = Kind::Frames;
  std::string name;
  std::vector<std::string> tags;
  std::vector<SweepEntrySpec> sweep;
  std::size_t frames = 0;       ///< Sweep, Frames
  std::optional<double> rate;   ///< frames a second
  std::string clip;             ///< Clip: address, or "*"
  std::optional<FileRef> file;  ///< Clip: other file than the rig's; Poses: the poses
  bool span_keys = false;       ///< Clip: start at the first key
  std::optional<std::pair<double, double>> span;  ///< Clip: seconds
  base::Problem place;
};

/// One parameter of a skinning method: what it may be, and what it is when not said.
struct ParameterSpec {
  enum class Kind { Number, Integer, Text, File, Choice } kind = Kind::Number;
  std::string name;
  std::string summary;
  double fallback = 0;
  double low = 0, high = 0;
  std::vector<std::string> choices;  ///< Choice: the first is the default
  bool required = false;
};

/// What the suite reader must know of a skinning method.
struct SkinningSpec {
  std::string name;
  std::string summary;
  std::string source;
  std::vector<ParameterSpec> parameters;
  bool computes = true;  ///< false: takes what an engine computed
};

using Parameter = std::variant<double, std::string, FileRef>;

struct MethodSpec {
  std::string name;
  std::string skinning;
  std::map<std::string, Parameter> parameters;  ///< all of the skinning's, defaults filled in
  std::string against;  ///< method compared with instead of the golden; or empty
  base::Problem place;

  double number(const std::string& key) const { return std::get<double>(parameters.at(key)); }
  const std::string& text(const std::string& key) const {
    return std::get<std::string>(parameters.at(key));
  }
};

struct LimitBound {
  std::optional<double> low, high;
  bool between = false;
};

struct DriftBound {
  std::optional<double> at_most;
  double relative = 0;
};

enum class Profile { Exact, Rounding, Reexport };

struct CaseSpec {
  std::string name;  ///< rig/motion/method
  std::size_t rig = 0, motion = 0, method = 0;
  std::map<std::string, LimitBound> limits;  ///< what the suite sets, by statistic
  std::vector<std::string> removed_limits;   ///< set always, but taken away by null
  Profile profile = Profile::Rounding;
  std::map<std::string, DriftBound> drift;
  std::vector<std::string> removed_drift;
};

struct Suite {
  std::string name;
  std::string file;            ///< as the user named it
  std::filesystem::path root;  ///< paths stay inside; goldens live in root/golden
  std::vector<RigSpec> rigs;
  std::vector<MotionSpec> motions;
  std::vector<MethodSpec> methods;
  WeightRule weights = WeightRule::AsIs;
  double weld = 1e-7;
  std::vector<CaseSpec> cases;  ///< in the order rig, motion, method of the suite
  std::string resolved;         ///< JSON text of the suite with everything it uses merged in
};

}  // namespace model
