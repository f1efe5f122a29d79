#include "inputs.h"

#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <sstream>
#include <thread>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/os/process.h"

namespace windrow::engine {
namespace {

constexpr std::int64_t kFresh_ns = 2'000'000'000;

std::int64_t now_ns() {
  return std::chrono::duration_cast<std::chrono::nanoseconds>(std::chrono::system_clock::now().time_since_epoch())
      .count();
}

}  // namespace

codec::Digest digest_file(const std::string& path) {
  os::ByteStream stream(path);
  codec::Hasher hasher;
  std::vector<std::byte> buffer(1 << 20);
  while (const std::size_t got = stream.read(buffer)) hasher.add(std::span<const std::byte>(buffer).first(got));
  return hasher.finish();
}

DigestCache::DigestCache(std::string file, bool reread) : file_(std::move(file)) {
  if (reread || !os::state(file_)) return;
  std::istringstream lines(os::read_text(file_));
  for (std::string line; std::getline(lines, line);) {
    std::istringstream words(line);
    std::string hex, path;
    Entry entry;
    if (words >> hex >> entry.state.size >> entry.state.mtime_ns >> entry.state.inode && words.get() == ' ' &&
        std::getline(words, path)) {
      entry.digest = codec::Digest::from_hex(hex);
      entries_[path] = entry;
    }
  }
}

codec::Digest DigestCache::of(const std::string& path) {
  const auto state = os::state(path);
  if (!state) throw Error(Failure::missing, path, "no such file");
  const std::lock_guard lock(mutex_);
  const auto known = entries_.find(path);
  if (known != entries_.end() && known->second.state == *state) return known->second.digest;
  const codec::Digest digest = digest_file(path);
  const auto after = os::state(path);
  if (!after || !(*after == *state)) {
    throw Error(Failure::io, path, "changed while it was read; run again when it is complete");
  }
  entries_.erase(path);
  if (now_ns() - state->mtime_ns > kFresh_ns) {
    entries_[path] = {*state, digest};
    changed_ = true;
  }
  return digest;
}

void DigestCache::save() const {
  if (!changed_) return;
  std::string text;
  for (const auto& [path, entry] : entries_) {
    if (path.find('\n') != std::string::npos) continue;
    text += fmt::format("{} {} {} {} {}\n", entry.digest.hex(), entry.state.size, entry.state.mtime_ns,
                        entry.state.inode, path);
  }
  os::replace_file(file_, text);
}

std::vector<std::string> run_files(const job::RunSpec& run) {
  std::vector<std::string> out;
  for (const auto& pattern : run.patterns) {
    const auto found = os::glob(pattern);
    if (found.empty()) {
      throw Error(Failure::missing, fmt::format("run '{}'", run.name), fmt::format("no file matches {}", pattern));
    }
    out.insert(out.end(), found.begin(), found.end());
  }
  std::sort(out.begin(), out.end());
  out.erase(std::unique(out.begin(), out.end()), out.end());
  return out;
}

void wait_until_settled(const std::vector<std::vector<std::string>>& files, double settle_s) {
  const auto youngest_s = [&files] {
    std::int64_t newest = 0;
    for (const auto& run : files) {
      for (const auto& path : run) {
        if (const auto state = os::state(path)) newest = std::max(newest, state->mtime_ns);
      }
    }
    return 1e-9 * static_cast<double>(now_ns() - newest);
  };
  while (settle_s > 0 && youngest_s() < settle_s) {
    if (os::stop_requested()) throw Error(Failure::interrupted, "", "interrupted; run again to go on from here");
    std::this_thread::sleep_for(std::chrono::milliseconds(200));
  }
}

std::string told_path(const std::string& path, const std::string& job_folder) {
  const std::string prefix = job_folder == "/" ? job_folder : job_folder + "/";
  return path.starts_with(prefix) ? path.substr(prefix.size()) : path;
}

std::string with_value(std::string text, const std::string& mark, const std::string& value) {
  for (std::size_t at = 0; (at = text.find(mark, at)) != std::string::npos; at += value.size()) {
    text.replace(at, mark.size(), value);
  }
  return text;
}

std::string for_run(std::string text, const job::RunSpec& run) {
  return with_value(with_value(std::move(text), "{run}", run.name), "{family}", run.family);
}

}  // namespace windrow::engine
