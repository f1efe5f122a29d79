// The command line as a plain record. Parsing only: nothing is printed or opened here.
#pragma once
#include <string>
#include <vector>

#include "windrow/engine/engine.h"

namespace windrow::cli {

enum class Command {
  print,
  start,
  inspect,
  plan,
  run,
  prove,
  vouch
};  ///< start: `windrow new`; print: --help, --version

struct Arguments {
  Command command = Command::print;
  std::string text;                ///< print: what to print
  std::string kind = "grid";       ///< start: --for
  std::string job;                 ///< plan, run, prove
  std::vector<std::string> files;  ///< inspect, vouch: at least one
  bool json = false;
  bool quiet = false;
  std::string csv;       ///< prove: path or empty
  std::string log_json;  ///< path or empty
  engine::Options options;
};

/// `words` without the program's name. Error(usage), one line, with the near miss of a misspelt command or option.
Arguments parse_arguments(const std::vector<std::string>& words);

}  // namespace windrow::cli
