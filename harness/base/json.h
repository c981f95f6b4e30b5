#pragma once

#include "harness/base/error.h"

#include <cstdint>
#include <initializer_list>
#include <limits>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace base {

/// The text a JSON value was read from; outlives the values (owned by JsonFile).
struct JsonSource {
  std::string file;    ///< as shown in messages
  std::string folder;  ///< what relative paths in it start from
  std::string text;
};

struct JsonMember;

/// A JSON value that knows where it stands. Objects keep the order of the file; a key is unique.
struct Json {
  enum class Kind : std::uint8_t { Null, Boolean, Number, String, Array, Object };
  Kind kind = Kind::Null;
  bool boolean = false;
  bool integer = false;  ///< a whole number of at most 53 bits, however it is written
  double number = 0;
  std::string string;
  std::vector<Json> items;
  std::vector<JsonMember> members;
  std::size_t offset = 0;              ///< byte of the source where the value begins
  const JsonSource* source = nullptr;  ///< never null for a parsed value

  const Json* find(std::string_view key) const;  ///< member of an object; null when absent
  Json* find(std::string_view key);
};

struct JsonMember {
  std::string key;
  Json value;
};

/// Name of a kind as used in messages: "a string", "an object", ...
std::string_view kind_name(Json::Kind kind);

struct JsonLimits {
  bool comments = false;  ///< allow // and /* */
  int depth = 64;         ///< deepest nesting of arrays and objects
};

/// Parses UTF-8 JSON. `source` must outlive the result.
/// Throws InputError with line and column: bad syntax, duplicate key, too deep, a number that
/// overflows.
Json parse_json(const JsonSource& source, JsonLimits limits = {});

/// A problem at `value`: file, line and column filled in.
Problem problem_at(const Json& value, std::string pointer, std::string message);

/// `pointer` extended by one key, escaped as RFC 6901 says.
std::string child_pointer(std::string_view pointer, std::string_view key);
std::string child_pointer(std::string_view pointer, std::size_t index);

struct Range {
  double low = -std::numeric_limits<double>::infinity();
  double high = std::numeric_limits<double>::infinity();
};

/// Typed look into one object. Wrong types and values are added to `problems` and the fallback is
/// returned, so that a reader reports everything at once (up to 100 problems); close() reports the
/// keys nobody asked for.
class JsonView {
 public:
  JsonView(const Json& value, std::string pointer, std::vector<Problem>& problems);

  const Json& json() const { return *value_; }
  const std::string& pointer() const { return pointer_; }
  std::vector<Problem>& problems() const { return *problems_; }
  bool is_object() const { return value_->kind == Json::Kind::Object; }

  /// The member, or null; remembers that the key is known.
  const Json* member(std::string_view key);
  /// The member if it has that kind; null (and a problem unless it is absent) otherwise.
  const Json* member(std::string_view key, Json::Kind kind);
  /// As member(), but absence is a problem too.
  const Json* required(std::string_view key, Json::Kind kind);

  std::string text(std::string_view key, std::string fallback = {});
  double number(std::string_view key, double fallback, Range range = {});
  std::int64_t integer(std::string_view key, std::int64_t fallback, Range range = {});
  bool boolean(std::string_view key, bool fallback);
  /// One of `choices`; the first is the fallback.
  std::string choice(std::string_view key, std::initializer_list<std::string_view> choices);
  /// Array of exactly `size` numbers (any when 0); empty when absent or wrong.
  std::vector<double> numbers(std::string_view key, std::size_t size = 0);
  std::vector<std::string> texts(std::string_view key);

  JsonView child(std::string_view key, const Json& value) const;
  JsonView child(std::size_t index, const Json& value) const;
  void fail(std::string message) const;                        ///< at this object
  void fail(std::string_view key, std::string message) const;  ///< at a member, or here if absent
  void close() const;                                          ///< every key not asked for: unknown

 private:
  const Json* value_;
  std::string pointer_;
  std::vector<Problem>* problems_;
  std::vector<std::string> known_;
};

}  // namespace base
