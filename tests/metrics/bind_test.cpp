#include "metrics/catalog.h"
#include "tests/support/limb.h"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>

using metrics::Index;
using metrics::Point;
using Affine = Eigen::Matrix<double, 3, 4>;

namespace {

// Three vertices, the last one on the joints 0 and 1 by 3/4 and 1/4.
struct Fixture {
  metrics::Points positions = {{0, 0, 0}, {2, 0, 0}, {0, 2, 1}};
  std::vector<Index> first = {0, 1, 2, 4};
  std::vector<Index> joint = {0, 1, 0, 1};
  std::vector<double> weight = {1, 1, 0.75, 0.25};
  std::vector<double> scale = {1, 1, 1};
  std::vector<Affine> products = {Affine::Identity(), Affine::Identity()};

  metrics::Reading residual(double size = 1) const {
    const auto surface = metrics::make_surface(
        tests::moved(positions, size * Eigen::Matrix3d::Identity()), {{0, 1, 2}});
    return metrics::bind().measure(surface, {.first = first,
                                             .joint = joint,
                                             .weight = weight,
                                             .bind_scale = scale,
                                             .positions = positions,
                                             .bind_product = products})[0];
  }
};

}  // namespace

// Catches: residuals that are not weighted, not in units of D. Source: elementary, D = 3.
TEST_CASE("bind.residual is the distance from the rest shape in units of D") {
  Fixture rig;
  CHECK(rig.residual().value == 0);
  rig.products[1](2, 3) = 0.3;
  CHECK(rig.residual().value == Approx(0.1).epsilon(1e-14));
  CHECK(rig.residual().element == 1);
  rig.products[1] = Affine::Identity();
  rig.products[1](0, 1) = 0.6;  // x + 0.6 y: only the last vertex has any y
  CHECK(rig.residual().value == Approx(0.25 * 1.2 / 3).epsilon(1e-14));
  CHECK(rig.residual().element == 2);
}

// Catches: weights that are normalized before they are used.
TEST_CASE("bind.residual sees weights that do not sum to 1") {
  Fixture rig;
  rig.weight[1] = 0.75;
  CHECK(rig.residual().value == Approx(0.5 / 3).epsilon(1e-14));
  CHECK(rig.residual().element == 1);
}

// Catches: a residual in the file's units below the bind scale held against D above it.
TEST_CASE("bind.residual does not depend on the scale above the skeleton") {
  Fixture rig;
  rig.products[1](2, 3) = 0.3;
  rig.scale = {100, 100, 100};
  CHECK(rig.residual(100).value == Approx(0.1).epsilon(1e-13));
}

// Catches: a singular bind that hides the other vertices, or that is taken for a good one; a vertex
// without weight taken to the origin.
TEST_CASE("bind.residual is undefined on singular binds only") {
  Fixture rig;
  rig.products[1].setConstant(std::numeric_limits<double>::quiet_NaN());
  rig.products[0](0, 3) = 0.3;
  CHECK(rig.residual().value == Approx(0.1).epsilon(1e-14));
  CHECK(rig.residual().element == 0);
  rig.joint = {1, 1, 1, 1};
  CHECK(std::isnan(rig.residual().value));

  rig = Fixture();
  rig.weight[1] = 0;
  CHECK(rig.residual().value == 0);
  rig.first = {0, 1, 1, 3};
  rig.joint = {0, 0, 1};
  rig.weight = {1, 0.75, 0.25};
  CHECK(rig.residual().value == 0);
}
