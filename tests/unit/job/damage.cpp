// Damaged job files: cut or changed at every byte they are read or refused with a job error, never anything else.
#include <doctest/doctest.h>

#include <algorithm>
#include <random>

#include "job_texts.h"
#include "windrow/job/spec.h"

using namespace windrow;

namespace {

// True when the text was read; a refusal must be one line with a place, of kind job.
bool reads(const std::string& text) {
  try {
    (void)job::parse_job("job.toml", text, {});
    return true;
  } catch (const Error& error) {
    const std::string what = error.what();
    const bool sound = error.kind() == Failure::job && what.starts_with("job.toml:") &&
                       what.find('\n') == std::string::npos && what.find('\0') == std::string::npos;
    if (!sound) FAIL("unsound refusal: " << what);
    return false;
  }
}

}  // namespace

TEST_CASE("a job file cut at any byte is read or refused with a job error") {
  REQUIRE(reads(job_texts::kEveryKey));
  int refused = 0;
  for (std::size_t length = 0; length < job_texts::kEveryKey.size(); ++length)
    refused += reads(job_texts::kEveryKey.substr(0, length)) ? 0 : 1;
  CHECK(refused > 1000);
}

TEST_CASE("a job file with any byte changed is read or refused with a job error") {
  int refused = 0;
  for (std::size_t at = 0; at < job_texts::kEveryKey.size(); ++at) {
    for (const char byte : {'\0', '\n', '"', '[', '{', '9', '-', '\xFF'}) {
      std::string text = job_texts::kEveryKey;
      text[at] = byte;
      refused += reads(text) ? 0 : 1;
    }
  }
  CHECK(refused > 5000);
}

TEST_CASE("a job file with pieces left out, doubled or moved is read or refused with a job error") {
  std::mt19937 random(20260301);
  int refused = 0;
  for (int trial = 0; trial < 3000; ++trial) {
    std::string text = job_texts::kEveryKey;
    for (int step = 0; step < 3; ++step) {
      const std::size_t from = random() % text.size(), count = random() % 40, to = random() % text.size();
      const std::string piece = text.substr(from, count);
      if (random() % 2 == 0) text.erase(from, count);
      text.insert(std::min(to, text.size()), piece);
    }
    refused += reads(text) ? 0 : 1;
  }
  CHECK(refused > 1000);
}
