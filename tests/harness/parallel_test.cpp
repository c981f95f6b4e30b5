#include "harness/parallel.h"

#include <catch2/catch.hpp>

#include <stdexcept>
#include <vector>

// Catches: calls that are lost or made twice, and failures whose order depends on the threads.
TEST_CASE("every index is worked on once, and the first failure is told") {
  for (const std::size_t jobs : {1u, 2u, 7u}) {
    std::vector<int> calls(1000, 0);
    harness::parallel_for(calls.size(), jobs, [&](std::size_t i) { ++calls[i]; });
    CHECK(calls == std::vector<int>(1000, 1));
    const auto failing = [](std::size_t i) {
      if (i % 10 == 3) throw std::runtime_error(std::to_string(i));
    };
    CHECK_THROWS_WITH(harness::parallel_for(100, jobs, failing), "3");
    harness::parallel_for(0, jobs, failing);
  }
}
