// Every exit status of windrow, in one place (numbers of sysexits.h, BSD). What each failure means is in base/error.h.
#pragma once
#include "windrow/base/error.h"

namespace windrow::cli {

inline constexpr int kSuccess = 0;        ///< made, or already up to date
inline constexpr int kUsage = 64;         ///< EX_USAGE: bad command line
inline constexpr int kBadData = 65;       ///< EX_DATAERR: input data that cannot be used; a product that does not hold
inline constexpr int kNoInput = 66;       ///< EX_NOINPUT: an input is missing
inline constexpr int kDefect = 70;        ///< EX_SOFTWARE: a defect of windrow
inline constexpr int kCannotCreate = 73;  ///< EX_CANTCREAT: permission, full disk, quota
inline constexpr int kInputOutput = 74;   ///< EX_IOERR
inline constexpr int kTryAgain = 75;      ///< EX_TEMPFAIL: interrupted, or the workspace is held: run again to go on
inline constexpr int kBadJob = 78;        ///< EX_CONFIG: bad job file

constexpr int exit_status(Failure failure) {
  switch (failure) {
    case Failure::usage:
      return kUsage;
    case Failure::data:
      return kBadData;
    case Failure::missing:
      return kNoInput;
    case Failure::defect:
      return kDefect;
    case Failure::output:
      return kCannotCreate;
    case Failure::io:
      return kInputOutput;
    case Failure::interrupted:
      return kTryAgain;
    case Failure::job:
      return kBadJob;
  }
  return kDefect;
}

}  // namespace windrow::cli
