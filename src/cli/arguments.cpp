// The only includer of the command-line library.
#include "arguments.h"

#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <cmath>

#include "windrow/text/words.h"

namespace windrow::cli {
namespace {

const std::vector<std::string> kCommands{"new", "inspect", "plan", "run", "prove", "vouch"};
const std::vector<std::string> kCommandsToCome{"join"};
const std::vector<std::string> kOptionsToCome{"--allow-revision", "--part"};

constexpr const char* kFooter =
    "Exit status: 0 made or already up to date; 64 bad command line; 65 bad input data, or a product that does not\n"
    "hold; 66 input missing; 70 defect of windrow; 73 cannot create output; 74 input/output error; 75 interrupted or\n"
    "workspace held: run again to go on; 78 bad job file.\n"
    "Start with `windrow new > job.toml`; what a job file can say stands in it.";

constexpr const char* kProveFooter =
    "Every adjusted field, on the anchor run of each family: each station is left out in turn, blocks of neighbouring\n"
    "stations together, and odd or even years or one half of the years; what the others make of its place is compared\n"
    "with its own record, beside the raw model and the height adjustment alone. The verdict rests on blocks of "
    "stations\n"
    "in years that were not fitted. Apart from the file of --csv nothing is written.\n"
    "Options of every command and the exit status: `windrow --help`.";

[[noreturn]] void refuse(const std::string& message) { throw Error(Failure::usage, "", message); }

bool contains(const std::vector<std::string>& words, const std::string& word) {
  return std::find(words.begin(), words.end(), word) != words.end();
}

// What the library fills in; numbers as typed, so that the messages are ours.
struct Typed {
  std::string threads, wait;
};

struct Parser {
  CLI::App app{"windrow: local, station-consistent climate data from coarse model output", "windrow"};
  Arguments arguments;
  Typed typed;
  bool version = false;

  Parser() {
    app.set_help_flag("-h,--help", "Print this help and exit");
    app.add_flag("--version", version, "Print the version and exit");
    app.add_option("--threads", typed.threads, "Threads to use; 0: the job's, else all processors")
        ->option_text("N")
        ->take_last();
    app.add_flag("--quiet", arguments.quiet, "No progress, no notes; of a summary only the last line");
    app.add_flag("--reread", arguments.options.reread, "Digest all inputs anew");
    app.add_option("--set", arguments.options.overrides, "Override a job-file key by its dotted path (field.0.units=K)")
        ->option_text("KEY=VALUE")
        ->allow_extra_args(false);
    app.add_option("--wait", typed.wait, "Wait so long for a workspace that another process holds; default 0")
        ->option_text("SECONDS")
        ->take_last();
    app.add_option("--log-json", arguments.log_json, "Append progress and events, one JSON object a line")
        ->option_text("FILE")
        ->take_last();
    app.add_option("--make-deps", arguments.options.make_deps, "Write a makefile fragment naming each product's inputs")
        ->option_text("FILE")
        ->take_last();
    app.require_subcommand(0, 1);
    app.fallthrough();
    app.allow_extras();
    app.footer(kFooter);

    command("new", "Print a commented job file to start from")
        ->add_option("--for", arguments.kind, "What for: grid, catchments or towns")
        ->option_text("KIND")
        ->take_last();
    CLI::App* inspect = command("inspect", "Say what a NetCDF, raster or station file is understood to be");
    inspect->add_option("FILE", arguments.files, "Files to look at")->option_text("...");
    CLI::App* plan = command("plan", "Read everything, write nothing: what will be made, how and why");
    plan->add_option("JOB", arguments.job, "The job file")->option_text(" ");
    CLI::App* run = command("run", "Make the products");
    run->add_option("JOB", arguments.job, "The job file")->option_text(" ");
    CLI::App* prove = command("prove", "Cross-validate the adjustment: what places without a station can expect");
    prove->add_option("JOB", arguments.job, "The job file")->option_text(" ");
    prove->add_option("--csv", arguments.csv, "Write a line a station, season and score")
        ->option_text("FILE")
        ->take_last();
    prove->footer(kProveFooter);
    CLI::App* vouch = command("vouch", "Check finished products again");
    vouch->add_option("PRODUCT", arguments.files, "Products to check")->option_text("...");
    for (CLI::App* with_json : {inspect, plan, run, prove, vouch})
      with_json->add_flag("--json", arguments.json, "Print JSON instead of text");
  }

  CLI::App* command(const std::string& name, const std::string& description) {
    CLI::App* added = app.add_subcommand(name, description);
    added->set_help_flag("-h,--help", "Print this help and exit");
    added->fallthrough();
    added->allow_extras();
    added->footer("Options of every command and the exit status: `windrow --help`.");
    return added;
  }

  // Names of the options a user can give at this point, "--threads", ...
  [[nodiscard]] std::vector<std::string> option_names(const CLI::App* chosen) const {
    std::vector<std::string> names;
    for (const CLI::App* level : {&app, chosen}) {
      if (level == nullptr) continue;
      for (const CLI::Option* option : level->get_options())
        for (const std::string& name : option->get_lnames()) names.push_back("--" + name);
    }
    return names;
  }
};

void refuse_option(const Parser& parser, const CLI::App* chosen, const std::string& word) {
  const std::string name = word.substr(0, word.find('='));
  if (contains(kOptionsToCome, name)) refuse(fmt::format("'{}' is not in this version; leave it out", name));
  const std::string where = chosen == nullptr ? "windrow" : "windrow " + chosen->get_name();
  const std::string nearest = text::nearest_word(name, parser.option_names(chosen));
  refuse(fmt::format(
      "unknown option '{}'; {}", name,
      nearest.empty() ? fmt::format("see `{} --help`", where) : fmt::format("did you mean '{}'?", nearest)));
}

void refuse_command(const std::string& word) {
  const std::string expected = text::alternatives(kCommands);
  if (contains(kCommandsToCome, word)) refuse(fmt::format("'{}' is not in this version; expected {}", word, expected));
  const std::string nearest = text::nearest_word(word, kCommands);
  refuse(fmt::format("unknown command '{}'; {}", word,
                     nearest.empty() ? "expected " + expected : fmt::format("did you mean '{}'?", nearest)));
}

// Words nothing took: a misspelt option or command, or a word too many.
void check_rest(const Parser& parser, const CLI::App* chosen) {
  for (const std::string& word : parser.app.remaining(true)) {
    if (word.size() > 1 && word.front() == '-') refuse_option(parser, chosen, word);
    if (chosen == nullptr) refuse_command(word);
    refuse(fmt::format("'{}' is a word too many for `windrow {}`", word, chosen->get_name()));
  }
}

int threads(const std::string& typed) {
  if (typed.empty()) return 0;
  const std::optional<double> number = text::parse_number(typed);
  if (!number || *number != std::floor(*number) || *number < 0 || *number > 4096)
    refuse(fmt::format("--threads {}: expected a whole number from 0 to 4096", typed));
  return static_cast<int>(*number);
}

double wait_seconds(const std::string& typed) {
  if (typed.empty()) return 0;
  std::optional<double> seconds = text::parse_number(typed);
  if (!seconds) seconds = text::parse_seconds(typed);
  if (!seconds || *seconds < 0) refuse(fmt::format("--wait {}: expected a number of seconds", typed));
  return *seconds;
}

void take_file(const CLI::App& chosen, const std::string& word, Arguments& arguments) {
  const std::string& name = chosen.get_name();
  if (name == "inspect" || name == "vouch")
    arguments.files.push_back(word);
  else if (name != "new" && arguments.job.empty())
    arguments.job = word;
  else
    refuse(fmt::format("'{}' is a word too many for `windrow {}`", word, name));
}

void check_files(const CLI::App& chosen, const Arguments& arguments) {
  const std::string& name = chosen.get_name();
  if (name == "new") return;
  if (name == "inspect" || name == "vouch") {
    if (arguments.files.empty())
      refuse(fmt::format("`windrow {}` needs a {}", name, name == "vouch" ? "product" : "file"));
    return;
  }
  if (arguments.job.empty()) refuse(fmt::format("`windrow {}` needs a job file", name));
}

}  // namespace

Arguments parse_arguments(const std::vector<std::string>& words) {
  Parser parser;
  // Behind "--" everything is a file, however it begins.
  const auto options_end = std::find(words.begin(), words.end(), "--");
  try {
    parser.app.parse(std::vector<std::string>(std::make_reverse_iterator(options_end), words.rend()));
  } catch (const CLI::CallForHelp&) {
    parser.arguments.text = parser.app.help();
    return parser.arguments;
  } catch (const CLI::ArgumentMismatch& error) {
    const std::string what = error.what();
    refuse(fmt::format("{} needs a value", what.substr(0, what.find(':'))));
  } catch (const CLI::ParseError& error) {
    refuse(error.what());
  }
  const std::vector<CLI::App*> chosen = parser.app.get_subcommands();
  check_rest(parser, chosen.empty() ? nullptr : chosen.front());
  Arguments& arguments = parser.arguments;
  if (parser.version) {
    arguments.text = "windrow " WINDROW_VERSION "\n";
    return arguments;
  }
  if (chosen.empty()) refuse("no command; expected " + text::alternatives(kCommands) + " (see `windrow --help`)");
  constexpr Command kChosen[] = {Command::start, Command::inspect, Command::plan,
                                 Command::run,   Command::prove,   Command::vouch};
  const auto at = std::find(kCommands.begin(), kCommands.end(), chosen.front()->get_name());
  arguments.command = kChosen[at - kCommands.begin()];
  arguments.options.threads = threads(parser.typed.threads);
  arguments.options.wait_s = wait_seconds(parser.typed.wait);
  for (auto word = options_end; word != words.end(); ++word)
    if (word != options_end) take_file(*chosen.front(), *word, arguments);
  check_files(*chosen.front(), arguments);
  return arguments;
}

}  // namespace windrow::cli
