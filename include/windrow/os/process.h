// The process and its machine: processors, memory ceiling, signals, clock, lease of a workspace.
#pragma once
#include <cstdint>
#include <functional>
#include <memory>
#include <string>

namespace windrow::os {

int usable_cpus();                  ///< affinity respected
std::int64_t memory_limit();        ///< bytes: the lower of the cgroup's limit and the machine's memory
std::int64_t current_memory();      ///< bytes resident now
std::int64_t peak_memory();         ///< bytes, of this process (VmHWM)
std::string host_name();
std::string utc_now();              ///< 2026-01-31T12:00:00Z
double monotonic_seconds();

/// Catches SIGINT and SIGTERM: stop_requested() becomes true; a second signal ends the process at once.
void watch_signals();
bool stop_requested();

/// Exclusive use of a workspace by one live process: a lease file with host, process and heartbeat. A lease whose
/// process is gone (same host) or whose heartbeat is silent for 60 s is taken over.
class Lease {
 public:
  /// Waits up to wait_s. Error(interrupted) naming the holder otherwise.
  Lease(const std::string& folder, double wait_s);
  ~Lease();
  Lease(const Lease&) = delete;
  Lease& operator=(const Lease&) = delete;
  /// Error(interrupted) when another process has taken the lease over: nothing may be written any more.
  void confirm() const;

 private:
  struct State;
  std::unique_ptr<State> state_;
};

}  // namespace windrow::os
