// Which products [ensemble] asks for, from which members, at which steps, and whether they are current. Reads no values
// of products. Private to the engine.
#pragma once
#include <map>
#include <memory>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "session.h"
#include "windrow/calendar/calendar.h"
#include "windrow/ensemble/ensemble.h"

namespace windrow::engine {

using SeriesPtr = std::shared_ptr<const Series>;

enum class EnsembleKind { contrast, anomaly, statistics, warming };

/// Products that are computed together from the same members.
struct EnsembleStage {
  EnsembleKind kind = EnsembleKind::contrast;
  std::size_t field = 0;
  std::string name;  ///< "contrast heron-all minus heron-natural of tas"
  std::vector<SeriesPtr> members;
  std::vector<std::vector<std::size_t>> steps;  ///< [member][step]: places of the stage's steps on the member's axis
  std::vector<std::size_t> period_steps;        ///< of the only member: baseline or warming window
  ensemble::Years period;                       ///< their years
  std::string forcing;                          ///< statistics: of the members
  bool of_anomalies = false;                    ///< statistics
  double level = 0;                             ///< warming
  int centre = 0;                               ///< warming: central year
  std::vector<job::EnsembleStatistic> statistics;
  std::vector<std::string> outputs;                                        ///< what stands for {run}, one a statistic
  std::vector<std::vector<std::pair<std::string, std::string>>> settings;  ///< [output]: those of its kind
  Series result;                       ///< axis; products of all outputs, one output after the other
  std::vector<std::size_t> output_of;  ///< [product]
};

/// What is known of the runs' products: nothing where the inputs could not be read.
using RunProducts = std::map<std::pair<std::size_t, std::size_t>, std::vector<Product>>;  ///< by field and run

struct EnsemblePlan {
  struct Failed {
    std::string name, reason;
    Failure kind;
  };
  std::vector<EnsembleStage> stages;  ///< in the order in which they can be made
  std::vector<Failed> failed;
  std::vector<Notice> notices;  ///< steps, members and levels left out
};

/// Fields without time take no part. Errors of single products are in `failed`.
EnsemblePlan plan_ensemble(Session& session, const RunProducts& runs);

/// Annual global means of a run, from the job's file or from the run's own files with exact cell areas (kept in the
/// workspace). Error(missing), Error(data).
struct GlobalMeans {
  std::vector<ensemble::YearMean> years;
  std::string place;  ///< for messages
};
GlobalMeans global_means(Session& session, std::size_t run);

/// The products of a series that hold any of these steps.
std::vector<const Product*> products_holding(const Series& series, const std::vector<std::size_t>& steps);

}  // namespace windrow::engine
