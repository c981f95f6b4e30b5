#include "harness/base/error.h"
#include "tests/harness/skinning/tube_rig.h"

#include <catch2/catch.hpp>

namespace tests {
namespace {

using model::WeightRule;
using skinning::resolve_weights;

const std::vector<int> kRanks = {0, 1, 2, 3};
const std::vector<int> kReversed = {3, 2, 1, 0};

model::Rig rig_with(const std::vector<Run>& runs) {
  model::Rig rig;
  rig.file = "strider.glb";
  rig.positions.assign(runs.size(), Point::Zero());
  rig.vertex_skin.assign(runs.size(), 0);
  rig.influences = influences_of(runs);
  rig.skins.emplace_back();
  rig.joints.resize(4);
  return rig;
}

std::vector<Run> resolved(const std::vector<Run>& runs, WeightRule rule) {
  return runs_of(resolve_weights(rig_with(runs), rule));
}

std::string refusal(const std::vector<Run>& runs) {
  try {
    resolved(runs, WeightRule::Refuse);
  } catch (const base::InputError& error) {
    CHECK(error.problems().front().file == "strider.glb");
    return error.problems().front().message;
  }
  return {};
}

std::vector<Run> kept(const Run& run, std::size_t count, const std::vector<int>& ranks = kRanks) {
  return runs_of(skinning::keep_influences(influences_of({run, {}}), count, ranks));
}

std::vector<Run> rounded(const Run& run, int bits, const std::vector<int>& ranks = kRanks) {
  return runs_of(skinning::round_weights(influences_of({run, {}}), bits, ranks));
}

// Catches a repeated joint overwritten instead of added up or moved to its last place, zeros kept
// or vertices lost with them, and weights repaired behind the user's back. Exact in binary.
TEST_CASE("resolve_weights: as_is adds up repeats and changes nothing else") {
  CHECK(resolved({{{2, 0.25}, {1, 0.5}, {2, 0.125}}, {}, {{0, 0.5}, {3, -0.25}}, {{1, 3.0}}},
                 WeightRule::AsIs) ==
        std::vector<Run>{{{2, 0.375}, {1, 0.5}}, {}, {{0, 0.5}, {3, -0.25}}, {{1, 3.0}}});
  CHECK(resolved({{{0, 0.5}, {0, -0.5}, {1, 1.0}}, {{1, 0.5}, {1, 0.5}}}, WeightRule::AsIs) ==
        std::vector<Run>{{{1, 1.0}}, {{1, 1.0}}});
}

// Catches a division by a sum that is zero or negative. Exact in binary.
TEST_CASE("resolve_weights: normalize brings sums to 1 where there is a positive sum") {
  CHECK(resolved({{{0, 0.5}, {1, 1.5}}, {}, {{0, -0.25}, {1, 0.25}}, {{0, -2.0}}},
                 WeightRule::Normalize) ==
        std::vector<Run>{{{0, 0.25}, {1, 0.75}}, {}, {{0, -0.25}, {1, 0.25}}, {{0, -2.0}}});
}

// Catches a tolerance that refuses what single precision cannot do better, or lets pass what it
// can, and offences that are not named or counted. Source of the tolerance: glTF 2.0, 3.7.3.1.
TEST_CASE("resolve_weights: refuse names the first offending vertex and counts all kinds") {
  CHECK(refusal({{{0, 0.5}, {1, 0.5}}, {{0, 0.5}, {1, 0.5 + 3.9e-7}}}).empty());
  CHECK_THAT(refusal({{{0, 1.0}}, {{0, 0.5}, {1, 0.5 + 4.1e-7}}}),
             Catch::StartsWith("vertex 1 has weights that sum to 1.00000041 instead of 1"));
  CHECK_THAT(refusal({{{0, 1.5}, {1, -0.5}}}), Catch::StartsWith("vertex 0 has a negative weight"));
  CHECK_THAT(refusal({{{0, 1.0}}, {{0, 1.0}}, {}}),
             Catch::StartsWith("vertex 2 has no weight at all"));
  CHECK_THAT(refusal({{{2, 0.5}, {2, 0.5}}}), Catch::StartsWith("vertex 0 names a joint twice"));
  CHECK_THAT(refusal({{}, {}, {}, {{0, 0.5}}, {{0, 0.25}}, {{0, 2.0}, {1, -1.0}}}),
             Catch::Contains("2 with another sum than 1, 1 with a negative weight, 3 without any, "
                             "0 with a joint twice"));
}

// Catches a mesh without skin refused for weights it cannot have, and runs that do not fit it.
TEST_CASE("resolve_weights: a mesh without skin has no influences under any rule") {
  model::Rig rig;
  rig.positions.assign(3, Point::Zero());
  for (const WeightRule rule : {WeightRule::AsIs, WeightRule::Normalize, WeightRule::Refuse}) {
    CHECK(runs_of(resolve_weights(rig, rule)) == std::vector<Run>(3));
  }
}

// Catches the sum brought to 1 instead of what it was, the order of influences lost, the lightest
// kept, ties by place, and vertices with fewer touched. Exact in binary where compared exactly.
TEST_CASE("keep_influences: the heaviest stay in place and take over the weight of the others") {
  const Run run = {{0, 0.125}, {1, 0.5}, {2, 0.125}, {3, 0.25}};
  CHECK(kept(run, 0) == std::vector<Run>{run, {}});
  CHECK(kept(run, 4) == std::vector<Run>{run, {}});
  CHECK(kept(run, 1) == std::vector<Run>{{{1, 1.0}}, {}});
  CHECK(kept(run, 2) == std::vector<Run>{{{1, 0.5 / 0.75}, {3, 0.25 / 0.75}}, {}});
  CHECK(kept({{0, 0.25}, {1, 0.125}, {2, 0.125}}, 1) == std::vector<Run>{{{0, 0.5}}, {}});
  CHECK(kept(run, 3)[0][0].first == 0);
  CHECK(kept(run, 3, kReversed)[0][1].first == 2);
  CHECK(kept({{0, 0.5}, {1, -0.5}, {2, -1.0}}, 2) == std::vector<Run>{{{0, 0.5}, {1, -0.5}}, {}});
}

// Catches rounding without repair (sums of 254 or 256), the repair given to the wrong influence,
// ties by place, a vertex whose sum is not 1 forced to it, and zeros kept.
// Source: largest remainder method (common practice); values by hand: 127.5, 63.75, 63.75 units
// need two more, 127.5 twice needs one.
TEST_CASE("round_weights: multiples of a step whose sum is kept, by largest remainder") {
  const auto units = [](double count) { return count / 255; };
  CHECK(rounded({{0, 0.5}, {1, 0.25}, {2, 0.25}}, 8) ==
        std::vector<Run>{{{0, units(127)}, {1, units(64)}, {2, units(64)}}, {}});
  CHECK(rounded({{1, 0.5}, {0, 0.5}}, 8) ==
        std::vector<Run>{{{1, units(127)}, {0, units(128)}}, {}});
  CHECK(rounded({{1, 0.5}, {0, 0.5}}, 8, kReversed) ==
        std::vector<Run>{{{1, units(128)}, {0, units(127)}}, {}});
  CHECK(rounded({{0, 0.5}, {1, 0.25}}, 8) ==
        std::vector<Run>{{{0, units(127)}, {1, units(64)}}, {}});
  CHECK(rounded({{0, 0.9990234375}, {1, 0.0009765625}}, 8) == std::vector<Run>{{{0, 1.0}}, {}});
  CHECK(rounded({{0, 0.5}, {1, 0.5}}, 16) ==
        std::vector<Run>{{{0, 32768.0 / 65535}, {1, 32767.0 / 65535}}, {}});
  CHECK(rounded({{0, 0.3}, {1, 0.7}}, 0) == std::vector<Run>{{{0, 0.3}, {1, 0.7}}, {}});
}

// Catches sums that drift and steps larger than one unit. Source: elementary.
TEST_CASE("round_weights: on random weights every sum is whole and no weight moves by a unit") {
  const TubeRig rig = random_tube(5);
  const std::vector<Run> before = runs_of(rig.prepared.influences);
  const std::vector<Run> after =
      runs_of(skinning::round_weights(rig.prepared.influences, 8, rig.prepared.joint_rank));
  for (std::size_t v = 0; v < before.size(); ++v) {
    double sum = 0;
    for (const auto& [joint, weight] : after[v]) {
      sum += 255 * weight;
      for (const auto& [was, old] : before[v]) {
        if (was == joint) CHECK(std::abs(weight - old) < 1.0 / 255);
      }
    }
    CHECK(sum == Approx(255).epsilon(1e-14));
  }
}

// Catches ties by place, the lightest taken, and negative weights taken for heavy.
TEST_CASE("heaviest: counted from the start of the run, ties by rank") {
  const model::Influences influences =
      influences_of({{{0, 1.0}}, {{0, 0.25}, {3, 0.5}, {1, 0.5}}, {}, {{0, -3.0}, {1, -1.0}}});
  CHECK(skinning::heaviest(influences, 0, kRanks) == 0);
  CHECK(skinning::heaviest(influences, 1, kRanks) == 2);
  CHECK(skinning::heaviest(influences, 1, kReversed) == 1);
  CHECK(skinning::heaviest(influences, 2, kRanks) == metrics::kNone);
  CHECK(skinning::heaviest(influences, 3, kRanks) == 1);
}

}  // namespace
}  // namespace tests
