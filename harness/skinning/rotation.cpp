#include "harness/skinning/skinning.h"

#include <Eigen/Geometry>

#include <array>
#include <cmath>
#include <limits>
#include <utility>

namespace skinning {
namespace {

using Eigen::Matrix3d;
using Eigen::Vector3d;
using Eigen::Vector4d;

constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();
constexpr double kEpsilon = std::numeric_limits<double>::epsilon();
constexpr int kSweeps = 40;          // six or so are needed
constexpr double kRankless = 1e-15;  // a direction that much shorter than the longest is noise
constexpr double kUndecided = 1e-3;  // cosine between quaternions
constexpr std::array<std::pair<int, int>, 3> kPairs{{{0, 1}, {0, 2}, {1, 2}}};

/// A rotation whose columns a matrix takes to perpendicular images, longest first.
struct Columns {
  Matrix3d images, axes;
};

/// Turns two columns by an angle of tangent t.
void turn(Matrix3d& A, std::pair<int, int> pair, double t) {
  const double c = 1 / std::sqrt(1 + t * t);
  const double s = c * t;
  const Vector3d p = A.col(pair.first);
  const Vector3d q = A.col(pair.second);
  A.col(pair.first) = c * p - s * q;
  A.col(pair.second) = s * p + c * q;
}

/// Swaps two columns and turns one around, which is a rotation.
void exchange(Matrix3d& A, std::pair<int, int> pair) {
  const Vector3d p = A.col(pair.first);
  A.col(pair.first) = A.col(pair.second);
  A.col(pair.second) = -p;
}

// One-sided Jacobi: Hestenes, Inversion of matrices by biorthogonalization and related results,
// J. SIAM 6(1), 1958.
Columns perpendicular_columns(const Matrix3d& A) {
  Columns result{A, Matrix3d::Identity()};
  Matrix3d& B = result.images;
  for (int sweep = 0, turned = 1; turned > 0 && sweep < kSweeps; ++sweep) {
    turned = 0;
    for (const auto& pair : kPairs) {
      const double p = B.col(pair.first).squaredNorm();
      const double q = B.col(pair.second).squaredNorm();
      const double pq = B.col(pair.first).dot(B.col(pair.second));
      if (std::abs(pq) <= kEpsilon * std::sqrt(p) * std::sqrt(q)) continue;
      const double zeta = (q - p) / (2 * pq);
      const double t = (zeta < 0 ? -1 : 1) / (std::abs(zeta) + std::sqrt(1 + zeta * zeta));
      turn(B, pair, t);
      turn(result.axes, pair, t);
      ++turned;
    }
  }
  for (const auto& pair : {kPairs[0], kPairs[2], kPairs[0]}) {
    if (B.col(pair.second).squaredNorm() <= B.col(pair.first).squaredNorm()) continue;
    exchange(B, pair);
    exchange(result.axes, pair);
  }
  return result;
}

/// Part of `v` perpendicular to the unit vector `u`; twice, so that it is so to the last bits.
Vector3d perpendicular(const Vector3d& v, const Vector3d& u) {
  const Vector3d once = v - u.dot(v) * u;
  return once - u.dot(once) * u;
}

/// Unit second column for a proper frame that starts with `u`: the second column where it has a
/// direction of its own, else such that the axes move little.
Vector3d second_axis(const Columns& columns, const Vector3d& u) {
  const Vector3d own = perpendicular(columns.images.col(1), u);
  if (own.norm() > kRankless * columns.images.col(0).norm()) return own.normalized();
  const Vector3d second = perpendicular(columns.axes.col(1), u);
  const Vector3d third = perpendicular(columns.axes.col(2), u);
  if (second.squaredNorm() >= third.squaredNorm()) return second.normalized();
  return third.normalized().cross(u);
}

}  // namespace

Polar polar(const Matrix3d& A) {
  const double size = A.cwiseAbs().maxCoeff();
  if (!A.allFinite()) return {Matrix3d::Constant(kNaN), Matrix3d::Constant(kNaN)};
  if (size == 0) return {Matrix3d::Identity(), Matrix3d::Zero()};

  const Columns columns = perpendicular_columns(A / size);
  Matrix3d U;
  U.col(0) = columns.images.col(0).normalized();
  U.col(1) = second_axis(columns, U.col(0));
  // The third from the other two: a reflection is undone along the shortest direction, and a
  // direction that was lost is found again.
  U.col(2) = U.col(0).cross(U.col(1));
  Polar result;
  result.R = U * columns.axes.transpose();
  const Matrix3d rest = result.R.transpose() * A;
  result.S = 0.5 * (rest + rest.transpose());
  return result;
}

// Shepperd, Quaternion from rotation matrix, J. Guidance and Control 1(3), 1978: divides by the
// largest of the four components.
Vector4d quaternion(const Matrix3d& R) {
  const double trace = R(0, 0) + R(1, 1) + R(2, 2);
  Vector4d q;
  if (trace >= R(0, 0) && trace >= R(1, 1) && trace >= R(2, 2)) {
    q << R(2, 1) - R(1, 2), R(0, 2) - R(2, 0), R(1, 0) - R(0, 1), 1 + trace;
  } else {
    int i = R(1, 1) > R(0, 0) ? 1 : 0;
    if (R(2, 2) > R(i, i)) i = 2;
    const int j = (i + 1) % 3;
    const int k = (i + 2) % 3;
    q[i] = 1 + R(i, i) - R(j, j) - R(k, k);
    q[j] = R(i, j) + R(j, i);
    q[k] = R(i, k) + R(k, i);
    q[3] = R(k, j) - R(j, k);
  }
  return q / q.norm();
}

std::vector<Vector4d> carried_rotations(const Prepared& prepared,
                                        std::span<const Affine> matrices) {
  if (matrices.empty()) return {};
  std::vector<Vector4d> joint_rotation;
  joint_rotation.reserve(matrices.size());
  for (const Affine& M : matrices) {
    joint_rotation.push_back(quaternion(polar(M.leftCols<3>()).R));
  }
  const model::Influences& influences = prepared.influences;
  std::vector<Vector4d> carried(prepared.rest.size(), Vector4d(0, 0, 0, 1));
  for (std::size_t v = 0; v < carried.size(); ++v) {
    const metrics::Index place = heaviest(influences, v, prepared.joint_rank);
    if (place == metrics::kNone) continue;
    const std::size_t begin = influences.first[v];
    const Vector4d& pivot = joint_rotation[influences.joint[begin + place]];
    Vector4d blend = Vector4d::Zero();
    bool decided = true;
    for (std::size_t i = begin; i < influences.first[v + 1]; ++i) {
      const Vector4d& q = joint_rotation[influences.joint[i]];
      const double cosine = q.dot(pivot);
      decided = decided && std::abs(cosine) >= kUndecided;
      blend += (cosine < 0 ? -influences.weight[i] : influences.weight[i]) * q;
    }
    const double length = blend.norm();
    carried[v] = decided && length > 0 ? Vector4d(blend / length) : Vector4d::Constant(kNaN);
  }
  return carried;
}

}  // namespace skinning
