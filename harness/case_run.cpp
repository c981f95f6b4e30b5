#include "harness/case_run.h"

#include "harness/base/file.h"
#include "harness/parallel.h"

#include <Eigen/LU>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace harness {

namespace fs = std::filesystem;
using model::Check;
using model::Verdict;

namespace {

constexpr double kGrain = 1e-6;                 // of D
constexpr double kRounding = 4.0 / 16777216.0;  // 4 * 2^-24, whatever the precision
constexpr double kSameTime = 1e-6;              // seconds

void widen(double& largest, const Eigen::Vector3d& v) {
  for (int i = 0; i < 3; ++i)  // a NaN stays, to be seen
    if (!std::isnan(largest) && !(std::abs(v[i]) <= largest)) largest = std::abs(v[i]);
}

// M of the noise model: the largest number that enters the arithmetic of a case. Never a coordinate
// of today's skin, so that a fault cannot widen its own allowance.
double input_magnitude(const CaseInputs& inputs) {
  double largest = 0;
  for (const auto& point : inputs.rig->surface.rest) widen(largest, point);
  if (!inputs.joints) return largest;
  const model::Rig& rig = inputs.rig->rig;
  for (const model::Joint& joint : rig.joints) widen(largest, joint.inverse_bind.block<3, 1>(0, 3));
  for (std::size_t f = 0; f < inputs.motion.times.size(); ++f) {
    const auto to_model = skinning::joint_to_model(rig, inputs.motion, f);
    for (const auto& matrix : to_model) widen(largest, matrix.block<3, 1>(0, 3));
    for (const auto& matrix : skinning::skinning_matrices(rig, to_model))
      widen(largest, matrix.col(3));
  }
  return largest;
}

// inverse(inverse bind) * inverse bind per joint; NaN where there is no inverse.
std::vector<Eigen::Matrix<double, 3, 4>> bind_products(const model::Rig& rig) {
  constexpr double kSingular = 1e-12;
  std::vector<Eigen::Matrix<double, 3, 4>> products;
  for (const model::Joint& joint : rig.joints) {
    const Eigen::Matrix3d A = joint.inverse_bind.topLeftCorner<3, 3>();
    const double size = A.col(0).norm() * A.col(1).norm() * A.col(2).norm();
    Eigen::Matrix<double, 3, 4> product;
    if (std::abs(A.determinant()) > kSingular * size && size > 0)
      product = (joint.inverse_bind.inverse() * joint.inverse_bind).topRows<3>();
    else
      product.setConstant(std::numeric_limits<double>::quiet_NaN());
    products.push_back(product);
  }
  return products;
}

}  // namespace

struct CaseRun::Frame {
  FrameVerdict verdict;
  metrics::Points points;
  std::string hash, reference_hash;  // of the unrounded positions; empty where none is compared
};

CaseRun::CaseRun(const model::Suite& suite, const model::CaseSpec& spec, const CaseInputs& inputs,
                 const Reference& reference, const fs::path& out)
    : suite_(suite),
      spec_(spec),
      inputs_(inputs),
      reference_(reference),
      folder_(golden::case_folder(out / "frames", suite.name, spec.name)),
      surface_(inputs.rig->surface),
      rest_(measure_rest(surface_)) {
  result_.name = spec.name;
  result_.rig = suite.rigs[spec.rig].name;
  result_.motion = suite.motions[spec.motion].name;
  result_.method = suite.methods[spec.method].name;
  result_.against = suite.methods[spec.method].against;
  result_.frames = inputs.motion.times.size();
  result_.vertices = surface_.rest.size();
  result_.inputs = inputs.inputs;
  result_.notes = inputs.rig->notes;

  magnitude_ = input_magnitude(inputs);
  if (!std::isfinite(magnitude_))
    throw base::InputError(
        "a joint of this motion moves to no finite place: a scale or translation overflows",
        inputs.rig->rig.file);
  double reference_magnitude = magnitude_;
  if (reference.record) reference_magnitude = std::max(magnitude_, reference.record->magnitude);
  const double reference_grain = reference.record ? reference.record->grain : 0;
  grain_ = kGrain * surface_.diagonal;
  noise_ = kRounding * magnitude_;
  delta_ = kRounding * reference_magnitude + reference_grain / 2 * std::sqrt(3.0);

  compare_shapes();
  plans_ = plan_checks(spec, inputs.rig->rig.has_skin(), comparable_);
  if (computable_) writer_.emplace(folder_, surface_.rest, surface_.faces, grain_);
}

void CaseRun::shape_check(std::string what, double today, double golden, std::string reason) {
  Check check;
  check.statistic = std::move(what);
  check.kind = "shape";
  check.value = today;
  check.golden = golden;
  check.over = true;
  check.verdict = Verdict::Beyond;
  check.reason = std::move(reason);
  result_.checks.push_back(std::move(check));
}

void CaseRun::compare_given(const model::GivenFrames& given) {
  const std::size_t frames = inputs_.motion.times.size();
  const std::size_t vertices = surface_.rest.size();
  if (given.frames != frames)
    shape_check(
        "frames", static_cast<double>(given.frames), static_cast<double>(frames),
        fmt::format("{} holds {} frames, the motion has {}", given.file, given.frames, frames));
  if (given.vertices != vertices)
    shape_check(
        "vertices", static_cast<double>(given.vertices), static_cast<double>(vertices),
        fmt::format("{} holds {} vertices, the rig has {}", given.file, given.vertices, vertices));
}

void CaseRun::compare_shapes() {
  const auto count = [](std::size_t n) { return static_cast<double>(n); };
  const std::vector<double>& times = inputs_.motion.times;
  if (inputs_.given) {
    compare_given(*inputs_.given);
    computable_ = result_.checks.empty();
  }
  if (reference_.kind == Reference::Kind::None || !computable_) return;
  const std::size_t differences = result_.checks.size();
  if (reference_.other && reference_.other->given) compare_given(*reference_.other->given);
  const std::vector<double>& golden = reference_.times;
  if (golden.size() != times.size()) {
    shape_check(
        "frames", count(times.size()), count(golden.size()),
        fmt::format("the motion has {} frames, the golden {}", times.size(), golden.size()));
  } else {
    for (std::size_t f = 0; f < times.size(); ++f) {
      if (std::abs(times[f] - golden[f]) <= kSameTime) continue;
      shape_check(
          "times", times[f], golden[f],
          fmt::format("frame {} is at {:.6g} s, the golden's at {:.6g} s", f, times[f], golden[f]));
      break;
    }
  }
  if (const auto& own = reference_.own_surface) {
    if (own->rest.size() != surface_.rest.size())
      shape_check("vertices", count(surface_.rest.size()), count(own->rest.size()),
                  fmt::format("the mesh has {} vertices, the golden {}", surface_.rest.size(),
                              own->rest.size()));
    else if (!metrics::same_topology(*own, surface_))
      shape_check(
          "topology", count(surface_.faces.size()), count(own->faces.size()),
          "the faces join other vertices than in the golden, or other vertices coincide at rest");
  }
  comparable_ = result_.checks.size() == differences;
}

CaseRun::Frame CaseRun::judge_frame_at(std::size_t index) const {
  Frame frame;
  const std::vector<skinning::Affine> matrices = matrices_of_frame(inputs_, index);
  inputs_.deform(index, matrices, frame.points);
  if (comparable_) frame.hash = golden::frame_sha256(frame.points);
  std::vector<Eigen::Vector4d> carried;
  if (inputs_.joints) carried = skinning::carried_rotations(inputs_.prepared, matrices);
  const Measured measured = measure(surface_, {frame.points, carried, noise_});

  FrameEvidence evidence;
  evidence.frame = index;
  evidence.time = inputs_.motion.times[index];
  evidence.today = {&surface_, frame.points, &measured};
  evidence.rest = &rest_;
  evidence.delta = delta_;
  metrics::Points golden_points;
  Measured golden_measured;
  if (comparable_) {
    if (reference_.file)
      reference_.file->read(index, golden_points);
    else
      deform_frame(*reference_.other, index, golden_points);
    // A golden that was computed from the same bits is known without the rounding of its file.
    frame.reference_hash = reference_.record ? reference_.record->frame_sha256[index]
                                             : golden::frame_sha256(golden_points);
    if (frame.hash == frame.reference_hash) golden_points = frame.points;
    const metrics::Surface& surface = reference_.own_surface ? *reference_.own_surface : surface_;
    golden_measured = measure(surface, {golden_points, {}, noise_});
    evidence.reference = {&surface, golden_points, &golden_measured};
  }
  frame.verdict = judge_frame(plans_, evidence);
  return frame;
}

void CaseRun::take(Frame&& frame) {
  const std::size_t index = taken_++;
  if (index == 0) worst_ = frame.verdict.checks;
  for (std::size_t i = 0; index > 0 && i < worst_.size(); ++i)
    if (worse(frame.verdict.checks[i], worst_[i])) worst_[i] = std::move(frame.verdict.checks[i]);
  for (const auto& [name, value] : frame.verdict.series) result_.series[name].push_back(value);
  writer_->add(inputs_.motion.times[index], frame.points);
  if (frame.hash == frame.reference_hash) return;
  if (bits_failing_++ == 0) first_other_bits_ = index;
}

void CaseRun::judge_frames(std::size_t jobs) {
  if (!computable_) return;
  const std::size_t block = 2 * std::max<std::size_t>(jobs, 1);
  std::vector<Frame> frames(block);
  for (std::size_t first = 0; first < result_.frames; first += block) {
    const std::size_t count = std::min(block, result_.frames - first);
    parallel_for(count, jobs, [&](std::size_t i) { frames[i] = judge_frame_at(first + i); });
    for (std::size_t i = 0; i < count; ++i) take(std::move(frames[i]));
  }
}

void CaseRun::judge_asset_checks() {
  const model::Rig& rig = inputs_.rig->rig;
  if (!rig.has_skin()) return;
  const auto products = bind_products(rig);
  std::vector<double> scale;
  for (const auto skin : rig.vertex_skin) scale.push_back(rig.skins[skin].bind_scale);
  metrics::Points positions(surface_.rest.size());  // the shape that the joints were bound to
  for (std::size_t v = 0; v < positions.size(); ++v) positions[v] = surface_.rest[v] / scale[v];
  const metrics::Binding binding{rig.influences.first,
                                 rig.influences.joint,
                                 rig.influences.weight,
                                 scale,
                                 positions,
                                 products};
  for (Check& check : judge_asset(plans_, surface_, binding))
    result_.checks.push_back(std::move(check));
}

void CaseRun::name_joints() {
  const model::Rig& rig = inputs_.rig->rig;
  const model::Influences& all = inputs_.prepared.influences;
  if (!rig.has_skin() || all.first.empty()) return;
  for (Check& check : result_.checks) {
    std::vector<double> sums(rig.joints.size(), 0);
    for (const auto v : check.vertices)
      for (auto i = all.first[v]; i < all.first[v + 1]; ++i) sums[all.joint[i]] += all.weight[i];
    std::size_t best = sums.size();
    for (std::size_t j = 0; j < sums.size(); ++j) {
      if (!(sums[j] > 0)) continue;
      const auto& rank = inputs_.prepared.joint_rank;
      if (best == sums.size() || sums[j] > sums[best] ||
          (sums[j] == sums[best] && rank[j] < rank[best]))
        best = j;
    }
    if (best == sums.size()) continue;
    const int node = rig.joints[best].node;
    const std::string& name = rig.nodes[static_cast<std::size_t>(node)].name;
    const auto alike = std::count_if(rig.joints.begin(), rig.joints.end(), [&](const auto& other) {
      return other.node != node && rig.nodes[static_cast<std::size_t>(other.node)].name == name;
    });
    check.joint = name.empty() ? fmt::format("#{}", node)
                  : alike == 0 ? name
                               : model::node_path(rig, node);
    if (check.domain != metrics::Domain::Asset) continue;
    // A statistic of the asset has no element of its own: the sentence tells where it is worst.
    if (check.verdict == Verdict::Beyond)
      check.reason =
          fmt::format("worst at vertex {}, joint {}", check.vertices.front(), check.joint);
    check.vertices.clear();
    check.place.reset();
    check.joint.clear();
  }
}

void CaseRun::write_candidate() {
  const golden::FramesWriter::Written written = writer_->commit();
  if (reference_.kind == Reference::Kind::Method) return;  // nothing to sign: no golden is meant
  model::Record record;
  record.suite = suite_.name;
  record.name = spec_.name;
  record.program = SKINFOLD_VERSION;
  record.frames_file = written.file;
  record.frames_sha256 = written.sha256;
  record.frames = written.frames;
  record.vertices = surface_.rest.size();
  record.faces = surface_.faces.size();
  record.diagonal = surface_.diagonal;
  record.grain = grain_;
  record.magnitude = std::max(magnitude_, written.largest_coordinate);
  record.weld = surface_.weld;
  const std::vector<model::Skin>& skins = inputs_.rig->rig.skins;
  for (std::size_t i = 0; i < skins.size(); ++i)
    if (skins[i].bind_scale != 1)
      record.bind_scale[fmt::format("#{} {}", i, skins[i].name)] = skins[i].bind_scale;
  record.inputs = result_.inputs;
  record.frame_sha256 = written.frame_sha256;
  record.non_finite = written.non_finite;
  for (const auto& [name, values] : result_.series) {
    const double neutral = model::find_statistic(name)->statistic->neutral;
    std::optional<model::RecordedWorst> worst;
    for (std::size_t f = 0; f < values.size(); ++f) {
      if (std::isnan(values[f])) continue;
      if (!worst || std::abs(values[f] - neutral) > std::abs(worst->value - neutral))
        worst = model::RecordedWorst{values[f], f};
    }
    if (worst) record.worst[name] = *worst;
  }
  base::write_file(folder_ / "record.json", golden::write_record(record));
}

Check CaseRun::bits_check() const {
  Check bits;
  bits.statistic = "bits";
  bits.kind = "bits";
  bits.value = static_cast<double>(bits_failing_);
  bits.allowance = 0;
  bits.failing = bits_failing_;
  if (bits_failing_ == 0) {
    bits.used = 0;
    return bits;
  }
  bits.over = true;
  bits.verdict = Verdict::Beyond;
  bits.frame = first_other_bits_;
  bits.time = inputs_.motion.times[first_other_bits_];
  return bits;
}

model::CaseResult CaseRun::finish() {
  for (Check& check : worst_) result_.checks.push_back(std::move(check));
  judge_asset_checks();
  if (comparable_ && spec_.profile == model::Profile::Exact) result_.checks.push_back(bits_check());
  name_joints();
  std::stable_sort(result_.checks.begin(), result_.checks.end(), worse);

  if (reference_.kind == Reference::Kind::None) result_.verdict = Verdict::Unsigned;
  if (!result_.against.empty())
    result_.notes.push_back(
        fmt::format("compared with method '{}', not with a golden", result_.against));
  for (const Check& check : result_.checks)
    result_.verdict = std::max(result_.verdict, check.verdict);
  if (reference_.record) {
    const model::Fingerprints& golden = reference_.record->inputs;
    for (const char* group :
         {"positions", "faces", "weights", "joints", "bind", "motion", "method"}) {
      const auto today = result_.inputs.find(group);
      const auto then = golden.find(group);
      const bool gone = today == result_.inputs.end();
      if (gone != (then == golden.end()) || (!gone && today->second != then->second))
        result_.changed.emplace_back(group);
    }
  }
  if (writer_ && result_.verdict != Verdict::Within) write_candidate();
  return std::move(result_);
}

}  // namespace harness
