#pragma once

#include <cstddef>
#include <functional>

namespace harness {

/// Calls work(0) … work(count - 1), on up to `jobs` threads. Calls must not touch each other's
/// data. If calls throw, the exception of the lowest index is thrown after all have ended.
void parallel_for(std::size_t count, std::size_t jobs,
                  const std::function<void(std::size_t)>& work);

}  // namespace harness
