#pragma once

#include "harness/skinning/skinning.h"
#include "tests/support/shapes.h"

#include <string>
#include <utility>
#include <vector>

namespace tests {

using skinning::Affine;
using skinning::Prepared;

/// (joint, weight) pairs of one vertex.
using Run = std::vector<std::pair<Index, double>>;

inline model::Influences influences_of(const std::vector<Run>& runs) {
  model::Influences result;
  result.first.push_back(0);
  for (const Run& run : runs) {
    for (const auto& [joint, weight] : run) {
      result.joint.push_back(joint);
      result.weight.push_back(weight);
    }
    result.first.push_back(static_cast<Index>(result.joint.size()));
  }
  return result;
}

inline std::vector<Run> runs_of(const model::Influences& influences) {
  std::vector<Run> runs;
  for (std::size_t v = 0; v + 1 < influences.first.size(); ++v) {
    Run& run = runs.emplace_back();
    for (std::size_t i = influences.first[v]; i < influences.first[v + 1]; ++i) {
      run.emplace_back(influences.joint[i], influences.weight[i]);
    }
  }
  return runs;
}

/// Joints ranked by their index.
inline Prepared prepared_of(const Points& rest, const std::vector<Run>& runs,
                            std::size_t joint_count) {
  Prepared prepared;
  prepared.rest = rest;
  prepared.influences = influences_of(runs);
  prepared.joint_count = joint_count;
  for (std::size_t j = 0; j < joint_count; ++j) prepared.joint_rank.push_back(static_cast<int>(j));
  return prepared;
}

inline Affine affine(const Eigen::Matrix3d& linear, const Point& translation = Point::Zero()) {
  Affine M;
  M << linear, translation;
  return M;
}

/// First b, then a.
inline Affine after(const Affine& a, const Affine& b) {
  return affine(a.leftCols<3>() * b.leftCols<3>(), a.leftCols<3>() * b.col(3) + a.col(3));
}

inline Affine inverse_of_rigid(const Affine& G) {
  const Eigen::Matrix3d turned = G.leftCols<3>().transpose();
  return affine(turned, -(turned * G.col(3)));
}

inline Points moved(const Points& points, const Affine& M) {
  return moved(points, Eigen::Matrix3d(M.leftCols<3>()), Point(M.col(3)));
}

inline Affine random_rigid(Random& random, double reach) {
  const Eigen::Matrix3d R = rotation(random.point(-1, 1), random.uniform(-3, 3));
  return affine(R, random.point(-reach, reach));
}

inline double largest_distance(const Points& a, const Points& b) {
  if (a.size() != b.size()) return std::numeric_limits<double>::infinity();
  double largest = 0;
  for (std::size_t i = 0; i < a.size(); ++i) {
    const double distance = (a[i] - b[i]).norm();
    if (!(distance <= largest)) largest = distance;  // NaN comes through
  }
  return largest;
}

inline constexpr std::size_t kTubeJoints = 8;
inline constexpr double kTubeDiagonal = 9.5;  ///< of the box around the tube: 2 x 2 x 9

/// A tube on eight joints, one to five of them to a vertex, that turn far from each other so that
/// quaternions point to opposite sides. Every third vertex has a tie between its heaviest two.
struct TubeRig {
  Prepared prepared;
  std::vector<Affine> matrices;
};

inline TubeRig random_tube(std::uint64_t seed) {
  Random random(seed);
  TubeOptions options;
  options.rings = 9;
  options.sides = 12;
  options.length = 9;
  const Shape shape = tube(options);
  std::vector<Run> runs;
  for (std::size_t v = 0; v < shape.points.size(); ++v) {
    const std::size_t count = 1 + random.bits() % 5;
    const std::size_t start = random.bits() % kTubeJoints;
    Run run;
    double total = 0;
    for (std::size_t k = 0; k < count; ++k) {
      const double weight = k == 1 && v % 3 == 0 ? run[0].second : random.uniform(0.1, 1);
      run.emplace_back(static_cast<Index>((start + 3 * k) % kTubeJoints),
                       k > 1 ? 0.1 * weight : weight);
      total += run.back().second;
    }
    for (auto& [joint, weight] : run) weight /= total;
    runs.push_back(run);
  }
  TubeRig rig{prepared_of(shape.points, runs, kTubeJoints), {}};
  for (std::size_t j = 0; j < kTubeJoints; ++j) rig.matrices.push_back(random_rigid(random, 2));
  return rig;
}

/// A method with all its parameters at their defaults.
inline model::MethodSpec with_defaults(const skinning::Method& method) {
  model::MethodSpec spec;
  spec.name = spec.skinning = method.spec.name;
  for (const model::ParameterSpec& parameter : method.spec.parameters) {
    switch (parameter.kind) {
      case model::ParameterSpec::Kind::Number:
      case model::ParameterSpec::Kind::Integer:
        spec.parameters[parameter.name] = parameter.fallback;
        break;
      case model::ParameterSpec::Kind::Choice:
        spec.parameters[parameter.name] = parameter.choices.front();
        break;
      case model::ParameterSpec::Kind::Text:
      case model::ParameterSpec::Kind::File:
        break;
    }
  }
  return spec;
}

inline Points deformed(const model::MethodSpec& method, const Prepared& prepared,
                       const std::vector<Affine>& matrices) {
  Points out;
  skinning::find_method(method.skinning).prepare(prepared, method)(0, matrices, out);
  return out;
}

inline Points deformed(const std::string& method, const Prepared& prepared,
                       const std::vector<Affine>& matrices) {
  return deformed(with_defaults(skinning::find_method(method)), prepared, matrices);
}

}  // namespace tests
