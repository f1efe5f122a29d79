// The command line: what each word means, and what is said about misspelt ones.
#include "cli/arguments.h"

#include <doctest/doctest.h>

#include "cli/exit_status.h"

using namespace windrow;
using cli::Arguments;
using cli::Command;
using cli::parse_arguments;

namespace {

std::string refused(const std::vector<std::string>& words) {
  try {
    (void)parse_arguments(words);
  } catch (const Error& error) {
    CHECK(cli::exit_status(error.kind()) == 64);
    CHECK(error.detail().empty());
    return error.what();
  }
  return "accepted";
}

}  // namespace

TEST_CASE("every option is read, before the command and behind it") {
  const std::vector<std::string> options{"--threads",       "3",      "--quiet", "--reread",   "--set",
                                         "field.0.units=K", "--wait", "2 min",   "--log-json", "run.log",
                                         "--make-deps",     "job.mk"};
  for (const bool before : {true, false}) {
    std::vector<std::string> words = options;
    words.insert(before ? words.end() : words.begin(), {"run", "job.toml"});
    const Arguments arguments = parse_arguments(words);
    CHECK(arguments.command == Command::run);
    CHECK(arguments.job == "job.toml");
    CHECK(arguments.options.threads == 3);
    CHECK(arguments.quiet);
    CHECK(arguments.options.reread);
    CHECK(arguments.options.overrides == std::vector<std::string>{"field.0.units=K"});
    CHECK(arguments.options.wait_s == 120);
    CHECK(arguments.log_json == "run.log");
    CHECK(arguments.options.make_deps == "job.mk");
    CHECK_FALSE(arguments.json);
  }
}

TEST_CASE("what is not said is off") {
  const Arguments arguments = parse_arguments({"plan", "job.toml"});
  CHECK(arguments.command == Command::plan);
  CHECK(arguments.options.threads == 0);
  CHECK(arguments.options.wait_s == 0);
  CHECK_FALSE(arguments.quiet);
  CHECK_FALSE(arguments.json);
  CHECK_FALSE(arguments.options.reread);
  CHECK(arguments.options.overrides.empty());
  CHECK(arguments.options.make_deps.empty());
  CHECK(arguments.log_json.empty());
}

TEST_CASE("each command takes its own words") {
  CHECK(parse_arguments({"new"}).command == Command::start);
  CHECK(parse_arguments({"new"}).kind == "grid");
  CHECK(parse_arguments({"new", "--for", "towns"}).kind == "towns");
  CHECK(parse_arguments({"inspect", "a.nc", "b.csv"}).files == std::vector<std::string>{"a.nc", "b.csv"});
  CHECK(parse_arguments({"vouch", "a.nc", "--json"}).json);
  CHECK(parse_arguments({"run", "job.toml"}).job == "job.toml");
  const Arguments prove = parse_arguments({"prove", "job.toml", "--csv", "scores.csv", "--json"});
  CHECK(prove.command == Command::prove);
  CHECK(prove.job == "job.toml");
  CHECK(prove.csv == "scores.csv");
  CHECK(prove.json);
}

TEST_CASE("--set takes one value and may be repeated; other options count as last said") {
  const Arguments arguments =
      parse_arguments({"run", "--set", "a=1", "job.toml", "--set=b=[1, 2]", "--threads", "1", "--threads", "2"});
  CHECK(arguments.job == "job.toml");
  CHECK(arguments.options.overrides == std::vector<std::string>{"a=1", "b=[1, 2]"});
  CHECK(arguments.options.threads == 2);
}

TEST_CASE("files may be called like commands, and like options behind --") {
  CHECK(parse_arguments({"inspect", "run", "plan"}).files == std::vector<std::string>{"run", "plan"});
  CHECK(parse_arguments({"inspect", "--json", "--", "--odd.nc"}).files == std::vector<std::string>{"--odd.nc"});
  CHECK(parse_arguments({"run", "--", "--job.toml"}).job == "--job.toml");
}

TEST_CASE("help and version are texts to print") {
  const Arguments version = parse_arguments({"--version"});
  CHECK(version.command == Command::print);
  CHECK(version.text == "windrow " WINDROW_VERSION "\n");
  const Arguments help = parse_arguments({"--help"});
  CHECK(help.command == Command::print);
  for (const char* word : {"new", "inspect", "plan", "run", "vouch", "--threads", "--quiet", "--reread", "--set",
                           "--wait", "--log-json", "--make-deps", "--version", "75"})
    CHECK(help.text.find(word) != std::string::npos);
  CHECK(parse_arguments({"new", "--help"}).text.find("--for") != std::string::npos);
  CHECK(parse_arguments({"vouch", "--help"}).text.find("--json") != std::string::npos);
}

TEST_CASE("a wrong command line is refused in one line with the near miss") {
  CHECK(refused({"rum", "job.toml"}) == "unknown command 'rum'; did you mean 'run'?");
  CHECK(refused({"make"}) == "unknown command 'make'; expected new, inspect, plan, run, prove or vouch");
  CHECK(refused({"join", "job.toml"}) ==
        "'join' is not in this version; expected new, inspect, plan, run, prove or vouch");
  CHECK(refused({}) == "no command; expected new, inspect, plan, run, prove or vouch (see `windrow --help`)");
  CHECK(refused({"run"}) == "`windrow run` needs a job file");
  CHECK(refused({"run", ""}) == "`windrow run` needs a job file");
  CHECK(refused({"inspect"}) == "`windrow inspect` needs a file");
  CHECK(refused({"vouch"}) == "`windrow vouch` needs a product");
  CHECK(refused({"run", "a.toml", "b.toml"}) == "'b.toml' is a word too many for `windrow run`");
  CHECK(refused({"run", "a.toml", "--", "b.toml"}) == "'b.toml' is a word too many for `windrow run`");
  CHECK(refused({"new", "grid"}) == "'grid' is a word too many for `windrow new`");
  CHECK(refused({"run", "job.toml", "--thread", "4"}) == "unknown option '--thread'; did you mean '--threads'?");
  CHECK(refused({"run", "job.toml", "--thread=4"}) == "unknown option '--thread'; did you mean '--threads'?");
  CHECK(refused({"--reraed", "run", "job.toml"}) == "unknown option '--reraed'; did you mean '--reread'?");
  CHECK(refused({"run", "job.toml", "--colour"}) == "unknown option '--colour'; see `windrow run --help`");
  CHECK(refused({"--colour"}) == "unknown option '--colour'; see `windrow --help`");
  CHECK(refused({"run", "job.toml", "-x"}) == "unknown option '-x'; see `windrow run --help`");
  CHECK(refused({"run", "job.toml", "--allow-revision"}) == "'--allow-revision' is not in this version; leave it out");
  CHECK(refused({"run", "job.toml", "--part", "1/4"}) == "'--part' is not in this version; leave it out");
  CHECK(refused({"run", "job.toml", "--threads"}) == "--threads needs a value");
  CHECK(refused({"run", "job.toml", "--set"}) == "--set needs a value");
  CHECK(refused({"run", "job.toml", "--threads", "all"}) == "--threads all: expected a whole number from 0 to 4096");
  CHECK(refused({"run", "job.toml", "--threads=-1"}) == "--threads -1: expected a whole number from 0 to 4096");
  CHECK(refused({"run", "job.toml", "--threads", "1.5"}) == "--threads 1.5: expected a whole number from 0 to 4096");
  CHECK(refused({"run", "job.toml", "--wait", "soon"}) == "--wait soon: expected a number of seconds");
}

TEST_CASE("each kind of failure has its own exit status of sysexits.h") {
  // Numbers of <sysexits.h> (4.3BSD), as the C library ships it.
  CHECK(cli::exit_status(Failure::usage) == 64);
  CHECK(cli::exit_status(Failure::data) == 65);
  CHECK(cli::exit_status(Failure::missing) == 66);
  CHECK(cli::exit_status(Failure::defect) == 70);
  CHECK(cli::exit_status(Failure::output) == 73);
  CHECK(cli::exit_status(Failure::io) == 74);
  CHECK(cli::exit_status(Failure::interrupted) == 75);
  CHECK(cli::exit_status(Failure::job) == 78);
}
