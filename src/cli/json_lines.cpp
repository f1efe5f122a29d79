// The only includer of the JSON library in this module.
#include "json_lines.h"

#include <cerrno>
#include <cstring>
#include <nlohmann/json.hpp>

#include "exit_status.h"
#include "windrow/os/process.h"
#include "wording.h"

namespace windrow::cli {
namespace {

using Json = nlohmann::ordered_json;

constexpr double kLogProgressEvery_s = 1;

std::string line(const Json& json) { return json.dump(-1, ' ', false, Json::error_handler_t::replace); }

}  // namespace

std::string progress_json(const std::string& time, const engine::ProgressState& state) {
  return line({{"time", time},
               {"event", "progress"},
               {"phase", state.phase},
               {"done_bytes", state.done_bytes},
               {"total_bytes", state.total_bytes},
               {"products_done", state.products_done},
               {"products_total", state.products_total}});
}

std::string event_json(const std::string& time, const engine::Event& event) {
  return line({{"time", time}, {"event", event.kind}, {"text", event.text}});
}

std::string summary_json(const engine::Summary& summary) {
  Json products = Json::array(), notices = Json::array();
  for (const engine::ProductStatus& product : summary.products)
    products.push_back({{"path", product.path}, {"state", state_word(product.state)}, {"reason", product.reason}});
  for (const Notice& notice : summary.notices) notices.push_back({{"place", notice.place}, {"text", notice.text}});
  return line({{"products", products},
               {"notices", notices},
               {"seconds", summary.seconds},
               {"output_bytes", summary.output_bytes},
               {"peak_memory_bytes", summary.peak_memory},
               {"status", summary.failure ? exit_status(*summary.failure) : kSuccess}});
}

std::string vouched_json(const engine::Vouched& vouched) {
  Json checks = Json::array();
  for (const engine::Check& check : vouched.checks)
    checks.push_back({{"name", check.name}, {"verdict", verdict_word(check.verdict)}, {"text", check.text}});
  return line({{"product", vouched.product},
               {"holds", vouched.holds()},
               {"value_digest", vouched.value_digest},
               {"checks", checks}});
}

JsonLog::JsonLog(const std::string& path) : file_(path, std::ios::app) {
  if (!file_) throw Error(Failure::output, path, std::string("cannot open the log: ") + std::strerror(errno));
}

void JsonLog::progress(const engine::ProgressState& state) {
  const std::lock_guard lock(mutex_);
  const double now = os::monotonic_seconds();
  if (now - last_progress_ < kLogProgressEvery_s) return;
  last_progress_ = now;
  write(progress_json(os::utc_now(), state));
}

void JsonLog::event(const engine::Event& event) {
  const std::lock_guard lock(mutex_);
  write(event_json(os::utc_now(), event));
}

bool JsonLog::complete() const {
  const std::lock_guard lock(mutex_);
  return file_.good();
}

void JsonLog::write(const std::string& line) { file_ << line << '\n' << std::flush; }

}  // namespace windrow::cli
