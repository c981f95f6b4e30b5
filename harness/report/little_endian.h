#pragma once

#include <bit>
#include <cstdint>
#include <string>
#include <type_traits>

namespace report {

/// Appends a number in little-endian order: unsigned integers, float (4 bytes) and double (8).
template <class Number>
void append(std::string& bytes, Number number) {
  if constexpr (std::is_same_v<Number, float>) {
    append(bytes, std::bit_cast<std::uint32_t>(number));
  } else if constexpr (std::is_same_v<Number, double>) {
    append(bytes, std::bit_cast<std::uint64_t>(number));
  } else {
    static_assert(std::is_unsigned_v<Number>);
    for (unsigned shift = 0; shift < 8 * sizeof(Number); shift += 8)
      bytes += static_cast<char>(number >> shift & 0xFF);
  }
}

}  // namespace report
