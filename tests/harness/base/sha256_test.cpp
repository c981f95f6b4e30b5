#include "harness/base/sha256.h"

#include <catch2/catch.hpp>

#include <limits>

using base::Sha256;

// Catches: another hash, or bytes in another order. Source: FIPS 180-4 example "abc" and the empty
// message, NIST cryptographic standards, examples with intermediate values.
TEST_CASE("SHA-256 of known messages") {
  Sha256 empty;
  CHECK(empty.hex() == "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
  Sha256 abc;
  const std::string text = "abc";
  abc.add(std::as_bytes(std::span(text)));
  CHECK(abc.hex() == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
}

// Catches: values that run into one another, or a sign of zero that makes a fingerprint differ.
TEST_CASE("typed values have one form") {
  const auto hash = [](auto... values) {
    Sha256 sha;
    (sha.add(values), ...);
    return sha.hex();
  };
  using namespace std::string_view_literals;
  CHECK(hash("ab"sv, "c"sv) != hash("a"sv, "bc"sv));
  CHECK(hash(0.0) == hash(-0.0));
  CHECK(hash(1.0) != hash(-1.0));
  const double nan = std::numeric_limits<double>::quiet_NaN();
  CHECK(hash(nan) == hash(-nan));
  CHECK(hash(std::uint64_t{1}) != hash(std::uint64_t{256}));
}
