#pragma once

#include "harness/model/motion.h"
#include "harness/model/rig.h"
#include "harness/model/suite.h"

#include <Eigen/Core>

#include <functional>
#include <optional>
#include <span>
#include <vector>

namespace skinning {

using Affine = Eigen::Matrix<double, 3, 4>;

/// Joint-to-model matrices of a frame, one per joint of the rig; empty for NoPose.
/// A node given as a matrix is taken apart where the motion moves it: x -> T + R * S * x with R the
/// rotation nearest to its columns brought to length 1 (a reflection turns the first around) and S
/// what is left, shear included. Precondition: frame < times.size().
std::vector<Eigen::Matrix4d> joint_to_model(const model::Rig& rig, const model::Motion& motion,
                                            std::size_t frame);

/// Skinning matrices for the rest shape: joint-to-model * inverse bind, its linear part divided by
/// the bind scale of the skin. Empty without joint_to_model; bottom rows are never read.
std::vector<Affine> skinning_matrices(const model::Rig& rig,
                                      std::span<const Eigen::Matrix4d> joint_to_model);

/// What every method starts from: the rest shape and its weights after the suite's rules.
/// Per vertex every joint occurs once; no weight is zero; heaviest first is not promised.
struct Prepared {
  model::Points rest;
  model::Influences influences;
  std::vector<int> joint_rank;  ///< per joint: ties between equal weights go to the lower
  std::size_t joint_count = 0;
  std::optional<model::GivenFrames> given;
};

/// Computes the skin of one frame; pure and safe to call from several threads. `matrices` is empty
/// where the rig has no joints.
using Deformer =
    std::function<void(std::size_t frame, std::span<const Affine> matrices, model::Points& out)>;

/// A skinning method: one .cpp, one line in methods.def.
struct Method {
  model::SkinningSpec spec;
  Deformer (*prepare)(const Prepared& prepared, const model::MethodSpec& method) = nullptr;
};

const std::vector<Method>& methods();
const Method& find_method(const std::string& name);  ///< the name must exist
std::vector<model::SkinningSpec> specs();

/// Weights after `rule`, repeated joints added up, zeros dropped. Throws InputError under Refuse.
model::Influences resolve_weights(const model::Rig& rig, model::WeightRule rule);

/// Keeps the `count` heaviest of every vertex and scales them to the sum it had; a vertex with no
/// more than that is untouched. 0 keeps all. What is kept is not scaled where it sums to 0.
model::Influences keep_influences(const model::Influences& influences, std::size_t count,
                                  std::span<const int> joint_rank);

/// Rounds weights to multiples of 1 / (2^bits - 1) whose sum is that of the vertex, rounded
/// (largest remainder; ties by rank). 0 leaves them.
model::Influences round_weights(const model::Influences& influences, int bits,
                                std::span<const int> joint_rank);

/// Heaviest influence of a vertex, counted from the start of its run, ties by rank; kNone without
/// any.
metrics::Index heaviest(const model::Influences& influences, std::size_t vertex,
                        std::span<const int> joint_rank);

/// Nearest proper rotation to a matrix, and what is left: A = R * S with S symmetric. A reflection
/// leaves S with a negative eigenvalue.
struct Polar {
  Eigen::Matrix3d R, S;
};
Polar polar(const Eigen::Matrix3d& A);
Eigen::Vector4d quaternion(const Eigen::Matrix3d& R);  ///< (x, y, z, w) of a proper rotation

/// Per vertex the normalized blend of its joints' rotations, signs by the heaviest joint; NaN where
/// a quaternion stands within 1e-3 of perpendicular to the heaviest's. Unowned: identity. Empty
/// without matrices.
std::vector<Eigen::Vector4d> carried_rotations(const Prepared& prepared,
                                               std::span<const Affine> matrices);

}  // namespace skinning
