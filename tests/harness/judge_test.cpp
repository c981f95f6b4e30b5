#include "harness/judge.h"

#include "tests/support/shapes.h"

#include <catch2/catch.hpp>

#include <cmath>

using harness::FrameEvidence;
using harness::Measured;
using harness::Plan;
using metrics::Points;
using metrics::Surface;
using model::Check;
using model::Verdict;

namespace {

constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

// A sphere, its golden and a result, judged as one frame.
struct Bench {
  Surface surface;
  Points golden, today;
  double delta = 0;

  Bench() {
    const tests::Shape shape = tests::icosphere(2);
    surface = metrics::make_surface(shape.points, shape.faces);
    golden = today = surface.rest;
  }

  std::vector<Check> judged(const model::CaseSpec& spec) const {
    const Measured rest = harness::measure_rest(surface);
    const std::vector<Eigen::Vector4d> still(today.size(), Eigen::Vector4d(0, 0, 0, 1));
    const Measured now = harness::measure(surface, {today, still, delta});
    const Measured then = harness::measure(surface, {golden, {}, delta});
    FrameEvidence evidence;
    evidence.frame = 3;
    evidence.time = 0.125;
    evidence.today = {&surface, today, &now};
    evidence.rest = &rest;
    evidence.reference = {&surface, golden, &then};
    evidence.delta = delta;
    return harness::judge_frame(harness::plan_checks(spec, false, true), evidence).checks;
  }

  Check judged(const model::CaseSpec& spec, const std::string& statistic,
               const std::string& kind = "drift") const {
    for (const Check& check : judged(spec))
      if (check.statistic == statistic && check.kind == kind) return check;
    FAIL("no check of " << statistic);
    return {};
  }
};

model::CaseSpec with_profile(model::Profile profile) {
  model::CaseSpec spec;
  spec.profile = profile;
  return spec;
}

}  // namespace

// Catches: a bound that is off by its own value, a side without bound that counts, `between` away
// from neutral. Values by the definition of "used" in the README.
TEST_CASE("used of a limit") {
  using harness::used_of_limit;
  const model::LimitBound most{{}, 1.6, false};
  CHECK(used_of_limit(1.3, 1, most) == Approx(0.5));
  CHECK(used_of_limit(1.6, 1, most) == Approx(1));
  CHECK(used_of_limit(0.2, 1, most) == 0);
  const model::LimitBound band{-0.1, 0.2, true};
  CHECK(used_of_limit(-0.05, 0, band) == Approx(0.5));
  CHECK(used_of_limit(0.05, 0, band) == Approx(0.25));
  const model::LimitBound away{2.0, 4.0, true};
  CHECK(used_of_limit(3, 0, away) == 0);
  CHECK(used_of_limit(4, 0, away) == Approx(1));
  CHECK(used_of_limit(6, 0, away) == Approx(3));
  const model::LimitBound none{{}, 0.0, false};
  CHECK(used_of_limit(0, 0, none) == 0);
  CHECK(std::isinf(used_of_limit(1, 0, none)));
}

// Catches: tolerances that a skin with no difference at all does not pass, in any profile.
TEST_CASE("a skin equal to its golden uses nothing") {
  const Bench bench;
  for (const auto profile : {model::Profile::Rounding, model::Profile::Reexport})
    for (const Check& check : bench.judged(with_profile(profile))) {
      INFO(check.statistic);
      CHECK(check.verdict == Verdict::Within);
      CHECK(check.used.value_or(0) == 0);
    }
}

// Catches: comparing aggregates instead of elements. The sphere is stretched everywhere, the golden
// most of all at one edge; moving another vertex leaves the largest stretch as it was.
TEST_CASE("drift is seen element by element even where the aggregate does not move") {
  Bench bench;
  bench.golden[0] *= 1.5;
  bench.today = bench.golden;
  const std::size_t other = 100;
  bench.today[other] *= 1.02;
  const Check check = bench.judged(with_profile(model::Profile::Reexport), "edge_stretch.max");
  CHECK(check.verdict == Verdict::Beyond);
  CHECK(check.frame == 3u);
  CHECK(check.failing > 1);
  bool touches = false;
  for (const auto v : check.vertices) touches = touches || v == other;
  CHECK(touches);
}

// Catches: an allowance that ignores the floor, the factor 4, the absolute or the relative part.
TEST_CASE("the allowance is the largest of four floors, absolute and relative part") {
  Bench bench;
  bench.delta = 1e-6;
  const double D = bench.surface.diagonal;
  const auto moved = [&](double by) {
    bench.today = bench.golden;
    bench.today[7].x() += by;
    return bench.judged(with_profile(model::Profile::Rounding), "position.max");
  };
  CHECK(moved(3.9e-6).verdict == Verdict::Within);
  CHECK(moved(3.9e-6).used == Approx(3.9 / 4));
  CHECK(moved(4.1e-6).verdict == Verdict::Beyond);
  CHECK(moved(4.1e-6).allowance == Approx(4e-6 / D));
  CHECK(moved(4.1e-6).element == 7u);
  CHECK(moved(4.1e-6).failing == 1);

  model::CaseSpec spec = with_profile(model::Profile::Rounding);
  spec.drift["position.max"] = {1e-3, 0};
  CHECK(bench.judged(spec, "position.max").allowance == Approx(1e-3));
  spec.drift["edge_stretch.max"] = {std::nullopt, 0.5};
  CHECK(bench.judged(spec, "edge_stretch.max").allowance ==
        Approx(0.5));  // of a golden stretch of 1
}

// Catches: a result that is undefined where the golden is not, and passes.
TEST_CASE("what is defined in only one of the two is beyond") {
  Bench bench;
  bench.today[5].y() = kNaN;
  for (const Check& check : bench.judged(with_profile(model::Profile::Rounding))) {
    INFO(check.statistic << " " << check.kind);
    CHECK(check.verdict == Verdict::Beyond);
  }
  CHECK(bench.judged(with_profile(model::Profile::Rounding), "finite.bad", "limit").value == 1);
  bench.golden = bench.today;  // undefined in both: nothing to compare
  CHECK(bench.judged(with_profile(model::Profile::Rounding), "position.max").verdict ==
        Verdict::Within);
  CHECK(bench.judged(with_profile(model::Profile::Rounding), "finite.bad").verdict ==
        Verdict::Within);
}

// Catches: a limit on a statistic that does not exist in a frame, and passes silently.
TEST_CASE("a limit that a suite sets on an undefined statistic is beyond, with the reason") {
  Bench bench;
  tests::Shape flat = tests::grid(4, 4);
  bench.surface = metrics::make_surface(flat.points, flat.faces);
  bench.golden = bench.today = bench.surface.rest;
  model::CaseSpec spec = with_profile(model::Profile::Rounding);
  spec.limits["volume.change"] = {-0.1, 0.1, true};
  const Check check = bench.judged(spec, "volume.change", "limit");
  CHECK(check.verdict == Verdict::Beyond);
  CHECK_FALSE(check.reason.empty());
  CHECK(bench.judged(spec, "volume.change").verdict == Verdict::Within);  // undefined in both
}

// Catches: a collapse that hides because the collapsed elements are too thin to be judged.
TEST_CASE("undecided elements are counted and may not become more") {
  Bench bench;
  bench.delta = 1e-5;
  const Check before = bench.judged(with_profile(model::Profile::Rounding), "dihedral.max");
  CHECK(before.undecided == 0);
  for (auto& point : bench.today) point *= 1e-7;
  const Check after = bench.judged(with_profile(model::Profile::Rounding), "dihedral.max");
  CHECK(after.verdict == Verdict::Beyond);
  CHECK(after.reason.find("too thin") != std::string::npos);
}

TEST_CASE("the worst check comes first") {
  Check within, beyond, over, undefined;
  within.used = 0.9;
  beyond.verdict = over.verdict = undefined.verdict = Verdict::Beyond;
  beyond.used = 4;
  over.over = undefined.over = true;
  over.value = 2;
  CHECK(harness::worse(beyond, within));
  CHECK(harness::worse(over, beyond));
  CHECK(harness::worse(undefined, over));
  CHECK_FALSE(harness::worse(within, within));
}

TEST_CASE("what is always asked can be taken away, and profile exact asks for bits alone") {
  model::CaseSpec spec;
  const auto has = [](const std::vector<Plan>& plans, const std::string& name, bool drift) {
    for (const Plan& plan : plans)
      if (plan.ref->name == name && plan.drift == drift) return true;
    return false;
  };
  CHECK(has(harness::plan_checks(spec, true, false), "weights.sum_error", false));
  CHECK(has(harness::plan_checks(spec, true, false), "finite.bad", false));
  CHECK_FALSE(has(harness::plan_checks(spec, false, false), "weights.sum_error", false));
  CHECK_FALSE(has(harness::plan_checks(spec, true, false), "position.max", true));
  CHECK(has(harness::plan_checks(spec, true, true), "position.max", true));
  spec.removed_limits = {"finite.bad"};
  CHECK_FALSE(has(harness::plan_checks(spec, true, false), "finite.bad", false));
  spec.profile = model::Profile::Exact;
  CHECK_FALSE(has(harness::plan_checks(spec, true, true), "position.max", true));
  spec.drift["position.max"] = {1e-3, 0};
  CHECK(has(harness::plan_checks(spec, true, true), "position.max", true));
}
