#include "harness/skinning/methods.h"

#include <Eigen/Geometry>

#include <cmath>

namespace skinning {
namespace {

using Eigen::Vector3d;
using Eigen::Vector4d;

/// A skinning matrix as rigid motion after a symmetric stretch.
struct Motor {
  Vector4d real, dual;  ///< unit dual quaternion, both parts (x, y, z, w)
  Eigen::Matrix3d stretch;
};

Motor motor(const Affine& M) {
  const Polar split = polar(M.leftCols<3>());
  Motor result;
  result.real = quaternion(split.R);
  result.stretch = split.S;
  const Vector3d t = M.col(3);
  const Vector3d v = result.real.head<3>();
  result.dual << 0.5 * (result.real.w() * t + t.cross(v)), -0.5 * t.dot(v);
  return result;
}

/// Moves a point by a dual quaternion whose real part has length 1; the component of the dual part
/// along the real one does not count.
Vector3d move(const Vector4d& real, const Vector4d& dual, const Vector3d& x) {
  const Vector3d d0 = real.head<3>();
  const Vector3d de = dual.head<3>();
  const double a0 = real.w();
  const double ae = dual.w();
  return x + 2 * d0.cross(d0.cross(x) + a0 * x) + 2 * (a0 * de - ae * d0 + d0.cross(de));
}

/// Where the influences of one vertex, not empty, take it.
Vector3d blend(const Vector3d& rest, const Motor& pivot, std::span<const metrics::Index> joint,
               std::span<const double> weight, const std::vector<Motor>& motors, bool stretch) {
  Vector4d real = Vector4d::Zero();
  Vector4d dual = Vector4d::Zero();
  Vector3d stretched = Vector3d::Zero();
  for (std::size_t i = 0; i < joint.size(); ++i) {
    const Motor& motor = motors[joint[i]];
    // q and -q are the same rotation: all are taken on the side of the heaviest joint.
    const double signed_weight = motor.real.dot(pivot.real) < 0 ? -weight[i] : weight[i];
    real += signed_weight * motor.real;
    dual += signed_weight * motor.dual;
    if (stretch) stretched += weight[i] * (motor.stretch * rest);
  }
  const Vector3d& start = stretch ? stretched : rest;
  const double length = std::sqrt(real.squaredNorm());
  // Only negative weights can cancel the blend.
  if (length == 0) return move(pivot.real, pivot.dual, start);
  return move(real / length, dual / length, start);
}

Deformer prepare(const Prepared& prepared, const model::MethodSpec& method) {
  std::vector<metrics::Index> pivots(prepared.rest.size(), metrics::kNone);
  for (std::size_t v = 0; v < pivots.size(); ++v) {
    pivots[v] = heaviest(prepared.influences, v, prepared.joint_rank);
  }
  const bool stretch = method.text("scale") == "two_phase";
  return [rest = prepared.rest, influences = prepared.influences, pivots, stretch](
             std::size_t /*frame*/, std::span<const Affine> matrices, model::Points& out) {
    std::vector<Motor> motors;
    motors.reserve(matrices.size());
    for (const Affine& M : matrices) motors.push_back(motor(M));
    const std::span<const metrics::Index> joints(influences.joint);
    const std::span<const double> weights(influences.weight);
    out = rest;
    for (std::size_t v = 0; v < rest.size(); ++v) {
      if (pivots[v] == metrics::kNone) continue;
      const std::size_t begin = influences.first[v];
      const std::size_t size = influences.first[v + 1] - begin;
      out[v] = blend(rest[v], motors[joints[begin + pivots[v]]], joints.subspan(begin, size),
                     weights.subspan(begin, size), motors, stretch);
    }
  };
}

}  // namespace

Method dual_quaternion() {
  model::ParameterSpec scale;
  scale.kind = model::ParameterSpec::Kind::Choice;
  scale.name = "scale";
  scale.summary =
      "two_phase: stretches of the joints are blended linearly before the rigid blend; drop: they "
      "are left out";
  scale.choices = {"two_phase", "drop"};

  Method method;
  method.spec.name = "dual_quaternion";
  method.spec.summary =
      "normalized blend of the joints' dual quaternions, signs by the heaviest joint";
  method.spec.source =
      "Kavan, Collins, Zara, O'Sullivan, Geometric skinning with approximate dual quaternion "
      "blending, ACM TOG 27(4), 2008";
  method.spec.parameters = {scale};
  method.prepare = prepare;
  return method;
}

}  // namespace skinning
