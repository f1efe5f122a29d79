// What is said about wrong job files, word for word, from the table testdata/job/wrong.txt.
#include <doctest/doctest.h>

#include <cstdlib>
#include <fstream>
#include <sstream>

#include "job_texts.h"
#include "windrow/job/spec.h"

using windrow::Error;
using windrow::Failure;
using windrow::job::parse_job;

namespace {

struct Wrong {
  std::string name, job, said;
};

std::vector<Wrong> wrong_jobs() {
  std::ifstream file(WINDROW_TESTDATA "/job/wrong.txt");
  std::vector<Wrong> out;
  std::string line;
  bool message = false;
  while (std::getline(file, line)) {
    if (line.starts_with("=== ")) {
      out.push_back({line.substr(4), "", ""});
      message = false;
    } else if (line == "---") {
      message = true;
    } else if (!out.empty()) {
      (message ? out.back().said : out.back().job) += line + "\n";
    }
  }
  return out;
}

std::string said_about(const std::string& text, const std::vector<std::string>& overrides = {}) {
  try {
    (void)parse_job("job.toml", text, overrides);
  } catch (const Error& error) {
    CHECK(error.kind() == Failure::job);
    const std::string what = error.what();
    CHECK(what.find('\n') == std::string::npos);
    return what + "\n" + (error.detail().empty() ? "" : error.detail() + "\n");
  }
  return "accepted";
}

}  // namespace

TEST_CASE("a wrong job file is refused with its place, the fault, what was expected, the line and a caret") {
  ::unsetenv("WINDROW_TEST_UNSET");
  const std::vector<Wrong> cases = wrong_jobs();
  REQUIRE(cases.size() >= 40);
  for (const Wrong& wrong : cases) {
    CAPTURE(wrong.name);
    CHECK(said_about(wrong.job) == wrong.said);
  }
}

TEST_CASE("a wrong override is refused by its own text, without a line of the file") {
  const auto said = [](const std::string& text) { return said_about(job_texts::kShortest, {text}); };
  CHECK(said("field.0.unitz=K") == "--set field.0.unitz=K: unknown key 'unitz' in [[field]]; did you mean 'units'?\n");
  CHECK(said("feild.0.units=K") ==
        "--set feild.0.units=K: unknown table 'feild' in the job file; did you mean 'field'?\n");
  CHECK(said("field.1.units=K") == "--set field.1.units=K: 'field' has no entry 1; expected an index from 0 to 0\n");
  CHECK(said("field.units=K") ==
        "--set field.units=K: 'field' is an array, and 'units' is no index in it; expected an index from 0 to 0\n");
  CHECK(said("field.0.variable.x=K") ==
        "--set field.0.variable.x=K: 'field.0.variable' is text and has no keys; expected a key of the job file\n");
  CHECK(said("output.digits=many") == "--set output.digits=many: 'digits' is text; expected a whole number\n");
  CHECK(said("mesh.lon.step=0.3") ==
        "--set mesh.lon.step=0.3: -10 to 30 is 133.333333 steps of 0.3; expected a whole number of steps\n");
  CHECK(said("reach.method=krigin") == "--set reach.method=krigin: unknown method 'krigin'; did you mean 'kriging'?\n");
  CHECK(said("units") == "--set units: no key and value; expected KEY=VALUE with the dotted path of a job-file key\n");
  CHECK(said("field..units=K") ==
        "--set field..units=K: an empty part in the dotted path; expected a path such as field.0.units\n");
}

TEST_CASE("a line too long to be walked safely is refused") {
  std::string deep = "a";
  for (int i = 0; i < 200000; ++i) deep += ".a";
  CHECK(said_about(deep + " = 1\n")
            .starts_with("job.toml:1:1: the line has 400005 bytes; expected at most 8192: break it up\n"));
}
