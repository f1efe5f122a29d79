// Progress on a terminal: wording, rate, time left, and how often the line is rewritten.
#include "cli/progress.h"

#include <doctest/doctest.h>

using namespace windrow;
using cli::duration_text;
using cli::progress_text;
using cli::RateMeter;
using engine::ProgressState;

namespace {

constexpr double kMiB = 1024.0 * 1024.0;

}  // namespace

TEST_CASE("durations are rounded as a person says them") {
  CHECK(duration_text(-1) == "0 s");
  CHECK(duration_text(0.4) == "0 s");
  CHECK(duration_text(59.4) == "59 s");
  CHECK(duration_text(60) == "1 min");
  CHECK(duration_text(89) == "1 min");
  CHECK(duration_text(90) == "2 min");
  CHECK(duration_text(3599) == "1 h 0 min");
  CHECK(duration_text(2.25 * 3600) == "2 h 15 min");
  CHECK(duration_text(86400 * 3 + 4 * 3600) == "3 d 4 h");
}

TEST_CASE("the progress line tells phase, products, bytes, share, rate and time left") {
  const ProgressState state{"making", 512 * kMiB, 2048 * kMiB, 3, 12};
  CHECK(progress_text(state, 64 * kMiB, 200) ==
        "making, 3 of 12 products, 512.0 MiB of 2.0 GiB (25 %), 64.0 MiB/s, 24 s left");
}

TEST_CASE("the progress line leaves out what is not known") {
  CHECK(progress_text({"reading", 0, 0, 0, 0}, 0, 80) == "reading");
  CHECK(progress_text({"reading", 3 * kMiB, 0, 0, 0}, 0, 80) == "reading, 3.0 MiB");
  CHECK(progress_text({"making", 0, 10 * kMiB, 0, 1}, 0, 80) == "making, 0 of 1 product, 0 B of 10.0 MiB (0 %)");
  CHECK(progress_text({"making", 20 * kMiB, 10 * kMiB, 1, 1}, 5 * kMiB, 80) ==
        "making, 1 of 1 product, 20.0 MiB of 10.0 MiB (100 %), 5.0 MiB/s");
}

TEST_CASE("the progress line is never wider than the terminal and never cuts a character") {
  const ProgressState state{"making t\xC3\xA4s_kelder.nc", 512 * kMiB, 2048 * kMiB, 3, 12};
  CHECK(progress_text(state, 0, 9) == "making t\xC3\xA4");
  CHECK(progress_text(state, 0, 8) == "making t");
  CHECK(progress_text(state, 0, 0).empty());
}

TEST_CASE("a steady rate is told exactly") {
  RateMeter meter;
  for (int i = 0; i <= 100; ++i) meter.add("making", i * 5 * kMiB, i * 0.5);
  CHECK(meter.bytes_per_second() == doctest::Approx(10 * kMiB).epsilon(1e-12));
}

TEST_CASE("a new rate is told to 90 % after 23 seconds") {
  // An exponential mean with a time constant of 10 s has forgotten all but exp(-2.3) = 10 % then.
  RateMeter meter;
  double bytes = 0;
  for (int second = 0; second <= 40; ++second) meter.add("making", bytes += kMiB, second);
  for (int second = 41; second <= 63; ++second) meter.add("making", bytes += 2 * kMiB, second);
  CHECK(meter.bytes_per_second() > 1.89 * kMiB);
  CHECK(meter.bytes_per_second() < 1.91 * kMiB);
}

TEST_CASE("a new phase starts its rate anew") {
  RateMeter meter;
  meter.add("reading", 0, 0);
  meter.add("reading", 10 * kMiB, 1);
  CHECK(meter.bytes_per_second() > 0);
  meter.add("making", 0, 2);
  CHECK(meter.bytes_per_second() == 0);
  meter.add("making", 10, 2.1);
  CHECK(meter.bytes_per_second() == 0);
}

TEST_CASE("the line is rewritten in place at most five times a second and taken away in the end") {
  std::vector<std::string> written;
  double now = 0;
  cli::ProgressLine line([&](const std::string& text) { written.push_back(text); }, [&] { return now; }, 81);
  for (int i = 0; i < 1000; ++i) {
    now = i * 0.01;
    line.show({"making", i * kMiB, 1000 * kMiB, 0, 1});
  }
  CHECK(written.size() <= 50);
  CHECK(written.size() >= 45);
  for (const std::string& text : written) {
    CHECK(text.front() == '\r');
    CHECK(text.ends_with("\x1b[K"));
    CHECK(text.find('\n') == std::string::npos);
    CHECK(text.size() <= 80 + 4);
  }
  line.clear();
  CHECK(written.back() == "\r\x1b[K");
  const std::size_t count = written.size();
  line.clear();
  CHECK(written.size() == count);
}
