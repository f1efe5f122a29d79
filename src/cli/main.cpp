// The program: parses, calls the engine, prints, and turns failures into the exit status.
#include <fmt/format.h>
#include <sys/ioctl.h>
#include <unistd.h>

#include <cstdio>
#include <cstdlib>
#include <memory>
#include <new>
#include <optional>
#include <string_view>

#include "arguments.h"
#include "exit_status.h"
#include "json_lines.h"
#include "progress.h"
#include "windrow/job/spec.h"
#include "windrow/os/files.h"
#include "windrow/os/process.h"
#include "wording.h"

namespace {

namespace cli = windrow::cli;
namespace engine = windrow::engine;
namespace job = windrow::job;
namespace os = windrow::os;
using windrow::Error;
using windrow::Failure;
using windrow::Notice;

void print(const std::string& text) { std::fwrite(text.data(), 1, text.size(), stdout); }
void tell(const std::string& text) {
  std::fwrite(text.data(), 1, text.size(), stderr);
  std::fflush(stderr);
}

// Columns of the terminal standard error is, nothing when it is none (or one that cannot rewrite a line).
std::optional<int> terminal_columns() {
  const char* terminal = std::getenv("TERM");
  if (::isatty(STDERR_FILENO) == 0 || terminal == nullptr || std::string_view(terminal) == "dumb") return std::nullopt;
  winsize size{};
  const bool known = ::ioctl(STDERR_FILENO, TIOCGWINSZ, &size) == 0 && size.ws_col > 10;
  return known ? size.ws_col : 80;
}

int run(const cli::Arguments& arguments) {
  std::unique_ptr<cli::JsonLog> log;
  std::unique_ptr<cli::ProgressLine> line;
  if (!arguments.log_json.empty()) log = std::make_unique<cli::JsonLog>(arguments.log_json);
  if (const auto columns = terminal_columns(); columns && !arguments.quiet)
    line = std::make_unique<cli::ProgressLine>(tell, os::monotonic_seconds, *columns);
  os::watch_signals();

  // Never throws: a log that cannot be written must not hide what the run itself has to say.
  const auto finish = [&](int status, const std::string& text) {
    if (line) line->clear();
    if (!log) return status;
    log->event({status == cli::kSuccess ? "end" : "failed", fmt::format("exit status {}{}", status, text)});
    if (log->complete()) return status;
    tell(fmt::format("windrow: {}: the log could not be written in full\n", arguments.log_json));
    return status == cli::kSuccess ? cli::kCannotCreate : status;
  };
  try {
    const engine::Summary summary = engine::run(
        arguments.job, arguments.options,
        [&](const engine::ProgressState& state) {
          if (line) line->show(state);
          if (log) log->progress(state);
        },
        [&](const engine::Event& event) {
          if (log) log->event(event);
        });
    const int status = finish(summary.failure ? cli::exit_status(*summary.failure) : cli::kSuccess, "");
    if (!arguments.quiet)
      for (const Notice& notice : summary.notices) tell(cli::notice_text(notice) + "\n");
    tell(cli::failures_text(summary));
    print(arguments.json ? cli::summary_json(summary) + "\n" : cli::summary_text(summary, arguments.quiet));
    return status;
  } catch (const Error& error) {
    (void)finish(cli::exit_status(error.kind()), std::string(", ") + error.what());
    throw;
  }
}

int prove(const cli::Arguments& arguments) {
  std::unique_ptr<cli::ProgressLine> line;
  if (const auto columns = terminal_columns(); columns && !arguments.quiet)
    line = std::make_unique<cli::ProgressLine>(tell, os::monotonic_seconds, *columns);
  os::watch_signals();
  const auto show = [&](const engine::ProgressState& state) {
    if (line) line->show(state);
  };
  const auto clear = [&] {
    if (line) line->clear();
  };
  try {
    const engine::Proof proof = engine::prove(arguments.job, arguments.options, show);
    clear();
    if (!arguments.quiet)
      for (const Notice& notice : proof.notices) tell(cli::notice_text(notice) + "\n");
    for (const std::string& failure : proof.failures) tell(fmt::format("windrow: {}\n", failure));
    if (!arguments.csv.empty() && !proof.csv.empty()) os::replace_file(arguments.csv, proof.csv);
    print(arguments.json ? proof.report.json : proof.report.text);
    return proof.failure ? cli::exit_status(*proof.failure) : cli::kSuccess;
  } catch (const Error&) {
    clear();
    throw;
  }
}

// Calls `one` for each file; an Error of one file does not keep the others from being looked at.
template <class F>
int for_each_file(const std::vector<std::string>& files, F one) {
  int status = cli::kSuccess;
  for (const std::string& file : files) {
    int found = cli::kSuccess;
    try {
      found = one(file);
    } catch (const Error& error) {
      std::fflush(stdout);
      tell(cli::error_text(error));
      found = cli::exit_status(error.kind());
    }
    if (status == cli::kSuccess) status = found;
  }
  return status;
}

int dispatch(const cli::Arguments& arguments) {
  switch (arguments.command) {
    case cli::Command::print:
      print(arguments.text);
      return cli::kSuccess;
    case cli::Command::start:
      print(job::template_text(arguments.kind));
      return cli::kSuccess;
    case cli::Command::inspect:
      return for_each_file(arguments.files, [&](const std::string& file) {
        const engine::Report report = engine::inspect(file);
        print(arguments.json ? report.json + "\n" : report.text);
        return cli::kSuccess;
      });
    case cli::Command::plan: {
      const engine::Report report = engine::plan(arguments.job, arguments.options);
      print(arguments.json ? report.json + "\n" : report.text);
      return cli::kSuccess;
    }
    case cli::Command::run:
      return run(arguments);
    case cli::Command::prove:
      return prove(arguments);
    case cli::Command::vouch:
      return for_each_file(arguments.files, [&](const std::string& file) {
        const engine::Vouched vouched = engine::vouch(file);
        print(arguments.json ? cli::vouched_json(vouched) + "\n" : cli::vouched_text(vouched));
        return vouched.holds() ? cli::kSuccess : cli::kBadData;
      });
  }
  return cli::kDefect;
}

int guarded(const std::vector<std::string>& words) {
  try {
    return dispatch(cli::parse_arguments(words));
  } catch (const Error& error) {
    std::fflush(stdout);
    tell(cli::error_text(error));
    return cli::exit_status(error.kind());
  } catch (const std::bad_alloc&) {
    tell("windrow: memory ran out; a lower 'memory' in [job] makes smaller tiles\n");
  } catch (const std::exception& error) {
    tell(fmt::format("windrow: a defect of windrow: {}; please report it with the job file\n", error.what()));
  }
  return cli::kDefect;
}

}  // namespace

int main(int count, char** words) {
  const int status = guarded({words + 1, words + count});
  if (std::fflush(stdout) != 0 || std::ferror(stdout) != 0) {
    tell("windrow: cannot write to standard output\n");
    return status == cli::kSuccess ? cli::kInputOutput : status;
  }
  return status;
}
