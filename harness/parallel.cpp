#include "harness/parallel.h"

#include <algorithm>
#include <atomic>
#include <exception>
#include <system_error>
#include <thread>
#include <vector>

namespace harness {

void parallel_for(std::size_t count, std::size_t jobs,
                  const std::function<void(std::size_t)>& work) {
  std::vector<std::exception_ptr> failures(count);
  std::atomic<std::size_t> next{0};
  const auto run = [&] {
    for (std::size_t i = next++; i < count; i = next++) {
      try {
        work(i);
      } catch (...) {
        failures[i] = std::current_exception();
      }
    }
  };
  std::vector<std::thread> threads;
  try {
    for (std::size_t t = 1; t < std::min(jobs, count); ++t) threads.emplace_back(run);
  } catch (const std::system_error&) {
    // No more threads to be had: those there are do the work.
  }
  run();
  for (std::thread& thread : threads) thread.join();
  for (const std::exception_ptr& failure : failures)
    if (failure) std::rethrow_exception(failure);
}

}  // namespace harness
