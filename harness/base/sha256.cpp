#include "harness/base/sha256.h"

#include <array>
#include <bit>
#include <cmath>
#include <openssl/evp.h>
#include <stdexcept>

namespace base {

struct Sha256::State {
  EVP_MD_CTX* context = EVP_MD_CTX_new();
  std::array<std::byte, 4096> pending;  // small values are gathered: one library call each is slow
  std::size_t used = 0;

  State() = default;
  State(const State&) = delete;
  State& operator=(const State&) = delete;
  ~State() { EVP_MD_CTX_free(context); }

  void check(int ok) const {
    if (ok != 1) throw std::runtime_error("SHA-256 is not available in this OpenSSL");
  }
  void flush() {
    check(EVP_DigestUpdate(context, pending.data(), used));
    used = 0;
  }
};

Sha256::Sha256() : state_(std::make_unique<State>()) {
  state_->check(EVP_DigestInit_ex(state_->context, EVP_sha256(), nullptr));
}

Sha256::~Sha256() = default;

void Sha256::add(std::span<const std::byte> bytes) {
  state_->flush();
  state_->check(EVP_DigestUpdate(state_->context, bytes.data(), bytes.size()));
}

void Sha256::add(std::string_view text) {
  add(static_cast<std::uint64_t>(text.size()));
  add(std::as_bytes(std::span(text)));
}

void Sha256::add(std::uint64_t value) {
  if (state_->used + 8 > state_->pending.size()) state_->flush();
  for (int i = 0; i < 8; ++i)
    state_->pending[state_->used++] = static_cast<std::byte>((value >> (8 * i)) & 0xFFu);
}

void Sha256::add(double value) {
  if (value == 0) value = 0;  // -0 as +0
  if (std::isnan(value)) value = std::bit_cast<double>(std::uint64_t{0x7FF8000000000000});
  add(std::bit_cast<std::uint64_t>(value));
}

std::string Sha256::hex() {
  state_->flush();
  std::array<unsigned char, EVP_MAX_MD_SIZE> digest{};
  unsigned int size = 0;
  state_->check(EVP_DigestFinal_ex(state_->context, digest.data(), &size));
  constexpr std::string_view kDigits = "0123456789abcdef";
  std::string text;
  for (unsigned int i = 0; i < size; ++i) {
    text += kDigits[digest[i] >> 4];
    text += kDigits[digest[i] & 15];
  }
  return text;
}

}  // namespace base
