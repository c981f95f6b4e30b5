#include "tests/harness/skinning/tube_rig.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <numeric>
#include <set>

namespace tests {
namespace {

/// Every method that computes, with defaults and with every other choice of its parameters.
std::vector<model::MethodSpec> computing() {
  std::vector<model::MethodSpec> all;
  for (const skinning::Method& method : skinning::methods()) {
    if (!method.spec.computes) continue;
    all.push_back(with_defaults(method));
    for (const model::ParameterSpec& parameter : method.spec.parameters) {
      if (parameter.kind != model::ParameterSpec::Kind::Choice) continue;
      for (std::size_t i = 1; i < parameter.choices.size(); ++i) {
        model::MethodSpec& other = all.emplace_back(with_defaults(method));
        other.parameters[parameter.name] = parameter.choices[i];
        other.name += " " + parameter.name + "=" + parameter.choices[i];
      }
    }
  }
  return all;
}

std::vector<Affine> all_after(const Affine& G, std::vector<Affine> matrices) {
  for (Affine& M : matrices) M = after(G, M);
  return matrices;
}

/// G M G^-1 for a rigid G.
std::vector<Affine> seen_from(const Affine& G, std::vector<Affine> matrices) {
  for (Affine& M : matrices) M = after(after(G, M), inverse_of_rigid(G));
  return matrices;
}

std::vector<std::size_t> shuffled(std::size_t size, Random& random) {
  std::vector<std::size_t> order(size);
  std::iota(order.begin(), order.end(), std::size_t{0});
  for (std::size_t i = size; i > 1; --i) std::swap(order[i - 1], order[random.bits() % i]);
  return order;
}

// Sources of all properties below: elementary; tolerances a hundred times what an independent
// implementation was measured to reach, in units of the diagonal.

// Catches a method without summary or source, two of one name, common parameters forgotten or
// given to a method that has no weights.
TEST_CASE("methods: each says what it is, and those that compute take the common parameters") {
  std::set<std::string> names;
  for (const skinning::Method& method : skinning::methods()) {
    INFO(method.spec.name);
    CHECK(names.insert(method.spec.name).second);
    CHECK_FALSE(method.spec.summary.empty());
    CHECK_FALSE(method.spec.source.empty());
    CHECK(&skinning::find_method(method.spec.name) == &method);
    std::set<std::string> parameters;
    for (const model::ParameterSpec& parameter : method.spec.parameters) {
      CHECK(parameters.insert(parameter.name).second);
      CHECK_FALSE(parameter.summary.empty());
    }
    CHECK(parameters.count("keep_influences") == (method.spec.computes ? 1 : 0));
    CHECK(parameters.count("weight_bits") == (method.spec.computes ? 1 : 0));
  }
  CHECK(names == std::set<std::string>{"rigid", "linear_blend", "dual_quaternion", "given"});
  CHECK(skinning::specs().size() == skinning::methods().size());
}

// Catches inverse binds applied twice, weights that do not come to 1, transposed matrices.
TEST_CASE("methods: joints at rest give the rest shape") {
  for (const model::MethodSpec& method : computing()) {
    INFO(method.name);
    TubeRig rig = random_tube(10);
    rig.matrices.assign(kTubeJoints, affine(Eigen::Matrix3d::Identity()));
    CHECK(largest_distance(deformed(method, rig.prepared, rig.matrices), rig.prepared.rest) <
          1e-12 * kTubeDiagonal);
  }
}

// Catches row and column vectors mixed up, and translations that are weighted or turned wrongly.
TEST_CASE("methods: moving all joints moves the skin along") {
  for (const model::MethodSpec& method : computing()) {
    INFO(method.name);
    Random random(11);
    TubeRig rig = random_tube(11);
    const Affine G = random_rigid(random, 5);
    CHECK(largest_distance(deformed(method, rig.prepared, all_after(G, rig.matrices)),
                           moved(deformed(method, rig.prepared, rig.matrices), G)) <
          1e-11 * kTubeDiagonal);
    rig.matrices.assign(kTubeJoints, G);
    CHECK(largest_distance(deformed(method, rig.prepared, rig.matrices),
                           moved(rig.prepared.rest, G)) < 1e-11 * kTubeDiagonal);
  }
}

// Catches a result that depends on where the rest shape stands or how it is turned.
TEST_CASE("methods: another frame for the rest shape changes nothing but the frame") {
  for (const model::MethodSpec& method : computing()) {
    INFO(method.name);
    Random random(12);
    TubeRig rig = random_tube(12);
    const Points expected = deformed(method, rig.prepared, rig.matrices);
    for (int i = 0; i < 3; ++i) {
      const Affine G = random_rigid(random, 5);
      Prepared other = rig.prepared;
      other.rest = moved(other.rest, G);
      CHECK(largest_distance(deformed(method, other, seen_from(G, rig.matrices)),
                             moved(expected, G)) < 1e-11 * kTubeDiagonal);
    }
  }
}

// Catches digits lost where a mesh stands far from the origin.
TEST_CASE("methods: a mesh a thousand units away deforms as it does at the origin") {
  for (const model::MethodSpec& method : computing()) {
    INFO(method.name);
    TubeRig rig = random_tube(13);
    const Points expected = deformed(method, rig.prepared, rig.matrices);
    const Affine G = affine(Eigen::Matrix3d::Identity(), {1000, -1000, 1000});
    rig.prepared.rest = moved(rig.prepared.rest, G);
    CHECK(largest_distance(deformed(method, rig.prepared, seen_from(G, rig.matrices)),
                           moved(expected, G)) < 1e-9 * kTubeDiagonal);
  }
}

// Catches a vertex that reads its neighbour's run of influences.
TEST_CASE("methods: renumbered vertices are only renumbered") {
  for (const model::MethodSpec& method : computing()) {
    INFO(method.name);
    Random random(14);
    const TubeRig rig = random_tube(14);
    const std::vector<Run> runs = runs_of(rig.prepared.influences);
    const Points as_before = deformed(method, rig.prepared, rig.matrices);
    Prepared other = rig.prepared;
    std::vector<Run> other_runs;
    Points expected;
    other.rest.clear();
    for (const std::size_t v : shuffled(runs.size(), random)) {
      other.rest.push_back(rig.prepared.rest[v]);
      other_runs.push_back(runs[v]);
      expected.push_back(as_before[v]);
    }
    other.influences = influences_of(other_runs);
    CHECK(largest_distance(deformed(method, other, rig.matrices), expected) <
          1e-11 * kTubeDiagonal);
  }
}

// Catches choices by index or by the order of influences: signs of quaternions, ties. Runs are
// sorted by the new numbers, as exporters write them.
TEST_CASE("methods: renumbered joints change nothing") {
  for (const model::MethodSpec& method : computing()) {
    for (std::uint64_t seed = 15; seed < 20; ++seed) {
      INFO(method.name);
      Random random(seed);
      const TubeRig rig = random_tube(seed);
      const std::vector<std::size_t> number = shuffled(kTubeJoints, random);
      TubeRig other = rig;
      for (std::size_t j = 0; j < kTubeJoints; ++j) {
        other.matrices[number[j]] = rig.matrices[j];
        other.prepared.joint_rank[number[j]] = rig.prepared.joint_rank[j];
      }
      std::vector<Run> runs = runs_of(rig.prepared.influences);
      for (Run& run : runs) {
        for (auto& [joint, weight] : run) joint = static_cast<Index>(number[joint]);
        std::sort(run.begin(), run.end());
      }
      other.prepared.influences = influences_of(runs);
      CHECK(largest_distance(deformed(method, other.prepared, other.matrices),
                             deformed(method, rig.prepared, rig.matrices)) < 1e-12 * kTubeDiagonal);
    }
  }
}

// Catches absolute lengths in a formula. A factor of two is exact in every step.
TEST_CASE("methods: a rig twice the size gives a skin twice the size") {
  for (const model::MethodSpec& method : computing()) {
    INFO(method.name);
    TubeRig rig = random_tube(20);
    Points expected = deformed(method, rig.prepared, rig.matrices);
    for (Point& point : expected) point *= 2;
    for (Point& point : rig.prepared.rest) point *= 2;
    for (Affine& M : rig.matrices) M.col(3) *= 2;
    CHECK(largest_distance(deformed(method, rig.prepared, rig.matrices), expected) <
          1e-13 * kTubeDiagonal);
  }
}

// Catches whatever a method adds on top of the joint where there is nothing to blend.
TEST_CASE("methods: a vertex with one joint moves with it") {
  for (const model::MethodSpec& method : computing()) {
    INFO(method.name);
    TubeRig rig = random_tube(21);
    std::vector<Run> runs = runs_of(rig.prepared.influences);
    Points expected;
    for (std::size_t v = 0; v < runs.size(); ++v) {
      runs[v] = {{static_cast<Index>(v % kTubeJoints), 1.0}};
      expected.push_back(moved({rig.prepared.rest[v]}, rig.matrices[v % kTubeJoints]).front());
    }
    rig.prepared.influences = influences_of(runs);
    CHECK(largest_distance(deformed(method, rig.prepared, rig.matrices), expected) <
          1e-12 * kTubeDiagonal);
  }
}

// Catches an unowned vertex bound to some joint or sent to the origin.
TEST_CASE("methods: a vertex without any joint stays where it is") {
  for (const model::MethodSpec& method : computing()) {
    INFO(method.name);
    TubeRig rig = random_tube(22);
    std::vector<Run> runs = runs_of(rig.prepared.influences);
    runs.front().clear();
    runs.back().clear();
    rig.prepared.influences = influences_of(runs);
    const Points points = deformed(method, rig.prepared, rig.matrices);
    CHECK(points.front() == rig.prepared.rest.front());
    CHECK(points.back() == rig.prepared.rest.back());
    CHECK(points[1] != rig.prepared.rest[1]);
  }
}

// Catches a deformer that keeps something from one frame to the next, or points into what it was
// prepared from.
TEST_CASE("methods: a deformer depends on the pose alone") {
  for (const model::MethodSpec& method : computing()) {
    INFO(method.name);
    const TubeRig rig = random_tube(23);
    const TubeRig other = random_tube(24);
    skinning::Deformer deformer;
    {
      const Prepared prepared = rig.prepared;
      deformer = skinning::find_method(method.skinning).prepare(prepared, method);
    }
    Points first;
    Points between;
    Points again;
    deformer(0, rig.matrices, first);
    deformer(1, other.matrices, between);
    deformer(2, rig.matrices, again);
    CHECK(first == again);
    CHECK(first != between);
    CHECK(first == deformed(method, rig.prepared, rig.matrices));
  }
}

}  // namespace
}  // namespace tests
