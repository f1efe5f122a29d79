// The lease of a workspace: a small file with host, process and start time, touched as a heartbeat.
#include <fcntl.h>
#include <fmt/format.h>
#include <signal.h>
#include <sys/stat.h>
#include <unistd.h>

#include <atomic>
#include <cerrno>
#include <chrono>
#include <condition_variable>
#include <cstring>
#include <mutex>
#include <sstream>
#include <thread>

#include "windrow/base/error.h"
#include "windrow/os/files.h"
#include "windrow/os/process.h"

namespace windrow::os {
namespace {
constexpr auto kHeartbeat = std::chrono::seconds(15);
constexpr double kSilent_s = 60;

double seconds_since_change(const std::string& path) {
  struct stat info {};
  if (::stat(path.c_str(), &info) != 0) return 0;
  return std::chrono::duration<double>(std::chrono::system_clock::now().time_since_epoch()).count() -
         (static_cast<double>(info.st_mtim.tv_sec) + 1e-9 * static_cast<double>(info.st_mtim.tv_nsec));
}

struct Holder {
  std::string host;
  long process = 0;
};

Holder holder_of(const std::string& path) {
  Holder holder;
  try {
    std::istringstream(read_text(path)) >> holder.host >> holder.process;
  } catch (const Error&) {
    // Gone between two looks: nobody holds it.
  }
  return holder;
}

bool abandoned(const std::string& path, const Holder& holder) {
  if (holder.host == host_name() && holder.process > 0) {
    return ::kill(static_cast<pid_t>(holder.process), 0) != 0 && errno == ESRCH;
  }
  return seconds_since_change(path) > kSilent_s;
}
}  // namespace

struct Lease::State {
  std::string path, text;
  std::mutex mutex;
  std::condition_variable wake;
  bool ending = false;
  std::thread heartbeat;

  void beat() {
    std::unique_lock lock(mutex);
    while (!wake.wait_for(lock, kHeartbeat, [this] { return ending; })) {
      ::utimensat(AT_FDCWD, path.c_str(), nullptr, 0);
    }
  }
};

Lease::Lease(const std::string& folder, double wait_s) : state_(std::make_unique<State>()) {
  state_->path = folder + "/lease";
  state_->text = fmt::format("{} {} {}\n", host_name(), ::getpid(), utc_now());
  const double start = monotonic_seconds();
  while (true) {
    const int fd = ::open(state_->path.c_str(), O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    if (fd >= 0) {
      const auto put = ::write(fd, state_->text.data(), state_->text.size());
      const int code = errno;
      ::close(fd);
      if (put != static_cast<ssize_t>(state_->text.size())) {
        remove_quietly(state_->path);
        throw Error(Failure::output, state_->path, fmt::format("cannot be written: {}", std::strerror(code)));
      }
      break;
    }
    if (errno != EEXIST) {
      throw Error(Failure::output, state_->path, fmt::format("cannot be written: {}", std::strerror(errno)));
    }
    const Holder holder = holder_of(state_->path);
    if (abandoned(state_->path, holder)) {
      // Renamed before removal, so that of two that take over only one removes this very lease.
      const std::string old = temporary_beside(state_->path);
      if (::rename(state_->path.c_str(), old.c_str()) == 0) remove_quietly(old);
      continue;
    }
    if (monotonic_seconds() - start >= wait_s) {
      throw Error(Failure::interrupted, folder,
                  fmt::format("the workspace is held by process {} on {}; run again later or use --wait SECONDS",
                              holder.process, holder.host));
    }
    std::this_thread::sleep_for(std::chrono::milliseconds(200));
  }
  state_->heartbeat = std::thread([state = state_.get()] { state->beat(); });
}

Lease::~Lease() {
  {
    const std::lock_guard lock(state_->mutex);
    state_->ending = true;
  }
  state_->wake.notify_all();
  state_->heartbeat.join();
  if (holder_of(state_->path).process == ::getpid()) remove_quietly(state_->path);
}

void Lease::confirm() const {
  const Holder holder = holder_of(state_->path);
  if (holder.process != ::getpid() || holder.host != host_name()) {
    throw Error(Failure::interrupted, state_->path, "the workspace was taken over by another process; run again");
  }
}

}  // namespace windrow::os
