#include "windrow/os/process.h"

#include <sched.h>
#include <signal.h>
#include <sys/resource.h>
#include <time.h>
#include <unistd.h>

#include <algorithm>
#include <csignal>
#include <ctime>
#include <fstream>
#include <string>

namespace windrow::os {
namespace {

volatile std::sig_atomic_t g_stop = 0;

void on_signal(int number) {
  if (g_stop != 0) {
    ::signal(number, SIG_DFL);
    ::raise(number);
  }
  g_stop = 1;
}

/// A number from a one-line control file; 0 when absent or "max".
std::int64_t control_value(const std::string& path) {
  std::ifstream file(path);
  std::int64_t value = 0;
  return file >> value ? value : 0;
}

}  // namespace

int usable_cpus() {
  cpu_set_t set;
  CPU_ZERO(&set);
  if (::sched_getaffinity(0, sizeof set, &set) != 0) return 1;
  return std::max(1, CPU_COUNT(&set));
}

std::int64_t memory_limit() {
  std::int64_t limit = static_cast<std::int64_t>(::sysconf(_SC_PHYS_PAGES)) * ::sysconf(_SC_PAGE_SIZE);
  std::ifstream groups("/proc/self/cgroup");
  for (std::string line; std::getline(groups, line);) {
    const auto path = line.substr(line.rfind(':') + 1);
    for (const std::string& root : {"/sys/fs/cgroup" + path + "/memory.max",
                                   "/sys/fs/cgroup/memory" + path + "/memory.limit_in_bytes"}) {
      if (const auto value = control_value(root); value > 0) limit = std::min(limit, value);
    }
  }
  return limit;
}

std::int64_t current_memory() {
  std::ifstream file("/proc/self/statm");
  std::int64_t total = 0, resident = 0;
  file >> total >> resident;
  return resident * ::sysconf(_SC_PAGE_SIZE);
}

std::int64_t peak_memory() {
  struct rusage usage {};
  ::getrusage(RUSAGE_SELF, &usage);
  return static_cast<std::int64_t>(usage.ru_maxrss) * 1024;
}

std::string host_name() {
  char name[256] = {};
  return ::gethostname(name, sizeof name - 1) == 0 ? name : "unknown";
}

std::string utc_now() {
  const std::time_t now = std::time(nullptr);
  std::tm parts{};
  ::gmtime_r(&now, &parts);
  char text[32];
  std::strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", &parts);
  return text;
}

double monotonic_seconds() {
  struct timespec now {};
  ::clock_gettime(CLOCK_MONOTONIC, &now);
  return static_cast<double>(now.tv_sec) + 1e-9 * static_cast<double>(now.tv_nsec);
}

void watch_signals() {
  struct sigaction action {};
  action.sa_handler = on_signal;
  sigemptyset(&action.sa_mask);
  action.sa_flags = SA_RESTART;
  ::sigaction(SIGINT, &action, nullptr);
  ::sigaction(SIGTERM, &action, nullptr);
  ::signal(SIGPIPE, SIG_IGN);
}

bool stop_requested() { return g_stop != 0; }

}  // namespace windrow::os
