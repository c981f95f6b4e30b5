#include "tests/harness/skinning/tube_rig.h"

#include <catch2/catch.hpp>

namespace tests {
namespace {

// Catches the first or last influence taken for the heaviest, ties broken by index instead of
// rank, and unowned vertices moved or lost. Source: elementary.
TEST_CASE("rigid: a vertex follows its heaviest joint, ties by rank, and stays without any") {
  const Points rest = {{1, 2, 3}, {1, 2, 3}, {1, 2, 3}};
  Prepared prepared =
      prepared_of(rest, {{{0, 0.25}, {1, 0.5}, {2, 0.25}}, {{0, 0.5}, {2, 0.5}}, {}}, 3);
  prepared.joint_rank = {2, 1, 0};
  const std::vector<Affine> matrices = {affine(Eigen::Matrix3d::Identity(), {1, 0, 0}),
                                        affine(2 * Eigen::Matrix3d::Identity()),
                                        affine(Eigen::Matrix3d::Identity(), {0, 0, 1})};
  CHECK(deformed("rigid", prepared, matrices) == Points{{2, 4, 6}, {1, 2, 4}, {1, 2, 3}});
}

}  // namespace
}  // namespace tests
