// Test only: writes the invented sample product of the unit tests to a path, for the reference script.
#include <iostream>

#include "../unit/cf/sample_product.h"
#include "windrow/base/error.h"

int main(int argc, char** argv) {
  if (argc != 2) return 64;
  try {
    windrow::sample::write(argv[1], windrow::sample::make(true, true));
  } catch (const windrow::Error& e) {
    std::cerr << e.what() << '\n';
    return 73;
  }
  return 0;
}
