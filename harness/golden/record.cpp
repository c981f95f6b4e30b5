#include "harness/base/error.h"
#include "harness/base/file.h"
#include "harness/base/json.h"
#include "harness/golden/golden.h"
#include "harness/golden/names.h"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

#include <algorithm>
#include <cmath>
#include <limits>

namespace golden {

namespace {

using base::Json;
using base::JsonView;
using Kind = base::Json::Kind;

constexpr std::string_view kFormat = "record 1";
constexpr std::uintmax_t kLargestRecord = std::uintmax_t{64} << 20;
constexpr double kLargestCount = 9007199254740992.0;  // 2^53
constexpr double kLargest = std::numeric_limits<double>::max();

bool is_hex(std::string_view text) {
  return std::all_of(text.begin(), text.end(),
                     [](char c) { return (c >= '0' && c <= '9') || (c >= 'a' && c <= 'f'); });
}

bool is_letter_or_digit(char c) {
  return (c >= '0' && c <= '9') || (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z');
}

// One part of a name; what is no such name could lead a path elsewhere.
bool is_name(std::string_view text) {
  return !text.empty() && text.size() <= 64 && is_letter_or_digit(text.front()) &&
         text.back() != '.' && std::all_of(text.begin(), text.end(), [](char c) {
           return is_letter_or_digit(c) || c == '.' || c == '_' || c == '-';
         });
}

bool is_case_name(std::string_view text) {
  const std::size_t first = text.find('/');
  const std::size_t last = text.rfind('/');
  return first != std::string_view::npos && first != last && is_name(text.substr(0, first)) &&
         is_name(text.substr(first + 1, last - first - 1)) && is_name(text.substr(last + 1));
}

std::string text_of(JsonView& view, std::string_view key) {
  const Json* value = view.required(key, Kind::String);
  return value == nullptr ? std::string() : value->string;
}

std::size_t count_of(JsonView& view, std::string_view key) {
  if (view.required(key, Kind::Number) == nullptr) return 0;
  return static_cast<std::size_t>(view.integer(key, 0, {0, kLargestCount}));
}

double length_of(JsonView& view, std::string_view key) {
  if (view.required(key, Kind::Number) == nullptr) return 0;
  return view.number(key, 0, {0, kLargest});
}

std::string sha256_of(JsonView& view, std::string_view key) {
  std::string text = text_of(view, key);
  if (view.json().find(key) != nullptr && !is_sha256(text))
    view.fail(key, "a SHA-256 was expected: 64 hexadecimal digits in lower case");
  return text;
}

std::map<std::string, double> numbers_by_name(JsonView& view, std::string_view key) {
  std::map<std::string, double> out;
  const Json* object = view.required(key, Kind::Object);
  if (object == nullptr) return out;
  JsonView inner = view.child(key, *object);
  for (const auto& [name, value] : object->members)
    if (inner.required(name, Kind::Number) != nullptr) out[name] = value.number;
  return out;
}

model::Fingerprints fingerprints_of(JsonView& view) {
  model::Fingerprints out;
  const Json* object = view.required("inputs", Kind::Object);
  if (object == nullptr) return out;
  JsonView inner = view.child("inputs", *object);
  for (const auto& [name, value] : object->members) out[name] = sha256_of(inner, name);
  return out;
}

std::map<std::string, model::RecordedWorst> worst_of(JsonView& view, std::size_t frames) {
  std::map<std::string, model::RecordedWorst> out;
  const Json* object = view.required("worst", Kind::Object);
  if (object == nullptr) return out;
  JsonView all = view.child("worst", *object);
  for (const auto& [name, value] : object->members) {
    if (all.required(name, Kind::Object) == nullptr) continue;
    JsonView inner = all.child(name, value);
    model::RecordedWorst& worst = out[name];
    const Json* number = inner.member("value");
    if (number != nullptr && number->kind == Kind::Null) {  // no finite number
      worst.value = std::numeric_limits<double>::quiet_NaN();
    } else {
      number = inner.required("value", Kind::Number);
      if (number != nullptr) worst.value = number->number;
    }
    worst.frame = count_of(inner, "frame");
    if (worst.frame >= frames) inner.fail("frame", fmt::format("there are only {} frames", frames));
  }
  return out;
}

std::vector<model::SignOff> signoffs_of(JsonView& view) {
  std::vector<model::SignOff> out;
  const Json* list = view.required("signoffs", Kind::Array);
  if (list == nullptr) return out;
  const std::string pointer = base::child_pointer(view.pointer(), "signoffs");
  for (const Json& item : list->items) {
    JsonView inner(item, base::child_pointer(pointer, out.size()), view.problems());
    model::SignOff& one = out.emplace_back();
    if (!inner.is_object()) continue;
    one = {text_of(inner, "by"), text_of(inner, "role"), text_of(inner, "when"),
           text_of(inner, "why"), text_of(inner, "predecessor")};
    const bool first = out.size() == list->items.size();
    if (first ? !one.predecessor.empty() : !is_sha256(one.predecessor))
      inner.fail("predecessor",
                 first ? "the oldest sign-off has no predecessor; an empty text was expected"
                       : "the SHA-256 of the record before was expected");
  }
  return out;
}

void check_contradictions(const JsonView& view, const model::Record& record) {
  if (!is_name(record.suite)) view.fail("suite", "this is no name of a suite");
  if (!is_case_name(record.name)) view.fail("name", "rig/motion/method was expected");
  if (!is_frames_file_name(record.frames_file) ||
      record.frames_file != frames_file_name(record.frames_sha256))
    view.fail("frames_file", "frames-<first 16 digits of frames_sha256>.bin was expected");
  if (record.frame_sha256.size() != record.frames)
    view.fail("frame_sha256", fmt::format("{} hashes were expected, one for each frame, not {}",
                                          record.frames, record.frame_sha256.size()));
  for (std::size_t i = 0; i < record.frame_sha256.size(); ++i)
    if (!is_sha256(record.frame_sha256[i]))
      view.fail("frame_sha256", fmt::format("entry {} is no SHA-256", i));
}

model::Record record_from(const Json& json) {
  std::vector<base::Problem> problems;
  JsonView view(json, "", problems);
  model::Record record;
  const std::string format = view.is_object() ? text_of(view, "skinfold") : "";
  if (problems.empty() && format != kFormat)
    view.fail("skinfold", fmt::format("this is '{}'; this version of Skinfold reads '{}'. A record "
                                      "of a later version needs a later Skinfold",
                                      format, kFormat));
  if (!problems.empty()) throw base::InputError(std::move(problems));
  record.suite = text_of(view, "suite");
  record.name = text_of(view, "name");
  record.program = text_of(view, "program");
  record.frames_file = text_of(view, "frames_file");
  record.frames_sha256 = sha256_of(view, "frames_sha256");
  record.frames = count_of(view, "frames");
  record.vertices = count_of(view, "vertices");
  record.faces = count_of(view, "faces");
  record.diagonal = length_of(view, "diagonal");
  record.grain = length_of(view, "grain");
  record.magnitude = length_of(view, "magnitude");
  record.weld = length_of(view, "weld");
  record.bind_scale = numbers_by_name(view, "bind_scale");
  record.inputs = fingerprints_of(view);
  record.worst = worst_of(view, record.frames);
  if (view.required("frame_sha256", Kind::Array) != nullptr)
    record.frame_sha256 = view.texts("frame_sha256");
  record.non_finite = count_of(view, "non_finite");
  record.signoffs = signoffs_of(view);
  if (problems.empty()) check_contradictions(view, record);
  if (!problems.empty()) throw base::InputError(std::move(problems));
  return record;
}

}  // namespace

bool is_sha256(std::string_view text) {
  return text.size() == 64 && is_hex(text);
}

std::string frames_file_name(std::string_view sha256) {
  return fmt::format("frames-{}.bin", sha256.substr(0, 16));
}

bool is_frames_file_name(std::string_view name) {
  return name.size() == 27 && name.starts_with("frames-") && name.ends_with(".bin") &&
         is_hex(name.substr(7, 16));
}

model::Record read_record(const std::filesystem::path& path, const std::string& shown) {
  if (const base::FileReader file(path, shown); file.size() > kLargestRecord)
    throw base::InputError(fmt::format("is {} bytes long; records of more than {} are refused",
                                       file.size(), kLargestRecord),
                           shown);
  const base::JsonSource source = base::read_json_source(path, shown);
  return record_from(base::parse_json(source));
}

std::string write_record(const model::Record& record) {
  // An object of this library keeps its keys sorted.
  nlohmann::json json = {
      {"skinfold", kFormat},
      {"suite", record.suite},
      {"name", record.name},
      {"program", record.program},
      {"frames_file", record.frames_file},
      {"frames_sha256", record.frames_sha256},
      {"frames", record.frames},
      {"vertices", record.vertices},
      {"faces", record.faces},
      {"diagonal", record.diagonal},
      {"grain", record.grain},
      {"magnitude", record.magnitude},
      {"weld", record.weld},
      {"bind_scale", record.bind_scale},
      {"inputs", record.inputs},
      {"worst", nlohmann::json::object()},
      {"frame_sha256", record.frame_sha256},
      {"non_finite", record.non_finite},
      {"signoffs", nlohmann::json::array()},
  };
  for (const auto& [name, worst] : record.worst)
    json["worst"][name] = {{"value", worst.value}, {"frame", worst.frame}};
  for (const model::SignOff& one : record.signoffs)
    json["signoffs"].push_back({{"by", one.by},
                                {"role", one.role},
                                {"when", one.when},
                                {"why", one.why},
                                {"predecessor", one.predecessor}});
  // A byte that is no UTF-8 (from a command line) becomes U+FFFD.
  return json.dump(2, ' ', false, nlohmann::json::error_handler_t::replace) + "\n";
}

std::filesystem::path case_folder(const std::filesystem::path& folder, const std::string& suite,
                                  const std::string& case_name) {
  if (!is_name(suite) || !is_case_name(case_name))
    throw base::InputError(fmt::format("'{}' and '{}' are no names of a suite and a case "
                                       "(rig/motion/method)",
                                       suite, case_name),
                           "");
  return folder / suite / case_name;
}

}  // namespace golden
