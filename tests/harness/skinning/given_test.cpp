#include "tests/harness/skinning/tube_rig.h"

#include <catch2/catch.hpp>

namespace tests {
namespace {

// Catches frames mixed up, positions touched on the way, and matrices or weights asked for where a
// mesh alone has none. Source: elementary.
TEST_CASE("given: hands on what the frames hold, frame by frame") {
  Prepared prepared;
  prepared.rest = {{7, 7, 7}};
  model::GivenFrames frames;
  frames.frames = 3;
  frames.vertices = 1;
  frames.read = [](std::size_t frame, Points& out) {
    out = {{static_cast<double>(frame), -0.5, 1e-300}};
  };
  prepared.given = frames;
  const skinning::Method& method = skinning::find_method("given");
  const skinning::Deformer deformer = method.prepare(prepared, {});
  for (const std::size_t frame : {2U, 0U, 1U}) {
    Points out(5, Point::Zero());
    deformer(frame, {}, out);
    CHECK(out == Points{{static_cast<double>(frame), -0.5, 1e-300}});
  }
}

// Catches a file that may be left out, and weights parameters on a method that has no weights.
TEST_CASE("given: needs its file and nothing else") {
  const model::SkinningSpec& spec = skinning::find_method("given").spec;
  CHECK_FALSE(spec.computes);
  REQUIRE(spec.parameters.size() == 1);
  CHECK(spec.parameters[0].name == "frames");
  CHECK(spec.parameters[0].kind == model::ParameterSpec::Kind::File);
  CHECK(spec.parameters[0].required);
}

}  // namespace
}  // namespace tests
