// What happens when a product cannot be written: one clear line, and no half file.
#include <doctest/doctest.h>
#ifdef __SANITIZE_ADDRESS__
#include <sanitizer/lsan_interface.h>
#endif
#include <sys/mount.h>
#include <sys/wait.h>
#include <unistd.h>

#include <cstdlib>
#include <filesystem>
#include <fstream>

#include "sample_product.h"
#include "windrow/base/error.h"

using namespace windrow;

namespace {

struct Folder {
  std::filesystem::path path;
  Folder() : path(std::filesystem::temp_directory_path() / ("windrow_failure_" + std::to_string(::getpid()))) {
    std::filesystem::create_directories(path);
  }
  ~Folder() { std::filesystem::remove_all(path); }
};

/// A file system of a given size, unmounted at the end; only root may mount.
struct TinyDisk {
  std::string path;
  bool mounted = false;
  TinyDisk(const std::string& where, const std::string& options) : path(where) {
    std::filesystem::create_directories(path);
    mounted = ::mount("none", path.c_str(), "tmpfs", 0, options.c_str()) == 0;
  }
  ~TinyDisk() {
    if (mounted) ::umount2(path.c_str(), MNT_DETACH);
  }
  TinyDisk(const TinyDisk&) = delete;
  TinyDisk& operator=(const TinyDisk&) = delete;
};

/// The failure's kind and text, or "written". HDF5 never frees what belongs to a file that it cannot close: not this
/// project's leak, so not looked for here (elsewhere it is).
std::string attempt(const std::string& path, const cf::ProductFile& p) {
#ifdef __SANITIZE_ADDRESS__
  const __lsan::ScopedDisabler library_keeps_it;
#endif
  try {
    sample::write(path, p);
  } catch (const Error& e) {
    CHECK(e.kind() == Failure::output);
    return e.what();
  }
  return "written";
}

}  // namespace

TEST_CASE("a disk that fills up at any moment gives one line and leaves nothing behind") {
  const Folder folder;
  const auto p = sample::make(true, true);
  // From one page to more than the product needs (about 70 kB), so that creating, defining, closing and the chunks
  // all meet the end of the disk.
  int failures = 0, written = 0;
  for (int kib = 4; kib <= 160; kib += 4) {
    const TinyDisk disk((folder.path / "disk").string(), "size=" + std::to_string(kib) + "k");
    if (!disk.mounted) {
      MESSAGE("skipped: mounting a file system for this test needs root");
      return;
    }
    const std::string path = disk.path + "/product.nc";
    CAPTURE(kib);
    const std::string outcome = attempt(path, p);
    if (outcome == "written") {
      ++written;
      CHECK(cf::open_product(path)->values("tas").size() == sample::kTime * sample::kY * sample::kX);
    } else {
      ++failures;
      CHECK(outcome == path + ": cannot be written: No space left on device");
      CHECK_FALSE(std::filesystem::exists(path));
    }
  }
  CHECK(failures > 5);
  CHECK(written > 5);
  CHECK(attempt((folder.path / "after.nc").string(), p) == "written");  // the libraries are still in order
}

TEST_CASE("a process that met a full disk still ends with its own exit status") {
  const Folder folder;
  const TinyDisk disk((folder.path / "disk").string(), "size=48k");  // enough to define the product, not to close it
  if (!disk.mounted) {
    MESSAGE("skipped: mounting a file system for this test needs root");
    return;
  }
  const pid_t child = ::fork();
  if (child == 0) std::exit(attempt(disk.path + "/p.nc", sample::make(true, true)) == "written" ? 0 : 73);
  int status = -1;
  ::waitpid(child, &status, 0);
  CHECK(WIFEXITED(status));
  CHECK(WEXITSTATUS(status) == 73);
}

TEST_CASE("a folder that may not be written gives one line") {
  const Folder folder;
  const auto p = sample::make(false, false);
  const std::string nowhere = (folder.path / "no" / "such.nc").string();
  CHECK(attempt(nowhere, p) == nowhere + ": cannot be created: No such file or directory");
  const TinyDisk disk((folder.path / "readonly").string(), "size=1m,ro");
  if (disk.mounted) {
    const std::string path = disk.path + "/p.nc";
    CHECK(attempt(path, p) == path + ": cannot be created: Read-only file system");
  } else {
    MESSAGE("skipped: mounting a file system for this test needs root");
  }
  std::filesystem::permissions(folder.path, std::filesystem::perms(0555));
  const std::string path = (folder.path / "p.nc").string();
  if (::geteuid() != 0) {
    CHECK(attempt(path, p) == path + ": cannot be created: Permission denied");
  } else {
    const pid_t child = ::fork();  // root may write anywhere: try as nobody
    if (child == 0) {
      const bool nobody = ::setgid(65534) == 0 && ::setuid(65534) == 0;
      ::_exit(nobody && attempt(path, p) == path + ": cannot be created: Permission denied" ? 0 : 1);
    }
    int status = -1;
    ::waitpid(child, &status, 0);
    CHECK(status == 0);
  }
  std::filesystem::permissions(folder.path, std::filesystem::perms(0755));
}

TEST_CASE("an error of the chunk source passes through, and the file is gone") {
  const Folder folder;
  const std::string path = (folder.path / "p.nc").string();
  const auto p = sample::make(true, true);
  std::vector<std::byte> held;
  const auto failing = [&](std::size_t variable, std::size_t index) -> std::span<const std::byte> {
    if (variable == 1) throw Error(Failure::interrupted, "", "stopped");
    held = sample::chunk_bytes(p, variable, index);
    return held;
  };
  CHECK_THROWS_WITH_AS(cf::write_product(path, p, failing), "stopped", Error);
  CHECK_FALSE(std::filesystem::exists(path));
}

TEST_CASE("records that contradict each other are refused before a file exists") {
  const Folder folder;
  const std::string path = (folder.path / "p.nc").string();
  const auto refused = [&](const cf::ProductFile& p) {
    CHECK_THROWS_AS(sample::write(path, p), Error);
    CHECK_FALSE(std::filesystem::exists(path));
  };
  auto p = sample::make(true, true);
  p.small[0].values.pop_back();
  refused(p);
  p = sample::make(true, true);
  p.small[6].values = {0.5};  // crs is an integer
  refused(p);
  p = sample::make(true, true);
  p.chunked[0].dimensions[1] = "unknown";
  refused(p);
  p = sample::make(true, true);
  p.chunked[0].chunk = {2, 3, 11};
  refused(p);
  p = sample::make(true, true);
  p.chunked[0].level = 10;
  refused(p);
}
