#pragma once

#include "metrics/surface.h"

#include <functional>
#include <limits>
#include <span>
#include <string_view>
#include <vector>

namespace metrics {

std::string_view domain_name(Domain domain);  ///< "frame", "vertex", ...

/// How one number is made of the values of all elements. Undefined (NaN) elements are left out.
enum class Aggregate {
  Max,    ///< largest
  Min,    ///< smallest
  P99,    ///< of n ascending values the one at index (99 (n - 1) + 99) div 100
  Rms,    ///< root of the mean of (value - neutral)^2, weighted by Metric::weights
  Count,  ///< sum of the values (each 0 or 1)
  Share,  ///< sum of value * weight over the sum of all weights
  Sum,    ///< sum of the values: the one value of a frame
};

/// One number of a measurement per frame, e.g. `max` of `edge_stretch`.
struct Statistic {
  std::string_view name;  ///< "max"; the whole name is "edge_stretch.max"
  Aggregate aggregate = Aggregate::Max;
  double neutral = 0;  ///< value of an undeformed skin
  bool limit = true;   ///< can be bounded as it is
  bool drift = true;   ///< can be compared with a golden
};

/// A skin in one frame.
struct Posed {
  std::span<const Point> points;  ///< per file vertex, file units, all finite
  /// Per file vertex the blended rotation of its joints as quaternion (x, y, z, w), normalized;
  /// NaN where the blend is undecided. Empty when the joints are unknown.
  std::span<const Eigen::Vector4d> carried;
  double delta = 0;  ///< position noise in file units (allowances of the drift checks)
};

using Values = std::vector<double>;  ///< one per element of the domain; NaN: undefined there

/// What is measured, as data: one instance per line of catalog.def.
struct Metric {
  std::string_view name;
  std::string_view unit;  ///< "D", "deg", "1", "count"
  std::string_view summary;
  std::string_view undefined;   ///< where it has no value
  std::string_view cannot_see;  ///< what it is blind to
  std::string_view source;      ///< reference, "common practice, no source" or "from memory"
  Domain domain = Domain::Vertex;
  std::vector<Statistic> statistics;

  /// Value of every element in a frame; sets the size. Null: exists only as drift.
  void (*measure)(const Surface&, const Posed&, Values&) = nullptr;
  /// What a limit bounds, from the value posed and the value at rest. Null: the value posed.
  double (*change)(double posed, double rest) = nullptr;
  /// Drift of an element from today's and the golden's value. Null: |current - golden|.
  double (*difference)(double current, double golden) = nullptr;
  /// Drift of all elements at once where it is no function of the two values; replaces
  /// `difference`.
  void (*compare)(const Surface& golden_surface, const Posed& current, const Posed& golden,
                  Values& drift) = nullptr;
  /// Noise floor of every element in the unit of the values. Null: 0.
  void (*floors)(const Surface&, const Posed&, Values&) = nullptr;
  /// An element with 4 * floor above this is undecided.
  double undecidable = std::numeric_limits<double>::infinity();
  /// Weight of every element for Rms and Share. Null: all equal.
  const std::vector<double>& (*weights)(const Surface&) = nullptr;
  /// What Rms subtracts where a limit is read; a drift subtracts 0.
  double centre = 0;
};

/// Number of elements a domain has on a surface (Frame and Asset: 1).
std::size_t element_count(const Surface& surface, Domain domain);

/// File vertices of an element: itself, the ends of an edge, the corners of a face; none otherwise.
std::vector<Index> element_vertices(const Surface& surface, Domain domain, std::size_t element);

/// A statistic and the element it was taken from.
struct Reading {
  double value = std::numeric_limits<double>::quiet_NaN();  ///< NaN: undefined
  std::size_t element = kNone;  ///< for Max and Min the lowest one that has it; else kNone
};

/// Aggregates `values`; no element at all gives `neutral` (Rms: 0), only undefined ones give NaN.
/// `weights` may be empty (all 1). Sums are pairwise over fixed blocks.
Reading aggregate(Aggregate how, std::span<const double> values, std::span<const double> weights,
                  double neutral);

/// Sum in a fixed order: pairwise over blocks of 128, the same bits whatever the thread count.
double fixed_sum(std::span<const double> values);

/// Everything a measurement of the asset sees of it.
struct Binding {
  std::span<const Index> first;  ///< per vertex start in `joint`, size vertices + 1
  std::span<const Index> joint;
  std::span<const double> weight;      ///< as in the file
  std::span<const double> bind_scale;  ///< per vertex: that of its skin
  std::span<const Point> positions;    ///< per vertex, as in the file (not scaled)
  /// Per joint inverse(inverse bind) * inverse bind as computed; NaN where singular.
  std::span<const Eigen::Matrix<double, 3, 4>> bind_product;
};

/// A measurement of the asset: domain Asset, one reading per statistic, in their order.
/// `element` of a reading is the worst file vertex.
struct AssetMetric {
  std::string_view name;
  std::string_view unit;
  std::string_view summary;
  std::string_view undefined;
  std::string_view cannot_see;
  std::string_view source;
  std::vector<Statistic> statistics;
  std::vector<double> always;  ///< per statistic: the upper bound that is always set
  std::vector<Reading> (*measure)(const Surface&, const Binding&) = nullptr;
};

/// All measurements of a frame, in the order of catalog.def.
const std::vector<Metric>& catalog();
/// All measurements of the asset.
const std::vector<AssetMetric>& asset_catalog();

}  // namespace metrics
