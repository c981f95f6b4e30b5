#include "harness/case_run.h"

#include "harness/base/file.h"
#include "harness/base/sha256.h"
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
  for (int i = 0; i < 3; ++i)
    if (!(std::abs(v[i]) <= largest)) largest = std::abs(v[i]);  // NaN widens, to be seen
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

std::string frame_hash(const metrics::Points& points) {
  base::Sha256 hash;
  for (const auto& point : points)
    for (int i = 0; i < 3; ++i) hash.add(point[i]);
  return hash.hex();
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
  std::string hash;
};

CaseRun::CaseRun(const model::Suite& suite, const model::CaseSpec& spec, const CaseInputs& inputs,
                 const Reference& reference, fs::path out)
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
  std::error_code ignored;
  fs::remove_all(folder_, ignored);  // what an earlier run left
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

void CaseRun::compare_shapes() {
  const auto count = [](std::size_t n) { return static_cast<double>(n); };
  const std::vector<double>& times = inputs_.motion.times;
  if (inputs_.given) {
    const model::GivenFrames& given = *inputs_.given;
    if (given.frames != times.size())
      shape_check("frames", count(given.frames), count(times.size()),
                  fmt::format("{} holds {} frames, the motion has {}", given.file, given.frames,
                              times.size()));
    if (given.vertices != surface_.rest.size())
      shape_check("vertices", count(given.vertices), count(surface_.rest.size()),
                  fmt::format("{} holds {} vertices, the rig has {}", given.file, given.vertices,
                              surface_.rest.size()));
    computable_ = result_.checks.empty();
  }
  if (reference_.kind == Reference::Kind::None || !computable_) return;
  const std::size_t differences = result_.checks.size();
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
    const metrics::Surface& surface = reference_.own_surface ? *reference_.own_surface : surface_;
    golden_measured = measure(surface, {golden_points, {}, noise_});
    evidence.reference = {&surface, golden_points, &golden_measured};
  }
  frame.verdict = judge_frame(plans_, evidence);
  if (spec_.profile == model::Profile::Exact) frame.hash = frame_hash(frame.points);
  return frame;
}

void CaseRun::take(Frame&& frame) {
  const std::size_t index = hashes_.size();
  if (index == 0) worst_ = frame.verdict.checks;
  for (std::size_t i = 0; index > 0 && i < worst_.size(); ++i)
    if (worse(frame.verdict.checks[i], worst_[i])) worst_[i] = std::move(frame.verdict.checks[i]);
  for (const auto& [name, value] : frame.verdict.series) result_.series[name].push_back(value);
  writer_->add(inputs_.motion.times[index], frame.points);
  hashes_.push_back(std::move(frame.hash));
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
  metrics::Points positions = rig.positions;  // the shape that the joints were bound to
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
    check.joint = name.empty() ? fmt::format("#{}", node) : name;
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
  for (const model::Skin& skin : inputs_.rig->rig.skins)
    if (skin.bind_scale != 1) record.bind_scale[skin.name] = skin.bind_scale;
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

model::CaseResult CaseRun::finish() {
  for (Check& check : worst_) result_.checks.push_back(std::move(check));
  judge_asset_checks();
  if (reference_.record && comparable_ && spec_.profile == model::Profile::Exact) {
    Check bits;
    bits.statistic = "bits";
    bits.kind = "bits";
    const auto& golden = reference_.record->frame_sha256;
    for (std::size_t f = 0; f < hashes_.size(); ++f) {
      if (hashes_[f] == golden[f]) continue;
      if (bits.failing++ == 0) {
        bits.frame = f;
        bits.time = inputs_.motion.times[f];
      }
    }
    bits.value = static_cast<double>(bits.failing);
    bits.allowance = 0;
    bits.over = bits.failing > 0;
    if (!bits.over) bits.used = 0;
    bits.verdict = bits.over ? Verdict::Beyond : Verdict::Within;
    result_.checks.push_back(std::move(bits));
  }
  name_joints();
  std::stable_sort(result_.checks.begin(), result_.checks.end(), worse);

  if (reference_.kind == Reference::Kind::None) result_.verdict = Verdict::Unsigned;
  if (reference_.kind == Reference::Kind::Method)
    result_.notes.push_back(fmt::format("compared with method '{}', not with a golden",
                                        suite_.methods[spec_.method].against));
  for (const Check& check : result_.checks)
    result_.verdict = std::max(result_.verdict, check.verdict);
  if (reference_.record)
    for (const auto& [group, hash] : result_.inputs) {
      const auto golden = reference_.record->inputs.find(group);
      if (golden == reference_.record->inputs.end() || golden->second != hash)
        result_.changed.push_back(group);
    }
  if (writer_ && result_.verdict != Verdict::Within) write_candidate();
  return std::move(result_);
}

}  // namespace harness
