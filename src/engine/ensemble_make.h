// Values and files of the products of [ensemble]. Private to the engine.
#pragma once
#include <cstdint>
#include <functional>
#include <string>
#include <vector>

#include "ensemble_plan.h"
#include "windrow/cf/product.h"
#include "windrow/pipeline/spool.h"
#include "windrow/plan/units.h"

namespace windrow::engine {

/// What a member's products say about their variable, and how differences are told.
struct MemberText {
  std::string variable, standard_name, long_name, units, units_metadata, cell_methods;
  float missing = 9.96920997e36F;
  bool temperature = false;
  std::vector<cf::Attribute> global;  ///< those all members agree on
};

/// One output's share of a stage: how values are told, and what differences are multiplied with.
struct OutputText {
  std::string variable, standard_name, long_name, units, units_metadata, cell_methods, comment;
  double scale = 1;
};

/// Error(data) where members have different units.
MemberText member_text(const EnsembleStage& stage);
OutputText output_text(const EnsembleStage& stage, const MemberText& member, std::size_t output);

struct EnsembleFacts {
  float minimum = 3.4e38F, maximum = -3.4e38F;
  std::int64_t missing = 0;
  std::vector<std::uint8_t> flags;  ///< one a mesh cell: those of all member products together
  plan::Chunk chunk;
  int level = 1;
};

/// The CF description of a product.
cf::ProductFile describe_ensemble(Session& session, const EnsembleStage& stage, std::size_t product,
                                  const MemberText& member, const EnsembleFacts& facts, const std::string& date);

struct EnsembleHooks {
  std::function<void(std::size_t product)> finished;
  std::function<void(std::int64_t bytes)> progress;
  std::function<bool()> stop;
};

/// Threads and the memory a stage needs. Error(job) when not even one thread fits under the job's ceiling.
struct EnsembleNeeds {
  int threads = 1;
  std::int64_t bound = 0;
  plan::Chunk chunk;
};
EnsembleNeeds ensemble_needs(Session& session, const EnsembleStage& stage);

/// Makes all wanted products of a stage; its members' products must be in place. Error(data) where one is not.
void make_ensemble(Session& session, const EnsembleStage& stage, const EnsembleHooks& hooks);

}  // namespace windrow::engine
