// The isinglass program.
#include "command/commands.h"

int main(int argc, char** argv) {
  return isinglass::run(argc, argv);
}
