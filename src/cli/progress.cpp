#include "progress.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "windrow/text/words.h"

namespace windrow::cli {
namespace {

constexpr double kShowEvery_s = 0.2;
constexpr double kMeterEvery_s = 0.5;  // shorter intervals measure the buffers, not the work
constexpr double kMemory_s = 10;       // time constant of the rate

std::string size_text(double bytes) { return text::bytes_text(static_cast<std::int64_t>(std::llround(bytes))); }

// The first `columns` characters, never cutting a UTF-8 character.
std::string cut(const std::string& text, int columns) {
  int count = 0;
  for (std::size_t i = 0; i < text.size(); ++i) {
    if ((static_cast<unsigned char>(text[i]) & 0xC0) == 0x80) continue;
    if (count++ == columns) return text.substr(0, i);
  }
  return text;
}

}  // namespace

std::string duration_text(double seconds) {
  const auto whole = static_cast<long long>(std::llround(std::max(seconds, 0.0)));
  if (whole < 60) return fmt::format("{} s", whole);
  const long long minutes = (whole + 30) / 60;
  if (minutes < 60) return fmt::format("{} min", minutes);
  if (minutes < 24 * 60) return fmt::format("{} h {} min", minutes / 60, minutes % 60);
  const long long hours = (minutes + 30) / 60;
  return fmt::format("{} d {} h", hours / 24, hours % 24);
}

void RateMeter::add(const std::string& phase, double done_bytes, double seconds) {
  if (!started_ || phase != phase_ || done_bytes < last_bytes_) {
    phase_ = phase;
    last_bytes_ = done_bytes;
    last_seconds_ = seconds;
    rate_ = 0;
    started_ = true;
    return;
  }
  const double elapsed = seconds - last_seconds_;
  if (elapsed < kMeterEvery_s) return;
  const double now = (done_bytes - last_bytes_) / elapsed;
  const double weight = rate_ > 0 ? 1 - std::exp(-elapsed / kMemory_s) : 1;
  rate_ += weight * (now - rate_);
  last_bytes_ = done_bytes;
  last_seconds_ = seconds;
}

std::string progress_text(const engine::ProgressState& state, double bytes_per_second, int columns) {
  std::string out = state.phase;
  const auto part = [&](const std::string& text) { out += (out.empty() ? "" : ", ") + text; };
  if (state.products_total > 0)
    part(fmt::format("{} of {} product{}", state.products_done, state.products_total,
                     state.products_total == 1 ? "" : "s"));
  if (state.total_bytes > 0) {
    const double share = std::clamp(state.done_bytes / state.total_bytes, 0.0, 1.0);
    part(fmt::format("{} of {} ({:.0f} %)", size_text(state.done_bytes), size_text(state.total_bytes),
                     std::floor(share * 100)));
  } else if (state.done_bytes > 0) {
    part(size_text(state.done_bytes));
  }
  if (bytes_per_second >= 1) {
    part(size_text(bytes_per_second) + "/s");
    const double left = state.total_bytes - state.done_bytes;
    if (left > 0) part(duration_text(left / bytes_per_second) + " left");
  }
  return cut(out, columns);
}

ProgressLine::ProgressLine(Writer write, Clock clock, int columns)
    : write_(std::move(write)), clock_(std::move(clock)), columns_(columns) {}

void ProgressLine::show(const engine::ProgressState& state) {
  const std::lock_guard lock(mutex_);
  const double now = clock_();
  rate_.add(state.phase, state.done_bytes, now);
  if (now - last_shown_ < kShowEvery_s) return;
  last_shown_ = now;
  visible_ = true;
  // The last column stays free: terminals wrap when it is written.
  write_("\r" + progress_text(state, rate_.bytes_per_second(), columns_ - 1) + "\x1b[K");
}

void ProgressLine::clear() {
  const std::lock_guard lock(mutex_);
  if (visible_) write_("\r\x1b[K");
  visible_ = false;
}

}  // namespace windrow::cli
