#include "windrow/os/files.h"

#include <dirent.h>
#include <fcntl.h>
#include <fmt/format.h>
#include <glob.h>
#include <signal.h>
#include <sys/stat.h>
#include <sys/statvfs.h>
#include <unistd.h>

#include <atomic>
#include <cerrno>
#include <cstring>
#include <filesystem>

#include "windrow/base/error.h"

namespace windrow::os {
namespace {

std::string reason(int code) { return std::strerror(code); }

/// Closes on every path out; close errors are checked where they matter (publish).
class Descriptor {
 public:
  explicit Descriptor(int fd) : fd_(fd) {}
  ~Descriptor() {
    if (fd_ >= 0) ::close(fd_);
  }
  Descriptor(const Descriptor&) = delete;
  Descriptor& operator=(const Descriptor&) = delete;
  [[nodiscard]] int get() const { return fd_; }
  int release() { return std::exchange(fd_, -1); }

 private:
  int fd_;
};

Error output_error(const std::string& path, int code) {
  return Error(Failure::output, path, fmt::format("cannot be written: {}", reason(code)));
}

/// Reads until `out` is full or the file ends.
std::size_t read_full(int file, std::span<std::byte> out, const std::string& path) {
  std::size_t done = 0;
  while (done < out.size()) {
    const ssize_t got = ::read(file, out.data() + done, out.size() - done);
    if (got < 0 && errno == EINTR) continue;
    if (got < 0) throw Error(Failure::io, path, fmt::format("cannot be read: {}", reason(errno)));
    if (got == 0) break;
    done += static_cast<std::size_t>(got);
  }
  return done;
}

int open_to_read(const std::string& path) {
  const int file = ::open(path.c_str(), O_RDONLY | O_CLOEXEC);
  if (file >= 0) return file;
  const int code = errno;
  if (code == ENOENT || code == ENOTDIR) throw Error(Failure::missing, path, "no such file");
  throw Error(Failure::io, path, fmt::format("cannot be read: {}", reason(code)));
}

template <typename Container>
Container read_whole(const std::string& path) {
  const Descriptor file(open_to_read(path));
  struct stat info {};
  if (::fstat(file.get(), &info) != 0 || S_ISDIR(info.st_mode)) {
    throw Error(Failure::io, path, "cannot be read: it is a folder");
  }
  Container out;
  out.resize(static_cast<std::size_t>(info.st_size));
  out.resize(read_full(file.get(), std::as_writable_bytes(std::span(out.data(), out.size())), path));
  return out;
}

void sync_folder(const std::string& folder) {
  const Descriptor handle(::open(folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC));
  if (handle.get() >= 0) ::fsync(handle.get());
}

}  // namespace

std::optional<FileState> state(const std::string& path) {
  struct stat info {};
  if (::stat(path.c_str(), &info) != 0) return std::nullopt;
  return FileState{info.st_size, static_cast<std::int64_t>(info.st_mtim.tv_sec) * 1'000'000'000 + info.st_mtim.tv_nsec,
                   static_cast<std::uint64_t>(info.st_ino)};
}

bool is_directory(const std::string& path) {
  struct stat info {};
  return ::stat(path.c_str(), &info) == 0 && S_ISDIR(info.st_mode);
}

ByteStream::ByteStream(const std::string& path) : path_(path), file_(open_to_read(path)) {}
ByteStream::~ByteStream() { ::close(file_); }
std::size_t ByteStream::read(std::span<std::byte> out) { return read_full(file_, out, path_); }

std::string read_text(const std::string& path) { return read_whole<std::string>(path); }
std::vector<std::byte> read_bytes(const std::string& path) { return read_whole<std::vector<std::byte>>(path); }

void make_folder(const std::string& path) {
  std::error_code code;
  std::filesystem::create_directories(path, code);
  if (code) {
    const std::string why = code.value() == ENOTDIR || code.value() == EEXIST ? "a part of the path is a file"
                                                                              : reason(code.value());
    throw Error(Failure::output, path, fmt::format("the folder cannot be made: {}", why));
  }
  if (::access(path.c_str(), W_OK | X_OK) != 0) throw output_error(path, errno);
}

std::string temporary_beside(const std::string& path) {
  static std::atomic<unsigned> counter{0};
  return fmt::format("{}/.{}.{}.{}.part", folder_of(path), file_name_of(path), ::getpid(), counter++);
}

void publish(const std::string& temporary, const std::string& path) {
  Descriptor file(::open(temporary.c_str(), O_RDONLY | O_CLOEXEC));
  if (file.get() < 0 || ::fsync(file.get()) != 0 || ::close(file.release()) != 0 ||
      ::rename(temporary.c_str(), path.c_str()) != 0) {
    const int code = errno;
    remove_quietly(temporary);
    throw output_error(path, code);
  }
  sync_folder(folder_of(path));
}

void replace_file(const std::string& path, std::span<const std::byte> bytes) {
  const std::string temporary = temporary_beside(path);
  Descriptor file(::open(temporary.c_str(), O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666));
  if (file.get() < 0) throw output_error(path, errno);
  std::size_t done = 0;
  while (done < bytes.size()) {
    const ssize_t put = ::write(file.get(), bytes.data() + done, bytes.size() - done);
    if (put < 0 && errno == EINTR) continue;
    if (put < 0) {
      const int code = errno;
      remove_quietly(temporary);
      throw output_error(path, code);
    }
    done += static_cast<std::size_t>(put);
  }
  if (::close(file.release()) != 0) {
    const int code = errno;
    remove_quietly(temporary);
    throw output_error(path, code);
  }
  publish(temporary, path);
}

void replace_file(const std::string& path, const std::string& text) {
  replace_file(path, std::as_bytes(std::span(text.data(), text.size())));
}

void remove_quietly(const std::string& path) { ::unlink(path.c_str()); }

void sweep_temporaries(const std::string& folder) {
  std::error_code code;
  for (const auto& entry : std::filesystem::directory_iterator(folder, code)) {
    const std::string name = entry.path().filename().string();
    if (name.size() < 8 || name.front() != '.' || !name.ends_with(".part")) continue;
    const auto stem = name.substr(0, name.size() - 5);
    const auto last = stem.rfind('.');
    const auto before = last == std::string::npos ? last : stem.rfind('.', last - 1);
    if (before == std::string::npos || before == 0) continue;
    const std::string pid = stem.substr(before + 1, last - before - 1);
    if (pid.empty() || pid.find_first_not_of("0123456789") != std::string::npos) continue;
    const auto process = static_cast<pid_t>(std::stol(pid));
    if (process != ::getpid() && ::kill(process, 0) != 0 && errno == ESRCH) remove_quietly(entry.path().string());
  }
}

std::vector<std::string> glob(const std::string& pattern) {
  glob_t found{};
  std::vector<std::string> out;
  if (::glob(pattern.c_str(), GLOB_ERR, nullptr, &found) == 0) {
    out.assign(found.gl_pathv, found.gl_pathv + found.gl_pathc);
  }
  ::globfree(&found);
  return out;
}

std::string absolute(const std::string& path, const std::string& base_folder) {
  const std::filesystem::path given(path);
  const auto full = given.is_absolute() ? given : std::filesystem::absolute(base_folder) / given;
  return full.lexically_normal().string();
}

std::string folder_of(const std::string& path) {
  const auto parent = std::filesystem::path(path).parent_path().string();
  return parent.empty() ? "." : parent;
}

std::string file_name_of(const std::string& path) { return std::filesystem::path(path).filename().string(); }

std::uint64_t free_bytes(const std::string& folder) {
  struct statvfs info {};
  if (::statvfs(folder.c_str(), &info) != 0) return 0;
  return static_cast<std::uint64_t>(info.f_bavail) * info.f_frsize;
}

}  // namespace windrow::os
