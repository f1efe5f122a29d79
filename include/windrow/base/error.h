// The one error type of the project. Every failure a user can meet is thrown as Error: where, what, what was expected.
#pragma once
#include <stdexcept>
#include <string>
#include <utility>

namespace windrow {

/// What kind of failure it is; the command line turns it into an exit status (sysexits).
enum class Failure {
  usage,        ///< 64 bad command line
  data,         ///< 65 input data that cannot be used
  missing,      ///< 66 an input is missing
  defect,       ///< 70 a defect of windrow
  output,       ///< 73 output cannot be created (permission, full disk, quota)
  io,           ///< 74 input/output error
  interrupted,  ///< 75 interrupted or held by another process: run again
  job           ///< 78 bad job file
};

/// One line: `place: message`. `detail` may hold further lines (job-file line with a caret).
class Error : public std::runtime_error {
 public:
  Error(Failure kind, const std::string& place, const std::string& message, std::string detail = {})
      : std::runtime_error(place.empty() ? message : place + ": " + message), kind_(kind), detail_(std::move(detail)) {}
  [[nodiscard]] Failure kind() const { return kind_; }
  [[nodiscard]] const std::string& detail() const { return detail_; }

 private:
  Failure kind_;
  std::string detail_;
};

}  // namespace windrow
