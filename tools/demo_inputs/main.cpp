// Makes the inputs of the demo job: windrow_demo_inputs FOLDER. All of it is invented; the same bytes every time.
#include <exception>
#include <filesystem>
#include <iostream>
#include <string>

#include "invented.h"
#include "island.h"
#include "model_files.h"
#include "station_files.h"

int main(int count, char** arguments) {
  if (count != 2) {
    std::cerr << "usage: windrow_demo_inputs FOLDER\n";
    return 64;
  }
  try {
    const std::string folder = arguments[1];
    std::filesystem::create_directories(folder);
    demo::write_relief(folder + "/relief");
    for (const demo::Model& model : demo::kModels) demo::write_model(model, folder);
    demo::write_stations(folder);
  } catch (const std::exception& error) {
    std::cerr << error.what() << '\n';
    return 73;
  }
  return 0;
}
