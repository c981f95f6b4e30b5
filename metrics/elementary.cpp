#include "metrics/elementary.h"

#include <array>
#include <cmath>
#include <limits>

namespace metrics {
namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();

/// An unevaluated sum: `low` is what `high` lost to rounding.
struct Sum {
  double high = 0, low = 0;
};

// Exact sum of two doubles. Source: Knuth, The Art of Computer Programming 2, 4.2.2 (from memory).
Sum exact_sum(double a, double b) {
  const double high = a + b;
  const double part = high - a;
  return {high, (a - (high - part)) + (b - part)};
}

// Value of coefficients[0] + x coefficients[1] + ...
template <std::size_t Count>
double polynomial(const std::array<double, Count>& coefficients, double x) {
  double result = coefficients[Count - 1];
  for (std::size_t i = Count - 1; i-- > 0;) {
    result = result * x + coefficients[i];
  }
  return result;
}

// Taylor series up to pi/4; the first term left out is below 2^-60 of the result.
constexpr std::array kSine{
    -1.0 / 6,        1.0 / 120,        -1.0 / 5040,          1.0 / 362880,
    -1.0 / 39916800, 1.0 / 6227020800, -1.0 / 1307674368000, 1.0 / 355687428096000};
constexpr std::array kCosine{
    1.0 / 24,        -1.0 / 720,         1.0 / 40320,         -1.0 / 3628800,
    1.0 / 479001600, -1.0 / 87178291200, 1.0 / 20922789888000};

double near_sine(const Sum& x) {
  const double square = x.high * x.high;
  const double tail = x.low * (1 - square / 2);
  return x.high + (x.high * square * polynomial(kSine, square) + tail);
}

double near_cosine(const Sum& x) {
  const double square = x.high * x.high;
  const double half = square / 2;
  const double top = 1 - half;
  const double lost = (1 - top) - half;
  return top + (lost + (square * square * polynomial(kCosine, square) - x.high * x.low));
}

// pi / 2 in parts of 33 bits and what is left.
constexpr std::array kParts{0x1.921fb544p+0, 0x1.0b4611a6p-34, 0x1.3198a2ep-69};
constexpr double kLast = 0x1.b839a252049c1p-104;

struct Reduced {
  Sum rest;         // in about [-pi/4, pi/4]
  int quarter = 0;  // 0..3: number of quarter turns taken off, modulo 4
};

// Takes off the nearest multiple of pi/2. Its first three parts have 33 bits and the multiplier at
// most 20, so those products are exact. Source: Cody & Waite 1980 (from memory).
Reduced reduced(double x) {
  const double turns = std::floor(x / (kPi / 2) + 0.5);
  Sum rest = exact_sum(x, -turns * kParts[0]);
  for (const double part : {kParts[1], kParts[2], kLast}) {
    const Sum next = exact_sum(rest.high, -turns * part);
    rest = exact_sum(next.high, next.low + rest.low);
  }
  const double quarter = turns - 4 * std::floor(turns / 4);
  return {rest, static_cast<int>(quarter)};
}

constexpr double kFarthest = 1e6;

// Sine of x + quarters * pi/2.
double shifted_sine(double x, int quarters) {
  if (!(std::abs(x) <= kFarthest)) {
    return kNan;
  }
  const Reduced r = reduced(x);
  const int quarter = (r.quarter + quarters) % 4;
  const double value = quarter % 2 == 0 ? near_sine(r.rest) : near_cosine(r.rest);
  return quarter < 2 ? value : -value;
}

// arc tangent of k / 8
constexpr std::array<Sum, 9> kEighths{{{0, 0},
                                       {0x1.fd5ba9aac2f6ep-4, -0x1.cd37686760c17p-59},
                                       {0x1.f5b75f92c80ddp-3, 0x1.8ab6e3cf7afbdp-57},
                                       {0x1.6f61941e4def1p-2, -0x1.c63aae6f6e918p-56},
                                       {0x1.dac670561bb4fp-2, 0x1.a2b7f222f65e2p-56},
                                       {0x1.1e00babdefeb4p-1, -0x1.928df287a668fp-58},
                                       {0x1.4978fa3269ee1p-1, 0x1.2419a87f2a458p-56},
                                       {0x1.700a7c5784634p-1, -0x1.8c34d25aadef6p-56},
                                       {0x1.921fb54442d18p-1, 0x1.1a62633145c07p-55}}};
constexpr Sum kQuarterTurn{0x1.921fb54442d18p+0, 0x1.1a62633145c07p-54};
constexpr Sum kHalfTurn{0x1.921fb54442d18p+1, 0x1.1a62633145c07p-53};
constexpr std::array kArcTangent{-1.0 / 3, 1.0 / 5, -1.0 / 7, 1.0 / 9, -1.0 / 11, 1.0 / 13};

// base + sign * (arc tangent of low / high), 0 <= low <= high, high > 0, both finite.
double turned(const Sum& base, double sign, double low, double high) {
  const double ratio = low / high;
  const double eighth = std::floor(8 * ratio + 0.5);
  Sum start{};
  double rest = ratio;
  if (eighth > 0) {
    // arc tangent of (low - c high) / (high + c low), c = eighth / 8, scaled to be of order 1.
    int exponent = 0;
    const double h = std::frexp(high, &exponent);
    const double l = std::ldexp(low, -exponent);
    const double c = eighth / 8;
    rest = (l - c * h) / (h + c * l);
    start = kEighths[static_cast<std::size_t>(eighth)];
  }
  const double square = rest * rest;
  const double bent = rest * square * polynomial(kArcTangent, square);
  const Sum total = exact_sum(base.high, sign * start.high);
  const Sum sum = exact_sum(total.high, sign * rest);
  return sum.high + (sum.low + (total.low + (base.low + sign * (start.low + bent))));
}

// arc_tangent for y > 0, or y = +0 and x not 0; neither NaN.
double upper_arc_tangent(double y, double x) {
  if (std::isinf(y) && std::isinf(x)) {
    return upper_arc_tangent(1, x > 0 ? 1 : -1);
  }
  const double width = std::abs(x);
  if (std::isinf(y) || std::isinf(x)) {
    return std::isinf(y) ? kQuarterTurn.high : x > 0 ? 0 : kHalfTurn.high;
  }
  if (y > width) {
    return turned(kQuarterTurn, x > 0 ? -1 : 1, width, y);
  }
  return x > 0 ? turned({}, 1, y, width) : turned(kHalfTurn, -1, y, width);
}

}  // namespace

double sine(double x) {
  // Besides saving work, this keeps the sign of a zero.
  return std::abs(x) < 0x1p-27 ? x : shifted_sine(x, 0);
}

double cosine(double x) {
  return shifted_sine(x, 1);
}

double arc_tangent(double y, double x) {
  if (std::isnan(x) || std::isnan(y)) {
    return kNan;
  }
  double result = 0;
  if (y == 0 && x == 0) {
    result = std::signbit(x) ? kHalfTurn.high : 0;
  } else {
    result = upper_arc_tangent(std::abs(y), x);
  }
  return std::copysign(result, y);
}

double cube_root(double x) {
  if (x == 0 || !std::isfinite(x)) {
    return x;
  }
  int exponent = 0;
  double m = std::frexp(std::abs(x), &exponent);
  const int third = exponent >= 0 ? (exponent + 2) / 3 : -(-exponent / 3);
  m = std::ldexp(m, exponent - 3 * third);  // in [1/8, 1)
  double root = 0.42 + 0.62 * m;
  for (int i = 0; i < 4; ++i) {
    root -= (root - m / (root * root)) / 3;
  }
  // One step of Halley from a root of 24 bits, whose square is exact, so that only the last
  // operations round.
  root = static_cast<double>(static_cast<float>(root));
  const double other = m / (root * root);
  root += root * ((other - root) / (2 * root + other));
  return std::copysign(std::ldexp(root, third), x);
}

}  // namespace metrics
