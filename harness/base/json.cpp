#include "harness/base/json.h"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

#include <algorithm>
#include <cmath>
#include <unordered_set>

namespace base {

namespace {

constexpr std::size_t kMostProblems = 100;  // more help nobody, and each costs a look at the text

// Line and column, both from 1, of a byte of the text.
Problem place_of(const JsonSource& source, std::size_t offset, std::string pointer,
                 std::string message) {
  const std::string_view before = std::string_view(source.text).substr(0, offset);
  const auto line = std::count(before.begin(), before.end(), '\n') + 1;
  const std::size_t start = before.rfind('\n') + 1;  // npos + 1 is 0
  return {std::move(message), source.file, static_cast<int>(line),
          static_cast<int>(before.size() - start) + 1, std::move(pointer)};
}

// Builds the tree from the events of the library's parser. The parser does not say where a token
// stood, so a cursor follows it over the text, which is valid up to the event.
class Builder final : public nlohmann::json_sax<nlohmann::json> {
 public:
  Builder(const JsonSource& source, JsonLimits limits) : source_(source), limits_(limits) {}

  Json take() { return std::move(root_); }

  bool null() override {
    return add(Json::Kind::Null, [](Json&) {});
  }
  bool boolean(bool value) override {
    return add(Json::Kind::Boolean, [&](Json& json) { json.boolean = value; });
  }
  bool number_integer(number_integer_t value) override {
    return number(static_cast<double>(value));
  }
  bool number_unsigned(number_unsigned_t value) override {
    return number(static_cast<double>(value));
  }
  bool number_float(number_float_t value, const string_t&) override { return number(value); }
  bool string(string_t& value) override {
    return add(Json::Kind::String, [&](Json& json) { json.string = std::move(value); });
  }
  bool binary(binary_t&) override { return false; }
  bool start_object(std::size_t) override {
    keys_.emplace_back();
    return open(Json::Kind::Object);
  }
  bool key(string_t& value) override {
    const std::size_t at = token();
    skip_string();
    if (!keys_.back().insert(value).second)
      throw InputError(place_of(source_, at, child_pointer(pointer(), value),
                                fmt::format("the key '{}' occurs twice in this object", value)));
    stack_.back()->members.push_back({std::move(value), Json{}});
    return true;
  }
  bool end_object() override {
    keys_.pop_back();
    return close();
  }
  bool start_array(std::size_t) override { return open(Json::Kind::Array); }
  bool end_array() override { return close(); }
  bool parse_error(std::size_t position, const std::string&,
                   const nlohmann::json::exception& error) override {
    const std::string_view text = error.what();
    if (error.id == 406)
      throw InputError(
          place_of(source_, token(), pointer(), "this number is too large for a double"));
    const std::size_t colon = text.find("parse error at");
    std::size_t cut =
        colon == std::string_view::npos ? std::string_view::npos : text.find(": ", colon);
    std::string message(cut == std::string_view::npos ? text : text.substr(cut + 2));
    // The position counts the bytes read, the offending one included.
    const std::size_t offset = std::min(position == 0 ? 0 : position - 1, source_.text.size());
    throw InputError(place_of(source_, offset, pointer(), "not valid JSON: " + message));
  }

 private:
  bool number(double value) {
    constexpr double kExact = 9007199254740992.0;
    return add(Json::Kind::Number, [&](Json& json) {
      json.number = value;
      json.integer = std::abs(value) <= kExact && value == std::floor(value);
    });
  }

  template <typename Fill>
  bool add(Json::Kind kind, Fill fill) {
    Json& json = slot(kind);
    if (kind == Json::Kind::String)
      skip_string();
    else
      while (at_ < source_.text.size() &&
             std::string_view("{}[],: \t\r\n/").find(source_.text[at_]) == std::string_view::npos)
        ++at_;
    fill(json);
    return true;
  }

  bool open(Json::Kind kind) {
    if (static_cast<int>(stack_.size()) >= limits_.depth)
      throw InputError(place_of(source_, token(), pointer(),
                                fmt::format("nested more than {} deep", limits_.depth)));
    Json& json = slot(kind);
    ++at_;
    stack_.push_back(&json);
    return true;
  }

  bool close() {
    token();
    ++at_;
    stack_.pop_back();
    return true;
  }

  // Where the next value goes. Pointers on the stack stay valid: only the innermost container
  // grows.
  Json& slot(Json::Kind kind) {
    const std::size_t offset = token();
    Json* json = &root_;
    if (!stack_.empty()) {
      Json& parent = *stack_.back();
      json = parent.kind == Json::Kind::Array ? &parent.items.emplace_back()
                                              : &parent.members.back().value;
    }
    json->kind = kind;
    json->offset = offset;
    json->source = &source_;
    return *json;
  }

  // Moves the cursor to the next token and returns it.
  std::size_t token() {
    const std::string& text = source_.text;
    if (at_ == 0 && text.starts_with("\xEF\xBB\xBF")) at_ = 3;
    while (at_ < text.size()) {
      if (std::string_view(" \t\r\n,:").find(text[at_]) != std::string_view::npos) {
        ++at_;
      } else if (text.compare(at_, 2, "//") == 0) {
        at_ = std::min(text.find('\n', at_), text.size());
      } else if (text.compare(at_, 2, "/*") == 0) {
        const std::size_t end = text.find("*/", at_ + 2);
        at_ = end == std::string::npos ? text.size() : end + 2;
      } else {
        break;
      }
    }
    return at_;
  }

  void skip_string() {
    for (++at_; at_ < source_.text.size() && source_.text[at_] != '"'; ++at_)
      if (source_.text[at_] == '\\') ++at_;
    ++at_;
  }

  std::string pointer() const {
    std::string out;
    for (std::size_t i = 0; i < stack_.size(); ++i) {
      const Json& json = *stack_[i];
      if (json.kind == Json::Kind::Object && !json.members.empty() && i + 1 < stack_.size())
        out = child_pointer(out, json.members.back().key);
      else if (json.kind == Json::Kind::Array && i + 1 < stack_.size())
        out = child_pointer(out, json.items.size() - 1);
    }
    return out;
  }

  const JsonSource& source_;
  JsonLimits limits_;
  Json root_;
  std::vector<Json*> stack_;
  std::vector<std::unordered_set<std::string>> keys_;
  std::size_t at_ = 0;
};

}  // namespace

const Json* Json::find(std::string_view key) const {
  for (const auto& [name, value] : members)
    if (name == key) return &value;
  return nullptr;
}

Json* Json::find(std::string_view key) {
  for (auto& [name, value] : members)
    if (name == key) return &value;
  return nullptr;
}

std::string_view kind_name(Json::Kind kind) {
  switch (kind) {
    case Json::Kind::Null:
      return "null";
    case Json::Kind::Boolean:
      return "true or false";
    case Json::Kind::Number:
      return "a number";
    case Json::Kind::String:
      return "a string";
    case Json::Kind::Array:
      return "an array";
    case Json::Kind::Object:
      return "an object";
  }
  return "";
}

Json parse_json(const JsonSource& source, JsonLimits limits) {
  Builder builder(source, limits);
  nlohmann::json::sax_parse(source.text, &builder, nlohmann::json::input_format_t::json, true,
                            limits.comments);
  return builder.take();
}

Problem problem_at(const Json& value, std::string pointer, std::string message) {
  if (value.source == nullptr) return {std::move(message), "", 0, 0, std::move(pointer)};
  return place_of(*value.source, value.offset, std::move(pointer), std::move(message));
}

std::string child_pointer(std::string_view pointer, std::string_view key) {
  std::string out(pointer);
  out += '/';
  for (const char c : key) {
    if (c == '~')
      out += "~0";
    else if (c == '/')
      out += "~1";
    else
      out += c;
  }
  return out;
}

std::string child_pointer(std::string_view pointer, std::size_t index) {
  return fmt::format("{}/{}", pointer, index);
}

JsonView::JsonView(const Json& value, std::string pointer, std::vector<Problem>& problems)
    : value_(&value), pointer_(std::move(pointer)), problems_(&problems) {
  if (!is_object()) fail(fmt::format("an object was expected, not {}", kind_name(value.kind)));
}

const Json* JsonView::member(std::string_view key) {
  known_.emplace_back(key);
  return value_->find(key);
}

const Json* JsonView::member(std::string_view key, Json::Kind kind) {
  const Json* value = member(key);
  if (value == nullptr || value->kind == kind) return value;
  fail(key, fmt::format("{} was expected, not {}", kind_name(kind), kind_name(value->kind)));
  return nullptr;
}

const Json* JsonView::required(std::string_view key, Json::Kind kind) {
  if (value_->find(key) == nullptr && is_object())
    fail(fmt::format("the key '{}' is missing ({})", key, kind_name(kind)));
  return member(key, kind);
}

std::string JsonView::text(std::string_view key, std::string fallback) {
  if (const Json* value = member(key, Json::Kind::String)) fallback = value->string;
  return fallback;
}

double JsonView::number(std::string_view key, double fallback, Range range) {
  const Json* value = member(key, Json::Kind::Number);
  if (value == nullptr) return fallback;
  if (value->number >= range.low && value->number <= range.high) return value->number;
  const bool above = std::isinf(range.high);
  fail(key,
       above ? fmt::format("a number of at least {} was expected, not {}", range.low, value->number)
             : fmt::format("a number from {} to {} was expected, not {}", range.low, range.high,
                           value->number));
  return fallback;
}

std::int64_t JsonView::integer(std::string_view key, std::int64_t fallback, Range range) {
  const Json* value = value_->find(key);
  if (value != nullptr && value->kind == Json::Kind::Number && !value->integer) {
    member(key);
    fail(key, fmt::format("a whole number was expected, not {}", value->number));
    return fallback;
  }
  constexpr double kExact = 9007199254740992.0;
  range = {std::max(range.low, -kExact), std::min(range.high, kExact)};
  return static_cast<std::int64_t>(number(key, static_cast<double>(fallback), range));
}

bool JsonView::boolean(std::string_view key, bool fallback) {
  const Json* value = member(key, Json::Kind::Boolean);
  return value == nullptr ? fallback : value->boolean;
}

std::string JsonView::choice(std::string_view key,
                             std::initializer_list<std::string_view> choices) {
  const std::vector<std::string> names(choices.begin(), choices.end());
  const Json* value = member(key, Json::Kind::String);
  if (value == nullptr) return names.front();
  if (std::find(names.begin(), names.end(), value->string) != names.end()) return value->string;
  fail(key, fmt::format("unknown value '{}'{}", value->string, hint(value->string, names)));
  return names.front();
}

std::vector<double> JsonView::numbers(std::string_view key, std::size_t size) {
  const Json* value = member(key, Json::Kind::Array);
  if (value == nullptr) return {};
  std::vector<double> out;
  for (const Json& item : value->items) {
    if (item.kind != Json::Kind::Number) {
      problems_->push_back(
          problem_at(item, child_pointer(child_pointer(pointer_, key), out.size()),
                     fmt::format("a number was expected, not {}", kind_name(item.kind))));
      return {};
    }
    out.push_back(item.number);
  }
  if (size == 0 || out.size() == size) return out;
  fail(key, fmt::format("{} numbers were expected, not {}", size, out.size()));
  return {};
}

std::vector<std::string> JsonView::texts(std::string_view key) {
  const Json* value = member(key, Json::Kind::Array);
  if (value == nullptr) return {};
  std::vector<std::string> out;
  for (const Json& item : value->items) {
    if (item.kind != Json::Kind::String) {
      problems_->push_back(
          problem_at(item, child_pointer(child_pointer(pointer_, key), out.size()),
                     fmt::format("a string was expected, not {}", kind_name(item.kind))));
      return {};
    }
    out.push_back(item.string);
  }
  return out;
}

JsonView JsonView::child(std::string_view key, const Json& value) const {
  return {value, child_pointer(pointer_, key), *problems_};
}

JsonView JsonView::child(std::size_t index, const Json& value) const {
  return {value, child_pointer(pointer_, index), *problems_};
}

void JsonView::fail(std::string message) const {
  if (problems_->size() >= kMostProblems) return;
  problems_->push_back(problem_at(*value_, pointer_, std::move(message)));
}

void JsonView::fail(std::string_view key, std::string message) const {
  if (problems_->size() >= kMostProblems) return;
  const Json* value = value_->find(key);
  if (value == nullptr) return fail(std::move(message));
  problems_->push_back(problem_at(*value, child_pointer(pointer_, key), std::move(message)));
}

void JsonView::close() const {
  for (const auto& [key, value] : value_->members)
    if (problems_->size() < kMostProblems &&
        std::find(known_.begin(), known_.end(), key) == known_.end())
      problems_->push_back(problem_at(value, child_pointer(pointer_, key),
                                      fmt::format("unknown key '{}'{}", key, hint(key, known_))));
}

}  // namespace base
