#pragma once

namespace metrics {

/// Elementary functions built on + - * / and square root alone, so that every machine gives the
/// same bits; the C library's depend on the processor. Within 2 ulp on the stated range.

double sine(double x);                   ///< |x| <= 1e6 radians; NaN beyond, for NaN and infinity
double cosine(double x);                 ///< |x| <= 1e6 radians; NaN beyond, for NaN and infinity
double arc_tangent(double y, double x);  ///< atan2 in (-pi, pi], signed zeros as in C
double cube_root(double x);              ///< all finite x

inline constexpr double kPi = 3.14159265358979323846;
inline constexpr double kDegree = kPi / 180;  ///< radians per degree

}  // namespace metrics
