#include "metrics/metric.h"

#include <algorithm>
#include <cmath>

namespace metrics {
namespace {

constexpr std::size_t kBlock = 128;

bool defined(double value) {
  return !std::isnan(value);
}

// The largest of sign * value; the lowest element that has it.
Reading extreme(std::span<const double> values, double sign) {
  Reading result;
  for (std::size_t i = 0; i < values.size(); ++i) {
    if (defined(values[i]) && !(sign * values[i] <= sign * result.value)) {
      result = {values[i], i};
    }
  }
  return result;
}

double percentile_99(std::span<const double> values) {
  std::vector<double> kept;
  kept.reserve(values.size());
  std::copy_if(values.begin(), values.end(), std::back_inserter(kept), defined);
  const std::size_t rank = (99 * (kept.size() - 1) + 99) / 100;
  const auto place = kept.begin() + static_cast<std::ptrdiff_t>(rank);
  std::nth_element(kept.begin(), place, kept.end());
  return *place + 0.0;  // which of two zeros of different sign stands here is left open: take +0
}

// Sum of term(value, weight) over the defined values, in the blocks of all of them.
template <class Term>
double weighted_sum(std::span<const double> values, std::span<const double> weights, Term term) {
  std::vector<double> terms(values.size(), 0.0);
  for (std::size_t i = 0; i < values.size(); ++i) {
    if (defined(values[i])) {
      terms[i] = term(values[i], weights.empty() ? 1.0 : weights[i]);
    }
  }
  return fixed_sum(terms);
}

}  // namespace

double fixed_sum(std::span<const double> values) {
  std::vector<double> sums;
  sums.reserve(values.size() / kBlock + 1);
  for (std::size_t first = 0; first < values.size(); first += kBlock) {
    double sum = 0;
    for (const double value : values.subspan(first, std::min(kBlock, values.size() - first))) {
      sum += value;
    }
    sums.push_back(sum);
  }
  for (; sums.size() > 1; sums.resize((sums.size() + 1) / 2)) {
    for (std::size_t i = 0; i < sums.size(); i += 2) {
      sums[i / 2] = i + 1 < sums.size() ? sums[i] + sums[i + 1] : sums[i];
    }
  }
  return sums.empty() ? 0 : sums[0];
}

Reading aggregate(Aggregate how, std::span<const double> values, std::span<const double> weights,
                  double neutral) {
  if (values.empty()) {
    return {how == Aggregate::Rms ? 0 : neutral, kNone};  // Rms has taken neutral off
  }
  if (std::none_of(values.begin(), values.end(), defined)) {
    return {};
  }
  const auto product = [](double value, double weight) { return value * weight; };
  const auto weight_of = [](double, double weight) { return weight; };
  const auto square = [&](double value, double weight) {
    return weight * ((value - neutral) * (value - neutral));
  };
  switch (how) {
    case Aggregate::Max:
      return extreme(values, 1);
    case Aggregate::Min:
      return extreme(values, -1);
    case Aggregate::P99:
      return {percentile_99(values), kNone};
    case Aggregate::Rms:
      return {std::sqrt(weighted_sum(values, weights, square) /
                        weighted_sum(values, weights, weight_of)),
              kNone};
    case Aggregate::Share:
      return {weighted_sum(values, weights, product) /
                  (weights.empty() ? static_cast<double>(values.size()) : fixed_sum(weights)),
              kNone};
    case Aggregate::Count:
    case Aggregate::Sum:
      return {weighted_sum(values, {}, product), kNone};
  }
  return {};
}

std::string_view domain_name(Domain domain) {
  switch (domain) {
    case Domain::Frame:
      return "frame";
    case Domain::Vertex:
      return "vertex";
    case Domain::Edge:
      return "edge";
    case Domain::Face:
      return "face";
    case Domain::Asset:
      return "asset";
  }
  return {};
}

std::size_t element_count(const Surface& surface, Domain domain) {
  switch (domain) {
    case Domain::Vertex:
      return surface.rest.size();
    case Domain::Edge:
      return surface.edges.size();
    case Domain::Face:
      return surface.faces.size();
    case Domain::Frame:
    case Domain::Asset:
      break;
  }
  return 1;
}

std::vector<Index> element_vertices(const Surface& surface, Domain domain, std::size_t element) {
  switch (domain) {
    case Domain::Vertex:
      return {static_cast<Index>(element)};
    case Domain::Edge:
      return {surface.edges[element].a, surface.edges[element].b};
    case Domain::Face:
      return {surface.faces[element].begin(), surface.faces[element].end()};
    case Domain::Frame:
    case Domain::Asset:
      break;
  }
  return {};
}

}  // namespace metrics
