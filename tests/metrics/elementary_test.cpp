#include "metrics/elementary.h"

#include "tests/support/shapes.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <limits>

namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();
constexpr double kNan = std::numeric_limits<double>::quiet_NaN();

// Distance from the exact value in units of the last place of a double there.
double ulps(double value, long double exact) {
  const int exponent = exact == 0 ? -1022 : std::max(std::ilogb(exact), -1022);
  return static_cast<double>(std::abs(static_cast<long double>(value) - exact) /
                             std::scalbn(1.0L, exponent - 52));
}

struct Worst {
  double error = 0, at = 0;
  void see(double found, double x) {
    if (!(found <= error)) {
      error = found;
      at = x;
    }
  }
};

bool same(double a, double b) {
  return a == b && std::signbit(a) == std::signbit(b);
}

}  // namespace

// The reference of this file is the C library in long double (11 more bits), on this machine.
static_assert(std::numeric_limits<long double>::digits >= 64);

// Catches a wrong coefficient, a lost tail of the reduction, a wrong quadrant.
TEST_CASE("sine and cosine stay within 1 ulp") {
  Worst sine;
  Worst cosine;
  const auto look = [&](double x) {
    const auto exact = static_cast<long double>(x);
    sine.see(ulps(metrics::sine(x), std::sin(exact)), x);
    cosine.see(ulps(metrics::cosine(x), std::cos(exact)), x);
  };
  tests::Random random(1);
  for (int i = 0; i < 200000; ++i) {
    look(random.uniform(-1e6, 1e6));
    look(random.uniform(-10, 10));
    look(std::scalbn(random.uniform(-1, 1), -static_cast<int>(random.bits() % 60)));
  }
  // Next to multiples of pi / 4, where the quadrant changes and the reduction cancels most.
  for (int k = -5000; k <= 5000; ++k) {
    for (const double scale : {1.0, 254.0}) {
      const double x = scale * k * (metrics::kPi / 4);
      look(x);
      look(std::nextafter(x, kInfinity));
      look(std::nextafter(x, -kInfinity));
    }
  }
  look(1e6);
  look(-1e6);
  CAPTURE(sine.at, cosine.at);
  CHECK(sine.error < 1);
  CHECK(cosine.error < 1);
}

// Catches a zero that loses its sign and an argument the reduction cannot serve.
TEST_CASE("sine and cosine at the edges") {
  CHECK(same(metrics::sine(0.0), 0.0));
  CHECK(same(metrics::sine(-0.0), -0.0));
  CHECK(metrics::cosine(0.0) == 1);
  CHECK(metrics::cosine(-0.0) == 1);
  CHECK(same(metrics::sine(-5e-324), -5e-324));
  for (const double x : {1000001.0, -1e300, kInfinity, -kInfinity, kNan}) {
    CHECK(std::isnan(metrics::sine(x)));
    CHECK(std::isnan(metrics::cosine(x)));
  }
}

// Catches a wrong entry of the table, a wrong octant, lost digits near the axes and diagonals.
TEST_CASE("the arc tangent stays within 2 ulp") {
  Worst worst;
  const auto look = [&](double y, double x) {
    const long double exact = std::atan2(static_cast<long double>(y), static_cast<long double>(x));
    worst.see(ulps(metrics::arc_tangent(y, x), exact), y / x);
  };
  tests::Random random(2);
  for (int i = 0; i < 200000; ++i) {
    look(random.uniform(-1, 1), random.uniform(-1, 1));
    look(std::scalbn(random.uniform(-1, 1), static_cast<int>(random.bits() % 80) - 40),
         random.uniform(-1, 1));
    look(std::scalbn(random.uniform(-1, 1), static_cast<int>(random.bits() % 2000) - 1000),
         std::scalbn(random.uniform(-1, 1), static_cast<int>(random.bits() % 2000) - 1000));
  }
  // On and beside the changes of the table's row.
  for (int k = 0; k <= 32; ++k) {
    for (const double sign : {1.0, -1.0}) {
      const double y = k / 16.0;
      look(y, sign);
      look(std::nextafter(y, 9), sign);
      look(std::nextafter(y, -9), sign);
      look(sign, y);
    }
  }
  look(1.7e308, 1.6e308);
  look(5e-324, 1e-323);
  look(5e-324, -1e308);
  CAPTURE(worst.at);
  CHECK(worst.error < 2);
}

// Catches a wrong half plane for zeros and infinities. Source: ISO C 23, annex F.10.1.4 (from
// memory), which the C library follows.
TEST_CASE("the arc tangent of special values is that of C") {
  const double values[] = {0.0, -0.0, 1.0, -1.0, 5e-324, -1e308, kInfinity, -kInfinity};
  for (const double y : values) {
    for (const double x : values) {
      CAPTURE(y, x);
      CHECK(same(metrics::arc_tangent(y, x), std::atan2(y, x)));
    }
  }
  CHECK(std::isnan(metrics::arc_tangent(kNan, 1)));
  CHECK(std::isnan(metrics::arc_tangent(1, kNan)));
}

// Catches a wrong exponent and a start too far away for the iterations.
TEST_CASE("the cube root stays within 1 ulp") {
  Worst worst;
  const auto look = [&](double x) {
    worst.see(ulps(metrics::cube_root(x), std::cbrt(static_cast<long double>(x))), x);
  };
  tests::Random random(3);
  for (int i = 0; i < 200000; ++i) {
    look(random.uniform(-10, 10));
    look(std::scalbn(random.uniform(-1, 1), static_cast<int>(random.bits() % 2100) - 1070));
  }
  for (int exponent = -1074; exponent < 1024; ++exponent) {
    const double x = std::scalbn(1.0, exponent);
    look(x);
    look(std::nextafter(x, 0.0));
  }
  look(std::numeric_limits<double>::max());
  CAPTURE(worst.at);
  CHECK(worst.error < 1);
  // Elementary: cubes of small numbers have exact roots.
  for (int k = -1000; k <= 1000; ++k) {
    CHECK(metrics::cube_root(static_cast<double>(k) * k * k) == k);
  }
  CHECK(same(metrics::cube_root(-0.0), -0.0));
  CHECK(metrics::cube_root(-kInfinity) == -kInfinity);
  CHECK(std::isnan(metrics::cube_root(kNan)));
}
