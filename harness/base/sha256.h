#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <string>
#include <string_view>

namespace base {

/// SHA-256 (FIPS 180-4) of a sequence of typed values, each in one fixed little-endian form.
class Sha256 {
 public:
  Sha256();
  ~Sha256();
  Sha256(const Sha256&) = delete;
  Sha256& operator=(const Sha256&) = delete;

  void add(std::span<const std::byte> bytes);
  void add(std::string_view text);  ///< length as 64 bits, then the bytes
  void add(std::uint64_t value);    ///< 8 bytes
  void add(double value);           ///< 8 bytes; -0 as +0, every NaN as one
  std::string hex();                ///< 64 lower-case digits; ends the computation

 private:
  struct State;
  std::unique_ptr<State> state_;
};

}  // namespace base
