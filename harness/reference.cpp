#include "harness/case_run.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace harness {

namespace fs = std::filesystem;

namespace {

using Diagonals = std::vector<std::array<metrics::Index, 2>>;

Reference golden_reference(const fs::path& folder, const std::string& shown,
                           const RigInputs& today) {
  Reference reference;
  const fs::path record = folder / "record.json";
  std::error_code error;
  if (fs::symlink_status(record, error).type() == fs::file_type::not_found) return reference;
  reference.kind = Reference::Kind::Golden;
  reference.record = golden::read_record(record, shown + "/record.json");
  const std::string& name = reference.record->frames_file;
  auto file = std::make_shared<const golden::FramesReader>(folder / name, shown + "/" + name);
  const model::Record& said = *reference.record;
  if (file->frames() != said.frames || file->rest().size() != said.vertices ||
      file->faces().size() != said.faces || file->grain() != said.grain)
    throw base::InputError(
        "the golden is damaged: its frames file and record.json contradict each other; restore "
        "both from version control, or remove them by hand, gate and sign off anew",
        shown + "/" + name);
  reference.times = file->times();
  if (file->rest() != today.surface.rest || file->faces() != today.surface.faces)
    // Fanned polygons are known to today's file alone; they matter where the faces are the same.
    reference.own_surface = metrics::make_surface(
        file->rest(), file->faces(),
        file->faces() == today.surface.faces ? today.rig.diagonals : Diagonals{},
        today.surface.weld);
  reference.file = std::move(file);
  return reference;
}

}  // namespace

Reference load_reference(const model::Suite& suite, const model::CaseSpec& spec,
                         const CaseInputs& inputs, const fs::path& golden_folder) {
  const std::string& against = suite.methods[spec.method].against;
  if (against.empty())
    return golden_reference(golden::case_folder(golden_folder, suite.name, spec.name),
                            fmt::format("golden/{}/{}", suite.name, spec.name), *inputs.rig);
  const auto method = std::find_if(suite.methods.begin(), suite.methods.end(),
                                   [&](const model::MethodSpec& m) { return m.name == against; });
  Reference reference;
  reference.kind = Reference::Kind::Method;
  reference.other = std::make_shared<const CaseInputs>(load_case(
      suite, spec, static_cast<std::size_t>(method - suite.methods.begin()), *inputs.rig));
  reference.times = reference.other->motion.times;
  return reference;
}

}  // namespace harness
