// What commands print: summaries, checks, errors, and their JSON.
#include <doctest/doctest.h>
#include <unistd.h>

#include <cstdio>
#include <fstream>

#include "cli/json_lines.h"
#include "cli/wording.h"

using namespace windrow;
using engine::State;
using engine::Verdict;

namespace {

engine::Summary summary() {
  engine::Summary out;
  out.products = {{"out/a.nc", State::made, "new"},
                  {"out/b.nc", State::current, ""},
                  {"out/c.nc", State::failed, "in/c.nc: no variable 'tas'"},
                  {"out/d.nc", State::failed, ""}};
  out.notices = {{"in/a.nc", "units 'deg C' read as 'degC'"}};
  out.failure = Failure::data;
  out.seconds = 2;
  out.output_bytes = 64.0 * 1024 * 1024;
  out.peak_memory = 512LL * 1024 * 1024;
  return out;
}

engine::Vouched vouched(Verdict verdict) {
  return {"out/a.nc", {{"structure", Verdict::passed, ""}, {"conservation", verdict, "2.1e-15, bound 1e-12"}}, "ab12"};
}

}  // namespace

TEST_CASE("a summary's last line counts made, current and failed and names the failed") {
  CHECK(cli::summary_text(summary(), false) ==
        "made    out/a.nc: new\n"
        "1 made, 1 current, 2 failed: out/c.nc, out/d.nc [2.0 s, 64.0 MiB of values (32.0 MiB/s), peak memory 512.0 MiB]\n");
  CHECK(cli::summary_text(summary(), true) ==
        "1 made, 1 current, 2 failed: out/c.nc, out/d.nc [2.0 s, 64.0 MiB of values (32.0 MiB/s), peak memory 512.0 MiB]\n");
  engine::Summary nothing;
  nothing.products = {{"out/a.nc", State::current, ""}};
  nothing.seconds = 0.04;
  CHECK(cli::summary_text(nothing, false) == "0 made, 1 current, 0 failed [0.0 s]\n");
}

TEST_CASE("each reason of failed products is told once, as an error") {
  engine::Summary both = summary();
  both.products[3].reason = both.products[2].reason;
  CHECK(cli::failures_text(both) == "windrow: in/c.nc: no variable 'tas'\n");
  both.products[3].reason = "in/d.nc: no such file";
  CHECK(cli::failures_text(both) == "windrow: in/c.nc: no variable 'tas'\nwindrow: in/d.nc: no such file\n");
  CHECK(cli::failures_text({}).empty());
}

TEST_CASE("a product's checks are told a line each") {
  CHECK(cli::vouched_text(vouched(Verdict::passed)) ==
        "passed       out/a.nc: structure\n"
        "passed       out/a.nc: conservation, 2.1e-15, bound 1e-12\n"
        "             out/a.nc: digest of the values ab12\n");
}

TEST_CASE("errors and notes name their place") {
  CHECK(cli::error_text(Error(Failure::job, "job.toml:1:2", "no key", "metod = 1\n ^")) ==
        "windrow: job.toml:1:2: no key\nmetod = 1\n ^\n");
  CHECK(cli::error_text(Error(Failure::usage, "", "no command")) == "windrow: no command\n");
  CHECK(cli::notice_text({"station K07", "left out: 4 complete years"}) ==
        "note: station K07: left out: 4 complete years");
  CHECK(cli::notice_text({"", "no stations"}) == "note: no stations");
}

TEST_CASE("JSON lines hold every figure and one line each, whatever bytes a name has") {
  CHECK(cli::progress_json("2026-01-31T12:00:00Z", {"making", 1, 2, 3, 4}) ==
        R"({"time":"2026-01-31T12:00:00Z","event":"progress","phase":"making","done_bytes":1.0,)"
        R"("total_bytes":2.0,"products_done":3,"products_total":4})");
  CHECK(cli::event_json("2026-01-31T12:00:00Z", {"notice", "a \"b\"\n\xFF"}) ==
        "{\"time\":\"2026-01-31T12:00:00Z\",\"event\":\"notice\",\"text\":\"a \\\"b\\\"\\n\xEF\xBF\xBD\"}");
  CHECK(cli::summary_json(summary()) ==
        R"({"products":[{"path":"out/a.nc","state":"made","reason":"new"},)"
        R"({"path":"out/b.nc","state":"current","reason":""},)"
        R"({"path":"out/c.nc","state":"failed","reason":"in/c.nc: no variable 'tas'"},)"
        R"({"path":"out/d.nc","state":"failed","reason":""}],)"
        R"("notices":[{"place":"in/a.nc","text":"units 'deg C' read as 'degC'"}],)"
        R"("seconds":2.0,"output_bytes":67108864.0,"peak_memory_bytes":536870912,"status":65})");
}

TEST_CASE("the JSON log is appended to, and progress is logged once a second at most") {
  const std::string path = "/tmp/windrow_log_" + std::to_string(::getpid()) + ".json";
  for (int run = 0; run < 2; ++run) {
    cli::JsonLog log(path);
    for (int i = 0; i < 100; ++i) log.progress({"making", 1, 2, 0, 1});
    log.event({"made", "out/a.nc"});
    CHECK(log.complete());
  }
  std::ifstream file(path);
  std::string line;
  int progress = 0, events = 0;
  while (std::getline(file, line)) {
    progress += line.find("\"event\":\"progress\"") != std::string::npos;
    events += line.find("\"event\":\"made\"") != std::string::npos;
  }
  CHECK(progress == 2);
  CHECK(events == 2);
  std::remove(path.c_str());
  CHECK_THROWS_AS(cli::JsonLog("/no/such/folder/log.json"), Error);
}
