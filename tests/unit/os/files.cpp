// Laws of atomic replacement, globbing and the workspace lease.
#include "windrow/os/files.h"

#include <doctest/doctest.h>
#include <sys/wait.h>
#include <unistd.h>

#include <cstdlib>
#include <filesystem>

#include "windrow/base/error.h"
#include "windrow/os/process.h"

namespace os = windrow::os;

namespace {
struct Folder {
  std::string path;
  Folder() {
    char name[] = "/tmp/windrow-os-XXXXXX";
    path = ::mkdtemp(name);
  }
  ~Folder() { std::filesystem::remove_all(path); }
};
}  // namespace

TEST_CASE("a replaced file holds the new text and leaves no temporary behind") {
  const Folder folder;
  os::replace_file(folder.path + "/a.txt", std::string("one"));
  os::replace_file(folder.path + "/a.txt", std::string("two"));
  CHECK(os::read_text(folder.path + "/a.txt") == "two");
  CHECK(std::distance(std::filesystem::directory_iterator(folder.path), {}) == 1);
}

TEST_CASE("a missing file and an unwritable place are told apart by kind") {
  const Folder folder;
  try {
    os::read_text(folder.path + "/none");
    FAIL("no error");
  } catch (const windrow::Error& error) {
    CHECK(error.kind() == windrow::Failure::missing);
    CHECK(std::string(error.what()) == folder.path + "/none: no such file");
  }
  try {
    os::replace_file(folder.path + "/no/such/a.txt", std::string("x"));
    FAIL("no error");
  } catch (const windrow::Error& error) {
    CHECK(error.kind() == windrow::Failure::output);
  }
}

TEST_CASE("temporaries of processes that are gone are swept, those of live ones stay") {
  const Folder folder;
  const pid_t child = ::fork();
  if (child == 0) ::_exit(0);
  ::waitpid(child, nullptr, 0);
  const std::string gone = folder.path + "/.a.nc." + std::to_string(child) + ".0.part";
  const std::string live = folder.path + "/.a.nc." + std::to_string(::getppid()) + ".0.part";
  os::replace_file(gone, std::string("x"));
  os::replace_file(live, std::string("x"));
  os::sweep_temporaries(folder.path);
  CHECK_FALSE(os::state(gone).has_value());
  CHECK(os::state(live).has_value());
}

TEST_CASE("a lease excludes a second holder, and one whose process is gone is taken over") {
  const Folder folder;
  {
    const os::Lease lease(folder.path, 0);
    lease.confirm();
    CHECK_THROWS_AS(os::Lease(folder.path, 0.1), windrow::Error);
  }
  const pid_t child = ::fork();
  if (child == 0) ::_exit(0);
  ::waitpid(child, nullptr, 0);
  os::replace_file(folder.path + "/lease", os::host_name() + " " + std::to_string(child) + " then\n");
  const os::Lease lease(folder.path, 0);
  lease.confirm();
}

TEST_CASE("patterns expand in order of names; the limits of this machine are positive") {
  const Folder folder;
  os::replace_file(folder.path + "/b_2.nc", std::string("x"));
  os::replace_file(folder.path + "/b_1.nc", std::string("x"));
  const auto found = os::glob(folder.path + "/b_*.nc");
  REQUIRE(found.size() == 2);
  CHECK(os::file_name_of(found[0]) == "b_1.nc");
  CHECK(os::glob(folder.path + "/c*").empty());
  CHECK(os::memory_limit() > (1 << 20));
  CHECK(os::usable_cpus() >= 1);
  CHECK(os::free_bytes(folder.path) > 0);
}
