#include "harness/base/error.h"
#include "harness/base/sha256.h"
#include "harness/golden/golden.h"
#include "tests/harness/golden/scratch.h"
#include "tests/support/shapes.h"

#include <catch2/catch.hpp>

#include <csignal>
#include <fstream>
#include <functional>
#include <sys/ptrace.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <unistd.h>

namespace fs = std::filesystem;
using tests::contents;
using tests::names_in;
using tests::Scratch;

namespace {

std::string sha256(const std::string& text) {
  base::Sha256 sha;
  sha.add(std::as_bytes(std::span(text)));
  return sha.hex();
}

// What a gate leaves for sign-off in `folder`; the skins of different seeds differ.
model::Record candidate(const fs::path& folder, std::uint64_t seed) {
  const tests::Shape shape = tests::cube();
  golden::FramesWriter writer(folder, shape.points, shape.faces, 1e-6);
  tests::Random random(seed);
  for (int f = 0; f < 20; ++f) {
    metrics::Points posed = shape.points;
    for (auto& point : posed) point += random.point(-0.1, 0.1);
    writer.add(f / 24.0, posed);
  }
  const auto written = writer.commit();
  model::Record record;
  record.suite = "arm";
  record.name = "main/bend/ship";
  record.program = "0.1.0";
  record.frames_file = written.file;
  record.frames_sha256 = written.sha256;
  record.frames = written.frames;
  record.vertices = 8;
  record.faces = 12;
  record.diagonal = record.magnitude = 1;
  record.grain = 1e-6;
  record.frame_sha256 = written.frame_sha256;
  base::write_file(folder / "record.json", golden::write_record(record));
  return record;
}

model::SignOff by(const std::string& name) {
  return {name, "lead", "2024-05-02T10:00:00Z", "looked at it", ""};
}

// Who signed the golden in `folder`, newest first; fails unless it is whole.
std::vector<std::string> signers(const fs::path& folder) {
  const model::Record record = golden::read_record(folder / "record.json", "record");
  const fs::path frames = folder / record.frames_file;
  REQUIRE(sha256(contents(frames)) == record.frames_sha256);
  const golden::FramesReader reader(frames, "frames");
  metrics::Points out;
  for (std::size_t f = 0; f < reader.frames(); ++f) reader.read(f, out);
  REQUIRE(reader.frames() == record.frames);
  std::vector<std::string> names;
  for (const model::SignOff& one : record.signoffs) names.push_back(one.by);
  return names;
}

std::set<std::string> whole(const model::Record& record) {
  return {"record.json", record.frames_file};
}

// Runs `part` in a process of its own, which must not come back. The exit status as of waitpid().
int in_child(const std::function<void()>& part) {
  const pid_t child = ::fork();
  if (child == 0) {
    part();
    ::_exit(99);
  }
  int status = 0;
  REQUIRE(child > 0);
  REQUIRE(::waitpid(child, &status, 0) == child);
  return status;
}

// Ends the process: 0 signed, 4 could not be written, 5 wrong input, 6 anything else.
void sign_and_exit(const fs::path& source, const fs::path& target, const std::string& name) {
  try {
    golden::sign(source, target, by(name));
  } catch (const base::OutputError&) {
    ::_exit(4);
  } catch (const base::InputError&) {
    ::_exit(5);
  } catch (...) {
    ::_exit(6);
  }
  ::_exit(0);
}

// Signs in a child that is killed at its stop number `stops`: each system call makes two, one
// before it and one after. True if it ended by itself before; false, killed.
bool signed_before(int stops, const fs::path& source, const fs::path& target) {
  const pid_t child = ::fork();
  if (child == 0) {
    if (::ptrace(PTRACE_TRACEME, 0, nullptr, nullptr) != 0) ::_exit(98);
    ::raise(SIGSTOP);
    sign_and_exit(source, target, "new");
  }
  REQUIRE(child > 0);
  int status = 0;
  ::waitpid(child, &status, 0);
  for (int stop = 0; stop < stops && WIFSTOPPED(status); ++stop) {
    REQUIRE(::ptrace(PTRACE_SYSCALL, child, nullptr, nullptr) == 0);
    ::waitpid(child, &status, 0);
  }
  if (WIFEXITED(status)) {
    REQUIRE(WEXITSTATUS(status) == 0);
    return true;
  }
  ::kill(child, SIGKILL);
  ::waitpid(child, &status, 0);
  return false;
}

}  // namespace

// Fault: a wrong or broken chain, an old frames file that stays, a record that is not what was
// judged.
TEST_CASE("signing makes the candidate the golden and keeps the chain") {
  const Scratch scratch;
  const fs::path target = scratch / "golden";
  const model::Record first = candidate(scratch / "one", 1);
  golden::sign(scratch / "one", target, by("Ada"));
  CHECK(names_in(target) == whole(first));
  CHECK(signers(target) == std::vector<std::string>{"Ada"});
  const std::string old = contents(target / "record.json");

  const model::Record second = candidate(scratch / "two", 2);
  model::SignOff signoff = by("Bo");
  signoff.predecessor = "not for the caller to say";
  golden::sign(scratch / "two", target, signoff);
  CHECK(names_in(target) == whole(second));
  CHECK(signers(target) == std::vector<std::string>{"Bo", "Ada"});
  const model::Record record = golden::read_record(target / "record.json", "r");
  CHECK(record.signoffs[0].predecessor == sha256(old));
  CHECK(record.signoffs[0].role == "lead");
  CHECK(record.signoffs[0].when == "2024-05-02T10:00:00Z");
  CHECK(record.signoffs[0].why == "looked at it");
  CHECK(record.signoffs[1].predecessor.empty());
  CHECK(record.frame_sha256 == second.frame_sha256);
  // The candidate stays as it was.
  CHECK(names_in(scratch / "two") == whole(second));
  CHECK(golden::read_record(scratch / "two" / "record.json", "r").signoffs.empty());
}

// Fault: other bytes for the same sign-off.
TEST_CASE("signing twice over gives the same bytes") {
  const Scratch scratch;
  candidate(scratch / "one", 1);
  for (const std::string target : {"a", "b"})
    golden::sign(scratch / "one", scratch / target, by("Ada"));
  CHECK(contents(scratch / "a" / "record.json") == contents(scratch / "b" / "record.json"));
}

// Fault: a dry run that lists other paths than a run writes.
TEST_CASE("planned writes are what is written") {
  const Scratch scratch;
  const fs::path target = scratch / "golden";
  const model::Record record = candidate(scratch / "one", 1);
  const std::vector<fs::path> both{target / record.frames_file, target / "record.json"};
  CHECK(golden::planned_writes(target, record) == both);
  CHECK_FALSE(fs::exists(target));
  golden::sign(scratch / "one", target, by("Ada"));
  // The same skin again: only the record changes.
  CHECK(golden::planned_writes(target, record) == std::vector<fs::path>{target / "record.json"});
  const auto before = fs::last_write_time(target / record.frames_file);
  golden::sign(scratch / "one", target, by("Bo"));
  CHECK(fs::last_write_time(target / record.frames_file) == before);
  CHECK(signers(target) == std::vector<std::string>{"Bo", "Ada"});
  // A frames file that is damaged is written again.
  std::ofstream(target / record.frames_file, std::ios::app) << "x";
  CHECK(golden::planned_writes(target, record) == both);
  golden::sign(scratch / "one", target, by("Cy"));
  CHECK(signers(target) == std::vector<std::string>{"Cy", "Bo", "Ada"});
}

// Fault: something that no gate wrote becomes a golden.
TEST_CASE("a damaged candidate is refused and nothing is written") {
  const Scratch scratch;
  const fs::path source = scratch / "one";
  const fs::path target = scratch / "golden";
  model::Record record = candidate(source, 1);
  const auto refused = [&](const std::string& part) {
    CHECK_THROWS_WITH(golden::sign(source, target, by("Ada")), Catch::Contains(part));
    CHECK_THROWS_AS(golden::sign(source, target, by("Ada")), base::InputError);
    CHECK_FALSE(fs::exists(target));
  };
  const auto rewrite = [&] {
    base::write_file(source / "record.json", golden::write_record(record));
  };
  const std::string frames = contents(source / record.frames_file);
  std::string other = frames;
  other[other.size() / 2] ^= 1;
  base::write_file(source / record.frames_file, other);
  refused("another SHA-256");
  fs::remove(source / record.frames_file);
  refused("no such file");
  base::write_file(source / record.frames_file, frames);
  record.vertices = 9;
  rewrite();
  refused("9 vertices");
  record.vertices = 8;
  record.signoffs = {by("Eve")};
  rewrite();
  refused("signed off already");
  base::write_file(source / "record.json", "{");
  refused("record.json:1");
}

// Fault: the history of a golden lost because its record could not be read.
TEST_CASE("a damaged golden is not replaced") {
  const Scratch scratch;
  const fs::path target = scratch / "golden";
  candidate(scratch / "one", 1);
  candidate(scratch / "two", 2);
  golden::sign(scratch / "one", target, by("Ada"));
  const auto names = names_in(target);
  const std::string text = contents(target / "record.json");
  base::write_file(target / "record.json", text.substr(0, text.size() / 2));
  CHECK_THROWS_WITH(golden::sign(scratch / "two", target, by("Bo")),
                    Catch::Contains("sign-offs would be lost"));
  CHECK(names_in(target) == names);
  CHECK(contents(target / "record.json") == text.substr(0, text.size() / 2));
  // A candidate in the place of a golden is none.
  CHECK_THROWS_WITH(golden::sign(scratch / "two", scratch / "one", by("Bo")),
                    Catch::Contains("signed off by nobody"));
}

// Fault: a folder that fills up with what crashes left, or files of others removed.
TEST_CASE("leftovers of crashes are removed, other files are not") {
  const Scratch scratch;
  const fs::path target = scratch / "golden";
  const model::Record record = candidate(scratch / "one", 1);
  for (const std::string name :
       {".record.json.17-0.partial", ".frames-0123456789abcdef.bin.17-0.partial",
        "frames-0123456789abcdef.bin", "notes.txt", "frames-old.bin", "record.json.orig"})
    base::write_file(target / name, "x");
  golden::sign(scratch / "one", target, by("Ada"));
  auto expected = whole(record);
  expected.insert({"notes.txt", "frames-old.bin", "record.json.orig"});
  CHECK(names_in(target) == expected);
}

// Fault: half a golden in a folder that cannot be written, or another error than OutputError.
TEST_CASE("a target that cannot be written is left as it was") {
  const Scratch scratch;
  candidate(scratch / "one", 1);
  candidate(scratch / "two", 2);
  const fs::path target = scratch / "golden" / "case";
  golden::sign(scratch / "one", target, by("Ada"));
  const auto names = names_in(target);
  fs::permissions(scratch.folder(), fs::perms{0755});
  const auto sign_as_nobody = [&](const fs::path& to) {
    return in_child([&] {
      // The superuser may write anywhere.
      if (::geteuid() == 0 && (::setgid(65534) != 0 || ::setuid(65534) != 0)) ::_exit(97);
      sign_and_exit(scratch / "two", to, "Bo");
    });
  };
  fs::permissions(target, fs::perms{0555});
  CHECK(WEXITSTATUS(sign_as_nobody(target)) == 4);
  fs::permissions(scratch / "golden", fs::perms{0555});
  CHECK(WEXITSTATUS(sign_as_nobody(scratch / "golden" / "new" / "case")) == 4);
  CHECK(names_in(scratch / "golden") == std::set<std::string>{"case"});
  fs::permissions(scratch / "golden", fs::perms{0755});
  fs::permissions(target, fs::perms{0755});
  CHECK(names_in(target) == names);
  CHECK(signers(target) == std::vector<std::string>{"Ada"});

  base::write_file(scratch / "file", "x");
  CHECK_THROWS_AS(golden::sign(scratch / "two", scratch / "file" / "case", by("Bo")),
                  base::OutputError);
}

// Fault: a full disk that leaves neither the old golden nor the new one. No file of the child may
// grow beyond a limit, from nothing to more than is needed.
TEST_CASE("a disk that fills up leaves the old golden or the new one") {
  const Scratch scratch;
  candidate(scratch / "one", 1);
  const model::Record second = candidate(scratch / "two", 2);
  const auto size = fs::file_size(scratch / "two" / second.frames_file);
  int old = 0;
  int fresh = 0;
  for (rlim_t limit = 0; limit < size + 4000; limit += 250) {
    const fs::path target = scratch / std::to_string(limit);
    golden::sign(scratch / "one", target, by("old"));
    const int status = in_child([&] {
      std::signal(SIGXFSZ, SIG_IGN);
      const rlimit most{limit, limit};
      if (::setrlimit(RLIMIT_FSIZE, &most) != 0) ::_exit(97);
      sign_and_exit(scratch / "two", target, "new");
    });
    const auto names = signers(target);
    CHECK(WEXITSTATUS(status) == (names.front() == "new" ? 0 : 4));
    ++(names.front() == "new" ? fresh : old);
  }
  CHECK(old > 0);
  CHECK(fresh > 0);
}

// Fault: an order of steps that leaves no golden, half of one or a dead lock at some moment. The
// child is killed between any two system calls that it makes.
TEST_CASE("a sign-off killed at any moment leaves the old golden or the new one") {
  if (WEXITSTATUS(in_child(
          [] { ::_exit(::ptrace(PTRACE_TRACEME, 0, nullptr, nullptr) == 0 ? 0 : 98); })) != 0) {
    WARN("not checked: this system does not allow a process to be traced");
    return;
  }
  const Scratch scratch;
  candidate(scratch / "one", 1);
  const model::Record second = candidate(scratch / "two", 2);
  golden::sign(scratch / "one", scratch / "start", by("old"));
  int old = 0;
  int fresh = 0;
  for (int stops = 1;; stops += 2) {
    const fs::path target = scratch / "golden";
    fs::remove_all(target);
    fs::copy(scratch / "start", target);
    const bool finished = signed_before(stops, scratch / "two", target);
    const auto names = signers(target);
    const bool is_new = names == std::vector<std::string>{"new", "old"};
    if (!is_new && names != std::vector<std::string>{"old"}) FAIL("stop " << stops);
    ++(is_new ? fresh : old);
    // Whatever was left, the next sign-off finds it and clears it away.
    golden::sign(scratch / "two", target, by("next"));
    if (names_in(target) != whole(second)) FAIL("left at stop " << stops);
    if (finished) break;
  }
  CHECK(old > 10);
  CHECK(fresh > 5);
}

// Fault: two sign-offs at once that lose a link of the chain, or each other's frames file.
TEST_CASE("sign-offs at the same time follow one another") {
  const Scratch scratch;
  constexpr int kSigners = 8;
  for (int i = 0; i < kSigners; ++i)
    candidate(scratch / std::to_string(i), static_cast<std::uint64_t>(i));
  for (int round = 0; round < 5; ++round) {
    const fs::path target = scratch / ("golden" + std::to_string(round));
    std::vector<pid_t> children;
    for (int i = 0; i < kSigners; ++i) {
      const pid_t child = ::fork();
      if (child == 0) sign_and_exit(scratch / std::to_string(i), target, std::to_string(i));
      REQUIRE(child > 0);
      children.push_back(child);
    }
    for (const pid_t child : children) {
      int status = 0;
      ::waitpid(child, &status, 0);
      CHECK(WEXITSTATUS(status) == 0);
    }
    const auto names = signers(target);
    CHECK(names.size() == kSigners);
    CHECK(std::set<std::string>(names.begin(), names.end()).size() == kSigners);
    CHECK(names_in(target).size() == 2);
  }
}
